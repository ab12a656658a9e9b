"""Delimited text into columns of text cells, each row with its true line in the file.

A file without quote characters goes through pyarrow's reader; one with quotes through the reader
of the standard library, which tells where a record that spans lines begins. Both give the same
cells. Where a row does not have as many fields as the header, all such rows are named.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files.decoding import RawText, read_text
from etl.files.header_faults import header_is_usable
from etl.files.headers import REMARKS, Header, find_header
from etl.files.line_account import line_account
from etl.files.loose_quotes import split_loosely
from etl.files.plain import read_plain
from etl.files.quoted import Split, split_quoted
from etl.files.repeats import Marks, repeated_headers, tell_strange_marks, without_marks
from etl.files.rows import Rows, Uneven, tell_uneven
from etl.files.stray_quotes import cells_open, stray_marks
from etl.files.tally import FileAccount, Tally
from etl.files.units import own_names


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
    account : FileAccount
        What became of every line of the file; rows are counted as ``"rows"``.
    ends_open : bool
        Whether the last line has no line end, as where a file was cut.
    comments : int
        Remarks below the header.
    comments_like_rows : int
        Those of them that have as many fields as the header.
    below_headers : tuple of int
        The rows, from 0, that come first below the header or below one that repeats it.
    """

    shown: str
    header: tuple[str, ...]
    header_line: int
    table: pa.Table
    lines: NDArray[np.int32]
    delimiter: str
    text: RawText
    account: FileAccount = field(default_factory=FileAccount)
    ends_open: bool = False
    comments: int = 0
    comments_like_rows: int = 0
    below_headers: tuple[int, ...] = (0,)

    def __len__(self) -> int:
        return len(self.lines)

    def column(self, name: str) -> pa.Array:
        """One column as a single array of text."""
        column = self.table.column(name)
        return column.chunk(0) if column.num_chunks == 1 else column.combine_chunks()

    def without(self, rows: Sequence[int], fate: str) -> Cells:
        """The cells but for some rows below headers, counted under a fate of their own."""
        if not rows:
            return self
        kept = np.ones(len(self), dtype=bool)
        kept[list(rows)] = False
        self.account.move("rows", fate, len(rows), int(self.lines[rows[0]]))
        own = self.account.lines.get("rows")
        if own is not None:
            own.first_line = int(self.lines[kept][0])
        table = self.table.filter(pa.array(kept))
        return replace(self, table=table, lines=self.lines[kept], below_headers=())

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
    remarks: Sequence[str] = REMARKS,
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
        Only these columns are kept; one that the header lacks is an error. A column that the file
        names with a known unit in brackets may be asked for without it.
    wary : bool
        Whether the rows are those of a log, whose cells are words and numbers. It is then an error
        that a cell in quotes holds a line which would be a row by itself, for a quote mark is
        missing; and a header may be repeated among the rows where files were put together.
    remarks : sequence of str
        What a line begins with that is a remark.

    Returns
    -------
    Cells or None
        None where a problem was recorded.
    """
    data, marks = without_marks(text.data) if wary else (text.data, Marks([], []))
    if marks.within:
        tell_strange_marks(marks.within, text.shown, findings)
        return None
    header = find_header(data, delimiter, needed or (), remarks)
    if not header_is_usable(header, data, text.shown, findings, needed):
        return None
    # A column without a name can never be asked for.
    asked = header.names if needed is None else own_names(needed, header.names).values()
    wanted = tuple(name for name in dict.fromkeys(asked) if name)
    body = data[header.body :]
    if b'"' in body:
        rows = _quoted(body, header, wanted, (text.shown, wary), findings)
    else:
        rows = read_plain(body, header, wanted, text.shown, findings)
    if rows is None:
        return None
    repeated = (
        repeated_headers(rows, header, data, text.shown, findings)
        if wary
        else np.zeros(0, dtype=np.int64)
    )
    if repeated is None:
        return None
    account = line_account(rows, header, data, rows.lines[repeated])
    if marks.beginning:
        aside = {*rows.aside.blank, *rows.aside.remarks, *rows.lines[repeated].tolist()}
        explained = {*aside, *range(1, header.first)}
        strange = [number for number in marks.beginning if number not in explained]
        if strange:
            tell_strange_marks(strange, text.shown, findings)
            return None
        account.repaired(
            "byte-order marks within the file", len(marks.beginning), marks.beginning[0]
        )
    if len(repeated):
        rows = rows.without(repeated)
    _tell_doubts(rows, header, text.shown, findings, wary=wary)
    return Cells(
        text.shown,
        header.names,
        header.line,
        rows.table,
        rows.lines,
        header.separator,
        text,
        account,
        not data.endswith(b"\n"),
        len(rows.aside.remarks),
        len(rows.aside.alike),
        # Each header that is taken out moves what is below it up by one.
        tuple(dict.fromkeys([0, *(repeated - np.arange(len(repeated))).tolist()])),
    )


def header_of(
    text: RawText,
    delimiter: str | None = None,
    *,
    needed: Sequence[str] = (),
    remarks: Sequence[str] = REMARKS,
) -> tuple[str, ...]:
    """The column names of a delimited text, without reading its rows.

    Parameters
    ----------
    text : RawText
        From :func:`etl.files.read_text`.
    delimiter : str, optional
        Found out where absent.
    needed : sequence of str
        Columns that the header must have, as for :func:`cells_of`.
    remarks : sequence of str
        What a line begins with that is a remark.

    Returns
    -------
    tuple of str
        The names, trimmed.
    """
    data = without_marks(text.data)[0] if needed else text.data
    return find_header(data, delimiter, needed, remarks).names


def _tell_doubts(rows: Rows, header: Header, shown: str, findings: Findings, *, wary: bool) -> None:
    """Warn of what may have been meant otherwise."""
    alike = rows.aside.alike
    if alike:
        tell_alike(len(alike), alike[0], header, shown, findings)
    if rows.mended.count and not wary:
        findings.warning(
            "quote marks inside a cell are not doubled; they were taken as they stand",
            path=shown,
            line=rows.mended.first_line,
            fix="check the cells, and double the quote marks inside them",
        )
    if rows.stray.count and not wary:
        findings.warning(
            "a cell without quotes holds quote marks; they were taken as they stand",
            path=shown,
            line=rows.stray.first_line,
            expected='a quote mark " on both sides of a cell, as others have, or in none',
            fix="check the cell: a quote mark may be lost",
        )


def tell_alike(
    count: int, first_line: int | None, header: Header, shown: str, findings: Findings
) -> None:
    """Warn of remarks that may have been meant as rows.

    Parameters
    ----------
    count : int
        How many there are, at least one.
    first_line : int or None
        Where the first one is.
    header : Header
        The header.
    shown : str
        The file's name for messages.
    findings : Findings
        Where it is recorded.
    """
    sign = " or ".join(header.remarks)
    findings.warning(
        f"{count:,} lines begin with {sign} and have as many fields as the header"
        if count > 1
        else f"a line begins with {sign} and has as many fields as the header",
        path=shown,
        line=first_line,
        expected="remarks, which are not read",
        fix="if this is a row, put its first cell in quotes",
    )


def _quoted(
    body: bytes,
    header: Header,
    wanted: tuple[str, ...],
    manner: tuple[str, bool],
    findings: Findings,
) -> Rows | None:
    """Split text with quoted cells; ``manner``: the file's name, and whether to be wary."""
    shown, wary = manner
    text = body.decode("utf-8")
    places = [header.names.index(name) for name in wanted]
    own = Findings()
    split = split_quoted(text, header, places, shown, own)
    if split is None or split.uneven or (wary and split.spanning):
        # In a log, a row of several lines is doubtful where each of them is a row by itself.
        loose = split_loosely(text, header, places, wary=wary)
        if loose is not None:
            return columns_of(loose, text, wanted)
    if split is None:
        findings.extend(own)
        return None
    if wary and split.swallowed:
        for opened, number in split.swallowed:
            findings.error(
                "a quoted cell holds whole rows",
                path=shown,
                line=opened,
                expected=f'a second quote mark " before line {number}, which has as many fields '
                "as a row",
                fix="close or double the quote mark in this line",
            )
        return None
    uneven = Uneven.of(split.uneven, len(split.rows) + len(split.uneven))
    if tell_uneven(header, uneven, shown, findings):
        return None
    if cells_open(text, header.separator):  # else marks mean nothing in this file
        split.stray = stray_marks(body, text, header, split)
    return columns_of(split, text, wanted)


def columns_of(split: Split, text: str, wanted: tuple[str, ...]) -> Rows:
    """Rows as columns.

    Parameters
    ----------
    split : Split
        The rows.
    text : str
        What was split.
    wanted : tuple of str
        The names of the cells that were kept.

    Returns
    -------
    Rows
    """
    by_column = list(zip(*split.rows, strict=True)) or [()] * len(wanted)
    height = text.count("\n") + (not text.endswith("\n") and bool(text))
    mended, stray = (
        Tally(len(lines), lines[0] if lines else None) for lines in (split.mended, split.stray)
    )
    return Rows(
        pa.table([pa.array(cells, pa.string()) for cells in by_column], names=list(wanted)),
        np.asarray(split.lines, dtype=np.int32),
        height,
        split.aside,
        mended,
        stray,
    )
