"""The lines of many texts searched at once: by height, or by number."""

from __future__ import annotations

import numpy as np

from etl.errors import FaultError
from etl.regions.geometry import Floats, Geometry, Integers, Offsets


def nearest_line(geometry: Geometry, text: Offsets, y_px: Floats) -> Offsets:
    """The line whose middle is vertically nearest; of two equally near ones the later.

    Parameters
    ----------
    geometry : Geometry
        The lines of the texts.
    text : (n,) int64 array
        The text of each point.
    y_px : (n,) float64 array
        Finite vertical positions.

    Returns
    -------
    (n,) int64 array
        Index into the geometry's lines.
    """
    middles = geometry.line_middles_px
    first, stop = geometry.line_offsets[text], geometry.line_offsets[text + 1]
    above = last_at_or_before(middles, first, stop, y_px)
    upper = np.maximum(above, first)
    lower = np.minimum(above + 1, stop - 1)
    return np.where(middles[lower] - y_px <= y_px - middles[upper], lower, upper)


def numbered_line(geometry: Geometry, text: Offsets, number: Integers) -> Offsets:
    """The line that has a number in its text.

    Parameters
    ----------
    geometry : Geometry
        The lines of the texts.
    text : (n,) int64 array
        Texts.
    number : (n,) int32 array
        Numbers of lines, from 1.

    Returns
    -------
    (n,) int64 array
        Index into the geometry's lines.

    Raises
    ------
    FaultError
        If a text has no line of that number.
    """
    first, stop = geometry.line_offsets[text], geometry.line_offsets[text + 1]
    # Whole numbers of this size are exact as floats, on which the search runs.
    numbers = geometry.line_numbers.astype(np.float64)
    slot = last_at_or_before(numbers, first, stop, number.astype(np.float64))
    if (slot < first).any() or (geometry.line_numbers[slot] != number).any():
        raise FaultError("a point was given a line that its text does not have")
    return slot


def last_at_or_before(values: Floats, first: Offsets, stop: Offsets, wanted: Floats) -> Offsets:
    """The last index in each ``first:stop`` with a value of at most ``wanted``, or ``first - 1``.

    Parameters
    ----------
    values : (m,) float64 array
        Ascending within each stretch.
    first, stop : (n,) int64 arrays
        Where each stretch begins and ends.
    wanted : (n,) float64 array
        What is looked for in each.

    Returns
    -------
    (n,) int64 array

    Notes
    -----
    The binary search runs over all stretches at once.
    """
    low, high = first.copy(), stop.copy()
    longest = int((stop - first).max(initial=0))
    for _ in range(longest.bit_length()):
        middle = (low + high) >> 1
        searching = low < high
        middle_value = values[np.minimum(middle, len(values) - 1)]
        right = searching & (middle_value <= wanted)
        high = np.where(searching & ~right, middle, high)
        low = np.where(right, middle + 1, low)
    return low - 1
