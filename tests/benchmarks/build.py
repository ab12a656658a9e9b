"""How long builds take beside what pyarrow alone needs, and beside a loop over trials.

Run ``python tests/benchmarks/build.py`` in a checkout for studies of one and ten million fixations;
``--millions 100`` needs some 40 GB of disk and half an hour. It prints one table. Every figure is a
whole process of its own; ratios count, seconds differ from machine to machine.

floor
    What pyarrow needs on one core to read the same logs and to write the very same tables, CSV
    files included, with the same options. The tables are read into memory beforehand.
one worker
    A build on one core into a new place, with nothing kept from before.
two workers
    The same with two.
limit changed
    A build after a screening limit was changed: logs are not parsed again.
one reader more
    A build after one reader came in: the others are found finished.
loop
    What a lab would write (``lab_loop.py``), on some readers, scaled up; it does less.
"""

from __future__ import annotations

import argparse
import json
import os
import shutil
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from dataclasses import dataclass
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
AS_CSV = ("outcomes_wide", "trials")
TRIALS, FIXATIONS, REGIONS = 100, 20, 6


@dataclass(frozen=True, slots=True)
class Measured:
    """What a part took in a process of its own."""

    seconds: float
    peak_mib: float
    worker_mib: float


def floor(study: Path, built: Path) -> float:
    """Read the same logs, write the very same tables; only that is timed."""
    took = 0.0
    for log in sorted((study.parent / "logs").iterdir()):
        started = time.perf_counter()
        csv.read_csv(
            log,
            read_options=csv.ReadOptions(use_threads=False),
            parse_options=csv.ParseOptions(delimiter="\t"),
        )
        took += time.perf_counter() - started
    with tempfile.TemporaryDirectory(dir=built.parent) as folder:
        for name in TABLES:
            took += floor_of_table(built / f"{name}.parquet", Path(folder) / name)
    return took


def floor_of_table(path: Path, into: Path) -> float:
    """Write one table again, a row group at a time, texts as codes: the fastest form to write."""
    took = 0.0
    schema = pq.read_schema(path)
    texts = [field.name for field in schema if pa.types.is_string(field.type)]
    texts += [field.name for field in schema if pa.types.is_dictionary(field.type)]
    sorted_by = [name for name in ("participant", "session", "trial") if name in schema.names]
    with pq.ParquetFile(path, read_dictionary=texts) as file:
        first = file.read_row_group(0)
        as_csv = csv.CSVWriter(f"{into}.csv", first.schema) if path.stem in AS_CSV else None
        writer = pq.ParquetWriter(
            f"{into}.parquet", first.schema, compression="zstd", write_statistics=sorted_by
        )
        for group in range(file.num_row_groups):
            rows = file.read_row_group(group)
            started = time.perf_counter()
            writer.write_table(rows)
            if as_csv is not None:
                as_csv.write_table(rows)
            took += time.perf_counter() - started
        started = time.perf_counter()
        writer.close()
        return took + time.perf_counter() - started


def build(study: Path, into: Path, workers: int) -> float:
    """The whole build, from the study file to the published folder."""
    started = time.perf_counter()
    etl.build(etl.load_study(study), into=into, workers=workers)
    return time.perf_counter() - started


def loop(study: Path, readers: int, style: str) -> float:
    """What a lab would write: pandas, groupby over trials, a function for each trial.

    It computes the same outcomes of some readers and writes the one table; it does less than the
    build: no checks, no line numbers, no table of fixations or regressions.
    """
    started = time.perf_counter()
    logs = sorted((study.parent / "logs").iterdir())[:readers]
    with tempfile.TemporaryDirectory() as folder:
        outcomes_of(study, logs, LOOPS[style]).to_parquet(Path(folder) / "outcomes.parquet")
        return time.perf_counter() - started


def part(arguments: Sequence[str]) -> None:
    """Do one part in this process, and print what it took."""
    name, study = arguments[0], Path(arguments[1])
    if name == "floor":
        seconds = floor(study, Path(arguments[2]))
    elif name == "build":
        seconds = build(study, Path(arguments[2]), int(arguments[3]))
    else:
        seconds = loop(study, int(arguments[2]), arguments[3])
    peaks = [0.0, 0.0]
    if sys.platform != "win32":
        import resource  # noqa: PLC0415  (there is none on Windows)

        unit = 1024**2 if sys.platform == "darwin" else 1024
        whose = (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)
        peaks = [resource.getrusage(who).ru_maxrss / unit for who in whose]
    print(json.dumps([seconds, *peaks]))


def measured(*arguments: object, cores: int = 1) -> Measured:
    """Run one part in a process of its own, on so many cores where the system allows that."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "OMP_NUM_THREADS": "1"}
    alone = cores == 1 and hasattr(os, "sched_setaffinity")
    done = subprocess.run(
        [sys.executable, str(Path(__file__)), "part", *map(str, arguments)],
        check=True,
        capture_output=True,
        text=True,
        env=environment,
        preexec_fn=_one_core if alone else None,
    )
    return Measured(*json.loads(done.stdout.splitlines()[-1]))


def _one_core() -> None:
    os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})


def forget(into: Path) -> None:
    """Remove a build and what it kept."""
    for folder in (into, into.with_name(f"{into.name}.kept")):
        shutil.rmtree(folder, ignore_errors=True)


def change_limit(study: Path, under_ms: int) -> None:
    """Another screening limit."""
    text = study.read_text(encoding="utf-8").split("[screening")[0]
    study.write_text(f"{text}[screening.fixations]\nunder_ms = {under_ms}\n", encoding="utf-8")


def add_reader(study: Path, new: str) -> None:
    """One reader more, with the trials and fixations of the first one."""
    log = min((study.parent / "logs").iterdir())
    old = log.stem
    text = log.read_text(encoding="utf-8").replace(old, new)
    log.with_name(f"{new}.tsv").write_text(text, encoding="utf-8")
    trials = study.parent / "trial_list.csv"
    with trials.open(encoding="utf-8") as file:
        more = [line.replace(old, new) for line in file if line.startswith(f"{old},")]
    with trials.open("a", encoding="utf-8") as file:
        file.writelines(more)


def row(millions: float, rounds: int, loops: int, room: Path) -> list[str]:
    """All figures of one size."""
    readers = max(round(millions * 1e6 / TRIALS / FIXATIONS), 1)
    made = write_bulk_study(
        room / "study", readers=readers, trials=TRIALS, fixations=FIXATIONS, regions=REGIONS
    )
    study, into = made.study_file, room / "built"
    del made
    found: dict[str, list[Measured]] = {}

    def take(name: str, *arguments: object, cores: int = 1) -> None:
        found.setdefault(name, []).append(measured(*arguments, cores=cores))
        print(f"  {millions:g} million, {name}: {found[name][-1]}", file=sys.stderr, flush=True)

    for number in range(rounds):
        forget(into)
        take("one", "build", study, into, 1)
        take("floor", "floor", study, into)
        change_limit(study, 90 + number)
        take("limit", "build", study, into, 1)
        add_reader(study, f"S{number}")
        take("reader", "build", study, into, 1)
        forget(into)
        take("two", "build", study, into, 2, cores=2)
    for style in LOOPS if loops else ():
        take(style, "loop", study, loops, style)
    seconds = {name: statistics.median(m.seconds for m in own) for name, own in found.items()}
    one, two = seconds["one"], seconds["two"]
    peak = max(m.peak_mib for m in found["one"])
    shared = max(m.peak_mib for m in found["two"]), max(m.worker_mib for m in found["two"])
    scale = readers / loops if loops else 0
    return [
        f"{readers * TRIALS * FIXATIONS:,}",
        f"{seconds['floor']:.1f} s",
        f"{one:.1f} s, {one / seconds['floor']:.2f} x floor",
        f"{two:.1f} s, {one / two:.2f} x faster",
        f"{seconds['limit']:.1f} s, {seconds['limit'] / one:.0%} of the first",
        f"{seconds['reader']:.1f} s, {seconds['reader'] / one:.0%}",
        *(f"{seconds[style] * scale / one:.0f} x" if loops else "-" for style in LOOPS),
        f"{peak:.0f} MiB",
        f"{shared[0]:.0f} + {shared[1]:.0f} MiB",
    ]


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--millions", type=float, nargs="+", default=[1, 10])
    parser.add_argument(
        "--rounds", type=int, default=3, help="of the smallest size; fewer of others"
    )
    parser.add_argument("--loop-readers", type=int, default=5)
    parser.add_argument("--room", type=Path, help="a folder with enough space")
    given = parser.parse_args()
    head = [
        "fixations",
        "floor",
        "one worker",
        "two workers",
        "limit changed",
        "one reader more",
        *(f"loop in {style}" for style in LOOPS),
        "peak, one",
        "peak, two: parent + worker",
    ]
    print(" | ".join(head))
    for millions in given.millions:
        rounds = max(round(given.rounds / max(millions, 1)), 1)
        loops = given.loop_readers if millions <= 1 else 0
        with tempfile.TemporaryDirectory(dir=given.room) as room:
            print(" | ".join(row(millions, rounds, loops, Path(room))), flush=True)


if __name__ == "__main__":
    if sys.argv[1:2] == ["part"]:
        pa.set_cpu_count(1)
        pa.set_io_thread_count(1)
        part(sys.argv[2:])
    else:
        main()
