"""Rows with quoted cells, by the standard library's reader, each with the line it begins on."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from contextlib import contextmanager

from etl.errors import Findings
from etl.files.headers import COMMENT, Header, Remarks, blanks, fields_in

#: The longest single cell the standard reader accepts; a longer one is a missing quote mark.
_LONGEST_CELL = 1_000_000


@contextmanager
def _longer_cells() -> Iterator[None]:
    """Let the standard reader take long cells; its limit is one for the whole process."""
    before = csv.field_size_limit(_LONGEST_CELL)
    try:
        yield
    finally:
        csv.field_size_limit(before)


def split_quoted(
    source: RecordLines, header: Header, shown: str, findings: Findings
) -> tuple[list[list[str]], list[int]] | None:
    """Split text into rows.

    Parameters
    ----------
    source : RecordLines
        The lines below the header.
    header : Header
        The header.
    shown : str
        The file's name for messages.
    findings : Findings
        Where a quote mark that is never closed, or a broken cell, is recorded.

    Returns
    -------
    rows and lines, or None
        The cells of each row, and the line on which it begins; None where a problem was recorded.
    """
    with _longer_cells():
        return _split(source, header, shown, findings)


def _split(
    source: RecordLines, header: Header, shown: str, findings: Findings
) -> tuple[list[list[str]], list[int]] | None:
    """Rows, and the lines on which they begin."""
    reader = csv.reader(source, delimiter=header.separator, strict=True)
    rows: list[list[str]] = []
    lines: list[int] = []
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
            return rows, lines
        rows.append(row)
        lines.append(source.began)


class RecordLines:
    """Lines for the standard reader; between records it steps over blank and comment lines.

    It also remembers, of every record that runs over a line that would be a row by itself, the
    line on which the quote mark opens and that line.
    """

    def __init__(self, text: str, header: Header) -> None:
        self._lines = iter(io.StringIO(text, newline="\n"))
        self._number = header.first - 1
        self._blanks = blanks(header.separator).decode()
        self._between = True
        self._header = header
        self._opened = header.first
        self.began = header.first
        self.remarks = Remarks()
        self.swallowed: list[tuple[int, int]] = []

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
                self._look_at(line)
                return line
            content = line.lstrip(self._blanks)
            if content.startswith(COMMENT.decode()):
                self.remarks.add(line, self._number, self._header)
            elif content.strip("\n"):
                self._between = False
                self.began = self._opened = self._number
                return line

    def _look_at(self, line: str) -> None:
        """See whether a line inside a cell would be a row by itself."""
        # What stands behind the mark that closes the cell is the rest of the record's own row.
        plain = line.replace('""', "")
        inside = plain.split('"', 1)[0]
        if fields_in(inside, self._header) == len(self._header.names) > 1 and (
            not self.swallowed or self.swallowed[-1][0] != self._opened
        ):
            self.swallowed.append((self._opened, self._number))
        marks = plain.count('"')
        if marks and marks % 2 == 0:  # one cell is closed, and another one opened
            self._opened = self._number
