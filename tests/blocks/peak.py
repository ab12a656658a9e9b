"""Read one log in a process of its own, and print how much memory that took at most, in MB.

``python -m tests.blocks.peak STUDY LENGTH``: the study file, and how long blocks are in bytes; 0 to
hold the log whole.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

import etl
from etl.errors import Findings
from etl.parsers import readers
from etl.session.kept_logs import Aside, Shelf
from etl.session.kept_store import KeptStore
from etl.session.plan import make_plan
from etl.session.work import LogTask, LogWork


def peak_mb() -> float:
    """The most memory that this process has had."""
    status = Path("/proc/self/status")
    if status.exists():
        # Of this program alone; the system's account of children counts what started it, too.
        line = next(x for x in status.read_text("ascii").splitlines() if x.startswith("VmHWM"))
        return int(line.split()[1]) / 1024
    import resource  # noqa: PLC0415  (not on every system)

    most = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return most / 2**20 if sys.platform == "darwin" else most / 2**10


def main(study: str, length: str) -> None:
    """Read the first log of a study."""
    readers.SIZES = (1 if int(length) else 2**60, int(length) or 1)  # type: ignore[misc]
    plan, logs = make_plan(etl.load_study(Path(study)), Findings(), None)
    assert plan is not None
    before = peak_mb()
    with tempfile.TemporaryDirectory() as folder:
        path, shown = logs[0]
        store = KeptStore(Path(folder) / "earlier", Path(folder))
        work = LogWork(plan.reader, Aside(store, False, Shelf()), None)
        (answer,) = work([LogTask(path, shown, 0)])
    assert answer.figures is not None, answer.findings.text()
    sys.stdout.write(f"{answer.figures.fixations} {len(answer.blocks)} {peak_mb() - before:.1f}\n")


if __name__ == "__main__":
    main(*sys.argv[1:])
