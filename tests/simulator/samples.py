"""Gaze samples made from fixations, such that the fixations can be found in them again exactly."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

#: The eyes rest this many samples longer than the fixation lasts, on either side of it: the moving
#: average over five samples sees a movement two samples before it begins.
_REST = 2
#: The shortest saccade that is found by default, and the longest that is made, in ms.
_SHORTEST_SACCADE_MS, _LONGEST_SACCADE_MS = 12.0, 80.0
#: Samples in motion are at most this share of those in fixations, so that the median velocity, and
#: the median of its square, are 0 and so are the thresholds.
_MOST_MOTION = 0.4


@dataclass(frozen=True, slots=True)
class TrialSamples:
    """The samples of one trial.

    Attributes
    ----------
    t_ms : (n,) float64 array, milliseconds
        One sampling interval apart, from the first onset to the end of the last fixation.
    x_px, y_px : (n,) float64 array, pixels
        NaN in gaps that are too short or too long for a saccade.
    fixation : (n,) int64 array
        Which fixation, from 0; -1 between two.
    """

    t_ms: NDArray[np.float64]
    x_px: NDArray[np.float64]
    y_px: NDArray[np.float64]
    fixation: NDArray[np.int64]


def samples_of(
    fixations: Sequence[tuple[float, float, float, float]], frequency_hz: float = 1000.0
) -> TrialSamples:
    """Make the samples of a trial from its fixations.

    Detection by velocity with default parameters, but for a ``shortest_fixation_ms`` that is not
    above the shortest of these fixations, finds their onsets, durations and positions again, bit
    for bit.

    Parameters
    ----------
    fixations : sequence of (onset_ms, duration_ms, x_px, y_px)
        In time order. Onsets must lie whole sampling intervals apart, durations be whole sampling
        intervals, and there must be at least one sample between two fixations: the end of one and
        the onset of the next differ by one interval or more. Positions that are not the same
        differ by 0.1 px or more.
    frequency_hz : float
        Samples a second.

    Returns
    -------
    TrialSamples

    Raises
    ------
    ValueError
        Where fixations cannot be made of whole samples, touch or overlap.

    Notes
    -----
    A fixation of duration d is d / interval samples, all at one place: each sample stands for one
    interval. A gap of 12 to 80 ms (and at least 5 samples) becomes a saccade: rest for two more
    samples, even motion, rest for two samples before the next fixation; a window of five samples
    sees the motion in all samples of the gap and in no other. Any other gap, and one between two
    fixations at the same place, beside a fixation of fewer than three samples, or beyond 0.4
    samples in motion for each at rest, is samples without a position: these end a fixation, as
    long as ``longest_gap_ms`` is 0. Detection by dispersion does not find the fixations, as the
    eyes rest a little longer than they last.

    Examples
    --------
    >>> made = samples_of([(0, 3, 10.0, 5.0), (4, 2, 20.0, 5.0)])
    >>> made.x_px.tolist()
    [10.0, 10.0, 10.0, nan, 20.0, 20.0]
    """
    interval_ms = 1000.0 / frequency_hz
    begin_ms = fixations[0][0]
    bounds: list[tuple[int, int]] = []
    for onset_ms, duration_ms, _, _ in fixations:
        first = _whole((onset_ms - begin_ms) / interval_ms, "onset", onset_ms)
        size = _whole(duration_ms / interval_ms, "duration", duration_ms)
        if size < 1 or (bounds and first <= bounds[-1][1]):
            raise ValueError(f"no sample lies before the fixation that begins at {onset_ms} ms")
        bounds.append((first, first + size))
    length = bounds[-1][1]
    x_px, y_px = np.full(length, np.nan), np.full(length, np.nan)
    number = np.full(length, -1, dtype=np.int64)
    for at, ((first, stop), (_, _, x, y)) in enumerate(zip(bounds, fixations, strict=True)):
        x_px[first:stop], y_px[first:stop], number[first:stop] = x, y, at
    # Beside a gap without positions two samples have no velocity.
    budget = _MOST_MOTION * sum(max(0, stop - first - 2 * _REST) for first, stop in bounds)
    for at in range(len(fixations) - 1):
        stop, begin = bounds[at][1], bounds[at + 1][0]
        here, there = fixations[at][2:], fixations[at + 1][2:]
        size = begin - stop
        lasts_ms = size * interval_ms
        fits = _SHORTEST_SACCADE_MS <= lasts_ms <= _LONGEST_SACCADE_MS and size > 2 * _REST
        # Beside a gap, the first two samples of a fixation are as the third: it must be there.
        brief = min(bounds[at][1] - bounds[at][0], bounds[at + 1][1] - begin) <= _REST
        if not fits or brief or here == there or size > budget:
            continue
        budget -= size
        steps = np.arange(1 - _REST, size - _REST + 1) / (size - 2 * _REST + 1)
        share = np.clip(steps, 0.0, 1.0)
        for place_px, start, end in ((x_px, here[0], there[0]), (y_px, here[1], there[1])):
            motion = np.round(start + share * (end - start), 3)
            place_px[stop:begin] = np.where(share == 0, start, np.where(share == 1, end, motion))
    t_ms = begin_ms + np.round(np.arange(length) * interval_ms, 6)
    return TrialSamples(t_ms, x_px, y_px, number)


def _whole(count: float, what: str, value_ms: float) -> int:
    """A number of samples, which must be whole."""
    whole = round(count)
    if abs(count - whole) > 1e-6:
        raise ValueError(f"the {what} {value_ms} ms is no whole number of samples")
    return whole
