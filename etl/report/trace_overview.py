"""The whole text over the picture of a trial of several lines, with where the eyes were on it."""

from __future__ import annotations

from typing import Final

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import TracedTrial
from etl.report.trace_markup import tag, text, wrapped
from etl.report.trace_places import PLOT_LEFT, Across

_PITCH: Final = 30.0
_RADIUS: Final = 2.6
_LARGEST_TYPE: Final = 17.0
#: Of a monospaced letter the advance is 0.6 of the type's size (common practice, no source).
_ADVANCE: Final = 0.6


def overview(traced: TracedTrial, top: float) -> tuple[str, float]:
    """The text with a mark for each fixation under its line; and where it ends.

    A text of one line has none: the line stands over its fixations as it is.
    """
    lines = sorted({piece.line for piece in traced.pieces})
    if len(lines) < 2:
        return "", top
    across = Across(traced)
    parts: list[str] = []
    tops = {line: top + row * _PITCH for row, line in enumerate(lines)}
    for line, y in tops.items():
        label: dict[str, str | float] = {"class": "small end", "x": PLOT_LEFT - 8, "y": y + 15}
        parts.append(wrapped("text", label, [text(f"line {line}")]))
        for piece in (p for p in traced.pieces if p.line == line):
            left, right = across.at(piece.left_px), across.at(piece.right_px)
            parity = "odd" if piece.order % 2 else "even"
            box: dict[str, str | float] = {
                "class": f"stripe {parity}",
                "x": left,
                "y": y,
                "width": right - left,
            }
            parts.append(tag("rect", {**box, "height": 21.0}))
        parts += words_of(traced, across, line, y + 15.5, _LARGEST_TYPE)
    for fixation in traced.fixations:
        if fixation.line not in tops:
            continue
        x, _ = across.of(fixation)
        kind = "later" if fixation.kept and not fixation.first_pass else "first"
        mark: dict[str, str | float] = {"class": f"dot {kind if fixation.kept else 'out'}", "cx": x}
        parts.append(tag("circle", {**mark, "cy": tops[fixation.line] + 24.5, "r": _RADIUS}))
    return wrapped("g", {"class": "overview"}, parts), top + len(lines) * _PITCH + 18


def words_of(traced: TracedTrial, across: Across, line: int, y: float, largest: float) -> list[str]:
    """The words of a line, each stretched to where it stood, whatever type there is."""
    own = [word for word in traced.words if word.line == line and word.text]
    if not own:
        return []
    narrowest = min((word.right_px - word.left_px) / max(1, width_of(word.text)) for word in own)
    size = min(largest, narrowest * across.scale / _ADVANCE)
    parts: list[str] = []
    for word in own:
        left, right = across.at(word.left_px), across.at(word.right_px)
        attributes: dict[str, str | float] = {
            "class": "text",
            "x": right if traced.right_to_left else left,
            "y": y,
            "font-size": size,
            "textLength": right - left,
            "lengthAdjust": "spacingAndGlyphs",
        }
        if traced.right_to_left:
            attributes["direction"] = "rtl"
        parts.append(wrapped("text", attributes, [text(word.text)]))
    return parts
