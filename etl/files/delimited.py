"""Delimited text into columns of text cells, each row with its true line in the file.

A file without quote characters goes through pyarrow's reader; one with quotes through the reader
of the standard library, which tells where a record that spans lines begins. Both give the same
cells. Where a row does not have as many fields as the header, all such rows are named.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray
from pyarrow import csv as arrow_csv

from etl.errors import Findings
from etl.files.decoding import RawText, read_text

#: Field separators that are recognised, in order of preference where two fit equally well.
SEPARATORS = ("\t", ";", ",", "|", " ")
#: A line that begins so is a comment (common practice, no source).
COMMENT = b"#"
_SAMPLE_LINES = 50
#: The longest single cell the standard reader accepts; a longer one is a missing quote mark.
_LONGEST_CELL = 1_000_000


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
        The columns that were asked for, as text, nothing trimmed or replaced.
    lines : (n,) int32 array
        The line on which each row begins, from 1.
    delimiter : str
        The separator of fields.
    text : RawText
        Where the cells came from (digest, encoding).
    """

    shown: str
    header: tuple[str, ...]
    header_line: int
    table: pa.Table
    lines: NDArray[np.int32]
    delimiter: str
    text: RawText

    def __len__(self) -> int:
        return len(self.lines)

    def column(self, name: str) -> pa.Array:
        """One column as a single array of text."""
        column = self.table.column(name)
        return column.chunk(0) if column.num_chunks == 1 else column.combine_chunks()

    def texts(self, name: str) -> list[str]:
        """One column as trimmed strings, a string per row."""
        texts: list[str] = pc.utf8_trim_whitespace(self.column(name)).to_pylist()
        return texts

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

    Returns
    -------
    Cells or None
        None where a problem was recorded.
    """
    start, line = _first_line(text.data)
    end = text.data.find(b"\n", start)
    end = len(text.data) if end < 0 else end
    sample = _sample(text.data[start:])
    separator = delimiter or _separator_of(sample)
    header, spans = _header(sample, separator)
    if not _header_is_usable(header, line, text, separator, findings, needed):
        return None
    wanted = tuple(dict.fromkeys(needed)) if needed is not None else header
    body = text.data[_skip_lines(text.data, start, spans) :]
    first = line + spans
    if b'"' in text.data:
        read = _quoted(body, header, first, separator, text.shown, findings)
        if read is None:
            return None
        table, lines = read
        table = table.select(list(wanted))
    else:
        body, lines = _without_blank_and_comment_lines(body, first)
        try:
            table = _plain(body, header, wanted, separator)
        except pa.ArrowInvalid:
            table = None
        if table is None or table.num_rows != len(lines):
            _name_uneven_rows(body, lines, len(header), separator, text.shown, findings)
            return None
    return Cells(text.shown, header, line, table, lines, separator, text)


def header_of(text: RawText, delimiter: str | None = None) -> tuple[str, ...]:
    """The column names of a delimited text, trimmed, without reading its rows."""
    start, _ = _first_line(text.data)
    sample = _sample(text.data[start:])
    return _header(sample, delimiter or _separator_of(sample))[0]


def _first_line(data: bytes) -> tuple[int, int]:
    """Offset and number of the first line that is neither blank nor a comment."""
    start, line = 0, 1
    while start < len(data):
        end = data.find(b"\n", start)
        end = len(data) if end < 0 else end
        content = data[start:end].strip()
        if content and not content.startswith(COMMENT):
            return start, line
        start, line = end + 1, line + 1
    return len(data), line


def _skip_lines(data: bytes, start: int, count: int) -> int:
    """Offset after ``count`` lines from ``start``."""
    for _ in range(count):
        end = data.find(b"\n", start)
        if end < 0:
            return len(data)
        start = end + 1
    return start


def _sample(data: bytes) -> str:
    """The first lines, for finding out the separator."""
    return data[: _skip_lines(data, 0, _SAMPLE_LINES)].decode("utf-8", errors="replace")


def _separator_of(sample: str) -> str:
    """The separator that splits the header, and the lines after it into as many fields."""
    best, best_score = "\t", (0.0, 0)
    for separator in SEPARATORS:
        if separator not in sample:
            continue
        try:
            rows = [row for row in csv.reader(io.StringIO(sample), delimiter=separator) if row]
        except csv.Error:
            continue
        width = len(rows[0]) if rows else 0
        if width < 2:
            continue
        even = sum(len(row) == width for row in rows) / len(rows)
        # A separator inside every cell (a decimal comma) splits rows but not the header; one that
        # splits both into equal parts is right. Blanks inside names are the weakest evidence.
        score = (even if separator != " " else even / 2, width)
        if score > best_score:
            best, best_score = separator, score
    return best


def _header(sample: str, separator: str) -> tuple[tuple[str, ...], int]:
    """The column names, and how many lines the header takes."""
    reader = csv.reader(io.StringIO(sample, newline=""), delimiter=separator)
    try:
        cells = next(reader, [])
    except csv.Error:
        cells = sample.split("\n", 1)[0].split(separator)
        return tuple(cell.strip() for cell in cells), 1
    return tuple(cell.strip() for cell in cells), max(reader.line_num, 1)


def _header_is_usable(
    header: tuple[str, ...],
    line: int,
    text: RawText,
    separator: str,
    findings: Findings,
    needed: Sequence[str] | None,
) -> bool:
    """Whether names are unique and every needed one is there; says what is wrong."""
    usable = True
    seen: dict[str, int] = {}
    for position, name in enumerate(header, start=1):
        if name and name in seen:
            usable = False
            findings.error(
                f"two columns have the same name, columns {seen[name]} and {position}",
                path=text.shown,
                line=line,
                found=name,
                expected="every column under a name of its own",
                fix="rename one of them in the file's header",
            )
        seen.setdefault(name, position)
    for name in dict.fromkeys(needed or ()):
        if name in seen:
            continue
        usable = False
        near = get_close_matches(name, [n for n in header if n], n=1, cutoff=0.6)
        listed = ", ".join(n for n in header if n)
        findings.error(
            f'there is no column "{name}"',
            path=text.shown,
            line=line,
            found=listed if len(listed) <= 200 else listed[:199] + "…",
            expected=f'a header, separated by {_spelled(separator)}, that has "{name}"',
            fix=(f'did you mean "{near[0]}"? ' if near else "")
            + "Write the header's own name in the study file, or correct the header",
        )
    return usable


def _spelled(separator: str) -> str:
    """A separator in words."""
    words = {"\t": "tabs", ";": "semicolons", ",": "commas", "|": "bars", " ": "blanks"}
    return words.get(separator, f'"{separator}"')


def _without_blank_and_comment_lines(body: bytes, first: int) -> tuple[bytes, NDArray[np.int32]]:
    """The body's data lines, and their numbers in the file."""
    count = body.count(b"\n") + (0 if not body or body.endswith(b"\n") else 1)
    numbers = np.arange(first, first + count, dtype=np.int32)
    blank = body.startswith(b"\n") or b"\n\n" in body or b" \n" in body or body.endswith(b" ")
    comment = body.startswith(COMMENT) or b"\n" + COMMENT in body
    if not (blank or comment):
        return body, numbers
    lines = body.split(b"\n")[:count]
    kept = [i for i, line in enumerate(lines) if line.strip(b" ") and not line.startswith(COMMENT)]
    return b"\n".join(lines[i] for i in kept) + b"\n", numbers[kept]


def _plain(body: bytes, header: tuple[str, ...], wanted: Sequence[str], separator: str) -> pa.Table:
    """Split text without quotes by pyarrow's reader; ArrowInvalid where rows are uneven."""
    if not body.strip(b"\n"):
        return pa.table({name: pa.array([], pa.string()) for name in wanted})
    # An empty name may stand several times in a header; it can never be asked for.
    names = [name or f"\x00{i}" for i, name in enumerate(header)]
    return arrow_csv.read_csv(
        pa.BufferReader(body),
        read_options=arrow_csv.ReadOptions(
            use_threads=False, column_names=names, block_size=max(len(body) + 1, 1 << 16)
        ),
        parse_options=arrow_csv.ParseOptions(
            delimiter=separator, quote_char=False, ignore_empty_lines=False
        ),
        convert_options=arrow_csv.ConvertOptions(
            include_columns=[name for name in wanted if name],
            column_types={name: pa.string() for name in wanted},
            null_values=[],
            strings_can_be_null=False,
        ),
    )


def _name_uneven_rows(
    body: bytes,
    lines: NDArray[np.int32],
    width: int,
    separator: str,
    shown: str,
    findings: Findings,
) -> None:
    """Record every row that has more or fewer fields than the header."""
    named = False
    for number, line in zip(lines.tolist(), body.split(b"\n"), strict=False):
        fields = line.count(separator.encode()) + 1
        if fields != width:
            named = True
            _uneven(shown, number, fields, width, findings)
    if not named:
        findings.error(
            "the table cannot be split into rows and columns",
            path=shown,
            expected=f"rows of {width} fields separated by {_spelled(separator)}",
            fix="open the file in a text editor and look for a damaged line",
        )


def _uneven(shown: str, line: int, fields: int, width: int, findings: Findings) -> None:
    """Record one row that has more or fewer fields than the header."""
    findings.error(
        "the row has too few fields" if fields < width else "the row has too many fields",
        path=shown,
        line=line,
        found=str(fields),
        expected=f"{width} fields, as in the header",
        fix="complete the row, or remove what is too much; a cell that holds the separator "
        "must stand in quotes",
    )


def _quoted(
    body: bytes,
    header: tuple[str, ...],
    first: int,
    separator: str,
    shown: str,
    findings: Findings,
) -> tuple[pa.Table, NDArray[np.int32]] | None:
    """Split text with quoted cells, by the standard library's reader."""
    source = _RecordLines(body.decode("utf-8"), first)
    csv.field_size_limit(_LONGEST_CELL)
    reader = csv.reader(source, delimiter=separator, strict=True)
    rows: list[list[str]] = []
    lines: list[int] = []
    width, even = len(header), True
    while True:
        source.begin()
        try:
            row = next(reader, None)
        except csv.Error as why:
            unclosed = "unexpected end" in str(why) or "field larger" in str(why)
            findings.error(
                "a quote mark is never closed" if unclosed else "a quoted cell is broken",
                path=shown,
                line=source.began,
                expected='a quote mark " on both sides of a cell, and doubled inside it',
                fix="close or double the quote mark in this line",
            )
            return None
        if row is None:
            break
        if len(row) != width:
            even = False
            _uneven(shown, source.began, len(row), width, findings)
            continue
        rows.append(row)
        lines.append(source.began)
    if not even:
        return None
    names = [name or f"\x00{i}" for i, name in enumerate(header)]
    columns = list(zip(*rows, strict=True)) if rows else [()] * width
    arrays = [pa.array(column, pa.string()) for column in columns]
    return pa.table(arrays, names=names), np.asarray(lines, dtype=np.int32)


class _RecordLines:
    """Lines for the standard reader; between records it steps over blank and comment lines."""

    def __init__(self, text: str, first: int) -> None:
        self._lines = iter(io.StringIO(text, newline="\n"))
        self._number = first - 1
        self._between = True
        self.began = first

    def begin(self) -> None:
        """The next line begins a record."""
        self._between = True

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        while True:
            line = next(self._lines)
            self._number += 1
            if not self._between:
                return line
            if line.strip(" \n") and not line.startswith(COMMENT.decode()):
                self._between = False
                self.began = self._number
                return line
