"""Saccades in the picture of a trial: thin lines, and rails with an arrowhead for regressions."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import Final

from etl.report.trace_input import Regression, TracedTrial
from etl.report.trace_markup import number, tag, text, wrapped
from etl.report.trace_places import Bar, Places

_HALF_BAR: Final = 6.0
_HEAD_LENGTH: Final = 12.0
_HEAD_HALF: Final = 6.5
#: From so many px down on, a regression crosses a line of text; where its name stands then.
_OTHER_LINE: Final = 60.0
_BEFORE_LINE: Final = 15.0
#: Rails at each side of the name, at least.
_SHORT: Final = 40.0


def links(traced: TracedTrial, places: Places) -> str:
    """All saccades between kept fixations; where none is kept, between all."""
    bars = {bar.fixation.number: bar for bar in places.bars}
    path = [bar for bar in places.bars if bar.fixation.kept] or list(places.bars)
    back = {(r.launch, r.landing) for r in traced.regressions}
    parts = [
        _saccade(before, after)
        for before, after in pairwise(path)
        if (before.fixation.number, after.fixation.number) not in back
    ]
    parts += [
        _regression(traced, place, regression, (bars[regression.launch], bars[regression.landing]))
        for place, regression in enumerate(traced.regressions, start=1)
    ]
    return wrapped("g", {"class": "saccades"}, parts)


def _saccade(before: Bar, after: Bar) -> str:
    """A saccade that is no regression."""
    d = f"M{number(before.x)} {number(before.bottom)} L{number(after.x)} {number(after.top)}"
    return tag("path", {"class": "saccade", "d": d})


def _badge_at(
    start: tuple[float, float], end: tuple[float, float], half: float
) -> tuple[float, float]:
    """Where a regression's name stands: on its way, but never over the arrowhead or a line."""
    (x1, y1), (x2, y2) = start, end
    if y2 - y1 > _OTHER_LINE:
        # The line that is landed on stands between; the name goes before it.
        share = _BEFORE_LINE / (y2 - y1)
        return x1 + (x2 - x1) * share, y1 + _BEFORE_LINE
    if abs(x2 - x1) < 2 * half + _SHORT:
        return x1 + (half + _HALF_BAR + 2) * (1 if x2 <= x1 else -1), y1 + 2
    return (x1 + x2) / 2, (y1 + y2) / 2


def _regression(
    traced: TracedTrial, place: int, regression: Regression, ends: tuple[Bar, Bar]
) -> str:
    """A regressive saccade: two rails, an arrowhead at the landing, a name."""
    launch, landing = ends
    x1, y1, x2, y2 = launch.x, launch.bottom, landing.x, landing.top
    length = math.hypot(x2 - x1, y2 - y1)
    # Two regions may meet in one place of the picture (on two lines); then the arrow points down.
    dx, dy = ((x2 - x1) / length, (y2 - y1) / length) if length else (0.0, 1.0)
    gap = 1 + _HALF_BAR * abs(dx)
    tip_x, tip_y = x2 - dx * gap, y2 - dy * gap
    base_x, base_y = tip_x - dx * _HEAD_LENGTH, tip_y - dy * _HEAD_LENGTH
    corner = (dy * _HEAD_HALF, -dx * _HEAD_HALF)
    head = (
        f"M{number(tip_x)} {number(tip_y)} "
        f"L{number(base_x + corner[0])} {number(base_y + corner[1])} "
        f"L{number(base_x - corner[0])} {number(base_y - corner[1])} Z"
    )
    rail = f"M{number(x1)} {number(y1)} L{number(base_x)} {number(base_y)}"
    name = f"R{place}"
    half = 5 + 3.6 * len(name)
    badge_x, badge_y = _badge_at((x1, y1), (x2, y2), half)
    fixations = {fixation.number: fixation for fixation in traced.fixations}
    source = traced.region(fixations[regression.launch].region_order)
    target = traced.region(fixations[regression.landing].region_order)
    ends_pass = ", ends the first pass" if regression.ends_first_pass else ""
    hint = (
        f"regression {name}: from {source} (fixation {regression.launch}) back to {target} "
        f"(fixation {regression.landing}){ends_pass}"
    )
    box: dict[str, str | float] = {
        "class": "badge",
        "x": badge_x - half,
        "y": badge_y - 8,
        "width": 2 * half,
        "height": 16.0,
        "rx": 8.0,
    }
    return wrapped(
        "g",
        {
            "class": "regression",
            "data-launch": str(regression.launch),
            "data-landing": str(regression.landing),
        },
        [
            wrapped("title", {}, [text(hint)]),
            tag("path", {"class": "rail", "d": rail}),
            tag("path", {"class": "between-rails", "d": rail}),
            tag("path", {"class": "arrowhead", "d": head}),
            tag("rect", box),
            wrapped(
                "text", {"class": "badge-text middle", "x": badge_x, "y": badge_y + 4}, [text(name)]
            ),
        ],
    )
