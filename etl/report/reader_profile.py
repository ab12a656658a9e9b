"""The summary of each reader that the audit page needs, from the finished rows of that reader.

It is made where the rows are made, in the worker, and is small: its size depends on the number of
conditions, regions and outcomes, never on the number of fixations. :class:`Profiles` adds the
summaries up as they arrive.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Literal

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.report.counts import (
    StudyCounts,
    codes_of,
    condition_codes,
    filled,
    missing_counts,
    rate_counts,
    reader_of,
)
from etl.report.line_trust import LineTally, LineTrust, tally
from etl.tables import TableDesign

#: The quantiles of fixation durations that are kept of a reader.
QUANTILES = (0.10, 0.25, 0.50, 0.75, 0.90)
#: Drift compares the first and the last third of a reader's trials; with fewer trials than this,
#: a third would rest on a single trial.
FEWEST_TRIALS_FOR_DRIFT = 6
_AT = np.array(QUANTILES)

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
class TrialFates:
    """What became of each trial of the study that was read; skipped ones are not among them.

    Attributes
    ----------
    factors : mapping of str to (trials,) int32 array
        The level of each factor, as its place in ``design.factors``.
    left_out_by : (trials,) int32 array
        The rule that left the trial out, as its place in ``design.left_out_by``; -1 where kept.
    trust : LineTrust or None
        How far the lines of the trials can be trusted; None where no lines are told apart.
    starts : (readers + 1,) int64 array, optional
        Where the trials of each reader begin, and how many there are; None for one reader.
    """

    factors: Mapping[str, NDArray[np.int32]]
    left_out_by: NDArray[np.int32]
    trust: LineTrust | None = None
    starts: Ints | None = None


@dataclass(frozen=True, slots=True)
class Durations:
    """Durations of a reader's kept fixations, inside regions and outside.

    Attributes
    ----------
    mean_ms : float
        Their mean.
    spread_ms : float or None
        Their sample standard deviation; None with fewer than two.
    quantiles_ms : tuple of float
        At :data:`QUANTILES`, linear between the order statistics.
    """

    mean_ms: float
    spread_ms: float | None
    quantiles_ms: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class ReaderNumbers:
    """One reader in a few numbers.

    Attributes
    ----------
    participant : str
        The reader.
    fixations, outside : int
        Kept fixations, and those of them outside every region.
    durations : Durations or None
        None where no fixation was kept.
    back, forward : int
        Saccades between regions that go to an earlier one, and to a later one.
    skips, skip_chances : int
        Values of ``first_pass_skip`` that are 1, and all of them; 0 where it was not asked for.
    offset_px : float or None
        Median distance of a fixation below the middle of its line; negative above. None where the
        study does not say where lines are, or the logs have no y.
    drift_px : float or None
        Median distance in the last third of the trials minus that in the first third.
    levels : mapping of str to str
        Factors of which the reader met one level only.
    lines : LineTally
        The reader's trials of several lines.
    """

    participant: str
    fixations: int
    outside: int
    durations: Durations | None
    back: int
    forward: int
    skips: int
    skip_chances: int
    offset_px: float | None
    drift_px: float | None
    levels: Mapping[str, str]
    lines: LineTally = field(default_factory=LineTally)


@dataclass(frozen=True, slots=True)
class ReaderProfile:
    """What the audit page needs of one reader; small, and can be pickled.

    Attributes
    ----------
    numbers : ReaderNumbers
        What stays a reader's own.
    counts : StudyCounts
        What is added up over readers.
    """

    numbers: ReaderNumbers
    counts: StudyCounts


@dataclass(slots=True)
class Profiles:
    """The readers of a study, and what was counted over all of them.

    Attributes
    ----------
    readers : list of ReaderNumbers
        In the order in which they were added.
    counts : StudyCounts
        Over all readers.
    """

    readers: list[ReaderNumbers] = field(default_factory=list)
    counts: StudyCounts = field(default_factory=StudyCounts)

    @property
    def lines(self) -> LineTally:
        """The trials of several lines of all readers."""
        return sum((reader.lines for reader in self.readers), LineTally())

    def add(self, profile: ReaderProfile) -> None:
        """Take in one more reader."""
        self.readers.append(profile.numbers)
        self.counts.add(profile.counts)


def profile_of(
    participant: str,
    batches: Mapping[str, pa.RecordBatch],
    fates: TrialFates,
    design: TableDesign,
    *,
    outside: Literal["ignore", "interrupt"] = "ignore",
    grid: LineGrid | None = None,
) -> ReaderProfile:
    """Sum up one reader.

    Parameters
    ----------
    participant : str
        The reader.
    batches : mapping of str to pa.RecordBatch
        The finished rows of this reader: ``outcomes``, ``outcomes_wide``, ``fixations``.
    fates : TrialFates
        What became of the reader's trials.
    design : TableDesign
        The tables of the study.
    outside : {"ignore", "interrupt"}
        What a fixation outside every region does to the step over it, as in ``[measures]``.
    grid : LineGrid, optional
        Where lines are, for studies that say so.

    Returns
    -------
    ReaderProfile
        Of a size that does not depend on the number of fixations.
    """
    starts = {name: np.array([0, batch.num_rows]) for name, batch in batches.items()}
    (profile,) = profiles_of([participant], (batches, starts), fates, design, (outside, grid))
    return profile


def profiles_of(
    participants: Sequence[str],
    tables: tuple[Mapping[str, pa.RecordBatch], Mapping[str, Ints]],
    fates: TrialFates,
    design: TableDesign,
    options: tuple[Literal["ignore", "interrupt"], LineGrid | None],
) -> list[ReaderProfile]:
    """Sum up some readers, each alone.

    Parameters
    ----------
    participants : sequence of str
        The readers.
    tables : tuple of two mappings
        The finished rows of ``outcomes``, ``outcomes_wide`` and ``fixations``, reader after reader,
        and for each table where the rows of each reader begin and how many there are.
    fates : TrialFates
        What became of the readers' trials.
    design : TableDesign
        The tables of the study.
    options : tuple
        ``outside`` and ``grid``, as for :func:`profile_of`.

    Returns
    -------
    list of ReaderProfile
        One a reader.
    """
    batches, starts = tables
    outside, grid = options
    kept = _kept(batches["fixations"], starts["fixations"])
    back, forward = _steps(kept, outside)
    heights = _heights(kept, grid)
    of_cells = reader_of(starts["outcomes_wide"])
    skips, chances = _skips(batches["outcomes_wide"], of_cells, len(participants))
    beside = np.bincount(kept.reader[kept.order == 0], minlength=len(participants)).tolist()
    of_trials = np.array([0, len(fates.left_out_by)]) if fates.starts is None else fates.starts
    levels = _only_levels(fates, reader_of(of_trials), design, len(participants))
    condition = condition_codes(
        [fates.factors[name] for name in design.factors], design, len(fates.left_out_by)
    )
    rates = rate_counts(batches["outcomes_wide"], design, of_cells, len(participants))
    missing = missing_counts(batches["outcomes"], design, starts["outcomes"])
    fate = list(zip(condition.tolist(), fates.left_out_by.tolist(), strict=True))
    profiles = []
    for place, participant in enumerate(participants):
        rows = slice(*kept.starts[place : place + 2].tolist())
        trials = slice(*of_trials[place : place + 2].tolist())
        numbers = ReaderNumbers(
            participant,
            fixations=rows.stop - rows.start,
            outside=beside[place],
            durations=_durations(kept.duration_ms[rows]),
            back=back[place],
            forward=forward[place],
            skips=skips[place],
            skip_chances=chances[place],
            offset_px=heights[place][0],
            drift_px=heights[place][1],
            levels=levels[place],
            lines=tally(None if fates.trust is None else fates.trust.of(trials)),
        )
        counts = StudyCounts(Counter(fate[trials]), rates[place], missing[place])
        profiles.append(ReaderProfile(numbers, counts))
    return profiles


@dataclass(frozen=True, slots=True)
class _Kept:
    """The kept fixations in time order, reader after reader; trials are numbered as they stand."""

    starts: Ints
    reader: Ints
    trial: Ints
    duration_ms: Floats
    y_px: Floats
    line: Ints
    order: Ints
    place: Ints


def _kept(fixations: pa.RecordBatch, starts: Ints) -> _Kept:
    """Read the columns of the kept fixations."""
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
    return _Kept(
        kept_starts,
        reader_of(kept_starts),
        np.cumsum(changes)[rows],
        np.asarray(whole.column("duration_ms"), dtype=np.float64),
        filled(whole.column("y_px"), np.nan),
        filled(whole.column("line"), 0),
        filled(whole.column("region_order"), 0),
        (file << 40) + np.asarray(whole.column("source_line"), dtype=np.int64),
    )


def _durations(duration_ms: Floats) -> Durations | None:
    """Mean, spread and quantiles.

    As numpy's mean, std and quantile (linear between the order statistics) have them, without their
    preparations: this is done for every reader.
    """
    count = len(duration_ms)
    if count == 0:
        return None
    mean = np.add.reduce(duration_ms) / count
    apart = duration_ms - mean
    spread = float(np.sqrt(np.add.reduce(apart * apart) / (count - 1))) if count > 1 else None
    ascending = np.sort(duration_ms)
    quantiles = np.interp(_AT * (count - 1), np.arange(count), ascending)
    return Durations(float(mean), spread, tuple(quantiles.tolist()))


def _steps(kept: _Kept, outside: str) -> tuple[list[int], list[int]]:
    """How many saccades of each reader go to an earlier region, and to a later one."""
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


def _heights(kept: _Kept, grid: LineGrid | None) -> list[tuple[float | None, float | None]]:
    """How far below the middle of their lines each reader's are, and how that changes."""
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


def _thirds(kept: _Kept, known: Flags) -> NDArray[np.int8]:
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


def _from_line(kept: _Kept, grid: LineGrid) -> Floats:
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


def _from_own_line(kept: _Kept) -> Floats:
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


def _skips(wide: pa.RecordBatch, reader: Ints, readers: int) -> tuple[list[int], list[int]]:
    """Skips of each reader, and values that are not missing; none where it was not asked for."""
    if "first_pass_skip" not in wide.schema.names:
        return [0] * readers, [0] * readers
    values = filled(wide.column("first_pass_skip"), -1)
    return (
        np.bincount(reader[values == 1], minlength=readers).tolist(),
        np.bincount(reader[values >= 0], minlength=readers).tolist(),
    )


def _only_levels(
    fates: TrialFates, reader: Ints, design: TableDesign, readers: int
) -> list[dict[str, str]]:
    """The factors of which each reader met one level only, with that level."""
    found: list[dict[str, str]] = [{} for _ in range(readers)]
    trials = np.bincount(reader, minlength=readers)
    some = np.flatnonzero(trials)
    first = np.searchsorted(reader, some)
    for name in design.factors:
        levels = fates.factors[name]
        met = np.full(readers, -1, dtype=np.int64)
        met[some] = levels[first]
        alike = np.bincount(reader, levels == met[reader], minlength=readers) == trials
        for place in np.flatnonzero(alike & (met >= 0)).tolist():
            found[place][name] = design.factors[name][int(met[place])]
    return found
