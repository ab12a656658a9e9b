"""Every fixation lasts, and something says when it was: what is checked row by row in a log."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings

#: Above this, in ms, a number no longer holds every whole millisecond (IEEE 754, 53 bits).
LONGEST_MS = 2.0**53
#: Decimals of a millisecond to which a difference of two times is rounded: microseconds, finer than
#: any recorder's clock.
DIFFERENCE_DIGITS = 3
_TO_MS = {"ms": 1.0, "s": 1000.0, "us": 0.001}
#: Digits kept after the conversion of a time to milliseconds: nanoseconds, so that 0.3 s is
#: 300 ms and not 299.99999999999994.
_MS_DIGITS = 6
#: What to do about a row that cannot be used.
WAY_OUT = "correct the cell, remove the row, or leave such rows out by [logs.where]"


def in_ms(values: NDArray[np.float64], unit: str) -> NDArray[np.float64]:
    """Convert times to milliseconds; everything that is compared with a log goes through here.

    Parameters
    ----------
    values : (n,) float64 array
        Times in ``unit``; NaN stays NaN.
    unit : {"ms", "s", "us"}
        The unit.

    Returns
    -------
    (n,) float64 array, milliseconds
        Rounded to nanoseconds where they were converted.

    Examples
    --------
    >>> in_ms(np.array([0.3]), "s").tolist()
    [300.0]
    """
    return values if unit == "ms" else np.round(values * _TO_MS[unit], _MS_DIGITS)


def check_times(
    numbers: Mapping[str, NDArray[np.float64]],
    cells: Mapping[str, pa.Array],
    lines: NDArray[np.int32],
    columns: Mapping[str, str],
    shown: str,
    findings: Findings,
) -> NDArray[np.float64]:
    """Check durations, onsets and numbers of fixations.

    Parameters
    ----------
    numbers : dict of str to (n,) float64 array
        The log's numbers by canonical name, times in ms; NaN where a cell has no value.
    cells : dict of str to (n,) pa.Array of text
        The cells by header, for messages.
    lines : (n,) int32 array
        Line of each row.
    columns : dict of str to str
        Header of each canonical name.
    shown : str
        The log's name for messages.
    findings : Findings
        Where every row that cannot be used is recorded.

    Returns
    -------
    (n,) float64 array, milliseconds
        The durations; from onset and end where the log gives the end.
    """

    def tell(rows: NDArray[np.bool_], name: str, problem: str, expected: str) -> None:
        for row in np.flatnonzero(rows).tolist():
            findings.error(
                problem,
                path=shown,
                line=int(lines[row]),
                where=f'column "{columns[name]}"',
                found=cells[columns[name]][row].as_py(),
                expected=expected,
                fix=WAY_OUT,
            )

    for name, what in (("onset", "onset"), ("end", "end"), ("fixation", "number")):
        # An onset that was computed from the end is told by the end; an end beside an onset below.
        if name in columns and (name != "end" or "onset" not in columns):
            tell(np.isnan(numbers[name]), name, f"the fixation has no {what}", "a number")
    for name in ("onset", "end", "duration"):
        if name in columns:
            tell(
                np.abs(numbers[name]) > LONGEST_MS,
                name,
                "the time is too large to be told to the millisecond",
                f"a time below {LONGEST_MS:.0e} ms",
            )
    if "fixation" in numbers:
        number = numbers["fixation"]
        broken = (number != np.floor(number)) & ~np.isnan(number)
        tell(broken, "fixation", "the fixation's number is not whole", "a whole number")
    if "duration" in numbers:
        duration = numbers["duration"]
        absent, wanted = np.isnan(duration), "a duration above 0"
        tell(absent, "duration", "the fixation has no duration", wanted)
        tell(duration <= 0, "duration", "the duration is not above 0", wanted)
        return duration
    duration = np.round(numbers["end"] - numbers["onset"], DIFFERENCE_DIGITS)
    tell(np.isnan(numbers["end"]), "end", "the fixation has no end", "an end after its onset")
    tell(
        duration <= 0, "end", "the fixation does not end after its onset", "an end after its onset"
    )
    return duration
