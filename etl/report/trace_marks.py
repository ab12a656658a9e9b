"""The marks of the map over the picture of a trial, and their legend.

No meaning rests on colour: a fixation on no line is a diamond, one left out is crossed, an unsure
line is a dashed outline, a line changed by hand a square frame.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Final

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import UNSURE_BELOW, TracedFixation
from etl.report.trace_markup import number, straight, tag, text, wrapped

RADIUS: Final = 3.2
_DIAMOND: Final = 5.4
_OUTLINE: Final = 3.4
_FRAME: Final = 2.8
_LEGEND_LETTER: Final = 6.3
_LEGEND_ROW: Final = 26.0


def link_path(x: float, start: float, end: float, *, moved: bool) -> str:
    """A link down or up to a line, with an arrowhead where it leads past a nearer line."""
    if not moved:
        return tag("path", {"class": "link", "d": straight(x, start, x, end)})
    side = 1 if end > start else -1
    tip = f"M{number(x)} {number(end)} l-3.4 {-6 * side} l6.8 0 z"
    line = straight(x, start, x, end - 5 * side)
    return tag("path", {"class": "link moved", "d": line}) + tag(
        "path", {"class": "link-tip", "d": tip}
    )


def mark_shape(kind: str, x: float, y: float, *, on_line: bool = True) -> str:
    """A round mark for a fixation on a line, a diamond for one on none; a cross where left out.

    Parameters
    ----------
    kind : {"first", "later", "out"}
        What it is.
    x, y : float
        Where.
    on_line : bool
        Whether it belongs to a line.

    Returns
    -------
    str
    """
    shape = ""
    if not on_line:
        shape = diamond(x, y)
    elif kind != "out":
        shape = tag("circle", {"class": f"dot {kind}", "cx": x, "cy": y, "r": RADIUS})
    if kind == "out":
        d = straight(x - RADIUS, y - RADIUS, x + RADIUS, y + RADIUS)
        d += " " + straight(x - RADIUS, y + RADIUS, x + RADIUS, y - RADIUS)
        shape += tag("path", {"class": "cross", "d": d})
    return shape


def diamond(x: float, y: float) -> str:
    """The mark of a fixation that belongs to no line."""
    r = number(_DIAMOND)
    d = f"M{number(x)} {number(y - _DIAMOND)} l{r} {r} l-{r} {r} l-{r} -{r} z"
    return tag("path", {"class": "none", "d": d})


def line_marks(
    fixation: TracedFixation, at: tuple[float, float], half: tuple[float, float]
) -> list[str]:
    """What stands around a mark: dashes where its line is unsure, a frame where a hand changed it.

    Parameters
    ----------
    fixation : TracedFixation
        The fixation.
    at : tuple of float
        The middle of its mark.
    half : tuple of float
        Half the width and half the height of its mark.

    Returns
    -------
    list of str
    """
    found = []
    if fixation.unsure:
        found.append(_box("doubt", at, half, _OUTLINE))
    if fixation.moved_by_hand:
        found.append(_box("hand", at, half, _FRAME))
    return found


def _box(kind: str, at: tuple[float, float], half: tuple[float, float], apart: float) -> str:
    """A box around a mark."""
    wide, high = half[0] + apart, half[1] + apart
    box: dict[str, str | float] = {"class": kind, "x": at[0] - wide, "y": at[1] - high}
    if kind == "doubt":
        box["rx"] = min(wide, high)
    return tag("rect", {**box, "width": 2 * wide, "height": 2 * high})


def _example(kind: str) -> Callable[[float, float], str]:
    """A mark for the legend."""

    def drawn(x: float, y: float) -> str:
        if kind == "link":
            return link_path(x, y - 8, y + 8, moved=False)
        if kind == "moved":
            return link_path(x, y - 9, y + 9, moved=True)
        if kind == "none":
            return diamond(x, y)
        around = "" if kind == "dot" else _box(kind, (x, y), (RADIUS, RADIUS), _OUTLINE)
        return mark_shape("first", x, y) + around

    return drawn


def map_legend(
    kinds: Iterable[str], off_px: float, place: tuple[float, float], right: float
) -> tuple[str, float]:
    """What the marks of a map mean.

    Parameters
    ----------
    kinds : iterable of str
        Which of them there are: ``link``, ``moved``, ``none``, ``doubt``, ``hand``.
    off_px : float
        From how far off its line a fixation has a link.
    place : tuple of float
        Where the legend begins, across and down.
    right : float
        Where its rows end.

    Returns
    -------
    str
        The legend.
    float
        Where it ends.
    """
    words = {
        "dot": "where it was recorded",
        "link": f"to its line, where that is {off_px:.0f} px or more off",
        "moved": "to its line, which is not the nearest",
        "none": "on no line",
        "doubt": f"line less than {100 * UNSURE_BELOW:g}% sure",
        "hand": "line changed by hand",
    }
    there = set(kinds)
    parts: list[str] = []
    x, y = place
    for kind, said in words.items():
        if kind not in there and kind != "dot":
            continue
        wide = 14 + width_of(said) * _LEGEND_LETTER
        if x + wide > right:
            x, y = place[0], y + _LEGEND_ROW
        parts.append(_example(kind)(x, y - 4))
        parts.append(wrapped("text", {"class": "small", "x": x + 14, "y": y}, [text(said)]))
        x += wide + 26
    return wrapped("g", {"class": "map-legend"}, parts), y
