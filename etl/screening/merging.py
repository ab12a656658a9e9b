"""Short fixations merged into their neighbours."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Merged:
    """Fixations after merging.

    Attributes
    ----------
    onset_ms, duration_ms : (n,) float64 array
        Of a fixation that took others in: the earliest onset and the sum of durations. Of one that
        was merged: its own duration when it was (with what it had taken in itself).
    blink : (n,) bool array
        A blink of any of the fixations put together.
    into : (n,) int64 array
        Index of the fixation that each was merged into; -1 where it was not.
    """

    onset_ms: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    blink: NDArray[np.bool_]
    into: NDArray[np.int64]


def merge_short(
    trial: NDArray[np.int64],
    onset_ms: NDArray[np.float64],
    duration_ms: NDArray[np.float64],
    place_px: tuple[NDArray[np.float64], NDArray[np.float64]],
    blink: NDArray[np.bool_],
    limits: tuple[float, float],
) -> Merged:
    """Merge fixations that are short and near a neighbour.

    Parameters
    ----------
    trial : (n,) int64 array
        Trial of each fixation, non-decreasing; fixations in time order within a trial.
    onset_ms, duration_ms : (n,) float64 array, milliseconds
        Onsets may be NaN throughout.
    place_px : tuple of two (n,) float64 arrays, pixels
        x and y. Where y is missing throughout, x alone decides; a fixation without x is near none.
    blink : (n,) bool array
        Whether a blink touches the fixation.
    limits : tuple of float
        A fixation shorter than the first (ms) is merged with a neighbour no farther than the
        second (px).

    Returns
    -------
    Merged

    Notes
    -----
    In every trial the shortest candidate goes first (the earliest of equals). It pairs with the
    nearer of the two neighbours that lie within the distance (of equals the longer, then the
    earlier), and of the pair the shorter one is merged into the longer (of equals the later into
    the earlier), whose position stays. Then the trial is looked at again, until no candidate is
    left. Common practice, no source, except that short fixations near a longer one are taken for
    a part of it.

    Examples
    --------
    >>> merged = merge_short(
    ...     np.array([0, 0, 0]), np.array([0.0, 220.0, 300.0]), np.array([200.0, 60.0, 180.0]),
    ...     (np.array([100.0, 110.0, 300.0]), np.zeros(3)), np.zeros(3, dtype=bool), (80.0, 14.0)
    ... )
    >>> merged.duration_ms.tolist(), merged.into.tolist()
    ([260.0, 60.0, 180.0], [-1, 0, -1])
    """
    under_ms, within_px = limits
    onset, duration, blinked = onset_ms.copy(), duration_ms.copy(), blink.copy()
    into = np.full(len(trial), -1, dtype=np.int64)
    x, y = place_px
    if np.isnan(y).all():
        y = np.zeros_like(x)
    # Trials without a candidate are done with; each round merges one pair in every other.
    left = np.flatnonzero(np.isin(trial, trial[duration < under_ms]))
    while left.size:
        pair = _pairs(trial[left], duration[left], (x[left], y[left]), under_ms, within_px)
        if not len(pair[0]):
            break
        earlier, later = left[pair[0]], left[pair[1]]
        forward = duration[earlier] < duration[later]
        loser, winner = np.where(forward, earlier, later), np.where(forward, later, earlier)
        duration[winner] += duration[loser]
        onset[winner] = np.fmin(onset[winner], onset[loser])
        blinked[winner] |= blinked[loser]
        into[loser] = winner
        left = left[into[left] < 0]
        left = left[np.isin(trial[left], trial[winner])]
    return Merged(onset, duration, blinked, into)


def _pairs(
    trial: NDArray[np.int64],
    duration: NDArray[np.float64],
    place: tuple[NDArray[np.float64], NDArray[np.float64]],
    under_ms: float,
    within_px: float,
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """The pair to be merged next in each trial: indices of the earlier and the later fixation."""
    x, y = place
    # Not hypot: its last digit may differ for equal distances, as of (5, 5) and (7, 1), and between
    # systems; that of a square root is prescribed.
    gap = np.sqrt(np.diff(x) ** 2 + np.diff(y) ** 2)
    gap[(np.diff(trial) != 0) | np.isnan(gap) | (gap > within_px)] = np.inf
    before, after = np.append(np.inf, gap), np.append(gap, np.inf)
    near = np.minimum(before, after) < np.inf
    candidate = np.flatnonzero((duration < under_ms) & near)
    order = np.lexsort((candidate, duration[candidate], trial[candidate]))
    candidate = candidate[order]
    first = np.ones(len(candidate), dtype=bool)
    first[1:] = np.diff(trial[candidate]) != 0
    one = candidate[first]
    longer_before = duration[np.maximum(one - 1, 0)] >= duration[np.minimum(one + 1, len(x) - 1)]
    back = (before[one] < after[one]) | ((before[one] == after[one]) & longer_before)
    return np.where(back, one - 1, one), np.where(back, one, one + 1)
