"""Files that were put together: headers among the rows, and byte-order marks within the text."""

from __future__ import annotations

import csv
import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files.headers import BYTE_ORDER_MARK, Header
from etl.files.numeric_cells import number_of
from etl.files.rows import Rows
from etl.files.separators import composed, reader_of, split_line

_MARK = BYTE_ORDER_MARK.encode("utf-8")
#: Up to so many names are looked for one by one.
_FEW_NAMES = 50


@dataclass(frozen=True, slots=True)
class Marks:
    """Byte-order marks within a text.

    Attributes
    ----------
    beginning : list of int
        The lines that begin with one.
    within : list of int
        The lines that have one elsewhere.
    """

    beginning: list[int]
    within: list[int]


def without_marks(data: bytes) -> tuple[bytes, Marks]:
    r"""A text without the byte-order marks with which its lines begin.

    Parameters
    ----------
    data : bytes
        The text: UTF-8, line feeds, without the mark with which a file may begin.

    Returns
    -------
    bytes and Marks

    Examples
    --------
    >>> without_marks("a\n\ufeffb\n".encode("utf-8"))
    (b'a\nb\n', Marks(beginning=[2], within=[]))
    """
    marks = Marks([], [])
    if _MARK[:1] not in data or _MARK not in data:
        return data, marks
    lines = data.split(b"\n")
    for number, line in enumerate(lines, start=1):
        if line.startswith(_MARK):
            marks.beginning.append(number)
            while line.startswith(_MARK):
                line = line.removeprefix(_MARK)
            lines[number - 1] = line
        if _MARK in line:
            marks.within.append(number)
    return b"\n".join(lines), marks


def tell_strange_marks(lines: Iterable[int], shown: str, findings: Findings) -> None:
    """Record byte-order marks elsewhere than where a file begins that was put behind another.

    Parameters
    ----------
    lines : iterable of int
        The lines that have one.
    shown : str
        The file's name for messages.
    findings : Findings
        Where they are recorded.
    """
    for number in lines:
        findings.error(
            "a byte-order mark stands in the middle of the file",
            path=shown,
            line=number,
            expected="one at the file's beginning, or before a header that is repeated",
            fix="remove the mark; if files were put together, give each a file of its own",
        )


def repeated_headers(
    rows: Rows, header: Header, data: bytes, shown: str, findings: Findings, *, first: int = 1
) -> NDArray[np.int64] | None:
    """The rows that repeat the header, as where files were put together.

    Parameters
    ----------
    rows : Rows
        What was read, with the columns that are needed.
    header : Header
        The header.
    data : bytes
        The text.
    shown : str
        The file's name for messages.
    findings : Findings
        Where a row is recorded that is a header of another kind: two of its cells are names of
        columns, and none is a number.
    first : int
        The number of the first line of the text.

    Returns
    -------
    (n,) int64 array or None
        Indices of rows; None where a problem was recorded.
    """
    columns = {name: rows.table.column(name) for name in rows.table.column_names}
    doubtful = _like_headers(columns, header) if _may_hold_one(columns, header) else []
    if not len(doubtful):
        return np.zeros(0, dtype=np.int64)
    lines = data.split(b"\n")
    same = []
    sound = True
    for row in doubtful:
        number = int(rows.lines[row])
        # The names of a header may hold line breaks.
        record = lines[number - first : number - first + header.height]
        cells = _cells(record, header.separator)
        if cells == list(header.names):
            same.append(row)
            continue
        sound = False
        findings.error(
            "a second header differs from the first",
            path=shown,
            line=number,
            found=", ".join(cells),
            expected=f"the header of line {header.line} again, or rows",
            fix="these are two tables in one file: give each a file of its own",
        )
    return np.array(same, dtype=np.int64) if sound else None


def _cells(record: Sequence[bytes], separator: str) -> list[str]:
    """The cells of a header."""
    texts = [line.decode("utf-8") + "\n" for line in record]
    try:
        cells = next(reader_of(texts, separator, strict=False), [])
    except csv.Error:
        cells = split_line("".join(texts), separator)
    return [composed(cell) for cell in cells]


def _may_hold_one(columns: dict[str, pa.ChunkedArray], header: Header) -> bool:
    """Whether any row may be a header: a look at the bytes, which is quick.

    A header with the same names in their places has each name in its own column; one with the
    names in other places has some name in every column, so also in the smallest.
    """
    texts = {name: _bytes_of(column) for name, column in columns.items()}
    if not texts or any(_holds(text, name) for name, text in texts.items()):
        return bool(texts)
    smallest = min(texts, key=lambda name: len(texts[name]))
    if len(header.names) <= _FEW_NAMES:
        return any(_holds(texts[smallest], name) for name in header.names if name)
    names = pa.array([name for name in header.names if name], pa.string())
    return bool(pc.any(pc.is_in(columns[smallest], value_set=names)).as_py())


def _bytes_of(column: pa.ChunkedArray) -> bytes:
    """The texts of a column, one behind the other."""
    buffers = [chunk.buffers()[2] for chunk in column.chunks]
    return b"".join([bytes(texts) for texts in buffers if texts is not None])


def _holds(text: bytes, name: str) -> bool:
    """Whether a name occurs in a text."""
    forms = (name,) if name.isascii() else (name, unicodedata.normalize("NFD", name))
    sought = [form.encode("utf-8") for form in forms]
    # Most columns are numbers: one letter is looked for quicker than a word.
    return any(form[:1] in text and form in text for form in sought)


def _like_headers(columns: dict[str, pa.ChunkedArray], header: Header) -> list[int]:
    """The rows of which two cells are names of columns, and none is a number."""
    names = pa.array([name for name in header.names if name], pa.string())
    count = np.zeros(len(next(iter(columns.values()))), dtype=np.int32)
    trimmed = [
        pc.utf8_normalize(pc.utf8_trim_whitespace(column), "NFC") for column in columns.values()
    ]
    for column in trimmed:
        count += pc.is_in(column, value_set=names).to_numpy().astype(np.int32)
    rows = np.flatnonzero(count >= min(2, len(columns)))
    return [
        row
        for row in rows.tolist()
        if all(number_of(column[row].as_py().replace(",", ".")) is None for column in trimmed)
    ]
