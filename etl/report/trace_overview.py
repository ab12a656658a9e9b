"""The whole text over the picture of a trial of several lines: a map of where the eyes were.

Lines and fixations stand as they stood on the screen, so that drift can be seen; a link goes from a
fixation that lies off its line to the middle of the line that it was given.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import TracedFixation, TracedTrial
from etl.report.trace_lines import (
    OFF_LINE,
    line_facts,
    line_middles,
    off_px,
    on_another,
    pitch_px,
    tell_lines,
)
from etl.report.trace_marks import RADIUS, line_marks, link_path, map_legend, mark_shape
from etl.report.trace_markup import number, tag, text, wrapped
from etl.report.trace_places import PLOT_LEFT, WIDTH, Across

#: Lines are drawn at least and at most so far apart.
_LEAST_PITCH: Final = 44.0
_MOST_PITCH: Final = 64.0
#: How much of the room for a line its stripe takes, and how far beyond the outer lines fixations
#: are drawn where they were, both in distances between lines.
_STRIPE: Final = 0.62
_BEYOND_LINES: Final = 1.6
_AROUND: Final = 0.55
_LARGEST_TYPE: Final = 17.0
#: Of a monospaced letter the advance is 0.6 of the type's size (common practice, no source).
_ADVANCE: Final = 0.6


@dataclass(frozen=True, slots=True)
class _Down:
    """From heights on the screen to heights in the map; what lies farther off is at the edge."""

    top: float
    low_px: float
    high_px: float
    scale: float

    @property
    def bottom(self) -> float:
        """Where the map ends."""
        return self.top + (self.high_px - self.low_px) * self.scale

    def at(self, y_px: float) -> float:
        """The height in the map."""
        return self.top + (min(max(y_px, self.low_px), self.high_px) - self.low_px) * self.scale

    def beyond(self, y_px: float) -> int:
        """Whether a place is off the map: -1 above, 1 below."""
        return (y_px > self.high_px) - (y_px < self.low_px)


def overview(traced: TracedTrial, top: float) -> tuple[str, float]:
    """The text with every fixation where it was recorded; and where that ends.

    A text of one line has none: the line stands over its fixations as it is.
    """
    middles_px = line_middles(traced)
    if len(middles_px) < 2 or not traced.pieces:
        return "", top
    across = Across(traced)
    said, top = _said(traced, top)
    down = _down(traced, middles_px, across, top)
    parts = [*said]
    for line, middle_px in middles_px.items():
        y = down.at(middle_px)
        label: dict[str, str | float] = {"class": "small end", "x": PLOT_LEFT - 8, "y": y + 4}
        parts.append(wrapped("text", label, [text(f"line {line}")]))
        high = _STRIPE * pitch_px(middles_px) * down.scale
        for piece in (p for p in traced.pieces if p.line == line):
            left, right = across.at(piece.left_px), across.at(piece.right_px)
            parity = "odd" if piece.order % 2 else "even"
            box: dict[str, str | float] = {
                "class": f"stripe {parity}",
                "x": left,
                "y": y - high / 2,
            }
            parts.append(tag("rect", {**box, "width": right - left, "height": high}))
        parts += words_of(traced, across, line, y + 5.5, _LARGEST_TYPE, "under-marks")
    places = [
        (fixation, across.of(fixation)[0], _height(fixation, middles_px))
        for fixation in traced.fixations
    ]
    shown = [(f, x, y_px) for f, x, y_px in places if not math.isnan(y_px)]
    marks = [_Mark(f, x, down, y_px, middles_px) for f, x, y_px in shown]
    parts += [mark.link() for mark in marks]
    parts += [mark.drawn(traced) for mark in marks]
    off = OFF_LINE * pitch_px(middles_px)
    place = PLOT_LEFT + 6, down.bottom + 26
    legend, bottom = map_legend(_kinds(marks), off, place, WIDTH - 20)
    return wrapped("g", {"class": "overview"}, [*parts, legend]), bottom + 22


def _said(traced: TracedTrial, top: float) -> tuple[list[str], float]:
    """How lines were told and how sure that is, over the map; and where that ends."""
    told = tell_lines(traced)
    if not told or traced.lines is None:
        return [], top
    words = f"Lines {told[0]}"
    row = wrapped("text", {"class": "strong", "x": 20, "y": top + 10}, [text(words)])
    return [row], top + 26


def _down(
    traced: TracedTrial, middles_px: Mapping[int, float], across: Across, top: float
) -> _Down:
    """The map's heights: to the scale of its widths, unless lines would be too near or too far."""
    pitch = pitch_px(middles_px)
    scale = min(_MOST_PITCH, max(_LEAST_PITCH, across.scale * pitch)) / pitch
    first, last = min(middles_px.values()), max(middles_px.values())
    seen = [f.y_px for f in traced.fixations if f.placed and not math.isnan(f.y_px)]
    around, most = _AROUND * pitch, _BEYOND_LINES * pitch
    low = max(first - most, min([first - around, *(y - 0.1 * pitch for y in seen)]))
    high = min(last + most, max([last + around, *(y + 0.1 * pitch for y in seen)]))
    return _Down(top, low, high, scale)


def _height(fixation: TracedFixation, middles_px: Mapping[int, float]) -> float:
    """Where a fixation is shown: where it was recorded, else on its line; NaN for nowhere."""
    if not fixation.placed and not fixation.region_order:
        return math.nan
    return middles_px.get(fixation.line, math.nan) if math.isnan(fixation.y_px) else fixation.y_px


@dataclass(frozen=True, slots=True)
class _Mark:
    """A fixation in the map."""

    fixation: TracedFixation
    x: float
    down: _Down
    y_px: float
    middles_px: Mapping[int, float]

    @property
    def y(self) -> float:
        """Its height in the map."""
        return self.down.at(self.y_px)

    @property
    def linked(self) -> bool:
        """Whether it lies so far off its line that a link is drawn."""
        return abs(off_px(self.fixation, self.middles_px)) >= OFF_LINE * pitch_px(self.middles_px)

    @property
    def moved(self) -> bool:
        """Whether another line is nearer."""
        return on_another(self.fixation, self.middles_px)

    def link(self) -> str:
        """From the place recorded to the line; with an arrowhead where that is not the nearest."""
        if not self.linked:
            return ""
        end = self.down.at(self.middles_px[self.fixation.line])
        return link_path(self.x, self.y, end, moved=self.moved)

    def drawn(self, traced: TracedTrial) -> str:
        """The mark, with what is known of its line shown on pointing at it."""
        fixation = self.fixation
        kind = "first"
        if not fixation.kept:
            kind = "out"
        elif fixation.line and not fixation.first_pass:
            kind = "later"
        parts = [
            wrapped("title", {}, [text(_hint(traced, fixation, self.middles_px))]),
            mark_shape(kind, self.x, self.y, on_line=fixation.line > 0),
        ]
        parts += line_marks(fixation, (self.x, self.y), (RADIUS, RADIUS))
        if beyond := self.down.beyond(self.y_px):
            d = f"M{number(self.x)} {number(self.y + 11 * beyond)} l-5 {-6 * beyond} l10 0 z"
            parts.append(tag("path", {"class": "beyond", "d": d}))
        return wrapped("g", {"class": "mark", "data-mark": str(fixation.number)}, parts)


def _hint(traced: TracedTrial, fixation: TracedFixation, middles_px: Mapping[int, float]) -> str:
    """What is known of a fixation's line."""
    parts = [f"fixation {fixation.number}"]
    if fixation.placed and not math.isnan(fixation.y_px):
        parts.append(f"recorded at x {fixation.x_px:.0f} px, y {fixation.y_px:.0f} px")
    parts.append(f"on line {fixation.line}" if fixation.line else "on no line")
    off = off_px(fixation, middles_px)
    if not math.isnan(off) and round(off):
        parts.append(f"{abs(off):.0f} px {'below' if off > 0 else 'above'} its middle")
    parts += line_facts(fixation)
    if not fixation.kept:
        parts.append(f"left out by {fixation.left_out_by}")
    elif fixation.region_order:
        parts.append(f"in {traced.region(fixation.region_order)}")
    return "; ".join(parts)


def _kinds(marks: list[_Mark]) -> set[str]:
    """The kinds of marks that a map has."""
    found = set()
    for mark in marks:
        fixation = mark.fixation
        found.add("none" if not fixation.line else "dot")
        if mark.linked:
            found.add("moved" if mark.moved else "link")
        if fixation.unsure:
            found.add("doubt")
        if fixation.moved_by_hand:
            found.add("hand")
    return found


def words_of(
    traced: TracedTrial, across: Across, line: int, y: float, largest: float, kind: str = ""
) -> list[str]:
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
            "class": f"text {kind}".rstrip(),
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
