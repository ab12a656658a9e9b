"""Sequences of fixations from left to right, merged until there are as many as lines."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.lines.nearest import lines_in_order
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.runs import Flags, Numbers, first_of_runs
from etl.lines.settings import MergeSettings, MethodSettings

#: The phases, in order: the fewest fixations of the smaller and of the larger sequence of a pair,
#: and whether slope and error of the pair are limited.
PHASES: Final = ((3, 3, True), (1, 3, True), (1, 1, True), (1, 1, False))
#: Errors are compared in steps of this, in px: two fixations lie on their line exactly, and which
#: of several such pairs comes first must not hang on the last digit of a sum.
_STEP_PX = 1e-3
#: How many sequences are held against all others at a time, to bound memory.
_BLOCK = 128


@line_method
def merge(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Merge sequences that lie on one line best, until there is one for each line.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    passage : Passage
        The text.
    settings : MethodSettings
        ``merge``: a step of more than 32 px up or down ends a sequence, as does any step back; a
        line through a pair must have a slope below 0.1 and an error below 20 px.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0: the sequence with the highest mean is on the first line,
        and so on. With fewer sequences than lines see
        :func:`etl.lines.nearest.lines_in_order`.

    Notes
    -----
    A line is fitted to each pair of sequences by least squares; the pair with the least root mean
    square error, of equal ones the earlier, is merged, and so on: first pairs of which each has
    three fixations or more, then those of which one has, then any, then any without a limit to
    slope and error. Which of the two is earlier makes no difference. Fails where fixations of two
    lines lie nearer to each other than those of one line, under noise above all.

    With s sequences O(s²) at first, then O(s) for each merging, and for each sequence whose nearest
    one was merged.

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``merge``, after Špakov, Istance,
    Hyrskykari, Siirtola & Räihä (2019), Behavior Research Methods, 51, 2661-2687,
    doi:10.3758/s13428-018-1120-x (cited from memory).

    Examples
    --------
    The second line was left for a word of the first and taken up again.

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> x_px = np.array([50.0, 150.0, 250.0, 50.0, 150.0, 250.0, 180.0, 280.0, 350.0])
    >>> y_px = np.array([120.0, 122.0, 121.0, 184.0, 181.0, 180.0, 123.0, 180.0, 182.0])
    >>> merge(x_px, y_px, passage, MethodSettings()).tolist()
    [0, 0, 0, 1, 1, 1, 0, 1, 1]
    """
    limits = settings.merge
    ends = (np.diff(x_px) < 0) | (np.abs(np.diff(y_px)) > limits.y_px)
    first = first_of_runs(ends)
    # From where the text begins, so that sums stay small and do not depend on where it stands.
    top_px = passage.line_y_px[0]
    x, y = x_px - passage.begin_x_px, y_px - top_px
    sums = np.add.reduceat(np.array([np.ones_like(x), x, y, x * x, x * y, y * y]), first, axis=1)
    owner = _Merging(sums, limits).owners(passage.line_y_px.size)
    kept, own = np.unique(owner, return_inverse=True)
    fixations, heights = (np.bincount(own, of, kept.size) for of in (sums[0], sums[2]))
    lines = lines_in_order(heights / fixations, passage.line_y_px - top_px)
    return np.repeat(lines[own], np.diff(np.append(first, x.size)))


class _Merging:
    """Sequences on their way to being merged, by the sums of their fixations.

    The sums of a merged sequence are those of its parts added up, and what is known of all other
    pairs stays true.
    """

    def __init__(self, sums: NDArray[np.float64], limits: MergeSettings) -> None:
        count = sums.shape[1]
        #: How many fixations, and the sums of x, y, x², xy and y², of each sequence.
        self.sums = sums.copy()
        self.limits = limits
        self.there = np.ones(count, dtype=np.bool_)
        #: Into which sequence each of the first ones has been merged.
        self.owner = np.arange(count)
        self.errors = np.empty((count, count))
        self.flat = np.empty((count, count), dtype=np.bool_)
        for start in range(0, count, _BLOCK):
            rows = np.arange(start, min(start + _BLOCK, count))
            self.errors[rows], self.flat[rows] = self._pairs(rows)

    def _pairs(self, rows: Numbers) -> tuple[Positions, Flags]:
        """Errors of pairs of some sequences with all, in steps; and which are within the limits."""
        n, x, y, xx, xy, yy = self.sums[:, rows, np.newaxis] + self.sums[:, np.newaxis]
        # Times the number of fixations: of whole pixels these are whole numbers, without rounding.
        spread_x, both, spread_y = n * xx - x * x, n * xy - x * y, n * yy - y * y
        upright = spread_x <= 0
        slope = np.where(upright, 0.0, both / np.where(upright, 1.0, spread_x))
        error_px = np.sqrt(np.maximum(spread_y - slope * both, 0.0)) / n
        flat = (np.abs(slope) < self.limits.slope) & (error_px < self.limits.error_px)
        return np.round(error_px / _STEP_PX), flat

    def _allowed(self, rows: Numbers, phase: tuple[int, int, bool]) -> Positions:
        """Errors of pairs of some sequences with all; infinite where a phase does not take them."""
        smaller, larger, limited = phase
        sizes = self.sums[0]
        own = sizes[rows, np.newaxis]
        taken = (np.minimum(own, sizes) >= smaller) & (np.maximum(own, sizes) >= larger)
        taken &= self.there & self.there[rows, np.newaxis]
        taken &= rows[:, np.newaxis] != np.arange(sizes.size)
        if limited:
            taken &= self.flat[rows]
        return np.where(taken, self.errors[rows], np.inf)

    def owners(self, line_count: int) -> Numbers:
        """For each of the first sequences the one that holds it once as many as lines are left."""
        spare = self.there.size - line_count
        for phase in PHASES:
            if spare <= 0:
                break
            spare = self._run(phase, spare)
        return self.owner

    def _run(self, phase: tuple[int, int, bool], spare: int) -> int:
        """Merge what a phase takes; how many sequences are still too many."""
        everyone = np.arange(self.there.size)
        errors = self._allowed(everyone, phase)
        partner = errors.argmin(axis=1)
        least = errors[everyone, partner]
        while spare:
            one = int(least.argmin())
            if np.isinf(least[one]):
                break
            # The first of those with the least error: its partner comes after it.
            other = int(partner[one])
            self._join(one, other)
            spare -= 1
            changed = np.array([one])
            row = self._allowed(changed, phase)[0]
            errors[one], errors[:, one] = row, row
            errors[other], errors[:, other] = np.inf, np.inf
            lost = (partner == one) | (partner == other)
            lost[[one, other]] = True
            nearer = (row < least) | ((row == least) & (one < partner))
            partner[nearer], least[nearer] = one, row[nearer]
            again = np.flatnonzero(lost)
            partner[again] = errors[again].argmin(axis=1)
            least[again] = errors[again, partner[again]]
        return spare

    def _join(self, one: int, other: int) -> None:
        """Merge one sequence into another."""
        self.sums[:, one] += self.sums[:, other]
        self.there[other] = False
        self.owner[self.owner == other] = one
        errors, flat = self._pairs(np.array([one]))
        self.errors[one], self.errors[:, one] = errors[0], errors[0]
        self.flat[one], self.flat[:, one] = flat[0], flat[0]
