"""The whole text over the picture of a trial of several lines, with where the eyes were on it."""

from __future__ import annotations

from typing import Final

from etl.report.trace_input import TracedTrial
from etl.report.trace_markup import tag, text, wrapped
from etl.report.trace_places import PLOT_LEFT, Across

_PITCH: Final = 30.0
_RADIUS: Final = 2.6
_LARGEST_TYPE: Final = 17.0


def overview(traced: TracedTrial, top: float) -> tuple[str, float]:
    """The text with a mark for each fixation under its line; and where it ends.

    A text of one line has none: the line stands over its fixations as it is.
    """
    lines = sorted({piece.line for piece in traced.pieces})
    if len(lines) < 2:
        return "", top
    across = Across(traced)
    words = {line.number: line for line in traced.lines}
    parts: list[str] = []
    tops = {line: top + row * _PITCH for row, line in enumerate(lines)}
    for line, y in tops.items():
        label = {"class": "small end", "x": PLOT_LEFT - 8, "y": y + 15}
        parts.append(wrapped("text", label, [text(f"line {line}")]))
        for piece in (p for p in traced.pieces if p.line == line):
            left, right = across.at(piece.left_px), across.at(piece.right_px)
            parity = "odd" if piece.order % 2 else "even"
            box = {"class": f"stripe {parity}", "x": left, "y": y, "width": right - left}
            parts.append(tag("rect", {**box, "height": 21.0}))
        if line in words:
            own = words[line]
            ends = (across.at(own.left_px), across.at(own.right_px))
            parts.append(_text(own.text, ends, y + 15.5, traced))
    for fixation in traced.fixations:
        if fixation.line not in tops:
            continue
        x, _ = across.of(fixation)
        kind = "later" if fixation.kept and not fixation.first_pass else "first"
        mark = {"class": f"dot {kind if fixation.kept else 'out'}", "cx": x}
        parts.append(tag("circle", {**mark, "cy": tops[fixation.line] + 24.5, "r": _RADIUS}))
    return wrapped("g", {"class": "overview"}, parts), top + len(lines) * _PITCH + 18


def _text(words: str, ends: tuple[float, float], y: float, traced: TracedTrial) -> str:
    """A line in smaller type."""
    from etl.report.trace_picture import line_of_text

    return line_of_text(
        words, ends, y, right_to_left=traced.right_to_left, largest=_LARGEST_TYPE
    )
