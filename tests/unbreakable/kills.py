"""Builds killed at any moment: ``python -m tests.unbreakable.kills --kills 200``.

Each build goes into a folder that holds an earlier, different one, and is killed: at a random
moment of its time, around publishing, or at one of its steps on the disk. After each, the folder
must be the one or the other build, byte for byte, and the next build must succeed, give the bytes
of a build that nobody disturbed, and leave nothing beside it.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from tests.end_to_end.running import environment
from tests.unbreakable.studies import TwoWays, beside, built, content, two_ways

#: The ways in which a build is killed, by how often.
MANNERS = ("time", "step", "swap", "late step", "settle")
#: Where a build was that said this last.
WHERE = {
    "begin": "at work",
    "settle": "while it waited for the disk",
    "swap": "while it put the folder in place or tidied up",
    "end": "at its end",
}
PROJECT = Path(__file__).resolve().parents[2]


@dataclass
class Tally:
    """What was found after so many kills."""

    found: Counter[str] = field(default_factory=Counter)
    torn: list[str] = field(default_factory=list)

    @property
    def kills(self) -> int:
        """How many builds were killed."""
        return sum(self.found.values())

    def text(self) -> str:
        """The figures in words."""
        lines = [
            f"{self.kills} builds killed; {len(self.torn)} left anything but an old or new one"
        ]
        lines += [f"  {name}: {count}" for name, count in sorted(self.found.items())]
        return "\n".join([*lines, *self.torn])


class Target:
    """A folder that is built into and killed, again and again."""

    def __init__(self, ways: TwoWays, folder: Path, *options: str) -> None:
        self.ways = ways
        self.options = options
        self.place = folder / "out"
        self.expected = {
            study.name: built(study, folder / "undisturbed" / study.name)
            for study in (ways.old, ways.new)
        }
        shutil.rmtree(folder / "undisturbed")
        self.there, self.coming = ways.old, ways.new
        built(self.there, self.place)

    def after_kill(self) -> str | None:
        """Which build is there now; None if it is neither."""
        now = content(self.place) if self.place.is_dir() else None
        names = [study.name for study in (self.there, self.coming)]
        return next((name for name in names if self.expected[name] == now), None)

    def build_next(self) -> list[str]:
        """Build as if nothing had happened; gives what is wrong then."""
        wrong = []
        if built(self.coming, self.place) != self.expected[self.coming.name]:
            wrong.append("the next build is not what it should be")
        if left := beside(self.place):
            wrong.append(f"the next build left {left}")
        self.there, self.coming = self.coming, self.there
        return wrong

    def start(self, workers: int, die_at: int = 0) -> subprocess.Popen[str]:
        """Start a build that says how far it is."""
        program = "tests.unbreakable.disturbed"
        return subprocess.Popen(
            [
                *(sys.executable, "-m", program, str(self.coming), str(self.place)),
                *("--workers", str(workers), "--die-at", str(die_at), *self.options),
            ],
            cwd=PROJECT,
            env=environment(PYTHONPATH=str(PROJECT)),
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
            start_new_session=True,
        )


@dataclass(frozen=True)
class Course:
    """When a build that nobody disturbs says something, and how many steps it has taken then."""

    at_s: dict[str, float]
    steps: dict[str, int]

    def left_s(self, word: str) -> float:
        """How long it takes from there."""
        return self.at_s["end"] - self.at_s[word]


def course(target: Target, workers: int) -> Course:
    """Watch a build that nobody disturbs."""
    at_s, steps = {}, {}
    with target.start(workers) as process:
        for line in words(process):
            word, _, number = line.partition(" ")
            at_s[word], steps[word] = time.monotonic(), int(number)
        assert process.wait() == 0, process.stderr.read() if process.stderr else ""
    assert target.after_kill() == target.coming.name or target.options
    target.build_next()
    return Course(at_s, steps)


def words(process: subprocess.Popen[str]) -> Iterator[str]:
    """What a build says of itself, as it says it."""
    assert process.stdout is not None
    for line in process.stdout:
        yield line.strip()


def until_all_ended(process: subprocess.Popen[str]) -> list[str]:
    """What it says until it and its workers have ended, which hold its streams, too."""
    late: list[str] = []

    def end() -> None:
        late.append("its workers live on")
        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)

    # Far longer than they need on the slowest machine: without an end of theirs it would be for
    # ever.
    timer = threading.Timer(60, end)
    timer.start()
    said = list(words(process))
    timer.cancel()
    assert late == []
    return said


def kill(target: Target, workers: int, manner: str, run: Course, draw: random.Random) -> str:
    """Kill one build; gives where it was."""
    first = run.steps["swap"] if manner == "late step" else 1
    die_at = draw.randint(first, run.steps["end"]) if manner.endswith("step") else 0
    until = manner if manner in run.at_s else "begin"
    last = ""
    with target.start(workers, die_at) as process:
        for last in words(process):
            if last.startswith(until):
                break
        if die_at:
            # It dies by itself, or gets to its end.
            last = ([last, *words(process)])[-1]
        else:
            time.sleep(draw.uniform(0.0, 1.05 * run.left_s(until)))
        # All of its processes at once, or the first alone: then the others must see to themselves.
        with contextlib.suppress(ProcessLookupError):
            if draw.random() < 0.5:
                os.killpg(process.pid, signal.SIGKILL)
            else:
                process.kill()
        last = ([last, *until_all_ended(process)])[-1]
    return WHERE[last.partition(" ")[0]]


def kills(
    target: Target,
    workers: Sequence[int],
    count: int,
    seed: int,
    manners: Sequence[str] = MANNERS,
) -> Tally:
    """Kill so many builds."""
    draw = random.Random(seed)
    runs = {number: course(target, number) for number in set(workers)}
    tally = Tally()
    for number in range(count):
        own = workers[number % len(workers)]
        manner = manners[number // len(workers) % len(manners)]
        when = kill(target, own, manner, runs[own], draw)
        there = target.after_kill()
        which = {target.there.name: "old", target.coming.name: "new"}.get(there or "", "torn")
        tally.found[f"with {own}, {when}: {which}"] += 1
        wrong = [] if there else ["the folder is neither build"]
        if there is None:
            shutil.rmtree(target.place, ignore_errors=True)
        wrong += target.build_next()
        if (number + 1) % 20 == 0:
            print(f"{number + 1} of {count}", file=sys.stderr)
        tally.torn += [f"  kill {number} ({manner}, {when}): {what}" for what in wrong]
    return tally


def main() -> int:
    """Kill builds as told on the command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--kills", type=int, default=200)
    parser.add_argument("--seed", type=int, default=7)
    parser.add_argument("--fault", choices=["copied", "emptied"])
    asked = parser.parse_args()
    options = ["--fault", asked.fault] if asked.fault else []
    with tempfile.TemporaryDirectory() as folder:
        root = Path(folder)
        target = Target(two_ways(root / "study"), root / "place", *options)
        tally = kills(target, [1, 2], asked.kills, asked.seed)
    print(tally.text())
    return 1 if tally.torn else 0


if __name__ == "__main__":
    sys.exit(main())
