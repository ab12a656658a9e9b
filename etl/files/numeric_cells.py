"""Text cells into numbers, with every cell that is none named by its line."""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Callable, Collection
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.errors import Findings

_NUMBER = r"^[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?$"
_ONE_NUMBER = re.compile(_NUMBER, re.ASCII)
#: Numbers whose commas may mark thousands; none is written with a leading zero.
_GROUPED = r"^[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+$"

#: Digits with signs between them that were meant as a number.
_SPOILED = re.compile(r"[+-]?[0-9][0-9]*(?:[.,' \u00a0\u202f][0-9]+)+(?:[eE][+-]?[0-9]+)?")


def number_of(text: str) -> float | None:
    """Read one text as a number, by the same grammar as a column of numbers.

    Parameters
    ----------
    text : str
        Trimmed; the decimal sign is a point.

    Returns
    -------
    float or None
        None where the text is no number, or one too large to be held.

    Examples
    --------
    >>> [number_of(text) for text in ("21.5", "1e1", "1_0", "nan", "3,5")]
    [21.5, 10.0, None, None, None]
    """
    if _ONE_NUMBER.fullmatch(text) is None:
        return None
    number = float(text)
    return number if math.isfinite(number) else None


@dataclass(frozen=True, slots=True)
class NumberReading:
    """How a column of numbers is to be read.

    Attributes
    ----------
    shown : str
        The file, for messages.
    lines : (n,) int32 array
        Line of each row.
    missing : collection of str
        Cells that stand for no value.
    decimal : {".", ","}
        The decimal sign.
    """

    shown: str
    lines: NDArray[np.int32]
    missing: Collection[str]
    decimal: str


def numbers_in(
    column: pa.Array, name: str, reading: NumberReading, findings: Findings, *, expected: str
) -> NDArray[np.float64] | None:
    """Read a column of text as numbers.

    Parameters
    ----------
    column : (n,) pa.Array of text
        The cells.
    name : str
        The column's name in the file.
    reading : NumberReading
        Decimal sign and missing marks.
    findings : Findings
        Where cells that are no numbers are recorded, each with its line.
    expected : str
        What the message says was expected, such as ``"a number in ms"``.

    Returns
    -------
    (n,) float64 array or None
        NaN where the cell is a missing mark; None where a problem was recorded. Infinite and
        not-a-number cells count as problems.
    """
    if reading.decimal == "." and not any(_parses(mark) for mark in reading.missing):
        try:
            values = pc.cast(column, pa.float64()).to_numpy(zero_copy_only=False)
        except pa.ArrowInvalid:
            pass
        else:
            if np.isfinite(values).all():
                return np.asarray(values, dtype=np.float64)
    trimmed = pc.utf8_trim_whitespace(column)
    marks = {unicodedata.normalize(form, m) for form in ("NFC", "NFD") for m in reading.missing}
    absent = pc.is_in(trimmed, value_set=pa.array(sorted(marks), pa.string()))
    pointed = trimmed
    if reading.decimal == ",":
        # A point in a column of decimal commas is a thousands sign or a slip: never guess which.
        spoiled = pc.replace_substring(trimmed, ".", "?")
        pointed = pc.replace_substring(spoiled, ",", ".", max_replacements=1)
    good = pc.match_substring_regex(pointed, _NUMBER)
    bad = pc.and_not(pc.invert(good), absent)
    wrong = np.flatnonzero(bad.to_numpy(zero_copy_only=False))
    if not wrong.size:
        values = _cast(pointed, absent)
        wrong = np.flatnonzero(np.isinf(values))
    for row in wrong.tolist():
        cell = column[row].as_py()
        findings.error(
            "this is no number",
            path=reading.shown,
            line=int(reading.lines[row]),
            where=f'column "{name}"',
            found=cell,
            expected=expected,
            fix=_way_out(cell, reading.decimal),
        )
    return None if wrong.size else values


def find_decimal(
    columns: dict[str, pa.Array], shown: str, line_of: Callable[[int], int], findings: Findings
) -> str | None:
    """Find out the decimal sign of a file from its columns of numbers.

    Parameters
    ----------
    columns : dict of name to (n,) pa.Array of text
        The columns that should hold numbers.
    shown : str
        The file, for messages.
    line_of : callable
        Row index to line.
    findings : Findings
        Where a file that cannot be decided is recorded.

    Returns
    -------
    {".", ","} or None
        None where both signs occur, or where a comma could as well mark thousands.
    """
    commas: dict[str, int] = {}
    points: dict[str, int] = {}
    grouped = True
    if not any(_may_hold(column, b",") for column in columns.values()):
        return "."
    for name, column in columns.items():
        with_comma = pc.match_substring(column, ",")
        with_point = pc.match_substring_regex(column, r"[0-9]\.[0-9]")
        if pc.any(with_comma).as_py():
            commas[name] = pc.index(with_comma, value=True).as_py()
            cells = pc.utf8_trim_whitespace(column.filter(with_comma))
            grouped = grouped and pc.all(pc.match_substring_regex(cells, _GROUPED)).as_py()
        if pc.any(with_point).as_py():
            points[name] = pc.index(with_point, value=True).as_py()
    if not commas:
        return "."
    name, row = next(iter(commas.items()))
    if points:
        other, other_row = next(iter(points.items()))
        findings.error(
            "the numbers have commas and points, so the decimal sign cannot be told "
            f'(a point in column "{other}", line {line_of(other_row)})',
            path=shown,
            line=line_of(row),
            where=f'column "{name}"',
            found=columns[name][row].as_py(),
            expected="one decimal sign in the whole file",
            fix='state decimal = "." or "," in [logs], and write numbers without thousands signs',
        )
        return None
    if grouped:
        findings.error(
            "the comma could be a decimal sign or a thousands sign",
            path=shown,
            line=line_of(row),
            where=f'column "{name}"',
            found=columns[name][row].as_py(),
            expected="numbers that can be read in one way only",
            fix='state decimal = "," in [logs] if it is the decimal sign; otherwise write the '
            "numbers without thousands signs",
        )
        return None
    return ","


def _may_hold(column: pa.Array, sign: bytes) -> bool:
    """Whether a sign can occur in a column: a look at its bytes, without one at its cells."""
    texts = column.buffers()[2]
    return texts is not None and sign in bytes(texts)


def _way_out(cell: str, decimal: str) -> str:
    """What to do about a cell that is no number."""
    if _SPOILED.fullmatch(cell.strip()):
        return (
            f'the log is read with "{decimal}" as decimal sign and without thousands signs: '
            "correct the cell, or [logs] decimal in the study file"
        )
    return "correct the cell, or add the word to [logs] missing if it stands for no value"


def _parses(text: str) -> bool:
    """Whether a missing mark would also pass for a number."""
    try:
        float(text)
    except ValueError:
        return False
    return True


def _cast(pointed: pa.Array, absent: pa.Array) -> NDArray[np.float64]:
    """The cells as numbers, NaN where absent."""
    cells = pc.if_else(absent, pa.scalar(None, pa.string()), pointed)
    # Arrow's own conversion knows no leading plus sign.
    cells = pc.replace_substring_regex(cells, r"^\+", "")
    values = pc.cast(cells, pa.float64()).to_numpy(zero_copy_only=False)
    return np.asarray(values, dtype=np.float64)
