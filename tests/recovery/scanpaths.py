"""Scanpaths that have given outcomes on the critical region, and are random in all else."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tests.simulator.draws import chance, normal, pick, uniform, whole
from tests.simulator.layout import Layout

SCREEN_PX = (1920, 1080)
#: The verb is the fourth of six regions.
REGIONS, CRITICAL = 6, 4
#: The limits that the study sets.
SHORTEST_MS, LONGEST_MS, MERGE_WITHIN_PX = 80, 800, 14
#: So long that a fixation stays below the longest one with a short neighbour merged on either side.
LONGEST_KEPT_MS = LONGEST_MS - 2 * (SHORTEST_MS - 1)
#: Probability that something else happens between two fixations.
DISTURBED = 0.12
#: All but "outside" is what screening takes away; a fixation outside regions is to be ignored.
DISTURBANCES = ("short", "near", "long", "blink", "off_screen", "outside")


@dataclass(frozen=True, slots=True)
class Look:
    """A fixation: where it was (px from the top left), how long, and whether a blink touched it."""

    x_px: float
    y_px: float
    duration_ms: int
    blink: bool = False


@dataclass(frozen=True, slots=True)
class Scanpath:
    """The fixations of a trial; the first may come before the text, the last after it."""

    looks: tuple[Look, ...]
    before_text: bool
    after_text: bool


def region_path(outcomes: Mapping[str, int | str], rng: np.random.Generator) -> list[int]:
    """The orders of the regions fixated, one after the other, in a trial with these outcomes.

    Parameters
    ----------
    outcomes : mapping of str to int or str
        ``first_pass_skip``, ``first_pass_regression_out`` and ``reread`` of the critical region:
        0, 1, or the reason why they are undefined.
    rng : numpy.random.Generator
        Decides everything else.

    Returns
    -------
    list of int
        At least one order.
    """
    path = wander(rng, 1 if chance(rng, 0.9) else 2, whole(rng, 1, 7), range(1, CRITICAL))
    skip, regression, reread = (
        outcomes[name] for name in ("first_pass_skip", "first_pass_regression_out", "reread")
    )
    if skip == "not_reached":
        return path
    later, others = range(CRITICAL + 1, REGIONS + 1), [*range(1, CRITICAL)]
    if skip:
        # Whatever follows, even on the critical region, is no first pass on it.
        return path + wander(rng, pick(rng, later), whole(rng, 1, 9), range(1, REGIONS + 1))
    path += visit(rng)
    if not regression and not reread and chance(rng, 0.1):
        return path
    landing = pick(rng, others if regression else later)
    rest = wander(rng, landing, whole(rng, 1, 8), [*others, *later])
    if reread:
        for _ in range(whole(rng, 1, 2)):
            again = whole(rng, 1, len(rest))
            rest[again:again] = visit(rng)
    return path + rest


def visit(rng: np.random.Generator) -> list[int]:
    """One or more fixations on the critical region."""
    count = 1
    while count < 4 and chance(rng, 0.25):
        count += 1
    return [CRITICAL] * count


def wander(rng: np.random.Generator, first: int, length: int, allowed: Sequence[int]) -> list[int]:
    """From a region on, mostly forwards, with refixations, skips and regressions."""
    path = [first]
    while len(path) < length:
        step = pick(rng, (1, 1, 1, 0, 0, 2, -1, -1, -2, 3))
        wanted = path[-1] + step
        path.append(wanted if wanted in allowed else pick(rng, allowed))
    return path


def scanpath(
    outcomes: Mapping[str, int | str], layout: Layout, rng: np.random.Generator
) -> Scanpath:
    """Fixations with places and durations that, after screening, have these outcomes.

    Parameters
    ----------
    outcomes : mapping of str to int or str
        As for :func:`region_path`.
    layout : Layout
        Where the words stand.
    rng : numpy.random.Generator
        Decides everything else.

    Returns
    -------
    Scanpath
        What screening is to remove lies anywhere: had it stayed, it would often change outcomes.
    """
    looks: list[Look] = []
    for order in region_path(outcomes, rng):
        # Never two disturbances in a row: short fixations could be merged into one that counts.
        if looks and chance(rng, DISTURBED):
            looks.append(disturbance(pick(rng, DISTURBANCES), looks[-1], layout, rng))
        looks.append(Look(*place_in(layout, order, rng), sound_duration_ms(rng)))
    before, after = chance(rng, 0.1), chance(rng, 0.1)
    anywhere = [Look(*place_in(layout, whole(rng, 1, REGIONS), rng), 200) for _ in range(2)]
    if before:
        looks.insert(0, anywhere[0])
    if after:
        looks.append(anywhere[1])
    return Scanpath(tuple(looks), before, after)


def disturbance(kind: str, previous: Look, layout: Layout, rng: np.random.Generator) -> Look:
    """A fixation that leaves the outcomes as they are: screened out, merged or in no region."""
    width, height = SCREEN_PX
    place = place_in(layout, whole(rng, 1, REGIONS), rng)
    if kind == "short":
        return Look(*place, whole(rng, 20, SHORTEST_MS - 1))
    if kind == "near":
        # Near enough to be merged into the fixation before it, also from the next region.
        away = tenths(uniform(rng, -0.7, 0.7) * MERGE_WITHIN_PX)
        beside = round(previous.x_px + away, 1), previous.y_px
        return Look(*beside, whole(rng, 20, SHORTEST_MS - 1))
    if kind == "long":
        return Look(*place, whole(rng, LONGEST_MS + 1, 2 * LONGEST_MS))
    if kind == "blink":
        return Look(*place, sound_duration_ms(rng), blink=True)
    if kind == "off_screen":
        beyond = tenths(uniform(rng, 1.0, 200.0))
        y_px = tenths(uniform(rng, 100.0, height - 100.0))
        x_px = pick(rng, (-beyond, width + beyond))
        return Look(x_px, y_px, sound_duration_ms(rng))
    above, below = layout.grid.top_px, layout.grid.top_px + layout.grid.line_height_px
    beyond_text = layout.words[-1].left_px + 1.0, layout.line_centre_px(1)
    outside = [(place[0], above - 0.1), (place[0], float(below)), beyond_text]
    return Look(*pick(rng, outside), sound_duration_ms(rng))


def sound_duration_ms(rng: np.random.Generator) -> int:
    """A duration that no rule minds, skewed to the right; now and then just at a limit."""
    drawn = round(float(np.exp(normal(rng, 5.3, 0.4))))
    return min(max(drawn, SHORTEST_MS), LONGEST_KEPT_MS)


def place_in(layout: Layout, order: int, rng: np.random.Generator) -> tuple[float, float]:
    """A point in the box of a region, in tenths of a pixel; left and upper edges belong to it."""
    words = [word for word in layout.words if word.region_order == order]
    x_px = tenths(uniform(rng, words[0].left_px, words[-1].right_px))
    top = layout.grid.top_px
    return x_px, tenths(uniform(rng, top, top + layout.grid.line_height_px))


def tenths(number: float) -> float:
    """The number rounded down to tenths, so that it stays on its side of a whole number above.

    Examples
    --------
    >>> tenths(299.99), tenths(300.0), tenths(-0.01)
    (299.9, 300.0, -0.1)
    """
    return float(np.floor(number * 10.0)) / 10.0
