"""The long run of the fuzz corpus: ``python -m tests.fuzz --cases 5000``."""

from __future__ import annotations

import argparse
import sys
import time
from collections import Counter

from tests.fuzz.cases import cases
from tests.fuzz.oracle import Judgement, judge

VERDICTS = ("refused", "mended", "harmless", "told", "fault")


def main() -> int:
    """Judge as many cases as asked for; 1 where one is a fault."""
    parser = argparse.ArgumentParser(prog="python -m tests.fuzz", description=__doc__)
    parser.add_argument("--cases", type=int, default=5000, help="how many damaged studies")
    parser.add_argument("--seed", type=int, default=1, help="where the places are drawn from")
    parser.add_argument("--kind", default="", help="a regular expression for kinds of log")
    parser.add_argument("--damage", default="", help="a regular expression for kinds of damage")
    asked = parser.parse_args()
    started = time.perf_counter()
    done: list[Judgement] = []
    for case in cases(asked.seed, kind=asked.kind, damage=asked.damage):
        judgement = judge(*case)
        if judgement.verdict == "does not apply":
            continue
        done.append(judgement)
        if judgement.verdict == "fault":
            print(judgement, flush=True)
        if len(done) % 500 == 0:
            took = time.perf_counter() - started
            print(f"{len(done):,} of {asked.cases:,} cases, {took:.0f} s", file=sys.stderr)
        if len(done) >= asked.cases:
            break
    report(done)
    return 1 if any(one.verdict == "fault" for one in done) else 0


def report(done: list[Judgement]) -> None:
    """Print the counts by kind of log and by kind of damage."""
    for title, key in (("kind of log", "kind"), ("damage", "damage")):
        counts: dict[str, Counter[str]] = {}
        for one in done:
            counts.setdefault(getattr(one, key), Counter())[one.verdict] += 1
        width = max(map(len, [title, *counts]), default=0)
        print(f"\n{title:<{width}}  " + "".join(f"{verdict:>9}" for verdict in VERDICTS))
        for name, own in sorted(counts.items()):
            print(f"{name:<{width}}  " + "".join(f"{own[verdict]:>9,}" for verdict in VERDICTS))
        total = Counter(one.verdict for one in done)
        print(f"{'all':<{width}}  " + "".join(f"{total[verdict]:>9,}" for verdict in VERDICTS))
    slowest = max(done, key=lambda one: one.seconds, default=None)
    if slowest is not None:
        print(f"\n{len(done):,} cases, the slowest took {slowest.seconds:.2f} s: {slowest.damage}")


if __name__ == "__main__":
    sys.exit(main())
