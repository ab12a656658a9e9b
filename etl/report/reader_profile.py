"""The summary of each reader that the audit page needs, from the finished rows of that reader.

It is made where the rows are made, in the worker, and is small: its size depends on the number of
conditions, regions and outcomes, never on the number of fixations. :class:`Profiles` adds the
summaries up as they arrive.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.report.counts import (
    StudyCounts,
    condition_codes,
    filled,
    missing_counts,
    rate_counts,
    reader_of,
)
from etl.report.kept_rows import LineGrid, heights, kept_rows, steps
from etl.report.line_trust import LineTally, LineTrust, tally
from etl.tables import TableDesign

#: The quantiles of fixation durations that are kept of a reader.
QUANTILES = (0.10, 0.25, 0.50, 0.75, 0.90)
_AT = np.array(QUANTILES)

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


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
    kept = kept_rows(batches["fixations"], starts["fixations"])
    back, forward = steps(kept, outside)
    height = heights(kept, grid)
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
            offset_px=height[place][0],
            drift_px=height[place][1],
            levels=levels[place],
            lines=tally(None if fates.trust is None else fates.trust.of(trials)),
        )
        counts = StudyCounts(Counter(fate[trials]), rates[place], missing[place])
        profiles.append(ReaderProfile(numbers, counts))
    return profiles


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
