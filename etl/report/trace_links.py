"""Saccades in the picture of a trial: thin lines, and rails with an arrowhead for regressions."""

from __future__ import annotations

import math
from typing import Final

from etl.report.trace_input import Regression, TracedTrial
from etl.report.trace_markup import number, tag, text, wrapped
from etl.report.trace_places import Bar, Places

_TO_THE_BAR: Final = 6.0
_HEAD_LENGTH: Final = 12.0
_HEAD_HALF: Final = 6.5


def links(traced: TracedTrial, places: Places) -> str:
    """All saccades between kept fixations; where none is kept, between all."""
    bars = {bar.fixation.number: bar for bar in places.bars}
    path = [bar for bar in places.bars if bar.fixation.kept] or list(places.bars)
    back = {(r.launch, r.landing) for r in traced.regressions}
    parts = [
        _saccade(before, after)
        for before, after in zip(path, path[1:], strict=False)
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


def _regression(
    traced: TracedTrial, place: int, regression: Regression, ends: tuple[Bar, Bar]
) -> str:
    """A regressive saccade: two rails, an arrowhead at the landing, a name."""
    launch, landing = ends
    x1, y1, x2, y2 = launch.x, launch.bottom, landing.x, landing.top
    length = math.hypot(x2 - x1, y2 - y1)
    # Two regions may meet in one place of the picture (on two lines); then the arrow points down.
    dx, dy = ((x2 - x1) / length, (y2 - y1) / length) if length else (0.0, 1.0)
    tip_x, tip_y = x2 - dx * _TO_THE_BAR, y2 - dy * _TO_THE_BAR
    base_x, base_y = tip_x - dx * _HEAD_LENGTH, tip_y - dy * _HEAD_LENGTH
    corner = (dy * _HEAD_HALF, -dx * _HEAD_HALF)
    head = (
        f"M{number(tip_x)} {number(tip_y)} "
        f"L{number(base_x + corner[0])} {number(base_y + corner[1])} "
        f"L{number(base_x - corner[0])} {number(base_y - corner[1])} Z"
    )
    rail = f"M{number(x1)} {number(y1)} L{number(base_x)} {number(base_y)}"
    badge_x, badge_y = (x1 + x2) / 2, (y1 + y2) / 2
    name = f"R{place}"
    half = 5 + 3.6 * len(name)
    fixations = {fixation.number: fixation for fixation in traced.fixations}
    source = traced.region(fixations[regression.launch].region_order)
    target = traced.region(fixations[regression.landing].region_order)
    ends_pass = ", ends the first pass" if regression.ends_first_pass else ""
    hint = (
        f"regression {name}: from {source} (fixation {regression.launch}) back to {target} "
        f"(fixation {regression.landing}){ends_pass}"
    )
    box = {
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
