"""Delimited text into columns of text cells, each row with its true line in the file.

A file without quote characters goes through pyarrow's reader; one with quotes through the reader
of the standard library, which tells where a record that spans lines begins. Both give the same
cells. Where a row does not have as many fields as the header, all such rows are named.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray
from pyarrow import csv as arrow_csv

from etl.errors import Findings
from etl.files.decoding import RawText, read_text
from etl.files.headers import (
    COMMENT,
    Header,
    Remarks,
    blanks,
    find_header,
    header_is_usable,
    spelled,
)
from etl.files.quoted import RecordLines, split_quoted

#: The longest piece of text, in bytes, that pyarrow's reader is given; it takes 32-bit sizes.
_LARGEST_BLOCK = 1 << 30


@dataclass(frozen=True, slots=True)
class Cells:
    """The cells of a delimited file.

    Attributes
    ----------
    shown : str
        The file as the user would name it.
    header : tuple of str
        Column names, trimmed.
    header_line : int
        Line of the header.
    table : pa.Table
        The columns that were asked for, as text, nothing trimmed or replaced; those without a
        name are left out.
    lines : (n,) int32 array
        The line on which each row begins, from 1.
    delimiter : str
        The separator of fields.
    text : RawText
        Where the cells came from (digest, encoding).
    comments : int
        Comment lines below the header.
    comments_like_rows : int
        Those of them that have as many fields as the header.
    """

    shown: str
    header: tuple[str, ...]
    header_line: int
    table: pa.Table
    lines: NDArray[np.int32]
    delimiter: str
    text: RawText
    comments: int = 0
    comments_like_rows: int = 0

    def __len__(self) -> int:
        return len(self.lines)

    def column(self, name: str) -> pa.Array:
        """One column as a single array of text."""
        column = self.table.column(name)
        return column.chunk(0) if column.num_chunks == 1 else column.combine_chunks()

    def texts(self, name: str) -> list[str]:
        """One column as strings, a string per row: trimmed, composed (Unicode NFC)."""
        return [unicodedata.normalize("NFC", t.strip()) for t in self.column(name).to_pylist()]

    def position(self, name: str) -> int:
        """Where the column stands in the file, from 1."""
        return self.header.index(name) + 1


def read_cells(
    path: Path,
    shown: str,
    findings: Findings,
    *,
    delimiter: str | None = None,
    encoding: str | None = None,
) -> Cells | None:
    """Read a delimited text file, plain or gzipped, with all its columns.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    findings : Findings
        Where problems are recorded.
    delimiter, encoding : str, optional
        Found out where absent.

    Returns
    -------
    Cells or None
        None where a problem was recorded.

    References
    ----------
    Well-formed files: RFC 4180 (Shafranovich 2005), with other separators and comment lines.
    """
    text = read_text(path, shown, findings, encoding=encoding)
    return None if text is None else cells_of(text, findings, delimiter=delimiter)


def cells_of(
    text: RawText,
    findings: Findings,
    *,
    delimiter: str | None = None,
    needed: Sequence[str] | None = None,
    wary: bool = False,
) -> Cells | None:
    """Split text into cells.

    Parameters
    ----------
    text : RawText
        From :func:`etl.files.read_text`.
    findings : Findings
        Where problems are recorded.
    delimiter : str, optional
        Found out where absent.
    needed : sequence of str, optional
        Only these columns are kept; one that the header lacks is an error.
    wary : bool
        Whether it is an error that a cell in quotes holds a line which would be a row by itself:
        in a log, whose cells are words and numbers, a quote mark is then missing.

    Returns
    -------
    Cells or None
        None where a problem was recorded.
    """
    header = find_header(text.data, delimiter)
    if not header_is_usable(header, text.data, text.shown, findings, needed):
        return None
    # A column without a name can never be asked for.
    wanted = tuple(name for name in dict.fromkeys(needed or header.names) if name)
    body = text.data[header.body :]
    if b'"' in body:
        read = _quoted(body, header, wanted, (text.shown, wary), findings)
    else:
        read = _plain(body, header, wanted, text.shown, findings)
    if read is None:
        return None
    alike = read.remarks.alike
    if alike:
        count = len(alike)
        findings.warning(
            f"{count:,} lines begin with # and have as many fields as the header"
            if count > 1
            else "a line begins with # and has as many fields as the header",
            path=text.shown,
            line=alike[0],
            expected="remarks, which are not read",
            fix="if this is a row, put its first cell in quotes",
        )
    return Cells(
        text.shown,
        header.names,
        header.line,
        read.table,
        read.lines,
        header.separator,
        text,
        read.remarks.count,
        len(alike),
    )


def header_of(text: RawText, delimiter: str | None = None) -> tuple[str, ...]:
    """The column names of a delimited text, without reading its rows.

    Parameters
    ----------
    text : RawText
        From :func:`etl.files.read_text`.
    delimiter : str, optional
        Found out where absent.

    Returns
    -------
    tuple of str
        The names, trimmed.
    """
    return find_header(text.data, delimiter).names


@dataclass(frozen=True, slots=True)
class _Rows:
    """What was read below the header: columns, the line of each row, the comments."""

    table: pa.Table
    lines: NDArray[np.int32]
    remarks: Remarks


def _data_lines(body: bytes, header: Header) -> tuple[bytes, NDArray[np.int32], Remarks]:
    """The body's data lines, their numbers in the file, and its comments."""
    count = body.count(b"\n") + (0 if not body or body.endswith(b"\n") else 1)
    numbers = np.arange(header.first, header.first + count, dtype=np.int32)
    signs = blanks(header.separator)
    may_be_blank = body.startswith(b"\n") or b"\n\n" in body
    for sign in (signs[i : i + 1] for i in range(len(signs))):
        may_be_blank = may_be_blank or sign + b"\n" in body or body.endswith(sign)
    if not may_be_blank and COMMENT not in body:
        return body, numbers, Remarks()
    kept, remarks = [], Remarks()
    lines = body.split(b"\n")[:count]
    for number, line in enumerate(lines):
        content = line.lstrip(signs)
        if content.startswith(COMMENT):
            remarks.add(line.decode("utf-8"), int(numbers[number]), header)
        elif content:
            kept.append(number)
    return b"\n".join([lines[i] for i in kept]) + b"\n", numbers[kept], remarks


def _plain(
    body: bytes, header: Header, wanted: tuple[str, ...], shown: str, findings: Findings
) -> _Rows | None:
    """Split text without quotes by pyarrow's reader."""
    body, lines, remarks = _data_lines(body, header)
    if not len(lines):
        empty = pa.table({name: pa.array([], pa.string()) for name in wanted})
        return _Rows(empty, lines, remarks)
    try:
        table = arrow_csv.read_csv(
            pa.BufferReader(body),
            read_options=arrow_csv.ReadOptions(
                use_threads=False,
                column_names=[name or f"\x00{i}" for i, name in enumerate(header.names)],
                block_size=min(max(len(body) + 1, 1 << 16), _LARGEST_BLOCK),
            ),
            parse_options=arrow_csv.ParseOptions(
                delimiter=header.separator, quote_char=False, ignore_empty_lines=False
            ),
            convert_options=arrow_csv.ConvertOptions(
                include_columns=list(wanted),
                column_types={name: pa.string() for name in wanted},
                null_values=[],
                strings_can_be_null=False,
            ),
        )
    except pa.ArrowInvalid:
        table = None
    if table is not None and table.num_rows == len(lines):
        return _Rows(table, lines, remarks)
    separator = header.separator.encode("utf-8")
    widths = [line.count(separator) + 1 for line in body.split(b"\n")][: len(lines)]
    if not _tell_uneven(header, widths, lines.tolist(), shown, findings):
        findings.error(
            "the table cannot be split into rows and columns",
            path=shown,
            expected=f"rows of {len(header.names)} fields separated by {spelled(header.separator)}",
            fix="open the file in a text editor and look for a damaged line",
        )
    return None


def _tell_uneven(
    header: Header, widths: Sequence[int], lines: Sequence[int], shown: str, findings: Findings
) -> bool:
    """Record the rows that have more or fewer fields than the header; False if there are none."""
    width = len(header.names)
    if len(widths) > 1 and set(widths) != {width} and len(set(widths)) == 1:
        findings.error(
            "the header has another number of fields than every row",
            path=shown,
            line=header.line,
            found=f"{width} in the header, {widths[0]} in each row",
            expected=f"as many names, separated by {spelled(header.separator)}, as fields in a row",
            fix="complete the header, or remove the name that is too much",
        )
        return True
    even = True
    for line, fields in zip(lines, widths, strict=True):
        if fields == width:
            continue
        even = False
        findings.error(
            "the row has too few fields" if fields < width else "the row has too many fields",
            path=shown,
            line=line,
            found=f"{fields} field{'' if fields == 1 else 's'}",
            expected=f"{width} fields, as in the header",
            fix="complete the row, or remove what is too much; a cell that holds the separator "
            "must stand in quotes",
        )
    return not even


def _quoted(
    body: bytes,
    header: Header,
    wanted: tuple[str, ...],
    manner: tuple[str, bool],
    findings: Findings,
) -> _Rows | None:
    """Split text with quoted cells; ``manner``: the file's name, and whether to be wary."""
    shown, wary = manner
    source = RecordLines(body.decode("utf-8"), header)
    split = split_quoted(source, header, shown, findings)
    if split is None:
        return None
    rows, lines = split
    if wary and source.swallowed:
        for opened, number in source.swallowed:
            findings.error(
                "a quoted cell holds whole rows",
                path=shown,
                line=opened,
                expected=f'a second quote mark " before line {number}, which has as many fields '
                "as a row",
                fix="close or double the quote mark in this line",
            )
        return None
    if _tell_uneven(header, [len(row) for row in rows], lines, shown, findings):
        return None
    places = [header.names.index(name) for name in wanted]
    columns = [pa.array([row[place] for row in rows], pa.string()) for place in places]
    return _Rows(
        pa.table(columns, names=list(wanted)), np.asarray(lines, dtype=np.int32), source.remarks
    )
