"""One assignment from those of all methods, with how far it can be trusted.

What it is
----------
A hidden Markov model of reading (``consensus_reading``) over lines that have drifted
(``consensus_drift``), fitted by expectation and maximisation. Such a fit ends where it began, more
or less; it is begun once from the assignment of *every* published method. So each method proposes,
and counts by how likely the trial is with the lines its proposal leads to: one that breaks the
order of reading or leaves fixations far from lines counts less, by what it takes to explain that.
The best of them moved by one line up or down are proposals too: they tell how far a whole line more
or less could be told. Chances of the lines are averaged over all distinct ends, weighted by
evidence.

Where the ideas are from
------------------------
Carr et al. (2022), doi:10.3758/s13428-021-01554-0: the methods; offset, slope and stretch as forms
of drift; that order and position tell about lines in different ways. Hidden Markov models with
forward and backward passes, and mixtures with a broad part for outliers, are common practice. The
combination, its constants and the calibration of confidence (``consensus_confidence``) are ours;
they were chosen on simulated trials and by judgement. What real, corrected trials were looked at
for is what people leave out by hand, and how heights scatter: wider than normally, and alike for
neighbouring fixations.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.lines.consensus_confidence import Signs, confidence_of_fixations, confidence_of_trial
from etl.lines.consensus_drift import (
    OFF_TEXT_AT,
    SCATTER_BEGIN,
    Fit,
    Problem,
    heights_off,
    problem_of,
    step,
    without_outliers,
)
from etl.lines.consensus_reading import Floats, course_of
from etl.lines.methods import METHODS
from etl.lines.passage import Lines, Passage, Positions
from etl.lines.settings import MethodSettings

#: Why a fixation belongs to no line, by code; the names go with the ledger.
REASONS: Final = ("", "off_text", "mid_sweep", "arrival", "stray")
OFF_TEXT, MID_SWEEP, ARRIVAL, STRAY = 1, 2, 3, 4
#: Certainly off the text: further than this above the first or below the last line, as they
#: drifted, in distances between lines; what is nearer may be off the text if it is likelier so.
FURTHEST_OFF_LINES: Final = 1.5

#: A trial is sure from this confidence on.
SURE: Final = 0.95

#: Steps before the best are picked, and after; lines drift by themselves from the third on.
STEPS_AT_FIRST, STEPS_THEN, STEPS_ROUGH = 4, 8, 2
#: How many distinct fits go on, besides the best one moved by a line.
GO_ON: Final = 5
#: What a proposal leaves to all lines alike.
LEFT_OPEN: Final = 0.0
#: Fits that differ by less than this, as the mean of summed differences of chances, are one.
SAME_FIT: Final = 0.01


@dataclass(frozen=True, slots=True, eq=False)
class LineAssignment:
    """The lines of a trial's fixations.

    Attributes
    ----------
    line : (n,) int32 array
        The line of each fixation, from 1 (top); 0 where it belongs to none.
    reason : (n,) int8 array
        Why a fixation belongs to no line: an index into ``REASONS``; 0 where it has a line.
    confidence : (n,) float64 array
        Chance that the line, or the 0, is right; calibrated on simulated trials.
    trial_confidence : float
        Chance that at least 97 % of the trial's fixations are right, calibrated likewise; 1.0
        without fixations.
    sure : bool
        Whether ``trial_confidence`` is at least ``SURE``.
    """

    line: Lines
    reason: NDArray[np.int8]
    confidence: Floats
    trial_confidence: float
    sure: bool


@dataclass(frozen=True, slots=True, eq=False)
class Pooled:
    """What the fits come to; d distinct ones, from the best to the worst.

    Attributes
    ----------
    proposed : (k, n) int32 array
        The lines of each method, from 0.
    problem : Problem
        The trial as it was fitted.
    fits : Fit
        The distinct fits.
    weights : (d,) float64 array
        What each counts; together 1.
    chances : (n, m + 1) float64 array
        Chance of none, then of each line.
    """

    proposed: Lines
    problem: Problem
    fits: Fit
    weights: Floats
    chances: Floats


def assign_by_consensus(
    x_px: Positions,
    y_px: Positions,
    duration_ms: Positions,
    passage: Passage,
    settings: MethodSettings | None = None,
) -> LineAssignment:
    """Which line each fixation belongs to, by all methods together, and how sure that is.

    Parameters
    ----------
    x_px, y_px : (n,) float64 array
        Fixations in time order. For a text read from right to left give ``-x_px`` and the mirrored
        passage.
    duration_ms : (n,) float64 array
        Their durations; NaN where one is not known.
    passage : Passage
        The lines and words of the text.
    settings : MethodSettings, optional
        Of the methods; the published ones if absent.

    Returns
    -------
    LineAssignment
        Lines from 1, 0 for fixations on no line.

    Raises
    ------
    FaultError
        If the arrays are not as long as each other, or a position is not finite.

    Notes
    -----
    Deterministic. Lengths count in distances between lines and widths of the text, but for the
    methods whose published settings are in px. Where a trial could as well be read one line higher
    or lower (all of it is off by a line, or only some lines were read), the likelier is given, and
    the trial is not sure.

    References
    ----------
    Carr, Pescuma, Furlan, Ktori & Crepaldi (2022). Algorithms for the automated correction of
    vertical drift in eye-tracking data. Behavior Research Methods, 54, 287-310.
    doi:10.3758/s13428-021-01554-0. The module says what is ours.

    Examples
    --------
    Two lines, recorded a little too low; the second begins with a sweep to the left:

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 250.0, 50.0, 250.0]),
    ...                   np.array([0, 0, 1, 1], np.int32), 60.0, 400.0)
    >>> x_px = np.array([40.0, 150.0, 255.0, 45.0, 160.0, 250.0])
    >>> y_px = np.array([112.0, 110.0, 113.0, 172.0, 171.0, 175.0])
    >>> assign_by_consensus(x_px, y_px, np.full(6, 200.0), passage).line.tolist()
    [1, 1, 1, 2, 2, 2]
    """
    x_px, y_px = np.asarray(x_px, dtype=np.float64), np.asarray(y_px, dtype=np.float64)
    duration_ms = np.asarray(duration_ms, dtype=np.float64)
    if not x_px.shape == y_px.shape == duration_ms.shape or x_px.ndim != 1:
        raise FaultError("fixations: x_px, y_px and duration_ms must be as long as each other")
    if not (np.isfinite(x_px).all() and np.isfinite(y_px).all()):
        raise FaultError("fixations: positions must be finite")
    if not x_px.size:
        none = np.zeros(0)
        return LineAssignment(none.astype(np.int32), none.astype(np.int8), none, 1.0, sure=True)
    pooled = pool(x_px, y_px, duration_ms, passage, settings or MethodSettings())
    line, reason = lines_of(pooled)
    signs = signs_of(pooled, line)
    trial, confidence = confidence_of_trial(signs), confidence_of_fixations(signs)
    return LineAssignment(line, reason, confidence, trial, sure=trial >= SURE)


def pool(
    x_px: Positions,
    y_px: Positions,
    duration_ms: Positions,
    passage: Passage,
    settings: MethodSettings,
) -> Pooled:
    """Fit from every proposal and average the distinct ends.

    Parameters
    ----------
    x_px, y_px : (n,) float64 array
        Fixations in time order, at least one, finite.
    duration_ms : (n,) float64 array
        Their durations; NaN where one is not known.
    passage : Passage
        The text.
    settings : MethodSettings
        Of the methods.

    Returns
    -------
    Pooled
        Fits, their weights, and chances of the lines.
    """
    count = passage.line_y_px.size
    proposed = np.stack([method(x_px, y_px, passage, settings) for method in METHODS.values()])
    problem = problem_of(x_px, y_px, passage, course_of(x_px, duration_ms, passage))
    share = _shares(problem, np.unique(proposed, axis=0))
    fits = _fitted(problem, share, np.full(len(share), SCATTER_BEGIN), STEPS_AT_FIRST, STEPS_ROUGH)
    fits = fits.of(_distinct(fits)[:GO_ON])
    best = fits.chances[0, :, 1:].argmax(1)
    moved = np.stack([np.maximum(best - 1, 0), np.minimum(best + 1, count - 1)])
    share = np.concatenate([fits.share, _shares(problem, moved)])
    scatter = np.concatenate([fits.scatter, np.full(len(moved), SCATTER_BEGIN)])
    fits = _fitted(problem, share, scatter, STEPS_THEN, STEPS_ROUGH)
    fits = fits.of(_distinct(fits))
    weights = np.exp(fits.evidence - fits.evidence[0])
    weights /= weights.sum()
    return Pooled(proposed, problem, fits, weights, np.tensordot(weights, fits.chances, 1))


def _shares(problem: Problem, lines: Lines) -> Floats:
    """Proposed lines as shares: all for the line proposed, but less where that is far off."""
    shares: Floats = np.eye(problem.height.shape[1])[lines]
    return without_outliers(problem, shares)


def _fitted(problem: Problem, share: Floats, scatter: Floats, steps: int, rough: int) -> Fit:
    """Some steps of the fit; the first ones without lines drifting by themselves."""
    fit = step(problem, share, scatter, by_line=rough == 0)
    for done in range(1, steps):
        fit = step(problem, fit.share, fit.scatter, by_line=done >= rough)
    return fit


def _distinct(fits: Fit) -> list[int]:
    """The fits that differ from every better one, from the best to the worst."""
    kept: list[int] = []
    for one in np.argsort(-fits.evidence, kind="stable").tolist():
        apart = np.abs(fits.chances[kept] - fits.chances[one]).sum(2).mean(1)
        if (apart > SAME_FIT).all():
            kept.append(one)
    return kept


def lines_of(pooled: Pooled) -> tuple[Lines, NDArray[np.int8]]:
    """The likeliest line of each fixation, 0 for those on none, with the reason.

    Parameters
    ----------
    pooled : Pooled
        Chances of the lines.

    Returns
    -------
    line : (n,) int32 array
        From 1; 0 for none.
    reason : (n,) int8 array
        An index into ``REASONS``.

    Notes
    -----
    On no line is what lies far off the text; what lies in the middle of a return sweep; and what
    is likelier on none than on any: an arrival where it is one of the first few and apart from
    its neighbours, else a stray.
    """
    course, count = pooled.problem.course, pooled.chances.shape[1] - 1
    line = pooled.chances[:, 1:].argmax(1) + 1
    reason = np.where(pooled.chances[:, 0] > 0.5, STRAY, 0)
    reason[(reason == STRAY) & course.lone_early] = ARRIVAL
    swept = course.mid_sweep.copy()
    swept[1:-1] &= line[:-2] < line[2:]
    reason[swept] = MID_SWEEP
    off = heights_off(pooled.problem, pooled.fits, 0)[np.arange(line.size), line - 1]
    beyond = np.abs(off) * np.where(line == 1, off < 0, (line == count) & (off > 0))
    reason[(reason == STRAY) & (beyond > OFF_TEXT_AT)] = OFF_TEXT
    reason[(beyond > FURTHEST_OFF_LINES) | pooled.problem.beside] = OFF_TEXT
    return np.where(reason, 0, line).astype(np.int32), reason.astype(np.int8)


def signs_of(pooled: Pooled, line: Lines) -> Signs:
    """What may tell whether an assignment is right."""
    off = heights_off(pooled.problem, pooled.fits, 0)
    own = off[np.arange(line.size), np.maximum(line - 1, 0)]
    labels = pooled.fits.chances.argmax(2)
    return Signs(
        line=line,
        chances=pooled.chances,
        off=np.where(line > 0, own, 0.0),
        scatter=float(pooled.fits.scatter[0]),
        evidence=pooled.fits.evidence,
        differing=(labels != labels[0]).mean(1),
        agreeing=pooled.proposed + 1 == line,
    )
