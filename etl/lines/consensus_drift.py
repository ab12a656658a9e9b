"""How recorded heights drift from the lines of a text, fitted together with the lines.

One step of expectation and maximisation for several models at once: given how far each fixation
belongs to each line, the drift is fitted; given the drift, the chances of the lines are found anew.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from etl.lines.consensus_reading import (
    AWAY_AGAIN,
    Course,
    Flags,
    Floats,
    forward_backward,
    logistic,
    reach_of_lines,
)
from etl.lines.passage import Passage, Positions

#: How large drifts are expected to be, as standard deviations of normal distributions about 0.
#: Slope and stretch are of the ranges that Carr et al. (2022) simulate (-0.1 to 0.1 px per px,
#: -0.2 to 0.2), the others are judgements. Heights are in distances between lines.
OFFSET_SD: Final = 0.35
SLOPE_SD: Final = 0.06  # px per px
STRETCH_SD: Final = 0.12  # of the distance from the middle of the text
ARC_SD: Final = 0.08  # of a bow over the width
LINE_SD: Final = 0.08  # of each line by itself

#: Scatter about a line: what is expected before any fixation is seen, as how many fixations that
#: counts, the least and the most that is allowed (40 px of 64 are 0.63), and where fitting begins.
SCATTER, SCATTER_WEIGHT = 0.12, 5.0
SCATTER_LEAST, SCATTER_MOST, SCATTER_BEGIN = 0.06, 0.7, 0.15
#: Further off than this is not scatter, and counts as this. At first: at this distance a fixation
#: counts half, and how often that is done.
NEAR: Final = 1.0
OUTLYING, REWEIGHTED = 0.5, 3
#: A tenth of the fixations scatter twice as far; a few more lie anywhere and still belong.
WIDE, WIDER, ANYWHERE = 0.1, 2.0, 0.002
#: Neighbouring fixations are off alike, by this correlation; beyond this many standard deviations
#: being further off says no more.
ALIKE, FURTHEST = 0.2, 4.0
#: A fixation past the ends of a line: free for one line height, then less likely, normally with
#: this standard deviation in line heights, never below this factor.
PAST_END_FREE, PAST_END_SD, PAST_END_LEAST = 1.0, 1.5, 0.01

#: Off the text, further than this above the first or below the last line, and how softly that
#: begins, in line heights; or this share of the width beside all words. Looks off the text (at a
#: question, at the clock) land close to it and go on: how likely each place there is, for one line
#: height, and how likely the next fixation is off the text as well.
OFF_TEXT_AT, OFF_TEXT_SOFT, BESIDE_SHARE = 1.3, 0.1, 0.15
OFF_TEXT_DENSITY, OFF_TEXT_AGAIN = 0.5, 0.9

#: Offset, slope, stretch and arc.
TERMS: Final = 4


@dataclass(frozen=True, slots=True, eq=False)
class Problem:
    """What stays the same in all steps; n fixations, m lines, heights in distances between lines.

    Attributes
    ----------
    height : (n, m) float64 array
        Each fixation's distance from each line, downwards.
    terms : (n, m, 4) float64 array
        What offset, slope, stretch and arc are multiplied with.
    products : (nm, 16) float64 array
        Products of the terms with each other.
    moments : (nm, 4) float64 array
        Products of the terms with the height.
    precision : (4, 4) float64 array
        One over the square of what is expected of each term, on the diagonal.
    reach : (n, m) float64 array
        A factor below 1 where a line does not reach to the fixation.
    beside : (n,) bool array
        Whether a fixation is far beside all words.
    elsewhere : float
        How likely any height is for a fixation on no line: the same over the text and a line more
        above and below.
    course : Course
        What the saccades say.
    """

    height: Floats
    terms: Floats
    products: Floats
    moments: Floats
    precision: Floats
    reach: Floats
    beside: Flags
    elsewhere: float
    course: Course


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """Models of one trial after a step; s models.

    Attributes
    ----------
    share : (s, n, m) float64 array
        How far each fixation counts for each line in the next fit.
    scatter : (s,) float64 array
        Standard deviation about the lines, in distances between lines.
    drift : (s, 4) float64 array
        Offset, slope over the width, stretch, arc.
    line_offset : (s, m) float64 array
        What each line is off by itself.
    chances : (s, n, m + 1) float64 array
        Chance of each line; first that of none.
    evidence : (s,) float64 array
        Log likelihood of the trial with what is expected of the drift; up to a constant.
    """

    share: Floats
    scatter: Floats
    drift: Floats
    line_offset: Floats
    chances: Floats
    evidence: Floats

    def of(self, which: list[int]) -> Fit:
        """Some of the models."""
        return Fit(
            self.share[which],
            self.scatter[which],
            self.drift[which],
            self.line_offset[which],
            self.chances[which],
            self.evidence[which],
        )


def problem_of(x_px: Positions, y_px: Positions, passage: Passage, course: Course) -> Problem:
    """All that does not change from step to step."""
    lines, between = passage.line_y_px, passage.line_height_px
    shape = (x_px.size, lines.size)
    across = ((x_px - passage.begin_x_px) / passage.width_px - 0.5)[:, None]
    # Far beside the text a bow would rise without bound.
    arc = np.clip(4 * across * across - 1 / 3, -1, 2)
    down = (lines - lines.mean()) / between
    parts = (np.ones(1), across, down, arc)
    terms = np.stack([np.broadcast_to(part, shape) for part in parts], axis=-1)
    flat = terms.reshape(-1, TERMS)
    height = (y_px[:, None] - lines) / between
    slope_sd = SLOPE_SD * passage.width_px / between
    first, last = reach_of_lines(passage)
    past = np.maximum(np.maximum(first - x_px[:, None], x_px[:, None] - last), 0) / between
    less = np.exp(-0.5 * (np.maximum(past - PAST_END_FREE, 0) / PAST_END_SD) ** 2)
    return Problem(
        height=height,
        terms=terms,
        products=(flat[:, :, None] * flat[:, None, :]).reshape(-1, TERMS * TERMS),
        moments=flat * height.reshape(-1, 1),
        precision=np.diag(np.array([OFFSET_SD, slope_sd, STRETCH_SD, ARC_SD]) ** -2),
        reach=np.maximum(less, PAST_END_LEAST),
        beside=past.min(axis=1) * between > BESIDE_SHARE * passage.width_px,
        elsewhere=1 / (lines.size + 2),
        course=course,
    )


def without_outliers(problem: Problem, share: Floats) -> Floats:
    """Shares of proposed lines, less for what lies far from them however they drifted.

    Parameters
    ----------
    problem : Problem
        The trial.
    share : (s, n, m) float64 array
        1 for the line proposed.

    Returns
    -------
    (s, n, m) float64 array
        The same times a weight; fits by least squares would be drawn to a few fixations far off.

    References
    ----------
    Iteratively reweighted least squares with weights of the Cauchy distribution: Holland & Welsch
    (1977). Communications in Statistics - Theory and Methods, 6(9), 813-827,
    doi:10.1080/03610927708827533 (cited from memory).
    """
    scatter, weighed = np.full(len(share), SCATTER_BEGIN), share
    for _ in range(REWEIGHTED):
        drift = _fitted_drift(problem, weighed, scatter)
        off = problem.height - np.tensordot(drift, problem.terms, (1, 2))
        weighed = share / (1 + (off / OUTLYING) ** 2)
    return weighed


def step(problem: Problem, share: Floats, scatter: Floats, *, by_line: bool) -> Fit:
    """Fit the drift to lines that are known in part, then find the lines anew.

    Parameters
    ----------
    problem : Problem
        The trial.
    share : (s, n, m) float64 array
        How far each fixation counts for each line.
    scatter : (s,) float64 array
        The standard deviation about the lines so far.
    by_line : bool
        Whether each line may be off by itself; not yet while the lines are still rough.

    Returns
    -------
    Fit
        After the step.

    Notes
    -----
    Chances of the lines take into account that neighbouring fixations are off alike; the fit of the
    drift does not, so that evidence may fall a little from one step to the next. Fixations on
    visits to other lines do not count in the fit.
    """
    drift = _fitted_drift(problem, share, scatter)
    off = problem.height - np.tensordot(drift, problem.terms, (1, 2))
    line_offset = np.zeros((share.shape[0], share.shape[2]))
    if by_line:
        pull = (scatter[:, None] / LINE_SD) ** 2
        line_offset = (share * off).sum(1) / (share.sum(1) + pull)
        off -= line_offset[:, None, :]
    near = np.clip(off, -NEAR, NEAR)
    squares = (share * near * near).sum((1, 2)) + SCATTER_WEIGHT * SCATTER**2
    spread: Floats = np.sqrt(squares / (share.sum((1, 2)) + SCATTER_WEIGHT))
    scatter = np.clip(spread, SCATTER_LEAST, SCATTER_MOST)
    expected = 0.5 * ((drift @ problem.precision) * drift).sum(1)
    expected += 0.5 * (line_offset**2).sum(1) / LINE_SD**2
    expected += 0.5 * SCATTER_WEIGHT * (2 * np.log(scatter / SCATTER) + (SCATTER / scatter) ** 2)
    share, chances, likelihood = _lines_anew(problem, off, scatter)
    return Fit(share, scatter, drift, line_offset, chances, likelihood - expected)


def _fitted_drift(problem: Problem, share: Floats, scatter: Floats) -> Floats:
    """Weighted least squares with what is expected of the drift: (s, 4)."""
    flat = share.reshape(share.shape[0], -1)
    variance = scatter[:, None] ** 2
    normal = (flat @ problem.products / variance).reshape(-1, TERMS, TERMS) + problem.precision
    right = flat @ problem.moments / variance
    solved = np.linalg.solve(normal, right[:, :, None])[:, :, 0]
    return np.asarray(solved, dtype=np.float64)


def _lines_anew(problem: Problem, off: Floats, scatter: Floats) -> tuple[Floats, Floats, Floats]:
    """Shares for the next fit, chances of lines and of none, log likelihood."""
    course, count = problem.course, off.shape[2]
    sd = scatter[:, None, None]
    squared = (off / sd) ** 2
    near = (1 - WIDE) * np.exp(-0.5 * squared) + WIDE / WIDER * np.exp(-0.5 * squared / WIDER**2)
    on_line = (1 - ANYWHERE) * problem.reach * near / (sd * np.sqrt(2 * np.pi))
    reading = on_line + ANYWHERE * problem.elsewhere * problem.reach
    visiting = course.visiting[:, None]
    nowhere = (1 - visiting) * _somewhere(problem, off)[:, :, None]
    away = visiting * (on_line @ course.visits.T) + nowhere
    emission = np.concatenate([reading, away], axis=2).swapaxes(0, 1)
    states, likelihood = forward_backward(
        np.ascontiguousarray(emission), course, _held(course, off / sd)
    )
    states = states.swapaxes(0, 1)
    gone = states[:, :, count:] / away
    visit = visiting * on_line * (gone @ course.visits)
    none = nowhere * gone.sum(2, keepdims=True)
    chances = np.concatenate([none, states[:, :, :count] + visit], axis=2)
    return states[:, :, :count] * (on_line / reading), chances, likelihood


def _somewhere(problem: Problem, off: Floats) -> Floats:
    """How likely each place is for a fixation on no line, after the one before: (s, n)."""
    beyond = np.maximum(-off[:, :, 0], off[:, :, -1])
    off_text = np.maximum(logistic((beyond - OFF_TEXT_AT) / OFF_TEXT_SOFT), problem.beside)
    again = np.ones_like(off_text)
    again[:, 1:] += (OFF_TEXT_AGAIN / AWAY_AGAIN - 1) * off_text[:, :-1]
    places: Floats = problem.elsewhere + off_text * (OFF_TEXT_DENSITY * again - problem.elsewhere)
    return places


def _held(course: Course, off: Floats) -> Floats:
    """How being off alike changes the chance of staying on a line: (n - 1, s, m)."""
    count = off.shape[2]
    bounded = np.clip(off, -FURTHEST, FURTHEST)
    before, after = bounded[:, :-1], bounded[:, 1:]
    rest = 1 - ALIKE**2
    # The normal density of the second, given the first, over its density by itself.
    gain = 0.5 * after**2 - 0.5 * (after - ALIKE * before) ** 2 / rest - 0.5 * np.log(rest)
    staying = np.diagonal(course.moves, axis1=1, axis2=2)[:, :count]
    return np.ascontiguousarray((staying * np.expm1(gain)).swapaxes(0, 1))


def heights_off(problem: Problem, fit: Fit, which: int) -> Floats:
    """How far each fixation lies below each line as it drifted, under one model: (n, m)."""
    off: Floats = problem.height - problem.terms @ fit.drift[which] - fit.line_offset[which]
    return off
