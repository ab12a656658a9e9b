"""Fixations from the dispersion of neighbouring gaze samples (I-DT)."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from etl.parsers.detection.track import Spans, Track, piece_bounds

#: By how much, in px, a dispersion may exceed its limit, so that one that lies on it exactly is not
#: told from it by the rounding of binary fractions.
_ROUNDING_PX = 1e-6
#: Half a microsecond, in ms: times are compared to the microsecond.
_ROUNDING_MS = 5e-4
#: How many samples a window is first tried to grow by; doubled as long as it grows.
_FIRST_GROWTH = 64

Numbers = NDArray[np.float64]


def fixation_windows(track: Track, dispersion_px: float, shortest_fixation_ms: float) -> Spans:
    """Find fixations as windows in which the positions stay near each other.

    Parameters
    ----------
    track : Track
        The samples that have a position.
    dispersion_px : float, pixels
        The most that (max x - min x) + (max y - min y) may be within a fixation.
    shortest_fixation_ms : float, milliseconds
        How long a window is at first, and so the shortest fixation.

    Returns
    -------
    Spans
        The samples of each fixation.

    Notes
    -----
    The paper's steps, in each stretch by itself: a window is put over the first samples, as few as
    cover the shortest duration (each sample stands for one sampling interval). If the dispersion
    within it is at most the limit, samples are added until it exceeds the limit; the window, but
    for the sample that exceeded it, is a fixation, and its samples are taken away. Otherwise the
    first sample is taken away. Fewer samples than cover the shortest duration are no fixation.

    References
    ----------
    Salvucci, D. D., & Goldberg, J. H. (2000). Identifying fixations and saccades in eye-tracking
    protocols. Proceedings of ETRA 2000, 71-78. doi:10.1145/355017.355028

    Examples
    --------
    >>> x_px = np.array([0.0, 3.0, 1.0, 50.0, 90.0, 91.0, 92.0, 93.0])
    >>> even = 10 * np.arange(8.0), (x_px, 0 * x_px), np.zeros(8, dtype=np.int64), 10.0
    >>> found = fixation_windows(Track.of(*even)[0], 3.0, 30.0)
    >>> found.first.tolist(), found.last.tolist()
    ([0, 4], [2, 7])
    """
    length = len(track)
    limit = dispersion_px + _ROUNDING_PX
    last = _window_ends(track, shortest_fixation_ms)
    extents = _extents(track, last)
    low_x, high_x, low_y, high_y = extents
    near = (high_x - low_x) + (high_y - low_y) <= limit
    begins = np.flatnonzero((last >= 0) & near)
    stops = np.append(np.flatnonzero(np.diff(track.stretch)) + 1, length)
    stop_of = stops[np.searchsorted(stops, begins, side="right")]
    found: list[tuple[int, int]] = []
    place, at = 0, 0
    while True:
        at += int(np.searchsorted(begins[at:], place))
        if at >= len(begins):
            break
        first = int(begins[at])
        extent = low_x[first], high_x[first], low_y[first], high_y[first]
        place = _grown(track, int(last[first]) + 1, int(stop_of[at]), extent, limit)
        found.append((first, place - 1))
    pairs = np.array(found, dtype=np.int64).reshape(-1, 2)
    return Spans(pairs[:, 0], pairs[:, 1])


def _window_ends(track: Track, shortest_ms: float) -> NDArray[np.int64]:
    """The last sample of the first window at each sample; -1 where its stretch is too short."""
    last = np.full(len(track), -1, dtype=np.int64)
    beyond = shortest_ms - track.interval_ms - _ROUNDING_MS
    bounds = piece_bounds(track.run).tolist()
    for start, stop in pairwise(bounds):
        time_ms, stretch = track.time_ms[start:stop], track.stretch[start:stop]
        own = np.maximum(np.searchsorted(time_ms, time_ms + beyond), np.arange(stop - start))
        covered = stretch[np.minimum(own, stop - start - 1)] == stretch
        last[start:stop] = np.where(covered & (own < stop - start), own + start, -1)
    return last


def _extents(track: Track, last: NDArray[np.int64]) -> tuple[Numbers, Numbers, Numbers, Numbers]:
    """Least and greatest x and y of the first window at each sample; NaN where there is none.

    Extremes of windows of 1, 2, 4, … samples are built one from the other; a window of any length
    is covered by two of the longest that fit into it.
    """
    begins = np.flatnonzero(last >= 0)
    ends = last[begins]
    level_of = np.floor(np.log2(ends - begins + 1)).astype(np.int64)
    extents = []
    for place_px in (track.x_px, track.y_px):
        for extreme in (np.minimum, np.maximum):
            out = np.full(len(track), np.nan)
            covered, size = place_px, 1
            for level in range(int(level_of.max()) + 1 if len(begins) else 0):
                rows = np.flatnonzero(level_of == level)
                if rows.size:
                    tail = covered[ends[rows] - size + 1]
                    out[begins[rows]] = extreme(covered[begins[rows]], tail)
                covered = extreme(covered[:-size], covered[size:])
                size *= 2
            extents.append(out)
    return extents[0], extents[1], extents[2], extents[3]


def _grown(
    track: Track, stop: int, most: int, extent: tuple[float, float, float, float], limit: float
) -> int:
    """Where a window ends that takes in samples as long as its dispersion is within the limit."""
    low_x, high_x, low_y, high_y = extent
    growth = _FIRST_GROWTH
    while stop < most:
        piece = slice(stop, min(stop + growth, most))
        x_px, y_px = track.x_px[piece], track.y_px[piece]
        lows_x = np.minimum(np.minimum.accumulate(x_px), low_x)
        lows_y = np.minimum(np.minimum.accumulate(y_px), low_y)
        highs_x = np.maximum(np.maximum.accumulate(x_px), high_x)
        highs_y = np.maximum(np.maximum.accumulate(y_px), high_y)
        exceeds = (highs_x - lows_x) + (highs_y - lows_y) > limit
        at = int(exceeds.argmax())
        if exceeds[at]:
            return stop + at
        low_x, high_x = lows_x[-1], highs_x[-1]
        low_y, high_y = lows_y[-1], highs_y[-1]
        stop, growth = piece.stop, growth * 2
    return stop
