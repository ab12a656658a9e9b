"""Panels of curves as one Scalable Vector Graphics picture, with nothing but text."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape

#: Sizes in px: a panel's plot, the space around it, panels in a row.
WIDE, HIGH, LEFT, ABOVE, RIGHT, BELOW, COLUMNS = 300, 210, 46, 16, 18, 46, 3
LEGEND = 44
#: The lowest percentage that is shown; curves that fall below run along the bottom.
LOWEST = 40.0
#: Ten colours that differ in lightness too; after Okabe & Ito's set, from memory, and greys.
COLOURS = (
    *("#0072b2", "#e69f00", "#009e73", "#cc79a7", "#56b4e9"),
    *("#d55e00", "#8a6d00", "#7f7f7f", "#5e3c99", "#b2b200"),
)
STRONG = "#000000"


@dataclass(frozen=True)
class Panel:
    """Curves over the same values, in percent."""

    title: str
    values: list[float]
    curves: dict[str, list[float]]


def _text(x: float, y: float, words: str, anchor: str = "middle") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}">{escape(words)}</text>'


def _line(points: list[tuple[float, float]], colour: str, width: float) -> str:
    path = " ".join(f"{x:.1f},{y:.1f}" for x, y in points)
    return f'<polyline points="{path}" stroke="{colour}" stroke-width="{width}"/>'


def _panel(panel: Panel, left: float, top: float, strong: str) -> list[str]:
    """Frame, axes, and curves, the strong one last and on top."""
    low, high = panel.values[0], panel.values[-1]

    def at(value: float, percent: float) -> tuple[float, float]:
        shown = max(percent, LOWEST)
        x = left + WIDE * (value - low) / (high - low)
        return x, top + HIGH * (100 - shown) / (100 - LOWEST)

    parts = []
    for percent in range(int(LOWEST), 101, 10):
        x, y = at(low, percent)
        parts.append(_line([(x, y), (x + WIDE, y)], "#dddddd", 1))
        parts.append(_text(left - 6, y + 4, str(percent), "end"))
    parts += [
        _text(at(value, LOWEST)[0], top + HIGH + 16, f"{value:g}")
        for value in (low, (low + high) / 2, high)
    ]
    parts.append(_text(left + WIDE / 2, top + HIGH + 34, panel.title))
    for (name, curve), colour in zip(panel.curves.items(), [*COLOURS, STRONG], strict=True):
        points = [at(*pair) for pair in zip(panel.values, curve, strict=True)]
        parts.append(_line(points, colour, 2.6 if name == strong else 1.4))
    return parts


def _legend(names: list[str], top: float) -> list[str]:
    """Names with their colours, in rows of six."""
    parts = []
    for i, (name, colour) in enumerate(zip(names, [*COLOURS, STRONG], strict=True)):
        x, y = LEFT + 150 * (i % 6), top + 18 * (i // 6)
        parts.append(_line([(x, y), (x + 26, y)], colour, 2.6 if colour == STRONG else 1.8))
        parts.append(_text(x + 32, y + 4, name, "start"))
    return parts


def drawn(panels: list[Panel], strong: str) -> str:
    """The picture of some panels.

    Parameters
    ----------
    panels : list of Panel
        All with the same ten curves and, last, the strong one.
    strong : str
        The curve that is drawn thick.

    Returns
    -------
    str
        The file's contents.
    """
    rows = -(-len(panels) // COLUMNS)
    width = COLUMNS * (LEFT + WIDE + RIGHT)
    height = rows * (ABOVE + HIGH + BELOW) + LEGEND
    parts = []
    for i, panel in enumerate(panels):
        left = LEFT + (i % COLUMNS) * (LEFT + WIDE + RIGHT)
        top = ABOVE + (i // COLUMNS) * (ABOVE + HIGH + BELOW)
        parts += _panel(panel, left, top, strong)
    parts += _legend(list(panels[0].curves), height - LEGEND + 16)
    head = (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" '
        f'viewBox="0 0 {width} {height}" font-family="sans-serif" font-size="11" role="img" '
        'aria-label="Percentage of fixations on the right line, by phenomenon and method">'
    )
    body = '<rect width="100%" height="100%" fill="#ffffff"/><g fill="none">'
    lines = [part for part in parts if part.startswith("<polyline")]
    words = [part for part in parts if part.startswith("<text")]
    inside = "\n".join([body, *lines, '</g><g fill="#222222">', *words, "</g>"])
    return f"{head}\n{inside}\n</svg>\n"
