"""Saccades from the velocity of gaze samples, and fixations as what lies between them."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from etl.parsers.detection.track import Spans, Track, piece_bounds

#: Samples on either side of the one whose velocity is estimated.
_REACH = 2
#: Sampling intervals in the denominator of the moving average over five samples: 2 + 1 + 1 + 2.
_WEIGHT = 6
#: What is below this, in px, in a sum of four positions is the rounding of binary fractions and no
#: movement: positions of up to 10 000 px are exact to 2e-12 px.
_ROUNDING_PX = 1e-9
#: A spread whose square is below this share of the median square velocity is the rounding of a
#: difference of two equal numbers.
_ROUNDING_SHARE = 1e-12
#: By how much the criterion must exceed 1, so that velocities that lie on the threshold exactly are
#: not told from it by the rounding of binary fractions.
_CRITERION_ROUNDING = 1e-9


def velocities(track: Track) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Velocity of each sample, as the moving average over five samples.

    Parameters
    ----------
    track : Track
        The samples that have a position.

    Returns
    -------
    x_px_per_ms, y_px_per_ms : (n,) float64 array, pixels per millisecond
        NaN at the first two and the last two samples of every stretch, for which there are no
        two neighbours on either side.

    Notes
    -----
    v(n) = (x(n+2) + x(n+1) - x(n-1) - x(n-2)) / 6 dt. Across a hole that a stretch lasts through,
    the true times take the place of the even ones: the denominator is t(n+2) + t(n+1) - t(n-1) -
    t(n-2), which is 6 dt where times are even.

    References
    ----------
    Engbert, R., & Kliegl, R. (2003). Microsaccades uncover the orientation of covert attention.
    Vision Research, 43, 1035-1045. doi:10.1016/S0042-6989(03)00084-1

    Examples
    --------
    >>> x_px = np.array([0.0, 0.0, 0.0, 0.0, 6.0, 6.0])
    >>> even = np.arange(6.0), (x_px, x_px), np.zeros(6, dtype=np.int64), 1.0
    >>> velocities(Track.of(*even)[0])[0].tolist()
    [nan, nan, 1.0, 2.0, nan, nan]
    """
    length = len(track)
    known = np.zeros(length, dtype=bool)
    span = 2 * _REACH
    inner = slice(_REACH, -_REACH)
    if length > span:
        known[inner] = track.stretch[span:] == track.stretch[:-span]
    denominator = np.full(length, _WEIGHT * track.interval_ms)
    uneven = np.zeros(length, dtype=bool)
    for shift in range(-1, _REACH + 1):
        uneven |= np.roll(track.after_hole, -shift)
    at = np.flatnonzero(uneven & known)
    denominator[at] = _ahead_less_behind(track.time_ms, at)
    found = []
    for place_px in (track.x_px, track.y_px):
        velocity = np.full(length, np.nan)
        at = np.flatnonzero(known)
        moved_px = _ahead_less_behind(place_px, at)
        moved_px[np.abs(moved_px) <= _ROUNDING_PX] = 0.0
        velocity[at] = moved_px / denominator[at]
        found.append(velocity)
    return found[0], found[1]


def _ahead_less_behind(values: NDArray[np.float64], at: NDArray[np.int64]) -> NDArray[np.float64]:
    """The sum of the next two values less that of the last two."""
    ahead, behind = values[at + 2] + values[at + 1], values[at - 1] + values[at - 2]
    return np.asarray(ahead - behind)


def spread_squared(velocity: NDArray[np.float64]) -> float:
    """Square of the median-based standard deviation of a velocity.

    Parameters
    ----------
    velocity : (n,) float64 array, pixels per millisecond
        At least one; none NaN.

    Returns
    -------
    float, squared pixels per squared millisecond
        The median of the squares less the square of the median.

    References
    ----------
    Engbert, R., & Kliegl, R. (2003). Microsaccades uncover the orientation of covert attention.
    Vision Research, 43, 1035-1045. doi:10.1016/S0042-6989(03)00084-1

    Examples
    --------
    >>> spread_squared(np.array([0.0, 1.0, 3.0, 5.0, 90.0]))
    0.0
    >>> spread_squared(np.array([-2.0, -1.0, 0.0, 1.0, 2.0]))
    1.0
    """
    square = float(np.median(velocity * velocity))
    spread = square - float(np.median(velocity)) ** 2
    return spread if spread > _ROUNDING_SHARE * square else 0.0


def saccade_samples(
    track: Track, threshold_factor: float, shortest_saccade_ms: float
) -> NDArray[np.bool_]:
    """Tell the samples of saccades by their velocity.

    Parameters
    ----------
    track : Track
        The samples that have a position.
    threshold_factor : float
        The thresholds in x and y are this many median-based standard deviations of the run's own
        velocities; 6 in the paper.
    shortest_saccade_ms : float, milliseconds
        What is faster for a shorter time is noise; 12 in the paper (three samples at 250 Hz).

    Returns
    -------
    (n,) bool array
        Whether each sample is in a saccade.

    Notes
    -----
    A sample is fast where (vx / threshold x)**2 + (vy / threshold y)**2 is above 1. The first two
    and the last two samples of a stretch have no velocity: they count as the nearest sample that
    has one, and as no part of a saccade where the whole stretch has none. Where more than half of
    the velocities of a run in x (or in y) are alike, or all point the same way, their spread is 0
    and so is the threshold: every movement in x (or in y) is then fast.

    References
    ----------
    Engbert, R., & Kliegl, R. (2003). Microsaccades uncover the orientation of covert attention.
    Vision Research, 43, 1035-1045. doi:10.1016/S0042-6989(03)00084-1

    Examples
    --------
    >>> x_px = np.array([0.0] * 7 + [30.0] * 7)
    >>> even = 4 * np.arange(14.0), (x_px, x_px), np.zeros(14, dtype=np.int64), 4.0
    >>> np.flatnonzero(saccade_samples(Track.of(*even)[0], 6, 12)).tolist()
    [5, 6, 7, 8]
    """
    x_velocity, y_velocity = velocities(track)
    known = np.flatnonzero(~np.isnan(x_velocity))
    criterion = np.zeros(len(track))
    runs = track.run[known]
    bounds = piece_bounds(runs).tolist()
    for velocity in (x_velocity[known], y_velocity[known]):
        threshold_squared = np.zeros(len(known))
        for start, stop in pairwise(bounds):
            spread = spread_squared(velocity[start:stop])
            threshold_squared[start:stop] = threshold_factor**2 * spread
        share = np.where(velocity == 0.0, 0.0, np.inf)
        np.divide(velocity * velocity, threshold_squared, out=share, where=threshold_squared > 0)
        criterion[known] += share
    fast = criterion > 1 + _CRITERION_ROUNDING
    saccades = Spans.where(fast, track.stretch).of_length(track, shortest_saccade_ms)
    inside = saccades.inside(len(track))
    _fill_edges(inside, track.stretch)
    return inside


def _fill_edges(inside: NDArray[np.bool_], stretch: NDArray[np.int64]) -> None:
    """Let the samples at the ends of a stretch, which have no velocity, be as the nearest one."""
    ends = piece_bounds(stretch)
    first, stop = ends[:-1], ends[1:]
    wide = stop - first > 2 * _REACH
    first, stop = first[wide], stop[wide]
    for shift in range(_REACH):
        inside[first + shift] = inside[first + _REACH]
        inside[stop - 1 - shift] = inside[stop - 1 - _REACH]
