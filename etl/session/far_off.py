"""Which of many numbers are far from the rest: the limits by which logs are compared."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.session.log_figures import Spread

#: A number is far from the rest where it is more than this many median absolute deviations (Leys et
#: al. 2013, doi:10.1016/j.jesp.2013.03.013, who speak of 2 to 3 scaled ones) off their median …
_DEVIATIONS = 5.0
#: … and by more than this part of the median, because logs that are all alike have a deviation of
#: 0 (both are our choice: a warning about one log in a hundred sound ones would not be read).
_PART = 1 / 3
#: Logs with fewer positions than this say too little about where they lie (our choice).
FEWEST_PLACED = 20
#: The middle of a log's positions is far off where it also lies outside the usual range, by more
#: than this part of its extent; the extent is, where it is this many times the usual (our choice).
_PART_OF_EXTENT, _FACTOR_OF_EXTENT = 1 / 3, 3.0


class Ranged(NamedTuple):
    """Where a log's fixations lie on one axis, and how many have a position."""

    spread: Spread
    placed: int


def far_off(values: Sequence[float]) -> tuple[float, NDArray[np.int64]]:
    """Which values are far from their median.

    Parameters
    ----------
    values : sequence of float
        Of the logs, none negative.

    Returns
    -------
    float and (n,) int64 array
        The median; and for each value -1 where it is far below, 1 where it is far above, else 0.

    Examples
    --------
    >>> middle, sign = far_off([24, 24, 23, 24, 3])
    >>> middle, sign.tolist()
    (24.0, [0, 0, 0, 0, -1])
    """
    own = np.asarray(values, dtype=np.float64)
    middle = float(np.median(own))
    off = own - middle
    deviation = float(np.median(np.abs(off)))
    far = (np.abs(off) > _DEVIATIONS * deviation) & (np.abs(off) > _PART * middle)
    # Of two numbers neither is the usual one.
    return middle, np.where(far & (len(own) > 2), np.sign(off), 0).astype(np.int64)


def medians_of_others(values: Sequence[float]) -> NDArray[np.float64]:
    """For each of at least two values the median of the others.

    Parameters
    ----------
    values : sequence of float
        At least two, without NaN.

    Returns
    -------
    (n,) float64 array
        In the order of the values.

    Examples
    --------
    >>> medians_of_others([1.0, 2.0, 30.0, 4.0]).tolist()
    [4.0, 4.0, 2.0, 2.0]
    """
    own = np.asarray(values, dtype=np.float64)
    order = np.argsort(own, kind="stable")
    rank = np.empty(len(own), dtype=np.int64)
    rank[order] = np.arange(len(own))
    in_order = own[order]

    def other(place: int) -> NDArray[np.float64]:
        """What stands at a place once a value's own is taken out."""
        picked: NDArray[np.float64] = in_order[np.where(place < rank, place, place + 1)]
        return picked

    last = len(own) - 2
    return (other(last // 2) + other((last + 1) // 2)) / 2


def off_by_factor(values: Sequence[float], factor: float) -> tuple[float, NDArray[np.bool_]]:
    """Which values are a factor off their median.

    Parameters
    ----------
    values : sequence of float
        Above 0; those that are NaN are left aside.
    factor : float
        Above 1.

    Returns
    -------
    float and (n,) bool array
        The median (the lower one of two, so that it is a value that occurs; NaN where there is
        none), and whether each value is more than so many times as large, or smaller. With fewer
        than three values none is.

    Examples
    --------
    >>> usual, off = off_by_factor([200.0, 210.0, 190.0, 0.2], 3)
    >>> usual, off.tolist()
    (190.0, [False, False, False, True])
    """
    own = np.asarray(values, dtype=np.float64)
    off = np.zeros(len(own), dtype=bool)
    known = np.flatnonzero(~np.isnan(own))
    if not known.size:
        return float("nan"), off
    usual = float(np.sort(own[known])[(len(known) - 1) // 2])
    if len(known) > 2:
        off[known] = (own[known] > factor * usual) | (own[known] < usual / factor)
    return usual, off


def far_placed(ranges: Sequence[Ranged]) -> tuple[Spread, NDArray[np.bool_]]:
    """Which logs have their fixations elsewhere than the rest, or over another range.

    Parameters
    ----------
    ranges : sequence of Ranged
        Of each log on one axis.

    Returns
    -------
    Spread and (n,) bool array
        What is usual: the medians over the logs; and whether each log is far off. With fewer than
        three logs that have enough positions none is.
    """
    off = np.zeros(len(ranges), dtype=bool)
    # A log without positions on this axis has none in its spread, whatever the other axis has.
    judged = [
        place
        for place, (spread, placed) in enumerate(ranges)
        if placed >= FEWEST_PLACED and not np.isnan(spread.middle_px)
    ]
    if len(judged) < 3:
        return Spread(float("nan"), float("nan"), float("nan")), off
    own = np.array(
        [(s.low_px, s.middle_px, s.high_px) for s, _ in (ranges[place] for place in judged)]
    )
    low, middle, high = np.median(own, axis=0).tolist()
    extent = own[:, 2] - own[:, 0]
    usual = float(np.median(extent))
    away = np.abs(own[:, 1] - middle)
    beyond = np.maximum(low - own[:, 1], own[:, 1] - high)
    far = (away > _DEVIATIONS * np.median(away)) & (beyond > _PART_OF_EXTENT * usual)
    wide = (extent > _FACTOR_OF_EXTENT * usual) | (extent < usual / _FACTOR_OF_EXTENT)
    off[judged] = far | wide
    return Spread(low, middle, high), off
