"""Positions from a log's own units and origin into pixels from the top left corner, y downwards."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa

from etl.errors import FaultError, Findings

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from etl.study.models import Screen


def degrees_to_px(
    degrees: NDArray[np.float64], *, size_px: float, size_cm: float, distance_cm: float
) -> NDArray[np.float64]:
    """Offset on a flat screen of a gaze angle from the straight-ahead line.

    Parameters
    ----------
    degrees : (n,) float64 array, degrees of visual angle
        From the point straight ahead; NaN stays NaN.
    size_px, size_cm : float
        The same extent of the screen in pixels and in centimetres.
    distance_cm : float
        From the eye to the screen.

    Returns
    -------
    (n,) float64 array, pixels
        Signed offset from the point straight ahead.

    References
    ----------
    Plane trigonometry: offset = distance * tan(angle). At 57.3 cm one degree covers one
    centimetre (common practice, e.g. handbooks of psychophysics; from memory).

    Examples
    --------
    >>> degrees_to_px(np.array([1.0]), size_px=1000, size_cm=50, distance_cm=57.29).round(1)
    array([20.])
    """
    offset_cm = distance_cm * np.tan(np.radians(degrees))
    return np.asarray(offset_cm * (size_px / size_cm), dtype=np.float64)


#: A position further from the screen than so many times its size is none (our choice: recorders
#: extrapolate a little beyond the screen, and mark what they lost by numbers such as -32768).
_SCREENS_AWAY = 5
#: The same where the screen is not known: no screen is much wider than 8,000 px.
_FURTHEST_PX = (-8_000.0, 16_000.0)


def tell_far_positions(
    positions: Mapping[str, NDArray[np.float64]],
    cells: Mapping[str, tuple[str, pa.Array]],
    lines: NDArray[np.int32],
    screen: Screen | None,
    shown: str,
    findings: Findings,
) -> None:
    """Record positions that are nowhere near the screen.

    Parameters
    ----------
    positions : mapping of str to (n,) float64 array, pixels
        ``x`` and ``y``, whichever the log has, on the screen.
    cells : mapping of str to (str, (n,) pa.Array of text)
        For each its header and its cells.
    lines : (n,) int32 array
        Line of each row.
    screen : Screen or None
        The study's ``[screen]``.
    shown : str
        The log's name.
    findings : Findings
        Where each such cell is recorded, with its line.
    """
    for axis, values in positions.items():
        low, high = _FURTHEST_PX
        if screen is not None:
            size = screen.width_px if axis == "x" else screen.height_px
            low, high = -_SCREENS_AWAY * float(size), (_SCREENS_AWAY + 1) * float(size)
        header, column = cells[axis]
        for row in np.flatnonzero((values < low) | (values > high)).tolist():
            findings.error(
                "the position is nowhere near the screen",
                path=shown,
                line=int(lines[row]),
                where=f'column "{header}"',
                found=column[row].as_py(),
                expected=f"between {low:g} and {high:g} px from its {_EDGES[axis]} edge",
                fix="if this stands for no position, add it to [logs] missing; else check the "
                "column's unit",
            )


_EDGES = {"x": "left", "y": "upper"}


def to_screen_px(
    x: NDArray[np.float64],
    y: NDArray[np.float64],
    *,
    units: tuple[str, str],
    screen: Screen | None,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Turn a log's positions into pixels from the top left corner, y downwards.

    Parameters
    ----------
    x, y : (n,) float64 array
        As in the log; NaN where there is none.
    units : tuple of {"px", "deg"}
        The unit of x and of y. Degrees are measured from the middle of the screen.
    screen : Screen or None
        The study's ``[screen]``; None means pixels from the top left, y downwards.

    Returns
    -------
    x_px, y_px : (n,) float64 array, pixels
    """
    if screen is None:
        return x, y
    size_cm = distance_cm = height_cm = 0.0
    if "deg" in units:
        if screen.width_cm is None or screen.distance_cm is None:
            raise FaultError("degrees need the screen's width and distance in cm")
        size_cm, distance_cm = screen.width_cm, screen.distance_cm
        # Pixels are square: the height follows from the width, as the study file gives one size.
        height_cm = size_cm * screen.height_px / screen.width_px
    if units[0] == "deg":
        x_px = screen.width_px / 2 + degrees_to_px(
            x, size_px=screen.width_px, size_cm=size_cm, distance_cm=distance_cm
        )
    else:
        x_px = x + screen.width_px / 2 if screen.origin == "centre" else x
    down = 1.0 if screen.y_axis == "down" else -1.0
    if units[1] == "deg":
        y_px = screen.height_px / 2 + down * degrees_to_px(
            y, size_px=screen.height_px, size_cm=height_cm, distance_cm=distance_cm
        )
    elif screen.origin == "centre":
        y_px = screen.height_px / 2 + down * y
    elif screen.origin == "bottom-left":
        # From the bottom corner, y counts upwards unless the study file says it counts down
        # (values at or below zero).
        y_px = screen.height_px + down * y
    else:
        y_px = down * y
    return x_px, y_px
