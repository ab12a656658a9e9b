"""The drawings of the audit page, as SVG that flows with the page.

Positions across are percentages, positions down are pixels, so a drawing fills whatever width it
is given and its letters keep their size: no scaling, no script, readable on a phone. Colours and
hatchings are classes of the page's style sheet, which knows light, dark and paper. Drawings say
nothing that does not also stand in words or in a table beside them, so they are hidden from
programs that read aloud.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from markupsafe import Markup

#: Hatchings for rules and shapes for levels; with more of either they begin anew.
HATCHINGS = 8
SHAPES = 6
#: Width of one trial where trials are drawn as squares, and the most that are.
UNIT_PX = 9
MOST_UNITS = 36


@dataclass(frozen=True, slots=True)
class Part:
    """A part of a bar.

    Attributes
    ----------
    slot : int, None or "absent"
        Hatching of a rule; None for what was kept; "absent" for trials that no log has.
    amount : int
        How many.
    """

    slot: int | Literal["absent"] | None
    amount: int


@dataclass(frozen=True, slots=True)
class Scale:
    """An axis: its ends, and where it bears numbers.

    Attributes
    ----------
    low, high : float
        The ends.
    ticks : tuple of float
        Round values within.
    """

    low: float
    high: float
    ticks: tuple[float, ...]

    def across(self, value: float) -> str:
        """The place of a value across the drawing."""
        return f"{self.share(value) * 100:.2f}%"

    def share(self, value: float) -> float:
        """The place of a value between the ends, from 0 to 1."""
        if self.high == self.low:
            return 0.5
        return min(1.0, max(0.0, (value - self.low) / (self.high - self.low)))


@dataclass(frozen=True, slots=True)
class Estimate:
    """A rate with its interval.

    Attributes
    ----------
    shape : int
        Which level of a factor it is for.
    rate, low, high : float
        On the axis.
    """

    shape: int
    rate: float
    low: float
    high: float


def round_scale(low: float, high: float, *, most: int = 5) -> Scale:
    """An axis around values, with round numbers on it.

    Parameters
    ----------
    low, high : float
        What it must hold.
    most : int
        About how many numbers it bears.

    Examples
    --------
    >>> round_scale(183, 262).ticks
    (180.0, 200.0, 220.0, 240.0, 260.0)
    """
    width = high - low
    if width <= 0:
        low, high, width = low - 1, high + 1, 2.0
    rough = width / most
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(m * power for m in (1, 2, 2.5, 5, 10) if m * power >= rough * 0.999)
    first, last = math.floor(low / step), math.ceil(high / step)
    ticks = tuple(round(i * step, 10) for i in range(first, last + 1))
    inside = tuple(t for t in ticks if low - 0.35 * step <= t <= high + 0.35 * step)
    pad = 0.04 * width
    return Scale(min(low - pad, inside[0]), max(high + pad, inside[-1]), inside)


def drawing(body: Sequence[str], height: float, kind: str, width: str = "100%") -> Markup:
    """Wrap parts of a drawing.

    Parameters
    ----------
    body : sequence of str
        Elements; whatever in them comes from data is escaped.
    height : float
        In pixels.
    kind : str
        The class of the drawing.
    width : str
        In pixels or percent.
    """
    inner = "".join(body)
    return Markup(  # noqa: S704 - made of our own elements; names in them are escaped
        f'<svg class="{kind}" width="{width}" height="{height:g}" aria-hidden="true" '
        f'focusable="false">{inner}</svg>'
    )


def swatch(slot: int | None) -> Markup:
    """A square with the hatching of a rule, or the colour of what was kept."""
    return drawing(
        [f'<rect class="bar-{_slot(slot)}" width="14" height="14"/>'], 14, "swatch", width="14"
    )


def _slot(slot: int | Literal["absent"] | None) -> str:
    """A hatching's name in classes."""
    if slot is None:
        return "kept"
    return slot if slot == "absent" else str(slot % HATCHINGS)


def marker(shape: int) -> Markup:
    """The shape of a level, for legends."""
    return drawing([_use(shape, "8", 8)], 16, "swatch", width="16")


def _use(shape: int, x: str, y: float) -> str:
    """A level's shape somewhere."""
    kind = shape % SHAPES
    return f'<use href="#shape-{kind}" class="level-{kind}" x="{x}" y="{y:g}"/>'


def unit_bar(parts: Sequence[Part], whole: int) -> Markup:
    """A bar of one reader's trials: a square a trial where they are few.

    Parameters
    ----------
    parts : sequence of Part
        Kept first, then what each rule left out.
    whole : int
        The most trials that any reader has, so that bars can be compared.
    """
    if whole > MOST_UNITS:
        return share_bar(parts, whole, height=13)
    body, x = [], 0
    for part in parts:
        if part.amount:
            width = part.amount * UNIT_PX
            body.append(
                f'<rect class="unit-{_slot(part.slot)}" x="{x}" width="{width}" height="13"/>'
            )
            x += width
    return drawing(body, 13, "units", width=str(max(1, whole) * UNIT_PX))


def share_bar(parts: Sequence[Part], whole: float, *, height: int = 18) -> Markup:
    """A bar of shares of a whole.

    Parameters
    ----------
    parts : sequence of Part
        From left to right.
    whole : float
        What the full width stands for.
    height : int
        In pixels.
    """
    body, done = [], 0
    for part in parts:
        if part.amount and whole:
            x, width = 100 * done / whole, 100 * part.amount / whole
            body.append(
                f'<rect class="bar-{_slot(part.slot)}" x="{x:.3f}%" width="{width:.3f}%" '
                f'height="{height}"/>'
            )
            done += part.amount
    return drawing(body, height, "shares")


def counts_bar(ones: int, zeros: int, most: int) -> Markup:
    """Ones, filled, against zeros, hollow.

    Parameters
    ----------
    ones, zeros : int
        How many there are.
    most : int
        What the full width stands for.

    Examples
    --------
    >>> print(counts_bar(1, 2, 4))
    <svg class="counts" aria-hidden="true"><rect width="75%"/><rect class="ones" width="25%"/></svg>
    """
    # Hundreds of these can be on a page: sizes that all share stand in the style sheet.
    all_, filled = (f"{100 * part / max(most, 1):.4g}%" for part in (zeros + ones, ones))
    body = f'<rect width="{all_}"/>' if ones + zeros else ""
    if ones:
        body += f'<rect class="ones" width="{filled}"/>'
    return Markup(f'<svg class="counts" aria-hidden="true">{body}</svg>')  # noqa: S704 - numbers


def quantile_bar(quantiles: Sequence[float], scale: Scale) -> Markup:
    """Five quantiles: a thin line over the middle 80 %, a thick one over the middle half, a dot.

    Parameters
    ----------
    quantiles : sequence of five float
        In ascending order.
    scale : Scale
        The axis that all readers share.
    """
    outer, inner, middle = (quantiles[0], quantiles[4]), (quantiles[1], quantiles[3]), quantiles[2]
    body = [
        f'<line class="{kind}" x1="{scale.across(a)}" x2="{scale.across(b)}" y1="8" y2="8"/>'
        for kind, (a, b) in (("whisker", outer), ("box", inner))
    ]
    body.append(f'<circle class="median-dot" cx="{scale.across(middle)}" cy="8" r="3"/>')
    return drawing(body, 16, "quantiles", width="110")


def estimate_row(estimates: Sequence[Estimate | None], scale: Scale) -> Markup:
    """Rates with their intervals, one above the other.

    Parameters
    ----------
    estimates : sequence of Estimate
        One a level; None where there is no value.
    scale : Scale
        The axis of the outcome.
    """
    gap = 12
    height = gap * max(1, len(estimates)) + 6
    body = _grid(scale, height)
    for row, one in enumerate(estimates):
        if one is None:
            continue
        y = 3 + gap / 2 + gap * row
        kind = one.shape % SHAPES
        body.append(
            f'<line class="interval line-{kind}" x1="{scale.across(one.low)}" '
            f'x2="{scale.across(one.high)}" y1="{y:g}" y2="{y:g}"/>'
        )
        body.append(_use(one.shape, scale.across(one.rate), y))
    return drawing(body, height, "estimates")


def axis(scale: Scale, unit: str) -> Markup:
    """The numbers under drawings that share an axis."""
    return drawing(numbers(scale, unit, 12), 16, "axis")


def _grid(scale: Scale, height: float) -> list[str]:
    """Faint lines at the round values."""
    return [
        f'<line class="grid" x1="{x}" x2="{x}" y1="0" y2="{height:g}"/>'
        for x in map(scale.across, scale.ticks)
    ]


def numbers(scale: Scale, unit: str, y: float) -> list[str]:
    """The round values in figures; the last one bears the unit.

    Parameters
    ----------
    scale : Scale
        The axis.
    unit : str
        The unit.
    y : float
        The base line of the figures, in pixels.
    """
    body = []
    for tick in scale.ticks:
        share = scale.share(tick)
        end = "start" if share < 0.03 else "end" if share > 0.97 else "middle"
        text = f"{tick:,.10g}".replace("-", "−") + (unit if tick == scale.ticks[-1] else "")
        body.append(
            f'<text class="tick" x="{scale.across(tick)}" y="{y:g}" text-anchor="{end}">'
            f"{text}</text>"
        )
    return body
