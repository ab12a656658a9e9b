"""All readers on one axis: a dot each, those who stand out with their names."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup, escape

from etl.report.charts import Scale, drawing, numbers
from etl.report.wording import cut

#: The width that strips of readers are laid out for: dots that do not touch at this width may
#: touch on a phone; labels are laid out for the phone.
_LAID_OUT_PX = 400
_NARROW_PX = 300
_LETTER_PX = 6.6
_DOT_PX = 4.5
#: With more readers than this dots are half as wide, and still fit side by side.
_MANY_DOTS = 100
_LABEL_PX = 15


@dataclass(frozen=True, slots=True)
class Dot:
    """A reader on a strip.

    Attributes
    ----------
    value : float
        Where.
    label : str
        The reader's name; empty unless the reader stands out.
    """

    value: float
    label: str = ""


def strip(
    dots: Sequence[Dot],
    scale: Scale,
    unit: str,
    *,
    fence: tuple[float, float] | None = None,
    published: tuple[float, float] | None = None,
    median: float | None = None,
) -> Markup:
    """All readers on one axis.

    Parameters
    ----------
    dots : sequence of Dot
        Ascending.
    scale : Scale
        The axis.
    unit : str
        Stands behind the last number.
    fence : tuple of float, optional
        Readers outside stand out: the band between is shaded.
    published : tuple of float, optional
        A published range: hatched.
    median : float, optional
        Of all readers: a line.
    """
    rows, depth = _labels(dots, scale)
    radius = _DOT_PX if len(dots) <= _MANY_DOTS else _DOT_PX / 2
    heights = _swarm([scale.share(dot.value) * _LAID_OUT_PX for dot in dots], radius)
    reach = max((abs(h) for h in heights), default=0.0) + _DOT_PX + 7
    top = depth * _LABEL_PX + 4
    middle, bottom = top + reach, top + 2 * reach
    body: list[str] = []
    for kind, band in (("fence", fence), ("published", published)):
        if band is not None:
            start, end = scale.share(band[0]) * 100, scale.share(band[1]) * 100
            body.append(
                f'<rect class="{kind}" x="{start:.2f}%" width="{max(0.0, end - start):.2f}%" '
                f'y="{top:g}" height="{2 * reach:g}"/>'
            )
    body.append(f'<line class="base" x1="0" x2="100%" y1="{bottom:g}" y2="{bottom:g}"/>')
    if median is not None:
        x_median = scale.across(median)
        body.append(
            f'<line class="median" x1="{x_median}" x2="{x_median}" y1="{top:g}" y2="{bottom:g}"/>'
        )
    for dot, height, row in zip(dots, heights, rows, strict=True):
        x = scale.across(dot.value)
        y = middle + height
        if not dot.label:
            body.append(f'<circle class="reader" cx="{x}" cy="{y:.1f}" r="{radius - 0.4:g}"/>')
            continue
        body.append(f'<use href="#stands-out" class="stands-out" x="{x}" y="{y:.1f}"/>')
        if row is not None:
            text_y = row * _LABEL_PX + 11
            side = _anchor(scale.share(dot.value))
            body.append(
                f'<line class="leader" x1="{x}" x2="{x}" y1="{text_y + 4:g}" y2="{y - 7:.1f}"/>'
                f'<text class="label" x="{x}" y="{text_y:g}" text-anchor="{side}">'
                f"{escape(cut(dot.label))}</text>"
            )
    body += numbers(scale, unit, bottom + 15)
    return drawing(body, bottom + 20, "strip")


def _anchor(share: float) -> str:
    """Which end of a label stands at its dot."""
    return "start" if share < 0.2 else "end" if share > 0.8 else "middle"


def _labels(dots: Sequence[Dot], scale: Scale) -> tuple[list[int | None], int]:
    """In which row above the dots each label goes, so that none covers another on a phone."""
    rows: list[int | None] = []
    ends: list[list[tuple[float, float]]] = []
    for dot in dots:
        if not dot.label:
            rows.append(None)
            continue
        share = scale.share(dot.value)
        x, width = share * _NARROW_PX, len(cut(dot.label)) * _LETTER_PX + 8
        start = {"start": x, "end": x - width, "middle": x - width / 2}[_anchor(share)]
        free = (
            r
            for r, taken in enumerate(ends)
            if all(start > b or start + width < a for a, b in taken)
        )
        row = next(free, len(ends))
        if row == len(ends):
            if row == 4:
                rows.append(None)  # the sentence below the strip names those without a label
                continue
            ends.append([])
        ends[row].append((start, start + width))
        rows.append(row)
    return rows, len(ends)


#: Up to this many dots are fitted closely to one another, which takes the square of their number.
_CLOSE_FITTING = 100


def _swarm(xs: Sequence[float], radius: float) -> list[float]:
    """How far up or down each dot moves so that dots do not cover one another."""
    width = 2 * radius
    most = 40.0
    if len(xs) > _CLOSE_FITTING:
        return _columns(xs, width, most)
    placed: list[tuple[float, float]] = []
    out: list[float] = []
    for x in xs:
        near = [(px, py) for px, py in placed[-60:] if x - px < width]
        tries = [0.0]
        for px, py in near:
            rise = math.sqrt(max(0.0, width**2 - (x - px) ** 2)) + 0.01
            tries += [py + rise, py - rise]
        free = [
            y
            for y in tries
            if abs(y) <= most
            and all((x - px) ** 2 + (y - py) ** 2 >= width**2 - 0.01 for px, py in near)
        ]
        y = min(free, key=lambda v: (abs(v), v)) if free else 0.0
        placed.append((x, y))
        out.append(y)
    return out


def _columns(xs: Sequence[float], width: float, most: float) -> list[float]:
    """Dots of many readers in columns: each a place farther from the middle than the last."""
    taken: dict[int, int] = {}
    out = []
    for x in xs:
        column = math.floor(x / width)
        place = taken.get(column, 0)
        taken[column] = place + 1
        height = (place + 1) // 2 * width * (1 if place % 2 else -1)
        out.append(height if abs(height) <= most else math.copysign(most, height))
    return out
