"""How long a build takes beside what pyarrow alone needs, and beside a loop over trials.

Run ``python tests/benchmarks/build.py`` in a checkout. Every figure is a whole process of its own
on one core; three are run in turn, round after round, and the ratios of their medians are what
counts: seconds differ from machine to machine.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq
from pyarrow import csv

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT))

import etl  # noqa: E402
from tests.benchmarks.lab_loop import in_numpy, in_pandas, outcomes_of  # noqa: E402
from tests.simulator import write_bulk_study  # noqa: E402

LOOPS = {"pandas": in_pandas, "numpy": in_numpy}
TABLES = ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")


def make(folder: Path, readers: int, trials: int, fixations: int) -> Path:
    """Write the study and give its study file."""
    study = write_bulk_study(folder, readers=readers, trials=trials, fixations=fixations, regions=6)
    return study.study_file


def floor(study: Path, built: Path) -> None:
    """What pyarrow alone needs: read the same logs, write the very same tables.

    The tables are read into memory beforehand, texts as codes, which is the fastest form to write;
    only the reading of logs and the writing of tables is reported.
    """
    pa.set_cpu_count(1)
    pa.set_io_thread_count(1)
    tables, groups = {}, {}
    for name in TABLES:
        path = built / f"{name}.parquet"
        texts = [f.name for f in pq.read_schema(path) if pa.types.is_string(f.type)]
        tables[name] = pq.read_table(path, read_dictionary=texts)
        groups[name] = pq.read_metadata(path).row_group(0).num_rows
    started = time.perf_counter()
    for log in sorted((study.parent / "logs").iterdir()):
        csv.read_csv(
            log,
            read_options=csv.ReadOptions(use_threads=False),
            parse_options=csv.ParseOptions(delimiter="\t"),
        )
    with tempfile.TemporaryDirectory(dir=built.parent) as folder:
        for name, table in tables.items():
            pq.write_table(
                table,
                Path(folder) / f"{name}.parquet",
                compression="zstd",
                row_group_size=groups[name],
            )
        print(time.perf_counter() - started)


def build(study: Path, into: Path) -> None:
    """The whole build, from the study file to the published folder."""
    pa.set_cpu_count(1)
    pa.set_io_thread_count(1)
    started = time.perf_counter()
    etl.build(etl.load_study(study), into=into, workers=1)
    print(time.perf_counter() - started)


def loop(study: Path, readers: int, style: str) -> None:
    """What a lab would write: pandas, groupby over trials, a function for each trial.

    It computes the same outcomes of some readers and writes the one table; it does less than the
    build: no checks, no line numbers, no table of fixations or regressions.
    """
    started = time.perf_counter()
    logs = sorted((study.parent / "logs").iterdir())[:readers]
    with tempfile.TemporaryDirectory() as folder:
        outcomes_of(study, logs, LOOPS[style]).to_parquet(Path(folder) / "outcomes.parquet")
        print(time.perf_counter() - started)


def seconds(arguments: Sequence[str]) -> float:
    """Run one part in a process of its own, on one core where the system allows that."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "OMP_NUM_THREADS": "1"}
    done = subprocess.run(
        [sys.executable, str(Path(__file__)), *arguments],
        check=True,
        capture_output=True,
        text=True,
        env=environment,
        preexec_fn=_one_core if hasattr(os, "sched_setaffinity") else None,
    )
    return float(done.stdout.split()[-1])


def _one_core() -> None:
    os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})


def peak_mib(study: Path, into: Path) -> float:
    """Peak memory of a build in a process of its own."""
    code = (
        "import resource, sys, etl\n"
        "if __name__ == '__main__':\n"
        "    etl.build(etl.load_study(sys.argv[1]), into=sys.argv[2], workers=1)\n"
        "    print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, str(study), str(into)],
        check=True,
        capture_output=True,
        text=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    return float(done.stdout.split()[-1]) / 1024


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--readers", type=int, default=500)
    parser.add_argument("--trials", type=int, default=100)
    parser.add_argument("--fixations", type=int, default=20)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--loop-readers", type=int, default=5)
    given = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        study = make(folder / "study", given.readers, given.trials, given.fixations)
        into = folder / "built"
        times: dict[str, list[float]] = {"floor": [], "build": [], "pandas": [], "numpy": []}
        seconds(["build", str(study), str(into)])
        for _ in range(given.rounds):
            times["floor"].append(seconds(["floor", str(study), str(into)]))
            times["build"].append(seconds(["build", str(study), str(into)]))
            for style in LOOPS:
                part = seconds(["loop", str(study), str(given.loop_readers), style])
                times[style].append(part * given.readers / given.loop_readers)
        middle = {name: statistics.median(values) for name, values in times.items()}
        total = given.readers * given.trials * given.fixations
        print(f"{given.readers} readers x {given.trials} trials x {given.fixations}: {total:,}")
        for part, values in times.items():
            spread = ", ".join(f"{value:.2f}" for value in sorted(values))
            print(f"  {part:<6} median {middle[part]:8.2f} s  ({spread})")
        print(f"  build / floor  {middle['build'] / middle['floor']:.2f}")
        for style in LOOPS:
            ratio = middle[style] / middle["build"]
            print(
                f"  loop over trials in {style} / build  {ratio:.0f}  (scaled up from some readers)"
            )
        print("  peak memory of a build, one log a reader:")
        for readers in (given.readers // 10, given.readers, given.readers * 2):
            one = make(folder / f"study{readers}", readers, given.trials, given.fixations)
            print(f"    {readers:>6} readers  {peak_mib(one, folder / f'out{readers}'):6.0f} MiB")


if __name__ == "__main__":
    parts = {"floor": floor, "build": build}
    if len(sys.argv) > 3 and sys.argv[1] in parts:
        parts[sys.argv[1]](Path(sys.argv[2]), Path(sys.argv[3]))
    elif len(sys.argv) > 3 and sys.argv[1] == "loop":
        loop(Path(sys.argv[2]), int(sys.argv[3]), sys.argv[4])
    else:
        main()
