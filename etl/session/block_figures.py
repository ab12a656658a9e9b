"""The figures of a log that is never held whole: exact middles and spans from its blocks."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.parsers import CanonicalLog
from etl.session.log_figures import FEWEST_STEPS, SPAN, LogFigures, Spread, steps_of

Floats = NDArray[np.float64]

#: How many values of a block tell roughly where its values lie.
POINTS: Final = 2048


@dataclass(frozen=True, slots=True)
class Sketch:
    """Where the values of a block lie: every so many of them, in order.

    Attributes
    ----------
    count : int
        How many values there are.
    every : int
        From one point to the next, in values.
    points : (p,) float64 array
        The smallest value, and every ``every``-th after it.
    """

    count: int
    every: int
    points: Floats

    @classmethod
    def of(cls, values: Floats, points: int = POINTS) -> Sketch:
        """The sketch of some values, of about so many points; those that are NaN are left aside."""
        known = np.sort(values[~np.isnan(values)])
        every = len(known) // points + 1
        return cls(len(known), every, known[::every].copy())

    def fewest(self, limits: Floats) -> NDArray[np.int64]:
        """How many values at least are not above each limit."""
        below = np.searchsorted(self.points, limits, side="right")
        return np.where(below > 0, (below - 1) * self.every + 1, 0)

    def most(self, limits: Floats) -> NDArray[np.int64]:
        """How many values at most are not above each limit."""
        below = np.searchsorted(self.points, limits, side="right")
        return np.where(below < len(self.points), below * self.every, self.count)


@dataclass(frozen=True, slots=True)
class Edge:
    """The first or last fixation of a block: its trial, and when it was, in ms."""

    trial: tuple[tuple[str, str], ...]
    onset_ms: float
    duration_ms: float


@dataclass(frozen=True, slots=True)
class BlockFigures:
    """A block in figures.

    Attributes
    ----------
    fixations, placed : int
        How many there are, and how many have a position from left to right.
    sketches : dict of str to Sketch
        Of durations, positions, and steps from onset to onset in durations.
    first, last : Edge
        The fixations at its ends.
    """

    fixations: int
    placed: int
    sketches: dict[str, Sketch]
    first: Edge
    last: Edge


def block_figures(log: CanonicalLog, points: int = POINTS) -> tuple[BlockFigures, Floats]:
    """Count and measure one block.

    Parameters
    ----------
    log : CanonicalLog
        Its fixations, at least one.
    points : int
        Of how many points sketches are.

    Returns
    -------
    BlockFigures and (m,) float64 array
        And how many durations it is from each onset to the next in a trial.
    """
    steps = steps_of(log)
    values = {"duration_ms": log.duration_ms, "x_px": log.x_px, "y_px": log.y_px, "steps": steps}
    figures = BlockFigures(
        len(log),
        int((~np.isnan(log.x_px)).sum()),
        {name: Sketch.of(own, points) for name, own in values.items()},
        _edge(log, 0),
        _edge(log, len(log) - 1),
    )
    return figures, steps


def _edge(log: CanonicalLog, row: int) -> Edge:
    """One fixation of a block."""
    trial = tuple((name, ids.text(row)) for name, ids in log.ids.items() if name != "item")
    return Edge(trial, float(log.onset_ms[row]), float(log.duration_ms[row]))


def joined_figures(
    blocks: Sequence[BlockFigures],
    counts: tuple[int, int],
    values: Callable[[str], Iterable[Floats]],
) -> LogFigures:
    """The figures of a log.

    Parameters
    ----------
    blocks : sequence of BlockFigures
        Of its blocks, in order; at least one.
    counts : tuple of int
        How many readers and trials it holds.
    values : callable
        Gives, for the name of a sketch, the values of all blocks, one block after the other.

    Returns
    -------
    LogFigures
        The same as of the log held whole.
    """
    between = np.array(list(_steps_between(blocks)))

    def ranked(name: str, ranks: Callable[[int], Sequence[int]]) -> list[float]:
        sketches = [block.sketches[name] for block in blocks]
        more = between if name == "steps" else between[:0]
        sketches.append(Sketch.of(more))
        count = sum(sketch.count for sketch in sketches)
        if not count:
            return []
        return _at_ranks(ranks(count), sketches, _chained(values(name), more))

    def spread(name: str) -> Spread:
        found = ranked(name, lambda n: [round(q * (n - 1)) for q in (SPAN[0], 0.5, SPAN[1])])
        return Spread(*found) if found else Spread.of(np.zeros(0))

    def median(name: str) -> float:
        found = ranked(name, lambda n: [(n - 1) // 2, n // 2])
        return float(np.mean(found)) if found else float("nan")

    steps = sum(block.sketches["steps"].count for block in blocks) + len(between)
    return LogFigures(
        *counts,
        sum(block.fixations for block in blocks),
        sum(block.placed for block in blocks),
        median("duration_ms"),
        median("steps") if steps >= FEWEST_STEPS else float("nan"),
        spread("x_px"),
        spread("y_px"),
    )


def _chained(values: Iterable[Floats], more: Floats) -> Iterator[Floats]:
    yield from values
    yield more


def _steps_between(blocks: Sequence[BlockFigures]) -> Iterator[float]:
    """How many durations it is from the last onset of a block to the first of the next."""
    for before, after in pairwise(blocks):
        if before.last.trial == after.first.trial:
            step = (after.first.onset_ms - before.last.onset_ms) / before.last.duration_ms
            if step > 0:
                yield step


def _at_ranks(
    ranks: Sequence[int], sketches: Sequence[Sketch], values: Iterable[Floats]
) -> list[float]:
    """The values that have so many before them, in order of size."""
    points = np.unique(np.concatenate([sketch.points for sketch in sketches]))
    fewest = np.sum([sketch.fewest(points) for sketch in sketches], axis=0)
    most = np.sum([sketch.most(points) for sketch in sketches], axis=0)
    # Each is above every point that has at most so many values up to it, and not above the first
    # that has at least one more.
    ends = np.array([-np.inf, *points, np.inf])
    lows = ends[np.searchsorted(most, ranks, side="right")]
    highs = ends[np.searchsorted(fewest, np.asarray(ranks) + 1) + 1]
    below = [0] * len(ranks)
    between: list[list[Floats]] = [[] for _ in ranks]
    for own in values:
        for place, (low, high) in enumerate(zip(lows, highs, strict=True)):
            below[place] += int((own <= low).sum())
            # Many a value may be equal to the upper end; none of these need be kept.
            between[place].append(own[(own > low) & (own < high)])
    found = []
    for rank, some, before, high in zip(ranks, between, below, highs, strict=True):
        inner = np.sort(np.concatenate(some))
        place = rank - before
        found.append(float(inner[place]) if place < len(inner) else float(high))
    return found
