"""Which line each fixation of a reader belongs to: by the study's method, and by hand.

Asked are the texts of several lines, trial by trial; what a method is told of a text is in
:mod:`etl.session.passages`. Everything else about lines stays with the regions: a fixation about
which no method was asked is on the line on which the region look-up puts it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.export.rows import TrialColumns
from etl.lines import METHODS, MethodSettings, Passage
from etl.lines.consensus import assign_by_consensus
from etl.lines.return_sweeps import label_sweeps
from etl.parsers import CanonicalLog
from etl.regions import RegionLibrary
from etl.screening import Limits, Recorded, screen_fixations
from etl.session.ordered import OrderedFixations
from etl.session.passages import is_right_to_left, passage_of

if TYPE_CHECKING:
    from etl.study.models import Layout

Mask = NDArray[np.bool_]
Floats = NDArray[np.float64]
Numbers = NDArray[np.int32]

#: The rules for fixations whose prey no method is to be led by: what is no reading at all.
NO_READING = ("outside_text_time", "off_screen")


@dataclass(frozen=True, slots=True)
class LineChoice:
    """How a study tells lines.

    Attributes
    ----------
    method : str
        As ``[lines] method``.
    settings : MethodSettings
        Of the published methods.
    layout : Layout or None
        Where laid-out texts stand; None for boxes and polygons.
    """

    method: str
    settings: MethodSettings
    layout: Layout | None


@dataclass(frozen=True, slots=True, eq=False)
class HandLines:
    """The lines of some fixations that were set by hand.

    Attributes
    ----------
    trial : (k,) int64 array
        Index into the trials of the reader, or of the group of readers.
    fixation : (k,) int64 array
        Number of the fixation in its trial, from 1.
    line : (k,) int32 array
        From 1; 0 for none.
    source_line : (k,) int32 array
        Where it is said in the table of corrections.
    """

    trial: NDArray[np.int64]
    fixation: NDArray[np.int64]
    line: Numbers
    source_line: Numbers

    def __len__(self) -> int:
        return len(self.trial)

    def take(self, rows: NDArray[np.integer] | Mask) -> HandLines:
        """Some of them."""
        return HandLines(
            self.trial[rows], self.fixation[rows], self.line[rows], self.source_line[rows]
        )


#: A reader whom nobody corrected.
NO_HAND = HandLines(
    np.zeros(0, dtype=np.int64),
    np.zeros(0, dtype=np.int64),
    np.zeros(0, dtype=np.int32),
    np.zeros(0, dtype=np.int32),
)


@dataclass(frozen=True, slots=True, eq=False)
class ReaderLines:
    """What is known of the lines of a reader's fixations, in the order of ``OrderedFixations``.

    Attributes
    ----------
    line : (n,) int32 array
        From 1; 0 on no line; -1 where neither a method nor a hand says anything.
    confidence : (n,) float64 array
        Chance that the line, or the 0, is right; 1 by hand; NaN where none was told.
    trial_confidence : (trials,) float64 array
        Chance that the lines of the trial are right; NaN where none was told. 1 for a trial that
        has a line set by hand: somebody has looked at it.
    sure : (trials,) bool array
        Whether the method, or the hand, is sure of the trial.
    by_hand : (n,) bool array
        Whether the line was set by hand.
    reason : (n,) int8 array
        Why a method puts the fixation on no line: an index into the method's reasons; 0 elsewhere.
    before : (n,) int32 array
        The line that a line set by hand replaced, 0 for none; -1 elsewhere.
    return_sweep, undersweep : (n,) bool arrays
        Whether a return sweep came down on the fixation, and whether it fell short.
    """

    line: Numbers
    confidence: Floats
    trial_confidence: Floats
    sure: Mask
    by_hand: Mask
    reason: NDArray[np.int8]
    before: Numbers
    return_sweep: Mask
    undersweep: Mask


class LineWork:
    """What the lines of any reader need, set up once in a process.

    Parameters
    ----------
    library : RegionLibrary
        The texts of the study; with geometry.
    choice : LineChoice
        How the study tells lines.
    limits : Limits
        Its rules of screening.
    """

    def __init__(self, library: RegionLibrary, choice: LineChoice, limits: Limits) -> None:
        self._library = library
        self._choice = choice
        self._limits = replace(limits, used=tuple(r for r in NO_READING if limits.on(r)))
        self._passages: dict[int, Passage] = {}

    @cached_property
    def _right_to_left(self) -> Mask:
        """(texts,) bool array: whether each text is read from right to left."""
        texts = range(len(self._library.texts))
        return np.array([is_right_to_left(self._library, text) for text in texts], dtype=bool)

    def told(
        self, trials: TrialColumns, log: CanonicalLog, ordered: OrderedFixations
    ) -> ReaderLines:
        """Ask the study's method about each trial of a text of several lines.

        Parameters
        ----------
        trials : TrialColumns
            The reader's trials.
        log : CanonicalLog
            The fixations, in time order.
        ordered : OrderedFixations
            Trial and number of each.

        Returns
        -------
        ReaderLines
            Without corrections and labels of sweeps.
        """
        count, width = len(log), len(trials)
        told = ReaderLines(
            np.full(count, -1, dtype=np.int32),
            np.full(count, np.nan),
            np.full(width, np.nan),
            np.zeros(width, dtype=bool),
            np.zeros(count, dtype=bool),
            np.zeros(count, dtype=np.int8),
            np.full(count, -1, dtype=np.int32),
            np.zeros(count, dtype=bool),
            np.zeros(count, dtype=bool),
        )
        if self._choice.method in ("nearest", "none"):
            return told
        geometry = self._library.geometry
        assert geometry is not None  # noqa: S101 - a study with lines has places
        text = trials.text
        several = (text >= 0) & (geometry.line_counts[np.maximum(text, 0)] > 1)
        read = self._is_reading(trials, log, ordered)
        asked = read & several[ordered.trial] & np.isfinite(log.x_px) & np.isfinite(log.y_px)
        rows = np.flatnonzero(asked)
        starts = np.flatnonzero(np.diff(ordered.trial[rows], prepend=-1))
        for own in np.split(rows, starts[1:]) if len(rows) else ():
            trial = int(ordered.trial[own[0]])
            self._ask(int(text[trial]), (trial, own), log, told)
        return told

    def _is_reading(
        self, trials: TrialColumns, log: CanonicalLog, ordered: OrderedFixations
    ) -> Mask:
        """Fixations of the recordings used that are neither off the screen nor off the text's time.

        Only as far as the study has the rules that say so.
        """
        any_place = np.ones(len(log), dtype=np.int64)
        screened = screen_fixations(
            Recorded(
                ordered.trial,
                any_place,
                any_place,
                log.onset_ms,
                log.duration_ms,
                log.x_px,
                log.y_px,
                log.blink,
                np.where(ordered.repeated, 0, -1).astype(np.int8),
            ),
            (trials.came_ms, trials.went_ms),
            self._limits,
        )
        return screened.left_out < 0

    def _ask(
        self, text: int, which: tuple[int, NDArray[np.int64]], log: CanonicalLog, told: ReaderLines
    ) -> None:
        """Ask the method about one trial and write down what it says."""
        trial, rows = which
        geometry = self._library.geometry
        assert geometry is not None  # noqa: S101 - a study with lines has places
        if text not in self._passages:
            self._passages[text] = passage_of(self._library, text, self._choice.layout)
        passage = self._passages[text]
        # A text that is read from right to left is looked at in a mirror, in which it is not.
        x_px = -log.x_px[rows] if self._right_to_left[text] else log.x_px[rows]
        y_px, settings = log.y_px[rows], self._choice.settings
        numbers = geometry.line_numbers[slice(*geometry.line_offsets[text : text + 2].tolist())]
        numbers = np.append(np.int32(0), numbers)
        if self._choice.method != "consensus":
            found = METHODS[self._choice.method](x_px, y_px, passage, settings)
            told.line[rows] = numbers[found + 1]
            return
        agreed = assign_by_consensus(x_px, y_px, log.duration_ms[rows], passage, settings)
        told.line[rows] = numbers[agreed.line]
        told.confidence[rows] = agreed.confidence
        told.reason[rows] = agreed.reason
        told.trial_confidence[trial] = agreed.trial_confidence
        told.sure[trial] = agreed.sure

    def corrected(
        self,
        told: ReaderLines,
        hand: HandLines,
        at: NDArray[np.int64],
        before: Numbers,
        trial: NDArray[np.int64],
    ) -> ReaderLines:
        """Put the lines set by hand in place of those told.

        A trial is sure by hand where the line of every fixation about which the method was asked
        was set by hand. Some corrections say nothing about the rest.

        Parameters
        ----------
        told : ReaderLines
            What the method says.
        hand : HandLines
            What was set by hand.
        at : (k,) int64 array
            The fixation of each.
        before : (k,) int32 array
            The line on which each would be without it.
        trial : (n,) int64 array
            Index of the trial of every fixation.

        Returns
        -------
        ReaderLines
        """
        asked = told.line >= 0
        told.line[at] = hand.line
        told.confidence[at] = 1.0
        told.reason[at] = 0
        told.by_hand[at] = True
        told.before[at] = before
        left = np.zeros(len(told.sure), dtype=bool)
        left[trial[asked & ~told.by_hand]] = True
        whole = hand.trial[~left[hand.trial]]
        told.trial_confidence[whole] = 1.0
        told.sure[whole] = True
        return told

    def labelled(
        self,
        told: ReaderLines,
        trials: TrialColumns,
        log: CanonicalLog,
        ordered: OrderedFixations,
        line: Numbers,
    ) -> ReaderLines:
        """Label return sweeps.

        Parameters
        ----------
        told : ReaderLines
            What the method says.
        trials : TrialColumns
            The reader's trials.
        log : CanonicalLog
            The fixations, in time order.
        ordered : OrderedFixations
            Trial and number of each.
        line : (n,) int32 array
            The line on which each fixation is in the end; 0 on none.

        Returns
        -------
        ReaderLines
        """
        text = trials.text[ordered.trial]
        mirrored = (text >= 0) & self._right_to_left[np.maximum(text, 0)]
        sweeps = label_sweeps(
            np.where(self._is_reading(trials, log, ordered) | told.by_hand, line, 0),
            np.where(mirrored, -log.x_px, log.x_px),
            2 * ordered.trial + ordered.repeated,
            right_to_left=False,
        )
        return replace(told, return_sweep=sweeps.return_sweep, undersweep=sweeps.undersweep)
