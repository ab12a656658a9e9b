"""Many builds in one process: ``python -m tests.unbreakable.soak --builds 200``.

Memory must be flat once everything is warm, and no file, thread or process may be left.
"""

from __future__ import annotations

import argparse
import gc
import multiprocessing
import os
import sys
import tempfile
import threading
from dataclasses import dataclass, field
from pathlib import Path
from statistics import median

import etl
from tests.unbreakable.studies import TwoWays, beside, content, two_ways

#: Builds before memory counts: allocators and caches fill up.
WARM = 4


@dataclass
class Soak:
    """What was measured after each build."""

    memory_bytes: list[int] = field(default_factory=list)
    open_files: list[int] = field(default_factory=list)
    threads: list[int] = field(default_factory=list)
    children: list[int] = field(default_factory=list)
    wrong: list[str] = field(default_factory=list)

    @property
    def growth(self) -> float:
        """By what share memory grew from the first third of what counts to the last."""
        counted = self.memory_bytes[WARM:]
        third = max(1, len(counted) // 3)
        return median(counted[-third:]) / median(counted[:third]) - 1

    def text(self) -> str:
        """The figures in words."""
        counted = self.memory_bytes[WARM:]
        first, last = counted[0] / 1e6, counted[-1] / 1e6
        lines = [
            f"{len(self.memory_bytes)} builds in one process",
            f"  memory after build {WARM + 1}: {first:.1f} MB, after the last: {last:.1f} MB",
            f"  from the first third to the last: {self.growth:+.1%}",
        ]
        for name in ("open_files", "threads", "children"):
            each = getattr(self, name)
            lines.append(f"  {name.replace('_', ' ')}: {min(each)} to {max(each)}")
        return "\n".join([*lines, *self.wrong])


def memory_bytes() -> int | None:
    """What this process holds in memory; None where the system does not say."""
    try:
        pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[1])
    except OSError:
        return None
    return pages * os.sysconf("SC_PAGE_SIZE")


def open_files() -> int | None:
    """How many files this process has open; None where the system does not say."""
    for place in ("/proc/self/fd", "/dev/fd"):
        if Path(place).is_dir():
            return len(os.listdir(place))  # noqa: PTH208  (the iterator would be open itself)
    return None


def soak(ways: TwoWays, folder: Path, builds: int, *, workers: int = 1) -> Soak:
    """Build so often, the two ways in turn, and measure after each build."""
    found = Soak()
    expected: dict[str, dict[str, bytes]] = {}
    for number in range(builds):
        study_file = (ways.old, ways.new)[number % 2]
        # With several processes, now and then: they start their own caches anew each time.
        result = etl.build(etl.load_study(study_file), into=folder / "out", workers=workers)
        now = content(result.folder)
        if expected.setdefault(study_file.name, now) != now:
            found.wrong.append(f"  build {number} is not what the first one was")
        if left := beside(folder / "out"):
            found.wrong.append(f"  build {number} left {left}")
        del result, now
        gc.collect()
        found.memory_bytes.append(memory_bytes() or 1)
        found.open_files.append(open_files() or 0)
        found.threads.append(threading.active_count())
        found.children.append(len(multiprocessing.active_children()))
    return found


def main() -> int:
    """Build as often as told on the command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--builds", type=int, default=200)
    parser.add_argument("--workers", type=int, default=1)
    asked = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        ways = two_ways(folder / "study")
        found = soak(ways, folder / "place", asked.builds, workers=asked.workers)
    print(found.text())
    return 1 if found.wrong else 0


if __name__ == "__main__":
    sys.exit(main())
