"""Screening readers: from fixations with their regions to what is left out, rule by rule."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.export.rows import TrialColumns
from etl.measures import Sequences, compute
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import (
    FixationScreening,
    Recorded,
    TrialQuantities,
    screen_fixations,
    screen_readers,
    screen_trials,
)
from etl.screening.entries import Screened
from etl.screening.rules import CODE
from etl.session.ordered import OrderedFixations

if TYPE_CHECKING:
    from etl.session.lines import ReaderLines
    from etl.session.reader import Options

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Unscreened:
    """The fixations of one or more readers before screening.

    Attributes
    ----------
    trials : TrialColumns
        The readers' trials.
    reader : (trials,) int64 array
        The reader of each trial, from 0; non-decreasing.
    log : CanonicalLog
        The fixations, in time order.
    ordered : OrderedFixations
        Trial and number of each.
    order : (n,) int32 array
        Order of each fixation's region; 0 outside.
    notes : tuple of str
        The experimenter's note on each reader.
    lines : ReaderLines, optional
        Which lines were read; None where the texts have no lines to tell apart.
    """

    trials: TrialColumns
    reader: NDArray[np.int64]
    log: CanonicalLog
    ordered: OrderedFixations
    order: NDArray[np.int32]
    notes: tuple[str, ...]
    lines: ReaderLines | None = None


def screen(readers: Unscreened, library: RegionLibrary, options: Options) -> Screened:
    """Apply all rules of a study to some readers.

    Parameters
    ----------
    readers : Unscreened
        Fixations with their regions.
    library : RegionLibrary
        The texts.
    options : Options
        The study's decisions.

    Returns
    -------
    Screened
    """
    limits = options.limits
    in_study = readers.trials.text >= 0
    recorded = _recorded(readers, in_study)
    text_time_ms = (readers.trials.came_ms, readers.trials.went_ms)
    fixations = screen_fixations(recorded, text_time_ms, limits)
    quantities = _quantities(readers, library, options, (recorded, fixations), in_study)
    trials = screen_trials(quantities, limits)
    noted = np.array([bool(note) for note in readers.notes], dtype=bool)
    return Screened(
        recorded,
        readers.ordered.number,
        fixations,
        trials,
        screen_readers(quantities, trials.left_out >= 0, noted, limits),
        np.where(in_study, -1, CODE["skip"]).astype(np.int8),
        readers.reader,
    )


def _recorded(readers: Unscreened, in_study: Mask) -> Recorded:
    """What the rules for fixations look at."""
    log, ordered = readers.log, readers.ordered
    count = len(log)
    # A recording is a run of fixations of one trial that are all used, or all not.
    starts = np.ones(count, dtype=bool)
    starts[1:] = (ordered.trial[1:] != ordered.trial[:-1]) | (
        ordered.repeated[1:] != ordered.repeated[:-1]
    )
    first = np.flatnonzero(starts)
    length = np.diff(np.append(first, count))
    from_start = np.arange(count) - np.repeat(first, length) + 1
    left_out = np.where(
        in_study[ordered.trial], np.where(ordered.repeated, CODE["repeated"], -1), CODE["skip"]
    )
    return Recorded(
        ordered.trial,
        from_start,
        np.repeat(length, length) - from_start + 1,
        log.onset_ms,
        log.duration_ms,
        log.x_px,
        log.y_px,
        log.blink,
        left_out.astype(np.int8),
        None if readers.lines is None else readers.lines.undersweep,
        readers.reader[ordered.trial],
    )


def _quantities(
    readers: Unscreened,
    library: RegionLibrary,
    options: Options,
    screened: tuple[Recorded, FixationScreening],
    in_study: Mask,
) -> TrialQuantities:
    """What the rules for trials and readers look at."""
    recorded, fixations = screened
    limits, trial = options.limits, recorded.trial
    width = len(in_study)
    kept = fixations.left_out < 0
    outside = kept & (readers.order == 0)
    onset = np.full(width, np.inf)
    end = np.full(width, -np.inf)
    np.fmin.at(onset, trial[kept], fixations.onset_ms[kept])
    np.fmax.at(end, trial[kept], (fixations.onset_ms + fixations.duration_ms)[kept])
    blinked = lacking = np.zeros(width, dtype=bool)
    passes = _Passes(readers, library, options, recorded, fixations)
    if limits.blink_regions:
        blinked = passes.touched_by_blink(limits.blink_regions)
    if limits.first_pass_regions:
        lacking = passes.lacking(limits.first_pass_regions)
    return TrialQuantities(
        in_study,
        np.array([bool(note) for note in readers.trials.notes], dtype=bool),
        np.bincount(trial[kept], minlength=width),
        np.bincount(trial[outside], minlength=width),
        np.where(np.isfinite(end - onset), end - onset, 0.0),
        blinked,
        lacking,
        readers.trials.answer,
        _cells(readers.trials) if limits.on("fewest_trials_per_cell") else None,
        readers.reader,
        len(readers.notes),
        None if readers.lines is None else readers.lines.trial_confidence,
    )


def _cells(trials: TrialColumns) -> NDArray[np.int64]:
    """Which combination of the factors each trial has."""
    cell = np.zeros(len(trials), dtype=np.int64)
    for levels in trials.factors.values():
        _, cell = np.unique(
            cell * (int(levels.max(initial=0)) + 2) + levels + 1, return_inverse=True
        )
    return cell


@dataclass(frozen=True, slots=True)
class _Passes:
    """First passes, as far as rules ask for them."""

    readers: Unscreened
    library: RegionLibrary
    options: Options
    recorded: Recorded
    fixations: FixationScreening

    def _regions(self, names: tuple[str, ...]) -> tuple[NDArray[np.int64], Mask]:
        """Where each trial's cells begin, and whether each cell is one of some regions."""
        text = self.readers.trials.text
        count = np.where(text >= 0, self.library.region_count[text], 1).astype(np.int64)
        offsets = np.append(0, np.cumsum(count))
        trial = np.repeat(np.arange(len(text)), count)
        within = np.arange(len(trial)) - offsets[trial]
        # A skipped trial has no text; the cell it is given for its one place is never wanted.
        text_or_any = np.maximum(text, 0)[trial]
        code = self.library.region_code[self.library.region_offsets[text_or_any] + within]
        wanted = [number for number, name in enumerate(self.library.region_names) if name in names]
        return offsets, np.isin(code, wanted) & (text[trial] >= 0)

    def _sequences(self, rows: NDArray[np.int64]) -> Sequences:
        """Some of the fixations, for the kernels."""
        text = self.readers.trials.text
        count = np.where(text >= 0, self.library.region_count[text], 1)
        return Sequences(
            self.recorded.trial[rows],
            self.readers.order[rows],
            self.fixations.duration_ms[rows],
            count.astype(np.int32),
        )

    def lacking(self, names: tuple[str, ...]) -> Mask:
        """Trials in which one of some regions has no first pass."""
        rows = np.flatnonzero(self.fixations.left_out < 0)
        outcomes = compute(self._sequences(rows), outside=self.options.outside)
        offsets, wanted = self._regions(names)
        none = wanted & np.isnan(outcomes.regions["first_pass_fixation_count"].values)
        return np.add.reduceat(none, offsets[:-1]) > 0

    def touched_by_blink(self, names: tuple[str, ...]) -> Mask:
        """Trials in which a blink touches the first pass on one of some regions.

        Fixations that only a blink left out are looked at as if they were in.
        """
        left_out = self.fixations.left_out
        rows = np.flatnonzero((left_out < 0) | (left_out == CODE["blink"]))
        outcomes = compute(self._sequences(rows), outside=self.options.outside)
        offsets, wanted = self._regions(names)
        trial, order = self.recorded.trial[rows], self.readers.order[rows]
        cell = offsets[trial] + np.maximum(order, 1) - 1
        touched = outcomes.first_pass & (order > 0) & wanted[cell] & self.fixations.blink[rows]
        return np.bincount(trial[touched], minlength=len(self.readers.trials)) > 0
