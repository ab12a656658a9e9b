"""The kept fixations as the summaries of readers look at them: steps, and heights on the lines."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.report.counts import codes_of, filled, reader_of

#: Drift compares the first and the last third of a reader's trials; with fewer trials than this,
#: a third would rest on a single trial.
FEWEST_TRIALS_FOR_DRIFT = 6

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class LineGrid:
    """Where the lines of text are on the screen, if the study says so.

    Attributes
    ----------
    top_px : float
        Top of the first line's box.
    height_px : float
        Height of a line's box.
    """

    top_px: float
    height_px: float


@dataclass(frozen=True, slots=True)
class KeptRows:
    """The kept fixations of some readers, reader after reader, each trial in time order.

    Attributes
    ----------
    starts : (readers + 1,) int64 array
        Where the fixations of each reader begin, and how many there are.
    reader, trial : (n,) int64 arrays
        Whose each is, and of which trial; both numbered as they stand.
    duration_ms, y_px : (n,) float64 arrays
        As in the table; NaN where missing.
    line, order : (n,) int64 arrays
        Line, and order of the region; 0 for none.
    place : (n,) int64 array
        Ascending as the logs are read.
    """

    starts: Ints
    reader: Ints
    trial: Ints
    duration_ms: Floats
    y_px: Floats
    line: Ints
    order: Ints
    place: Ints


def kept_rows(fixations: pa.RecordBatch, starts: Ints) -> KeptRows:
    """Read the columns of the kept fixations.

    Parameters
    ----------
    fixations : pa.RecordBatch
        Rows of ``fixations``, reader after reader.
    starts : (readers + 1,) int64 array
        Where the rows of each reader begin, and how many there are.

    Returns
    -------
    KeptRows
    """
    rows = np.flatnonzero(np.asarray(fixations.column("kept")) == 1)
    changes = np.zeros(len(fixations) + 1, dtype=bool)
    changes[starts[1:]] = True
    changes = changes[:-1]
    for name in ("session", "trial"):
        if name in fixations.schema.names:
            column = fixations.column(name)
            own = column.indices if pa.types.is_dictionary(column.type) else column
            values = filled(own, -1)
            changes[1:] |= values[1:] != values[:-1]
    needed = ["duration_ms", "y_px", "line", "region_order", "source_file", "source_line"]
    whole = fixations.select(needed)
    if len(rows) < len(fixations):
        whole = whole.take(pa.array(rows))
    file = codes_of(whole, "source_file").astype(np.int64)
    kept_starts = np.searchsorted(rows, starts)
    return KeptRows(
        kept_starts,
        reader_of(kept_starts),
        np.cumsum(changes)[rows],
        np.asarray(whole.column("duration_ms"), dtype=np.float64),
        filled(whole.column("y_px"), np.nan),
        filled(whole.column("line"), 0),
        filled(whole.column("region_order"), 0),
        (file << 40) + np.asarray(whole.column("source_line"), dtype=np.int64),
    )


def steps(kept: KeptRows, outside: str) -> tuple[list[int], list[int]]:
    """How many saccades of each reader go to an earlier region, and to a later one.

    Parameters
    ----------
    kept : KeptRows
        The fixations.
    outside : {"ignore", "interrupt"}
        What a fixation outside every region does to the step over it.

    Returns
    -------
    two lists of int
        One count a reader: back, and forward.
    """
    inside = kept.order > 0
    reader, trial, order = kept.reader, kept.trial, kept.order
    if outside == "ignore" and not inside.all():
        rows = np.flatnonzero(inside)
        reader, trial, order = reader[rows], trial[rows], order[rows]
    between = (trial[1:] == trial[:-1]) & (order[1:] > 0) & (order[:-1] > 0)
    readers = len(kept.starts) - 1
    back, forward = order[1:] < order[:-1], order[1:] > order[:-1]
    return (
        np.bincount(reader[1:][between & back], minlength=readers).tolist(),
        np.bincount(reader[1:][between & forward], minlength=readers).tolist(),
    )


def heights(kept: KeptRows, grid: LineGrid | None) -> list[tuple[float | None, float | None]]:
    """How far below the middle of their lines each reader's fixations are, and how that changes.

    Parameters
    ----------
    kept : KeptRows
        The fixations.
    grid : LineGrid or None
        Where lines are; None where the study does not say so.

    Returns
    -------
    list of (float or None, float or None)
        For each reader the median distance in px, and that in the last third of the trials minus
        that in the first. None where nothing is known, or trials are too few.
    """
    distance = _from_own_line(kept) if grid is None else _from_line(kept, grid)
    known = np.isfinite(distance)
    part = _thirds(kept, known)
    every = []
    for start, stop in pairwise(kept.starts.tolist()):
        own, when, there = distance[start:stop], part[start:stop], known[start:stop]
        offset = None if grid is None or not there.any() else _median(own[there])
        early, late = own[when == 1], own[when == 2]
        drift = _median(late) - _median(early) if len(early) else None
        every.append((offset, drift))
    return every


def _median(values: Floats) -> float:
    """The median of one or more numbers; numpy's own looks for NaN and more."""
    half = len(values) // 2
    if len(values) % 2:
        return float(np.partition(values, half)[half])
    middle = np.partition(values, [half - 1, half])[half - 1 : half + 1]
    return float((middle[0] + middle[1]) / 2)


def _thirds(kept: KeptRows, known: Flags) -> NDArray[np.int8]:
    """Which fixations are of the first third of the reader's trials (1), and of the last (2).

    Trials are in the order in which the logs hold them: ids of trials need not be in the order of
    reading, and the time in a log may begin anew with every trial.
    """
    if not len(known):
        return np.zeros(0, dtype=np.int8)
    first = np.flatnonzero(known)
    first = first[np.diff(kept.trial[first], prepend=-1) != 0]
    reader = kept.reader[first]
    first = first[np.lexsort((kept.place[first], reader))]
    starts = np.searchsorted(reader, np.arange(len(kept.starts)))
    count = np.diff(starts)[reader]
    rank = np.arange(len(first)) - starts[reader]
    enough, third = count >= FEWEST_TRIALS_FOR_DRIFT, count // 3
    when = np.zeros(int(kept.trial[-1]) + 1, dtype=np.int8)
    when[kept.trial[first[enough & (rank < third)]]] = 1
    when[kept.trial[first[enough & (rank >= count - third)]]] = 2
    return np.where(known, when[kept.trial], np.int8(0))


def _from_line(kept: KeptRows, grid: LineGrid) -> Floats:
    """Distance of each fixation below the middle of its line; of one on none, of the nearest.

    A fixation may be so far off that the build gave it no line; leaving it out would hide just
    what is looked for. So the nearest of the lines up to the last that the trial has fixations on.
    """
    line = kept.line - 1
    lost = np.flatnonzero(line < 0)
    if len(lost):
        last = np.ones(int(kept.trial[-1]) + 1, dtype=np.int64)
        np.maximum.at(last, kept.trial, kept.line)
        from_top = (kept.y_px[lost] - grid.top_px) / grid.height_px
        nearest = np.floor(np.where(np.isfinite(from_top), from_top, 0))
        line = line.astype(np.float64)
        line[lost] = np.clip(nearest, 0, last[kept.trial[lost]] - 1)
    return kept.y_px - (grid.top_px + (line + 0.5) * grid.height_px)


def _from_own_line(kept: KeptRows) -> Floats:
    """Distance of each fixation below the reader's own median height on its line."""
    distance = np.full(len(kept.line), np.nan)
    rows = np.flatnonzero((kept.line > 0) & np.isfinite(kept.y_px))
    if not len(rows):
        return distance
    key = kept.reader[rows] * (int(kept.line.max()) + 1) + kept.line[rows]
    rows = rows[np.argsort(key, kind="stable")]
    key = np.sort(key)
    starts = np.flatnonzero(np.diff(key, prepend=-1))
    for own in np.split(rows, starts[1:]):
        distance[own] = kept.y_px[own] - _median(kept.y_px[own])
    return distance
