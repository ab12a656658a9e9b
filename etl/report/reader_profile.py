"""The summary of one reader that the audit page needs, from the finished rows of that reader.

It is made where the rows are made, in the worker, and is small: its size depends on the number of
conditions, regions and outcomes, never on the number of fixations. :class:`Profiles` adds the
summaries up as they arrive.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
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
)
from etl.report.line_trust import LineTally, LineTrust, tally
from etl.tables import TableDesign

#: The quantiles of fixation durations that are kept of a reader.
QUANTILES = (0.10, 0.25, 0.50, 0.75, 0.90)
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
class TrialFates:
    """What became of each trial of the study that a reader read; skipped ones are not among them.

    Attributes
    ----------
    factors : mapping of str to (trials,) int32 array
        The level of each factor, as its place in ``design.factors``.
    left_out_by : (trials,) int32 array
        The rule that left the trial out, as its place in ``design.left_out_by``; -1 where kept.
    trust : LineTrust or None
        How far the lines of the trials can be trusted; None where no lines are told apart.
    """

    factors: Mapping[str, NDArray[np.int32]]
    left_out_by: NDArray[np.int32]
    trust: LineTrust | None = None


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
    fixations = batches["fixations"]
    kept = _kept(fixations)
    back, forward = _steps(kept, outside)
    offset_px, drift_px = _height(kept, grid)
    skips = _values(batches["outcomes_wide"], "first_pass_skip")
    condition = condition_codes(
        [fates.factors[name] for name in design.factors], design, len(fates.left_out_by)
    )
    return ReaderProfile(
        ReaderNumbers(
            participant,
            fixations=len(kept.order),
            outside=int((kept.order == 0).sum()),
            durations=_durations(kept.duration_ms),
            back=back,
            forward=forward,
            skips=int((skips == 1).sum()),
            skip_chances=len(skips),
            offset_px=offset_px,
            drift_px=drift_px,
            levels=_only_levels(fates, design),
            lines=tally(fates.trust),
        ),
        StudyCounts(
            Counter(zip(condition.tolist(), fates.left_out_by.tolist(), strict=True)),
            rate_counts(batches["outcomes_wide"], design),
            missing_counts(batches["outcomes"], design),
        ),
    )


@dataclass(frozen=True, slots=True)
class _Kept:
    """The kept fixations of one reader in time order; trials are numbered as they stand."""

    trial: Ints
    duration_ms: Floats
    y_px: Floats
    line: Ints
    order: Ints
    place: Ints


def _kept(fixations: pa.RecordBatch) -> _Kept:
    """Read the columns of the kept fixations."""
    rows = np.flatnonzero(np.asarray(fixations.column("kept")) == 1)
    changes = np.zeros(len(fixations), dtype=bool)
    for name in ("session", "trial"):
        if name in fixations.schema.names:
            column = fixations.column(name)
            own = column.indices if pa.types.is_dictionary(column.type) else column
            values = np.asarray(own)
            changes[1:] |= values[1:] != values[:-1]
    needed = ["duration_ms", "y_px", "line", "region_order", "source_file", "source_line"]
    whole = fixations.select(needed)
    if len(rows) < len(fixations):
        whole = whole.take(pa.array(rows))
    file = codes_of(whole, "source_file").astype(np.int64)
    return _Kept(
        np.cumsum(changes)[rows],
        np.asarray(whole.column("duration_ms"), dtype=np.float64),
        filled(whole.column("y_px"), np.nan),
        filled(whole.column("line"), 0),
        filled(whole.column("region_order"), 0),
        (file << 40) + np.asarray(whole.column("source_line"), dtype=np.int64),
    )


def _durations(duration_ms: Floats) -> Durations | None:
    """Mean, spread and quantiles."""
    if len(duration_ms) == 0:
        return None
    spread = float(np.std(duration_ms, ddof=1)) if len(duration_ms) > 1 else None
    ascending = np.sort(duration_ms)
    # Linear between the order statistics, as numpy.quantile has it, without its preparations: this
    # is done for every reader.
    at = np.array(QUANTILES) * (len(ascending) - 1)
    quantiles = np.interp(at, np.arange(len(ascending)), ascending)
    return Durations(float(np.mean(duration_ms)), spread, tuple(quantiles.tolist()))


def _steps(kept: _Kept, outside: str) -> tuple[int, int]:
    """How many saccades go from a region to an earlier one, and to a later one."""
    inside = kept.order > 0
    rows = np.flatnonzero(inside) if outside == "ignore" else np.arange(len(inside))
    trial, order = kept.trial[rows], kept.order[rows]
    between = (trial[1:] == trial[:-1]) & (order[1:] > 0) & (order[:-1] > 0)
    step = np.diff(order)[between]
    return int((step < 0).sum()), int((step > 0).sum())


def _height(kept: _Kept, grid: LineGrid | None) -> tuple[float | None, float | None]:
    """How far below the middle of their lines fixations are, and how that changes."""
    distance = _from_own_line(kept) if grid is None else _from_line(kept, grid)
    known = np.isfinite(distance)
    if not known.any():
        return None, None
    offset = None if grid is None else float(np.median(distance[known]))
    # Trials in the order in which the logs hold them: ids of trials need not be in the order of
    # reading, and the time in a log may begin anew with every trial.
    first = np.flatnonzero(known)
    first = first[np.diff(kept.trial[first], prepend=-1) != 0]
    trials = kept.trial[first]
    if len(trials) < FEWEST_TRIALS_FOR_DRIFT:
        return offset, None
    in_order = trials[np.argsort(kept.place[first], kind="stable")]
    third = len(trials) // 3
    when = np.zeros(int(kept.trial[-1]) + 1, dtype=np.int8)
    when[in_order[:third]], when[in_order[-third:]] = 1, 2
    part = np.where(known, when[kept.trial], 0)
    return offset, float(np.median(distance[part == 2]) - np.median(distance[part == 1]))


def _from_line(kept: _Kept, grid: LineGrid) -> Floats:
    """Distance of each fixation below the middle of its line; of one on none, of the nearest.

    A fixation may be so far off that the build gave it no line; leaving it out would hide just
    what is looked for. So the nearest of the lines up to the last that the trial has fixations on.
    """
    if len(kept.trial) == 0:
        return np.zeros(0)
    last = np.ones(int(kept.trial.max()) + 1, dtype=np.int64)
    np.maximum.at(last, kept.trial, kept.line)
    from_top = (kept.y_px - grid.top_px) / grid.height_px
    known = np.isfinite(from_top)
    nearest = np.clip(np.floor(np.where(known, from_top, 0)), 0, last[kept.trial] - 1)
    line = np.where(kept.line > 0, kept.line - 1, nearest)
    return kept.y_px - (grid.top_px + (line + 0.5) * grid.height_px)


def _from_own_line(kept: _Kept) -> Floats:
    """Distance of each fixation below the reader's own median height on its line."""
    distance = np.full(len(kept.line), np.nan)
    for line in np.unique(kept.line[kept.line > 0]).tolist():
        rows = (kept.line == line) & np.isfinite(kept.y_px)
        if rows.any():
            distance[rows] = kept.y_px[rows] - np.median(kept.y_px[rows])
    return distance


def _values(wide: pa.RecordBatch, measure: str) -> Ints:
    """The values of an outcome that are not missing; none where it was not asked for."""
    if measure not in wide.schema.names:
        return np.zeros(0, dtype=np.int64)
    return np.asarray(wide.column(measure).drop_null(), dtype=np.int64)


def _only_levels(fates: TrialFates, design: TableDesign) -> dict[str, str]:
    """The factors of which a reader met one level only, with that level."""
    levels = {name: np.unique(fates.factors[name]) for name in design.factors}
    return {
        name: design.factors[name][int(own[0])]
        for name, own in levels.items()
        if len(own) == 1 and own[0] >= 0
    }
