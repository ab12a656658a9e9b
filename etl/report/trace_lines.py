"""Lines in a trial of several lines: how far fixations are off them, and what is said of them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from itertools import pairwise
from statistics import median
from typing import Final

from etl.report.trace_input import UNSURE_BELOW, TracedFixation, TracedTrial
from etl.report.trace_phrases import fixations, joined, numbers

#: Why a fixation belongs to no line, in words.
WHY_ON_NONE: Final[Mapping[str, str]] = {
    "off_text": "far off the text",
    "mid_sweep": "in the middle of a return sweep",
    "arrival": "before reading began",
    "stray": "near no line as the eyes went",
}
#: From so many distances between lines on, a place is said to be off its line (our choice: half as
#: far as the border between two lines).
OFF_LINE: Final = 0.25
#: With fewer fixations than this a line says little about drift.
_FEWEST_FOR_DRIFT: Final = 3
#: More numbers of fixations than this, as they are listed, are counted instead.
_LONGEST_LIST: Final = 110


def line_middles(traced: TracedTrial) -> dict[int, float]:
    """The height of the middle of each line, in px, from the top.

    Parameters
    ----------
    traced : TracedTrial
        The trial. Where it does not say how lines were told, the middle is that between the
        highest and the lowest edge of the line's pieces.

    Returns
    -------
    dict of int to float
        Empty where nothing is known of places.

    Examples
    --------
    >>> from etl.report.trace_input import Piece
    >>> pieces = (Piece(1, 1, 0, 100, 50, 160), Piece(2, 2, 0, 160, 50, 220))
    >>> line_middles(TracedTrial("P1", "", "7", "i", {}, ("a", "b"), ("", ""), (), (), {}, {},
    ...                          pieces=pieces))
    {1: 130.0, 2: 190.0}
    """
    if traced.lines is not None:
        return dict(sorted(traced.lines.middles_px.items()))
    own: dict[int, tuple[float, float]] = {}
    for piece in traced.pieces:
        top, bottom = own.get(piece.line, (math.inf, -math.inf))
        own[piece.line] = min(top, piece.top_px), max(bottom, piece.bottom_px)
    return {line: (top + bottom) / 2 for line, (top, bottom) in sorted(own.items())}


def pitch_px(middles_px: Mapping[int, float]) -> float:
    """The distance between neighbouring lines, in px; 0 where there is one line.

    Examples
    --------
    >>> pitch_px({1: 130.0, 2: 190.0, 3: 250.0})
    60.0
    """
    heights = sorted(middles_px.values())
    return median(b - a for a, b in pairwise(heights)) if heights[1:] else 0.0


def off_px(fixation: TracedFixation, middles_px: Mapping[int, float]) -> float:
    """How far below the middle of its line a fixation was recorded; NaN where that says nothing.

    Examples
    --------
    >>> look = TracedFixation(1, 0.0, 200.0, 40.0, 172.5, 2, 1, 1, True, "P1.tsv", 2)
    >>> off_px(look, {1: 130.0, 2: 190.0})
    -17.5
    """
    middle = middles_px.get(fixation.line)
    return math.nan if middle is None else fixation.y_px - middle


def nearest_line(fixation: TracedFixation, middles_px: Mapping[int, float]) -> int:
    """The line whose middle is nearest to the recorded place, the lower of two; 0 without a y."""
    if math.isnan(fixation.y_px) or not middles_px:
        return 0
    return min(middles_px, key=lambda line: (abs(fixation.y_px - middles_px[line]), -line))


def on_another(fixation: TracedFixation, middles_px: Mapping[int, float]) -> bool:
    """Whether a fixation is on a line, but not on the one that is nearest to it."""
    near = nearest_line(fixation, middles_px)
    return fixation.line > 0 and near > 0 and fixation.line != near


def counted(chosen: Sequence[TracedFixation]) -> str:
    """Fixations by their numbers, or how many there are where that would be a long list."""
    listed = numbers(fixation.number for fixation in chosen)
    return f"{len(chosen)} fixations" if len(listed) > _LONGEST_LIST else fixations(chosen)


def sweep_label(fixation: TracedFixation) -> str:
    """What a fixation is in a return sweep, as the columns of the table have it."""
    if fixation.undersweep:
        return "undersweep"
    return "return sweep" if fixation.return_sweep else ""


def confidence_text(confidence: float) -> str:
    """A confidence in percent; never rounded up to certainty, nor to what passes as sure.

    Examples
    --------
    >>> confidence_text(0.8996), confidence_text(0.99996), confidence_text(float("nan"))
    ('89%', '99%', '')
    """
    return "" if math.isnan(confidence) else f"{math.floor(100 * confidence + 1e-9)}%"


def line_facts(fixation: TracedFixation) -> list[str]:
    """What is said of a fixation's line beside its number."""
    facts = []
    if fixation.on_none:
        facts.append(WHY_ON_NONE.get(fixation.on_none, fixation.on_none))
    if fixation.moved_by_hand:
        was = f"line {fixation.line_told}" if fixation.line_told else "no line"
        facts.append(f"set by hand, was {was}")
    elif fixation.by_hand:
        facts.append("set by hand")
    elif not math.isnan(fixation.line_confidence):
        facts.append(f"{confidence_text(fixation.line_confidence)} sure")
    if label := sweep_label(fixation):
        facts.append(label)
    return facts


def tell_lines(traced: TracedTrial) -> tuple[str, ...]:
    """What is to be said of the lines of a trial, a sentence each.

    Parameters
    ----------
    traced : TracedTrial
        The trial.

    Returns
    -------
    tuple of str
        How lines were told and how sure that is first; empty where no lines were told.
    """
    if traced.lines is None:
        return ()
    middles_px = line_middles(traced)
    placed = tuple(f for f in traced.fixations if f.line and not math.isnan(f.y_px))
    told = [
        _how_sure(traced),
        _unsure(traced),
        _on_another(tuple(f for f in placed if on_another(f, middles_px)), len(placed)),
        _drift(placed, middles_px),
        *_on_none(traced),
        _by_hand(traced),
        _sweeps(traced),
    ]
    return tuple(sentence for sentence in told if sentence)


def _how_sure(traced: TracedTrial) -> str:
    """The method, and how far the trial can be trusted."""
    lines = traced.lines
    if lines is None:
        return ""
    if traced.lines is not None and any(f.by_hand for f in traced.fixations):
        return f"told by {lines.method} and by hand: taken for sure, since somebody has looked"
    if math.isnan(lines.confidence):
        return f"told by {lines.method}, which says nothing of how sure it is"
    verdict = "sure" if lines.sure else "not sure: look at this trial"
    return (
        f"told by {lines.method}, {verdict}; with a chance of {confidence_text(lines.confidence)} "
        "at least 97 in 100 fixations are on their right line"
    )


def _unsure(traced: TracedTrial) -> str:
    """The fixations to be looked at, and where they are."""
    chosen = tuple(f for f in traced.fixations if f.unsure)
    if not chosen:
        return ""
    own = sorted({f.line for f in chosen if f.line})
    where = f", on line{'' if len(own) == 1 else 's'} {numbers(own)}" if own else ""
    verb = "is" if len(chosen) == 1 else "are"
    return f"{counted(chosen)}{where}, {verb} less than {100 * UNSURE_BELOW:g}% sure"


def _on_another(chosen: tuple[TracedFixation, ...], count: int) -> str:
    """What corrected drift amounts to."""
    if not chosen:
        return "every fixation is on the line nearest to where it was recorded" if count else ""
    verb = "is" if len(chosen) == 1 else "are"
    share = f"{len(chosen)} of {count}" if len(chosen) > 1 else f"one of {count}"
    listed = counted(chosen)
    which = f": {listed}" if not listed.startswith(str(len(chosen))) else ""
    return f"{share} {verb} on another line than the one nearest to the place recorded{which}"


def _drift(placed: tuple[TracedFixation, ...], middles_px: Mapping[int, float]) -> str:
    """How far recorded places lie off their lines, at the top and at the bottom of the text."""
    off: dict[int, list[float]] = {}
    for fixation in placed:
        off.setdefault(fixation.line, []).append(off_px(fixation, middles_px))
    known = [line for line in sorted(off) if len(off[line]) >= _FEWEST_FOR_DRIFT]
    if not known:
        return ""

    def told(line: int) -> str:
        return f"{_height(median(off[line]))} on line {line}"

    ends = list(dict.fromkeys((known[0], known[-1])))
    return f"recorded places lie, by their median, {joined([told(line) for line in ends])}"


def _height(distance_px: float) -> str:
    """A distance up or down, in words."""
    rounded = round(distance_px)
    if not rounded:
        return "at the middle"
    return f"{abs(rounded)} px {'below' if rounded > 0 else 'above'} the middle"


def _on_none(traced: TracedTrial) -> list[str]:
    """The fixations that belong to no line, by why."""
    told = []
    for reason, words in WHY_ON_NONE.items():
        own = tuple(f for f in traced.fixations if f.on_none == reason)
        if own:
            verb = "belongs" if len(own) == 1 else "belong"
            told.append(f"{counted(own)} {verb} to no line ({reason}: {words})")
    return told


def _by_hand(traced: TracedTrial) -> str:
    """What a hand set."""
    own = tuple(f for f in traced.fixations if f.by_hand)
    if not own:
        return ""
    moved = tuple(f for f in own if f.moved_by_hand)
    corrections = traced.lines.corrections if traced.lines is not None else ""
    source = f" ({corrections})" if corrections else ""
    head = f"set by hand{source}: {counted(own)}"
    if not moved:
        return f"{head}; none to another line than was told"
    changes = [f"{f.number} to {_line(f.line)} from {_line(f.line_told or 0)}" for f in moved]
    listed = ", ".join(changes)
    if len(listed) > 2 * _LONGEST_LIST:
        listed = f"{len(moved)} of them"
    return f"{head}; to another line than was told: {listed}"


def _line(line: int) -> str:
    """A line by its number."""
    return f"line {line}" if line else "no line"


def _sweeps(traced: TracedTrial) -> str:
    """Return sweeps, and those that fell short."""
    sweeps = tuple(f for f in traced.fixations if f.return_sweep)
    if not sweeps:
        return ""
    short = tuple(f for f in sweeps if f.undersweep)
    verb = "return sweep comes" if len(sweeps) == 1 else "return sweeps come"
    words = f"{len(sweeps)} {verb} down on {counted(sweeps)}"
    return words + (f"; undersweep: {numbers(f.number for f in short)}" if short else "")
