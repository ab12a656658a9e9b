"""How readers move between lines: a Markov chain over lines, and its forward-backward pass.

A fixation is *reading* a line, or *away*: on a visit to another line, or on none at all. Who is
away remembers the line that was left, so that one odd fixation does not cost the reading order. The
chance of each move comes from the saccade alone; where fixations lie in height is the business of
``consensus_drift``. All lengths are shares of the width of the text or of its lines.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.lines.passage import Passage, Positions

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

#: Chances of the line after a saccade: the same, the next, the one before, or any of them. They
#: were set once, by judgement, and tried on simulated trials; no published table of them exists.
#: A return sweep: leftwards over more than a third of the line, landing in the text's left third.
AFTER_SWEEP: Final = (0.08, 0.86, 0.02, 0.04)
#: Any other saccade of less than a fifth of the width: hardly ever to another line.
AFTER_NEAR: Final = (0.985, 0.004, 0.004, 0.007)
#: Any other saccade.
AFTER_FAR: Final = (0.90, 0.025, 0.025, 0.05)

#: Where one kind of saccade passes into the other, and how softly (of a logistic function).
SWEEP_AT, SWEEP_SOFT = 0.35, 0.08
LANDING_AT, LANDING_SOFT = 0.35, 0.08
FAR_AT, FAR_SOFT = 0.2, 0.05
#: A line of less than this is taken to be this long: its sweeps would be any saccade.
SHORTEST_LINE: Final = 0.15

#: Chance that reading begins on the first line; the rest is shared by all lines.
BEGINS_FIRST: Final = 0.5
#: Chances of being away: for any fixation (1 to 2 in 100 were left out by hand in the data of Carr
#: et al. 2022), for a lone one among the first few, in mid sweep, and once more after another.
AWAY, AWAY_EARLY, AWAY_MID_SWEEP, AWAY_AGAIN = 0.015, 0.2, 0.6, 0.2
#: How many fixations of a trial are the first few.
EARLY: Final = 6
#: A fixation shorter than this is more likely away, by this factor (common practice, no source).
SHORT_MS, SHORT_FACTOR = 60.0, 3.0
#: A lone fixation has saccades of more than this before and after it.
LEAP: Final = 0.1
#: Two saccades to the left of more than a fifth of the width each, together more than three fifths:
#: what lies between them is in mid sweep. Corrections after undersweeps go over a few letters.
MID_SWEEP_EACH, MID_SWEEP_BOTH = 0.2, 0.6
#: Sums are taken back to 1 after so many fixations. What may lie anywhere and the least chance of a
#: move bound how unlikely one fixation can be (about 1e-12); a float goes down to 1e-308.
SCALED_EVERY: Final = 16
#: Of fixations away, how many visit a line; the same for arrivals and in mid sweep; and how many of
#: the visits go to earlier lines.
VISITING, VISITING_EARLY, VISITING_EARLIER = 0.5, 0.1, 0.9


@dataclass(frozen=True, slots=True, eq=False)
class Course:
    """What the saccades of a trial say about its lines; m lines, first reading, then away.

    Attributes
    ----------
    moves : (n - 1, 2m, 2m) float64 array
        Chance of each state of a fixation (columns), given that of the one before (rows). Rows
        add up to 1.
    begin : (2m,) float64 array
        Chance of each state of the first fixation.
    visits : (m, m) float64 array
        Of the visits from a line (rows), how many go to each other one.
    visiting : (n,) float64 array
        Chance that a fixation, if away, visits a line.
    mid_sweep : (n,) bool array
        Whether a fixation lies between two long saccades to the left.
    lone_early : (n,) bool array
        Whether a fixation is one of the first few and between long saccades.
    """

    moves: Floats
    begin: Floats
    visits: Floats
    visiting: Floats
    mid_sweep: Flags
    lone_early: Flags


def reach_of_lines(passage: Passage) -> tuple[Positions, Positions]:
    """The middles of the first and last word of each line; of the whole text where it has none."""
    count = passage.line_y_px.size
    first, last = np.full(count, np.inf), np.full(count, -np.inf)
    np.minimum.at(first, passage.word_line, passage.word_x_px)
    np.maximum.at(last, passage.word_line, passage.word_x_px)
    empty = first > last
    first[empty], last[empty] = passage.word_x_px.min(), passage.word_x_px.max()
    return first, last


def course_of(x_px: Positions, duration_ms: Positions, passage: Passage) -> Course:
    """What the saccades say: chances of moves, and which fixations stand apart.

    Parameters
    ----------
    x_px : (n,) float64 array
        Fixations in time order, at least one, finite.
    duration_ms : (n,) float64 array
        Their durations; NaN is of usual length.
    passage : Passage
        The text.

    Returns
    -------
    Course
        For the text's lines.
    """
    along = (x_px - passage.begin_x_px) / passage.width_px
    count = passage.line_y_px.size
    mid_sweep, lone_early = _in_mid_sweep(along), _lone_early(along)
    away = np.where(duration_ms < SHORT_MS, AWAY * SHORT_FACTOR, AWAY)
    away[lone_early], away[mid_sweep] = AWAY_EARLY, AWAY_MID_SWEEP
    visiting = np.where(lone_early | mid_sweep, VISITING_EARLY, VISITING)
    begin = np.full(count, (1 - BEGINS_FIRST) / count)
    begin[0] += BEGINS_FIRST
    return Course(
        moves=_moves(along, away, passage),
        begin=np.concatenate([begin * (1 - away[0]), begin * away[0]]),
        visits=_visits(count),
        visiting=visiting,
        mid_sweep=mid_sweep,
        lone_early=lone_early,
    )


def _moves(along: Floats, away: Floats, passage: Passage) -> Floats:
    """Chances of moves between the states reading and away."""
    count = passage.line_y_px.size
    moves = np.zeros((along.size - 1, 2 * count, 2 * count))
    if along.size == 1:
        return moves
    once = _line_after(along[:-1], along[1:], passage)
    # Whoever comes back from one fixation away has moved on from the fixation before that one.
    left_from = along[np.maximum(np.arange(along.size - 1) - 1, 0)]
    back = _line_after(left_from, along[1:], passage)
    leaves = away[1:, None, None]
    moves[:, :count, :count] = once * (1 - leaves)
    moves[:, :count, count:] = np.eye(count) * leaves
    moves[:, count:, :count] = back * (1 - AWAY_AGAIN)
    moves[:, count:, count:] = np.eye(count) * AWAY_AGAIN
    return moves


def _line_after(start: Floats, landing: Floats, passage: Passage) -> Floats:
    """(n, m, m) chances of the line after a saccade, by the line before it."""
    first, last = reach_of_lines(passage)
    extent = np.clip((last - first) / passage.width_px, SHORTEST_LINE, 1.0)
    step = (landing - start)[:, None]
    sweep = logistic((-step / extent - SWEEP_AT) / SWEEP_SOFT)
    sweep *= logistic((LANDING_AT - landing[:, None]) / LANDING_SOFT)
    far = logistic((np.abs(step) - FAR_AT) / FAR_SOFT)
    kinds = (
        (sweep, AFTER_SWEEP),
        ((1 - sweep) * far, AFTER_FAR),
        ((1 - sweep) * (1 - far), AFTER_NEAR),
    )
    chances = np.zeros((start.size, extent.size, extent.size))
    for share, after in kinds:
        chances += share[:, :, None] * _table(extent.size, after)
    return chances


def logistic(values: Floats) -> Floats:
    """From 0 to 1; unlike the textbook form without overflow."""
    risen: Floats = 0.5 * (1 + np.tanh(0.5 * values))
    return risen


def _table(count: int, chances: tuple[float, float, float, float]) -> Floats:
    """(m, m) chances of the line after (columns) by the line before; rows add up to 1."""
    same, following, before, anywhere = chances
    step = np.arange(count)[None, :] - np.arange(count)[:, None]
    table = np.full((count, count), anywhere / count)
    table += same * (step == 0) + following * (step == 1) + before * (step == -1)
    divided: Floats = table / table.sum(1, keepdims=True)
    return divided


def _visits(count: int) -> Floats:
    """Where visits from each line go: mostly to earlier lines; never to the line itself."""
    home, to = np.arange(count)[:, None], np.arange(count)[None, :]
    earlier = np.where(to < home, VISITING_EARLIER / np.maximum(home, 1), 0.0)
    later = np.where(to > home, (1 - VISITING_EARLIER) / np.maximum(count - 1 - home, 1), 0.0)
    return earlier + later


def _in_mid_sweep(along: Floats) -> Flags:
    """Whether each fixation lies between two long saccades to the left."""
    found = np.zeros(along.size, dtype=np.bool_)
    step = np.diff(along)
    before, after = step[:-1], step[1:]
    each = (before < -MID_SWEEP_EACH) & (after < -MID_SWEEP_EACH)
    found[1:-1] = each & (before + after < -MID_SWEEP_BOTH)
    return found


def _lone_early(along: Floats) -> Flags:
    """Whether each fixation is one of the first few and has no neighbour near it."""
    leap = np.abs(np.diff(along)) > LEAP
    lone = np.append(leap, True) & np.insert(leap, 0, True)
    lone[EARLY:] = False
    return lone


def forward_backward(emission: Floats, course: Course, held: Floats) -> tuple[Floats, Floats]:
    """Chance of each state of each fixation, of several models of the same course at once.

    Parameters
    ----------
    emission : (n, s, 2m) float64 array
        How likely each fixation is in each state, under each of s models; above 0.
    course : Course
        Chances of moves.
    held : (n - 1, s, m) float64 array
        Added to the chance of staying on each line: how much likelier, or less likely, fixation
        ``i + 1`` is where fixation ``i`` lay, if both are on that line. Above minus that chance.

    Returns
    -------
    chances : (n, s, 2m) float64 array
        Of each state, given all fixations.
    log_likelihood : (s,) float64 array
        Of all fixations.

    References
    ----------
    Rabiner (1989). A tutorial on hidden Markov models. Proceedings of the IEEE, 77(2), 257-286,
    doi:10.1109/5.18626: forward and backward variables, scaled.
    """
    size = emission.shape[0]
    count = held.shape[2]
    peak = emission.max(axis=2, keepdims=True)
    emission = emission / peak
    log_likelihood = np.log(peak[:, :, 0]).sum(0)
    ahead = np.empty_like(emission)
    ahead[0] = course.begin * emission[0]
    for i in range(1, size):
        now = np.matmul(ahead[i - 1], course.moves[i - 1], out=ahead[i])
        now[:, :count] += ahead[i - 1, :, :count] * held[i - 1]
        now *= emission[i]
        if i % SCALED_EVERY == 0:
            scale = now.sum(1, keepdims=True)
            now /= scale
            log_likelihood += np.log(scale[:, 0])
    log_likelihood += np.log(ahead[-1].sum(1))
    back = np.ones_like(emission)
    backwards = course.moves.swapaxes(1, 2)
    for i in range(size - 2, -1, -1):
        later = emission[i + 1] * back[i + 1]
        now = np.matmul(later, backwards[i], out=back[i])
        now[:, :count] += later[:, :count] * held[i]
        if i % SCALED_EVERY == 0:
            now /= now.sum(1, keepdims=True)
    chances = ahead * back
    chances /= chances.sum(2, keepdims=True)
    return chances, log_likelihood
