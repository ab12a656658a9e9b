"""How long a check of hundreds of logs takes beside just reading them.

Run ``python tests/benchmarks/check.py`` in a checkout. Every figure is a whole process of its own;
the parts are run in turn, round after round, and the ratios of their medians are what counts:
seconds differ from machine to machine. Parts that use one process are held to one core.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import pyarrow as pa
from pyarrow import csv

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT))

import etl  # noqa: E402
from tests.simulator import write_bulk_study  # noqa: E402


def read_bytes(study: Path) -> None:
    """Read the bytes of every log."""
    started = time.perf_counter()
    size = sum(len(log.read_bytes()) for log in sorted((study.parent / "logs").iterdir()))
    print(f"{size} bytes {time.perf_counter() - started}")


def parse(study: Path) -> None:
    """Parse every log with pyarrow's own reader, one after the other."""
    pa.set_cpu_count(1)
    pa.set_io_thread_count(1)
    started = time.perf_counter()
    for log in sorted((study.parent / "logs").iterdir()):
        csv.read_csv(
            log,
            read_options=csv.ReadOptions(use_threads=False),
            parse_options=csv.ParseOptions(delimiter="\t"),
        )
    print(time.perf_counter() - started)


def check(study: Path, workers: int) -> None:
    """The whole check, with the time by stage."""
    stages: dict[str, float] = {}
    started = time.perf_counter()

    def note(stage: str, _done: int, _total: int) -> None:
        stages[stage] = time.perf_counter() - started

    findings = etl.check(etl.load_study(study), workers=workers, progress=note)
    elapsed = time.perf_counter() - started
    assert not findings.failed, findings.text()
    before, spoken = 0.0, []
    for stage, until in stages.items():
        spoken.append(f"{stage} until {until:.2f} ({until - before:.2f})")
        before = until
    print(", ".join(spoken), elapsed)


def run(study: Path, part: str, workers: int = 1) -> tuple[str, float]:
    """Run one part in a process of its own; gives what it said and its seconds."""
    alone = workers == 1 and hasattr(os, "sched_setaffinity")
    done = subprocess.run(
        [sys.executable, str(Path(__file__)), part, str(study), str(workers)],
        check=True,
        capture_output=True,
        text=True,
        env={**os.environ, "PYTHONPATH": str(ROOT), "OMP_NUM_THREADS": "1"},
        preexec_fn=_one_core if alone else None,
    )
    said, _, seconds = done.stdout.strip().rpartition(" ")
    return said, float(seconds)


def _one_core() -> None:
    os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--logs", type=int, default=400)
    parser.add_argument("--trials", type=int, default=120)
    parser.add_argument("--fixations", type=int, default=12)
    parser.add_argument("--rounds", type=int, default=5)
    given = parser.parse_args()
    cores = os.cpu_count() or 1
    parts = {"bytes": 1, "parse": 1, "check": 1, f"check, {cores} workers": cores}
    with tempfile.TemporaryDirectory() as name:
        study = write_bulk_study(
            Path(name),
            readers=given.logs,
            trials=given.trials,
            fixations=given.fixations,
            regions=6,
        ).study_file
        times: dict[str, list[float]] = {part: [] for part in parts}
        said: dict[str, str] = {}
        for _ in range(given.rounds):
            for part, workers in parts.items():
                said[part], seconds = run(study, part.partition(",")[0], workers)
                times[part].append(seconds)
        middle = {part: statistics.median(values) for part, values in times.items()}
        print(f"{given.logs:,} logs x {given.trials} trials x {given.fixations} fixations")
        width = max(map(len, parts))
        for part, values in times.items():
            spread = ", ".join(f"{value:.2f}" for value in sorted(values))
            print(f"  {part:<{width}}  median {middle[part]:7.3f} s  ({spread})  {said[part]}")
        for part in parts:
            if part.startswith("check"):
                print(
                    f"  {part}: {middle[part] / middle['parse']:.1f} times parsing by pyarrow, "
                    f"{middle[part] / middle['bytes']:.0f} times reading the bytes"
                )


if __name__ == "__main__":
    if len(sys.argv) > 3 and sys.argv[1] == "bytes":
        read_bytes(Path(sys.argv[2]))
    elif len(sys.argv) > 3 and sys.argv[1] == "parse":
        parse(Path(sys.argv[2]))
    elif len(sys.argv) > 3 and sys.argv[1] == "check":
        check(Path(sys.argv[2]), int(sys.argv[3]))
    else:
        main()
