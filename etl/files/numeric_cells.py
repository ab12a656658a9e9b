"""Text cells into numbers, with every cell that is none named by its line."""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Callable, Collection, Iterable
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
    return decimal_signs(columns, line_of).decide(shown, findings)


@dataclass(frozen=True, slots=True)
class DecimalSigns:
    """The signs in the columns of numbers of a file, or of a part of it.

    Attributes
    ----------
    commas : dict of str to (int, str)
        For each column with a comma, line and text of the first such cell.
    points : dict of str to int
        For each column with a point between digits, the line of the first such cell; may be empty
        where there is no comma.
    grouped : bool
        Whether all commas may be thousands signs.
    """

    commas: dict[str, tuple[int, str]]
    points: dict[str, int]
    grouped: bool = True

    def joined(self, below: DecimalSigns, order: Iterable[str]) -> DecimalSigns:
        """The signs of this part and of the one below it; columns in their order."""
        commas = {**below.commas, **self.commas}
        points = {**below.points, **self.points}
        return DecimalSigns(
            {name: commas[name] for name in order if name in commas},
            {name: points[name] for name in order if name in points},
            self.grouped and below.grouped,
        )

    def decide(self, shown: str, findings: Findings) -> str | None:
        """The decimal sign; see :func:`find_decimal`."""
        if not self.commas:
            return "."
        name, (line, cell) = next(iter(self.commas.items()))
        if self.points:
            other, other_line = next(iter(self.points.items()))
            findings.error(
                "the numbers have commas and points, so the decimal sign cannot be told "
                f'(a point in column "{other}", line {other_line})',
                path=shown,
                line=line,
                where=f'column "{name}"',
                found=cell,
                expected="one decimal sign in the whole file",
                fix='state decimal = "." or "," in [logs], and write numbers without thousands '
                "signs",
            )
            return None
        if self.grouped:
            findings.error(
                "the comma could be a decimal sign or a thousands sign",
                path=shown,
                line=line,
                where=f'column "{name}"',
                found=cell,
                expected="numbers that can be read in one way only",
                fix='state decimal = "," in [logs] if it is the decimal sign; otherwise write the '
                "numbers without thousands signs",
            )
            return None
        return ","


def decimal_signs(
    columns: dict[str, pa.Array], line_of: Callable[[int], int], *, points: bool = False
) -> DecimalSigns:
    """Look for decimal signs in columns of numbers.

    Parameters
    ----------
    columns : dict of name to (n,) pa.Array of text
        The columns that should hold numbers.
    line_of : callable
        Row index to line.
    points : bool
        Whether points matter even where there is no comma, as in a part of a file.

    Returns
    -------
    DecimalSigns
    """
    found = DecimalSigns({}, {})
    if not points and not any(_may_hold(column, b",") for column in columns.values()):
        return found
    grouped = True
    for name, column in columns.items():
        if _may_hold(column, b","):
            with_comma = pc.match_substring(column, ",")
            if pc.any(with_comma).as_py():
                row = pc.index(with_comma, value=True).as_py()
                found.commas[name] = (line_of(row), column[row].as_py())
                cells = pc.utf8_trim_whitespace(column.filter(with_comma))
                grouped = grouped and pc.all(pc.match_substring_regex(cells, _GROUPED)).as_py()
        row = _first_point(column)
        if row >= 0:
            found.points[name] = line_of(row)
    return DecimalSigns(found.commas, found.points, grouped)


def _first_point(column: pa.Array) -> int:
    """The first row with a point between digits; -1 where there is none."""
    if not _may_hold(column, b"."):
        return -1
    # Most often it is one of the first.
    for part in (column.slice(0, 1000), column):
        row = pc.index(pc.match_substring_regex(part, r"[0-9]\.[0-9]"), value=True).as_py()
        if row >= 0:
            return int(row)
    return -1


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
