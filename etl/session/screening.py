"""Screening one reader: from fixations with their regions to what is left out, rule by rule."""

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
    screen_reader,
    screen_trials,
)
from etl.screening.ledger import Screened
from etl.screening.rules import CODE
from etl.session.ordering import OrderedFixations

if TYPE_CHECKING:
    from etl.session.lines import ReaderLines
    from etl.session.reader import Options

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Unscreened:
    """A reader's fixations before screening.

    Attributes
    ----------
    trials : TrialColumns
        The reader's trials.
    log : CanonicalLog
        The fixations, in time order.
    ordered : OrderedFixations
        Trial and number of each.
    order : (n,) int32 array
        Order of each fixation's region; 0 outside.
    note : str
        The experimenter's note on the reader.
    lines : ReaderLines, optional
        Which lines were read; None where the texts have no lines to tell apart.
    """

    trials: TrialColumns
    log: CanonicalLog
    ordered: OrderedFixations
    order: NDArray[np.int32]
    note: str
    lines: ReaderLines | None = None


def screen(reader: Unscreened, library: RegionLibrary, options: Options) -> Screened:
    """Apply all rules of a study to one reader.

    Parameters
    ----------
    reader : Unscreened
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
    in_study = reader.trials.text >= 0
    recorded = _recorded(reader, in_study)
    fixations = screen_fixations(recorded, (reader.trials.came_ms, reader.trials.went_ms), limits)
    quantities = _quantities(reader, library, options, (recorded, fixations), in_study)
    trials = screen_trials(quantities, limits)
    return Screened(
        recorded,
        reader.ordered.number,
        fixations,
        trials,
        screen_reader(quantities, trials.left_out >= 0, bool(reader.note), limits),
        np.where(in_study, -1, CODE["skip"]).astype(np.int8),
    )


def _recorded(reader: Unscreened, in_study: Mask) -> Recorded:
    """What the rules for fixations look at."""
    log, ordered = reader.log, reader.ordered
    count = len(log)
    # A recording is a run of fixations of one trial that are all used, or all not.
    starts = np.ones(count, dtype=bool)
    starts[1:] = (np.diff(ordered.trial) != 0) | (np.diff(ordered.repeated.astype(np.int8)) != 0)
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
        None if reader.lines is None else reader.lines.undersweep,
    )


def _quantities(
    reader: Unscreened,
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
    outside = kept & (reader.order == 0)
    onset = np.full(width, np.inf)
    end = np.full(width, -np.inf)
    np.fmin.at(onset, trial[kept], fixations.onset_ms[kept])
    np.fmax.at(end, trial[kept], (fixations.onset_ms + fixations.duration_ms)[kept])
    blinked = lacking = np.zeros(width, dtype=bool)
    passes = _Passes(reader, library, options, recorded, fixations)
    if limits.blink_regions:
        blinked = passes.touched_by_blink(limits.blink_regions)
    if limits.first_pass_regions:
        lacking = passes.lacking(limits.first_pass_regions)
    cell = np.zeros(width, dtype=np.int64)
    for levels in reader.trials.factors.values():
        _, cell = np.unique(
            cell * (int(levels.max(initial=0)) + 2) + levels + 1, return_inverse=True
        )
    return TrialQuantities(
        in_study,
        np.array([bool(note) for note in reader.trials.notes], dtype=bool),
        np.bincount(trial[kept], minlength=width),
        np.bincount(trial[outside], minlength=width),
        np.where(np.isfinite(end - onset), end - onset, 0.0),
        blinked,
        lacking,
        reader.trials.answer,
        cell,
        None if reader.lines is None else reader.lines.trial_confidence,
    )


@dataclass(frozen=True, slots=True)
class _Passes:
    """First passes, as far as rules ask for them."""

    reader: Unscreened
    library: RegionLibrary
    options: Options
    recorded: Recorded
    fixations: FixationScreening

    def _regions(self, names: tuple[str, ...]) -> tuple[NDArray[np.int64], Mask]:
        """Where each trial's cells begin, and whether each cell is one of some regions."""
        text = self.reader.trials.text
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
        text = self.reader.trials.text
        count = np.where(text >= 0, self.library.region_count[text], 1)
        return Sequences(
            self.recorded.trial[rows],
            self.reader.order[rows],
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
        trial, order = self.recorded.trial[rows], self.reader.order[rows]
        cell = offsets[trial] + np.maximum(order, 1) - 1
        touched = outcomes.first_pass & (order > 0) & wanted[cell] & self.fixations.blink[rows]
        return np.bincount(trial[touched], minlength=len(self.reader.trials)) > 0
