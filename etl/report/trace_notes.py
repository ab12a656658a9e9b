"""The notes beside the picture of a trial: regressions, what was left out, what lies outside."""

from __future__ import annotations

from typing import Final

from etl.report.trace_glyphs import printable, shortened, width_of
from etl.report.trace_input import Piece, TracedFixation, TracedTrial
from etl.report.trace_lines import WHY_ON_NONE, confidence_text
from etl.report.trace_markup import number, tag, text, wrapped
from etl.report.trace_phrases import ms
from etl.report.trace_places import PLOT_RIGHT, Bar, Places

_LEFT: Final = PLOT_RIGHT + 22.0
_LINE: Final = 15.0
#: How many bold letters fit beside the picture (of plain ones 4 more), and of a region's name.
_LETTERS: Final = 36
_NAME_LETTERS: Final = 11


def notes(traced: TracedTrial, places: Places) -> str:
    """All notes, each at the height of what it is about, none on another."""
    wanted = sorted(_wanted(traced, places), key=lambda note: note[0])
    parts: list[str] = []
    free = -float("inf")
    for y, kind, words in wanted:
        at = max(y, free)
        free = at + _LINE
        d = (
            f"M{number(PLOT_RIGHT + 3)} {number(y)} L{number(PLOT_RIGHT + 9)} {number(y)} "
            f"L{number(_LEFT - 9)} {number(at)} L{number(_LEFT - 4)} {number(at)}"
        )
        parts.append(tag("path", {"class": "lead", "d": d}))
        shown = shortened(printable(words), _LETTERS + (0 if kind == "back" else 4))
        inner = [text(shown)]
        if shown != printable(words):
            inner.insert(0, wrapped("title", {}, [text(words)]))
        parts.append(wrapped("text", {"class": f"note {kind}", "x": _LEFT, "y": at + 4}, inner))
    return wrapped("g", {"class": "notes"}, parts)


def _wanted(traced: TracedTrial, places: Places) -> list[tuple[float, str, str]]:
    """Height, kind and words of every note."""
    bars = {bar.fixation.number: bar for bar in places.bars}
    found: list[tuple[float, str, str]] = []
    for place, regression in enumerate(traced.regressions, start=1):
        launch, landing = bars[regression.launch], bars[regression.landing]
        orders = (launch.fixation.region_order, landing.fixation.region_order)
        ends = ", ends 1st pass" if regression.ends_first_pass else ""
        y = (launch.bottom + landing.top) / 2
        found.append((y, "back", f"R{place} {_from_to(traced, orders, ends)}"))
    whole = traced.removal.rule if traced.removal is not None else ""
    for bar in places.bars:
        words = _joined(bar.fixation, _note(traced, bar, whole), _line_note(bar.fixation))
        if words:
            kind = "out" if not bar.fixation.kept else "outside"
            found.append(((bar.top + bar.bottom) / 2, kind, words))
    return found


def _from_to(traced: TracedTrial, orders: tuple[int, int], ends: str) -> str:
    """The regions of a regression: with their words where there is room, else by names alone."""
    called = [f"{traced.region(k)} “{traced.region_texts[k - 1].strip()}”" for k in orders]
    words = f"{called[0]} to {called[1]}{ends}"
    if all(traced.region_texts[k - 1].strip() for k in orders) and width_of(words) <= _LETTERS - 8:
        return words
    names = [shortened(printable(traced.region(k)), _NAME_LETTERS) for k in orders]
    return f"{names[0]} to {names[1]}{ends}"


def _note(traced: TracedTrial, bar: Bar, whole: str) -> str:
    """What is to be said of a fixation; empty where nothing is."""
    fixation = bar.fixation
    beyond = f", at x = {ms(fixation.x_px)} px" if bar.beyond else ""
    removal = fixation.removal
    if removal is not None:
        if removal.rule == whole:
            return f"{fixation.number} lies{beyond[1:]}" if beyond else ""
        if fixation.merged_into:
            limit = f" ({removal.rule} {removal.limit})" if removal.limit else ""
            return f"{fixation.number} merged into {fixation.merged_into}{limit}"
        limit = f" = {removal.limit}" if removal.limit else ""
        found = f", found {removal.observed}" if removal.observed else ""
        return f"{fixation.number} left out: {removal.rule}{limit}{found}"
    if fixation.on_none:
        why = WHY_ON_NONE.get(fixation.on_none, fixation.on_none)
        return f"{fixation.number} on no line{beyond or ': ' + why}"
    if not fixation.region_order:
        return f"{fixation.number} outside{beyond or _how_far(traced, fixation)}"
    return f"{fixation.number} lies{beyond[1:]}" if beyond else ""


def _line_note(fixation: TracedFixation) -> str:
    """What is to be said of a fixation's line: that it is unsure, or was changed by hand."""
    on = f"line {fixation.line}" if fixation.line else "no line"
    if fixation.moved_by_hand:
        was = f"line {fixation.line_told}" if fixation.line_told else "no line"
        return f"{on} by hand, was {was}"
    if fixation.unsure:
        return f"{on if fixation.line else 'that'} {confidence_text(fixation.line_confidence)} sure"
    return "undersweep" if fixation.undersweep else ""


def _joined(fixation: TracedFixation, note: str, of_line: str) -> str:
    """Both notes on a fixation in one."""
    if not of_line:
        return note
    return f"{note}; {of_line}" if note else f"{fixation.number} {of_line}"


def _how_far(traced: TracedTrial, fixation: TracedFixation) -> str:
    """How far above or below all regions a fixation is."""
    if not traced.pieces:
        return "" if traced.region_names or fixation.placed else ", no position"
    if not fixation.placed or fixation.y_px != fixation.y_px:
        return ", no position" if not fixation.placed else ""
    top = min(piece.top_px for piece in traced.pieces)
    bottom = max(piece.bottom_px for piece in traced.pieces)
    if fixation.y_px < top:
        return f", {top - fixation.y_px:.0f} px above the text"
    if fixation.y_px >= bottom:
        return f", {fixation.y_px - bottom:.0f} px below the text"
    return _which_side(traced.pieces, fixation)


def _which_side(pieces: tuple[Piece, ...], fixation: TracedFixation) -> str:
    """Whether a fixation is to the left or to the right of all regions."""
    left = min(piece.left_px for piece in pieces)
    right = max(piece.right_px for piece in pieces)
    if fixation.x_px < left:
        return f", {left - fixation.x_px:.0f} px left of the text"
    if fixation.x_px >= right:
        return f", {fixation.x_px - right:.0f} px right of the text"
    return ""
