"""The curve of a comparison over all variants, drawn: values above, decisions in rows beneath.

As in the other drawings, positions across are percentages and positions down are pixels. Where
there are many variants each column of the curve stands for several that follow one another, so
that a drawing of ten thousand is no bigger than one of a hundred. Marks of many columns are one
path in a box that is stretched to the width of the page.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.charts import Scale, drawing, round_scale
from etl.variants.facts import Compared, Flags, Floats, Ints

#: Up to so many variants have a column of their own; with more there are so many columns.
MOST_SINGLE = 150
COLUMNS = 100
#: Up to so many columns are marked with dots; with more, with bars that stand close together.
MOST_DOTS = 24
PLOT_PX = 250
TOP_PX = 26
ROW_PX = 20
HEAD_PX = 24
#: Numbers from here on have too many figures to stand beneath their columns on a phone.
MOST_NUMBER = 99
#: An interval that reaches farther than so many typical widths beyond all values is cut.
_FARTHEST = 2.0


@dataclass(frozen=True, eq=False)
class Curve:
    """The variants that have a value, cut into columns.

    Attributes
    ----------
    order : (n,) int64 array
        Variants from the lowest value to the highest.
    bounds : (columns + 1,) int64 array
        Where in the order each column begins; the last is n.
    study : int
        The variant that is the study as it stands.
    base : int or None
        The column that it is in; None where it has no value.
    """

    order: Ints
    bounds: Ints
    study: int
    base: int | None

    @property
    def columns(self) -> int:
        """How many columns there are."""
        return len(self.bounds) - 1

    @property
    def single(self) -> bool:
        """Whether every variant has a column of its own."""
        return self.columns == len(self.order)

    def across(self, column: int) -> float:
        """The middle of a column, as a share of the width."""
        return (column + 0.5) / self.columns

    def each(self) -> list[Ints]:
        """The variants of each column."""
        return np.split(self.order, self.bounds[1:-1])

    @property
    def density(self) -> str:
        """How close the columns stand, a class of the style sheet."""
        if not self.single:
            return "binned"
        return "sparse" if self.columns <= MOST_DOTS else "close" if self.columns <= 60 else "dense"


def curve_of(order: Ints, difference: Floats, base: int) -> Curve:
    """Cut the variants into columns.

    Parameters
    ----------
    order : (V,) int64 array
        Variants from the lowest value to the highest, those without one at the end.
    difference : (V,) float64 array
        Their values.
    base : int
        The study as it stands.

    Returns
    -------
    Curve
        Without those that have no value.
    """
    known = order[np.isfinite(difference[order])]
    n = len(known)
    columns = n if n <= MOST_SINGLE else COLUMNS
    bounds = np.arange(columns + 1, dtype=np.int64) * n // max(columns, 1)
    found = np.flatnonzero(known == base)
    at = int(np.searchsorted(bounds, found[0], side="right")) - 1 if len(found) else None
    return Curve(known, bounds, base, at)


def scale_of(curve: Curve, compared: Compared, *, rate: bool) -> Scale:
    """The axis of a curve: it holds all values, 0 where a difference is drawn, and the intervals.

    Parameters
    ----------
    curve : Curve
        The columns.
    compared : Compared
        Values and intervals.
    rate : bool
        Whether rates are drawn, in percent.

    Returns
    -------
    Scale
        From bottom to top.
    """
    factor = 100.0 if rate else 1.0
    middle = compared.difference[curve.order] * factor
    low, high = compared.low[curve.order] * factor, compared.high[curve.order] * factor
    reach = _FARTHEST * float(np.nanmedian(high - low)) if np.isfinite(high - low).any() else 1.0
    bottom = max(np.nanmin([*low, middle.min()]), middle.min() - reach)
    top = min(np.nanmax([*high, middle.max()]), middle.max() + reach)
    if not rate:
        bottom, top = min(bottom, 0.0), max(top, 0.0)
    return round_scale(float(bottom), float(top))


def cut_off(curve: Curve, compared: Compared, scale: Scale, *, rate: bool) -> int:
    """How many intervals reach beyond the axis."""
    factor = 100.0 if rate else 1.0
    low, high = compared.low[curve.order] * factor, compared.high[curve.order] * factor
    return int(((low < scale.low) | (high > scale.high)).sum())


def leaves_out(compared: Compared) -> Flags:
    """Which variants have an interval that leaves out 0."""
    return (compared.low > 0) | (compared.high < 0)


def _down(scale: Scale, amount: float) -> float:
    """The place of a value down the drawing."""
    return TOP_PX + (1 - scale.share(amount)) * (PLOT_PX - TOP_PX - 8)


def _percent(share: float) -> str:
    """A place across."""
    return f"{100 * share:.4g}%"


def _stretched(columns: int, height: float, paths: Sequence[str]) -> str:
    """Paths in units of columns, stretched to the width."""
    return (
        f'<svg width="100%" height="{height:g}" viewBox="0 0 {columns} {height:g}" '
        f'preserveAspectRatio="none">{"".join(paths)}</svg>'
    )


def ticks(scale: Scale, *, rate: bool) -> Markup:
    """The numbers beside a curve; 0 stands out where it parts more from fewer.

    Parameters
    ----------
    scale : Scale
        The axis.
    rate : bool
        Whether the numbers are percent.

    Returns
    -------
    Markup
        A drawing.
    """
    body = []
    for tick in scale.ticks:
        zero = tick == 0 and not rate
        text = "0" if zero else f"{tick:{'' if rate else '+'},.10g}".replace("-", "−")
        body.append(
            f'<text class="tick{" nought-word" if zero else ""}" x="100%" '
            f'y="{_down(scale, tick) + 4:.1f}" text-anchor="end">{text}{"%" if rate else ""}</text>'
        )
    return drawing(body, PLOT_PX, "curve-ticks")


def plot(curve: Curve, compared: Compared, scale: Scale, *, rate: bool) -> Markup:
    """Values with their intervals, the study marked by a diamond and a line.

    Parameters
    ----------
    curve : Curve
        The columns.
    compared : Compared
        Values and intervals.
    scale : Scale
        The axis.
    rate : bool
        Whether rates are drawn.

    Returns
    -------
    Markup
        A drawing.
    """
    body = []
    for tick in scale.ticks:
        kind = "nought" if tick == 0 and not rate else "grid"
        y = f"{_down(scale, tick):.1f}"
        body.append(f'<line class="{kind}" x1="0" x2="100%" y1="{y}" y2="{y}"/>')
    body.append(_own_line(curve, TOP_PX - 8, PLOT_PX))
    factor = 100.0 if rate else 1.0
    clear = np.ones(len(compared.low), dtype=bool) if rate else leaves_out(compared)
    if curve.single:
        body += _points(curve, compared, scale, clear, factor)
    else:
        body.append(_bins(curve, compared, scale, clear, factor))
    body.append(_own_mark(curve, compared, scale, clear, factor))
    return drawing([part for part in body if part], PLOT_PX, f"curve-plot {curve.density}")


def _points(
    curve: Curve, compared: Compared, scale: Scale, clear: Flags, factor: float
) -> list[str]:
    """A point with its interval for each variant."""
    lines, points = [], []
    for column, variant in enumerate(curve.order):
        x, kind = _percent(curve.across(column)), "clear" if clear[variant] else "open"
        low, high = compared.low[variant] * factor, compared.high[variant] * factor
        if math.isfinite(low) and math.isfinite(high):
            lines.append(
                f'<line class="span {kind}" x1="{x}" x2="{x}" y1="{_down(scale, low):.1f}" '
                f'y2="{_down(scale, high):.1f}"/>'
            )
        if column != curve.base:
            y = _down(scale, compared.difference[variant] * factor)
            points.append(f'<circle class="dot {kind}" cx="{x}" cy="{y:.1f}"/>')
    return lines + points


def _bins(curve: Curve, compared: Compared, scale: Scale, clear: Flags, factor: float) -> str:
    """For each column the reach of its intervals, thin, and of its values, thick."""
    spans, mids = {True: "", False: ""}, {True: "", False: ""}
    for column, variants in enumerate(curve.each()):
        all_clear = bool(clear[variants].all())
        low = np.nanmin(compared.low[variants]) * factor
        high = np.nanmax(compared.high[variants]) * factor
        bottom, top = (
            _down(scale, end * factor)
            for end in (compared.difference[variants].min(), compared.difference[variants].max())
        )
        # Neighbouring values are mostly alike; a mark must be there all the same.
        bottom = max(bottom, top + 4)
        x = column + 0.5
        if math.isfinite(low) and math.isfinite(high):
            spans[all_clear] += f"M{x:g} {_down(scale, low):.1f}V{_down(scale, high):.1f}"
        mids[all_clear] += f"M{x - 0.4:.1f} {bottom:.1f}V{top:.1f}h.8V{bottom:.1f}z"
    paths = [
        f'<path class="{what} {"clear" if kind else "open"}" d="{d}"/>'
        for what, by in (("span", spans), ("mid", mids))
        for kind, d in by.items()
        if d
    ]
    return _stretched(curve.columns, PLOT_PX, paths)


def _own_line(curve: Curve, top: float, bottom: float) -> str:
    """The line that marks the study from the curve down through all rows."""
    if curve.base is None:
        return ""
    x = _percent(curve.across(curve.base))
    return f'<line class="own-line" x1="{x}" x2="{x}" y1="{top:g}" y2="{bottom:g}"/>'


def _own_mark(curve: Curve, compared: Compared, scale: Scale, clear: Flags, factor: float) -> str:
    """The diamond of the study, with its word; hollow where the interval includes 0."""
    if curve.base is None:
        return ""
    own = curve.across(curve.base)
    y = _down(scale, float(compared.difference[curve.study]) * factor)
    anchor = "start" if own < 0.12 else "end" if own > 0.88 else "middle"
    kind = "" if clear[curve.study] else " open"
    return (
        f'<use href="#own" class="own-mark{kind}" x="{_percent(own)}" y="{y:.1f}"/>'
        f'<text class="label" x="{_percent(own)}" y="12" text-anchor="{anchor}">the study</text>'
    )


def row(curve: Curve, takes: Flags) -> Markup:
    """Where along the curve variants take an alternative.

    Parameters
    ----------
    curve : Curve
        The columns.
    takes : (V,) bool array
        Which variants do.

    Returns
    -------
    Markup
        Dots, or bars as high as the share of a column's variants that do.
    """
    body = [_own_line(curve, 0, ROW_PX)]
    if curve.single and curve.columns <= MOST_DOTS:
        for column, variant in enumerate(curve.order):
            x, kind = _percent(curve.across(column)), "takes" if takes[variant] else "passes"
            body.append(f'<circle class="{kind}" cx="{x}" cy="{ROW_PX / 2:g}"/>')
        return drawing([part for part in body if part], ROW_PX, "curve-strip")
    path, room = "", ROW_PX - 4
    for column, variants in enumerate(curve.each()):
        share = float(takes[variants].mean())
        if share:
            top = ROW_PX - 2 - max(1.5, room * share)
            path += f"M{column + 0.12:.2f} {ROW_PX - 2}V{top:.3g}h.76V{ROW_PX - 2}z"
    base = f'<line class="grid" x1="0" x2="100%" y1="{ROW_PX - 2}" y2="{ROW_PX - 2}"/>'
    filled = _stretched(curve.columns, ROW_PX, [f'<path class="bars" d="{path}"/>'])
    return drawing([base, filled, *filter(None, body)], ROW_PX, "curve-strip")


def passing(curve: Curve) -> Markup:
    """The line of the study where it passes a heading between rows."""
    return drawing([_own_line(curve, 0, HEAD_PX)], HEAD_PX, "curve-strip")


def numbers_row(curve: Curve) -> Markup:
    """The numbers of the variants, from 1; empty where they would stand too close."""
    if not curve.single or curve.columns > MOST_DOTS or max(curve.order, default=0) >= MOST_NUMBER:
        return Markup()
    body = [
        f'<text class="tick" x="{_percent(curve.across(column))}" y="13" text-anchor="middle">'
        f"{variant + 1}</text>"
        for column, variant in enumerate(curve.order)
    ]
    return drawing(body, ROW_PX, "curve-strip")


def shares_bar(alone: float, together: float) -> Markup:
    """How much a decision decides alone, filled, and with others, hollow."""
    widths = [f"{100 * min(1.0, max(0.0, part)):.4g}%" for part in (together, alone)]
    body = [f'<rect width="{widths[0]}"/>', f'<rect class="ones" width="{widths[1]}"/>']
    return Markup(  # noqa: S704 - numbers
        f'<svg class="counts" aria-hidden="true">{"".join(body)}</svg>'
    )


def chance_bar(chance: float) -> Markup:
    """A chance from 0 to 1 as a bar; nothing where there is none."""
    if math.isnan(chance):
        return Markup()
    width = f"{100 * min(1.0, max(0.0, chance)):.4g}%"
    return Markup(  # noqa: S704 - numbers
        f'<svg class="counts" aria-hidden="true"><rect class="ones" width="{width}"/></svg>'
    )


def reach_bar(low: float, high: float, own: float, scale: Scale, *, rate: bool) -> Markup:
    """From the lowest to the highest over the variants, with the study as a diamond.

    Parameters
    ----------
    low, high, own : float
        The ends and the study's own value; NaN where there is none.
    scale : Scale
        The axis that all rows share.
    rate : bool
        Whether there is no 0 to part more from fewer.

    Returns
    -------
    Markup
        A drawing.
    """
    body = []
    if not rate:
        x = scale.across(0.0)
        body.append(f'<line class="nought" x1="{x}" x2="{x}" y1="0" y2="16"/>')
    if not math.isnan(low):
        ends = f'x1="{scale.across(low)}" x2="{scale.across(high)}"'
        body.append(f'<line class="reach" {ends} y1="8" y2="8"/>')
    if not math.isnan(own):
        body.append(f'<use href="#own-small" class="own-mark" x="{scale.across(own)}" y="8"/>')
    return drawing(body, 16, "reaches", width="130")
