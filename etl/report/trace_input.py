"""One trial with everything that its picture and its explanation need."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Final, Literal

#: Below this confidence the line of a fixation is called unsure (our choice: of those above it, on
#: simulated trials, hardly any is wrong).
UNSURE_BELOW: Final = 0.9


@dataclass(frozen=True, slots=True)
class Removal:
    """Why something was left out, as the ledger of exclusions says it.

    Attributes
    ----------
    rule : str
        The rule it is charged to, such as ``under_ms``.
    limit : str
        The rule's limit as in the study file, such as ``80``; empty where it has none.
    observed : str
        What was found, such as ``62``; empty where there is nothing to say.
    also : str
        Later rules that would have left it out too, separated by blanks.
    """

    rule: str
    limit: str = ""
    observed: str = ""
    also: str = ""


@dataclass(frozen=True, slots=True)
class Cell:
    """One outcome: its value, or NaN and the reason why it is missing."""

    value: float
    reason: str = ""


@dataclass(frozen=True, slots=True)
class Word:
    """A stretch of characters as shown, without blanks, with the box that it fills, in px."""

    line: int
    text: str
    left_px: float
    top_px: float
    right_px: float
    bottom_px: float


@dataclass(frozen=True, slots=True)
class Piece:
    """A rectangle of a region, in px; a region that runs over two lines has two.

    Attributes
    ----------
    order : int
        The order of its region, from 1.
    line : int
        The line it is on, from 1.
    left_px, top_px, right_px, bottom_px : float
        Its edges; of a polygon those of the box around it.
    """

    order: int
    line: int
    left_px: float
    top_px: float
    right_px: float
    bottom_px: float


@dataclass(frozen=True, slots=True)
class TracedFixation:
    """One fixation of the trial, kept or not.

    Attributes
    ----------
    number : int
        Its number in the trial, from 1.
    onset_ms : float
        When it began, in log time; NaN where the log has no onsets.
    duration_ms : float
        How long it lasted; of a kept one with what was merged into it.
    x_px, y_px : float
        Where it was; NaN where the log has no coordinates.
    line : int
        Line of the text, from 1; 0 on none.
    region_order : int
        Order of its region, from 1; 0 outside every region.
    visit : int
        Which visit to its region, from 1; 0 where it has none.
    first_pass : bool
        Whether it belongs to the first pass on its region.
    source_file : str
        The log it was read from.
    source_line : int
        Its line in that log, from 1.
    removal : Removal or None
        Why it was left out; None where it is kept.
    merged_into : int
        Number of the fixation it was merged into; 0 where it was not.
    line_confidence : float
        Chance that its line, or that it is on none, is right; NaN where none was told.
    return_sweep : bool
        Whether a return sweep came down on it.
    undersweep : bool
        Whether that sweep fell short and was corrected.
    on_none : str
        Why it belongs to no line of the text, such as ``stray``; empty where no method says so.
    line_told : int or None
        Where its line was set by hand: the line on which it was without that, 0 for none. None
        where no hand set it.
    """

    number: int
    onset_ms: float
    duration_ms: float
    x_px: float
    y_px: float
    line: int
    region_order: int
    visit: int
    first_pass: bool
    source_file: str
    source_line: int
    removal: Removal | None = None
    merged_into: int = 0
    line_confidence: float = math.nan
    return_sweep: bool = False
    undersweep: bool = False
    on_none: str = ""
    line_told: int | None = None

    @property
    def kept(self) -> bool:
        """Whether the outcomes are computed from it."""
        return self.removal is None

    @property
    def left_out_by(self) -> str:
        """The rule that left it out; empty where it is kept."""
        return "" if self.removal is None else self.removal.rule

    @property
    def placed(self) -> bool:
        """Whether it has coordinates."""
        return not math.isnan(self.x_px)

    @property
    def by_hand(self) -> bool:
        """Whether its line was set by hand."""
        return self.line_told is not None

    @property
    def moved_by_hand(self) -> bool:
        """Whether the hand set another line than was there."""
        return self.line_told is not None and self.line_told != self.line

    @property
    def unsure(self) -> bool:
        """Whether its line was told with little confidence."""
        return self.line_confidence < UNSURE_BELOW


@dataclass(frozen=True, slots=True)
class TracedLines:
    """How the lines of a trial of several lines were told.

    Attributes
    ----------
    method : str
        As ``[lines] method``.
    middles_px : mapping of int to float
        The height of the middle of each line, by its number.
    confidence : float
        Chance that the lines of the trial are right; NaN where none was told.
    sure : bool
        Whether that is enough.
    corrections : str
        The table of lines set by hand, as the study file names it; empty where it names none.
    """

    method: str
    middles_px: Mapping[int, float]
    confidence: float = math.nan
    sure: bool = False
    corrections: str = ""


@dataclass(frozen=True, slots=True)
class Regression:
    """One regressive saccade, by the numbers of the fixations before and after it."""

    launch: int
    landing: int
    ends_first_pass: bool


@dataclass(frozen=True, slots=True)
class TracedTrial:
    """One trial with everything that is needed to draw and to explain it.

    Attributes
    ----------
    participant, session, trial, item : str
        Which trial; session is empty where the logs have none.
    factors : dict of str to str
        The trial's levels.
    region_names : tuple of str
        The regions in reading order; the order of the first is 1.
    region_texts : tuple of str
        Each region's own text; empty where the definition holds none.
    fixations : tuple of TracedFixation
        All that were read, in time order.
    regressions : tuple of Regression
        The regressive saccades, in time order.
    outcomes : dict of str to tuple of Cell
        For each measure asked for, one cell a region, in reading order.
    trial_outcomes : dict of str to Cell
        The outcomes of the trial.
    words : tuple of Word
        The text as shown, word by word; empty where the text or its place is not known.
    pieces : tuple of Piece
        Where the regions are; empty where the log's labels say what was fixated.
    right_to_left : bool
        The direction of the text.
    outside : {"ignore", "interrupt"}
        What a fixation outside every region does.
    no_opportunity : {"missing", "zero"}
        What an outcome is where the reader had no chance.
    removal : Removal or None
        Why the whole trial is left out; None where it is kept.
    values_set_missing : dict of (str, int) to Removal
        Outcomes that a rule on values set missing, by measure and region order.
    lines : TracedLines or None
        How lines were told; None where the text has one line, or nobody told.
    """

    participant: str
    session: str
    trial: str
    item: str
    factors: Mapping[str, str]
    region_names: tuple[str, ...]
    region_texts: tuple[str, ...]
    fixations: tuple[TracedFixation, ...]
    regressions: tuple[Regression, ...]
    outcomes: Mapping[str, tuple[Cell, ...]]
    trial_outcomes: Mapping[str, Cell]
    words: tuple[Word, ...] = ()
    pieces: tuple[Piece, ...] = ()
    right_to_left: bool = False
    outside: Literal["ignore", "interrupt"] = "ignore"
    no_opportunity: Literal["missing", "zero"] = "missing"
    removal: Removal | None = None
    values_set_missing: Mapping[tuple[str, int], Removal] = field(default_factory=dict)
    lines: TracedLines | None = None

    def region(self, order: int) -> str:
        """The name of the region with an order; ``outside`` for 0."""
        return self.region_names[order - 1] if order else "outside"

    @property
    def heading(self) -> str:
        """The trial in words: reader, session, trial and item."""
        named = (
            ("participant", self.participant),
            ("session", self.session),
            ("trial", self.trial),
            ("item", self.item),
        )
        return ", ".join(f"{name} {value}" for name, value in named if value)

    @property
    def summary(self) -> str:
        """What the trial holds, in one sentence."""
        count = len(self.fixations)
        kept = sum(fixation.kept for fixation in self.fixations)
        left = "all kept" if kept == count else f"{count - kept} of them left out"
        back = len(self.regressions)
        return (
            f"{count} fixation{'' if count == 1 else 's'}, {left}; "
            f"{back or 'no'} regressive saccade{'' if back == 1 else 's'}; "
            f"{len(self.region_names)} region{'' if len(self.region_names) == 1 else 's'}"
        )
