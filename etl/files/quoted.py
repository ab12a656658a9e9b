"""Rows with quoted cells, by the standard library's reader, each with the line it begins on."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from operator import itemgetter

from etl.errors import Findings
from etl.files.headers import Header
from etl.files.rows import SetAside
from etl.files.separators import BLANK, fields_in, reader_of

#: The longest single cell the standard reader accepts; a longer one is a missing quote mark.
_LONGEST_CELL = 1_000_000


@contextmanager
def longer_cells() -> Iterator[None]:
    """Let the standard reader take long cells; its limit is one for the whole process."""
    before = csv.field_size_limit(_LONGEST_CELL)
    try:
        yield
    finally:
        csv.field_size_limit(before)


@dataclass(slots=True)
class Split:
    """Text split into rows, of which only some cells are kept.

    Attributes
    ----------
    rows : list of tuple of str
        The cells that were asked for.
    lines : list of int
        The line on which each row begins.
    uneven : list of (int, int)
        Line and number of fields of each row that has not as many as the header.
    aside : SetAside
        Lines between the rows.
    spanning : int
        How many rows run over a line's end.
    swallowed : list of (int, int)
        Of every row that runs over a line which would be a row by itself: the line on which the
        quote mark opens, and that line.
    mended : list of int
        The lines with quote marks that were not doubled.
    stray : list of int
        The lines with quote marks in a cell without quotes, where other cells have quotes.
    """

    rows: list[tuple[str, ...]] = field(default_factory=list)
    lines: list[int] = field(default_factory=list)
    uneven: list[tuple[int, int]] = field(default_factory=list)
    aside: SetAside = field(default_factory=SetAside)
    spanning: int = 0
    swallowed: list[tuple[int, int]] = field(default_factory=list)
    mended: list[int] = field(default_factory=list)
    stray: list[int] = field(default_factory=list)


def picker(places: Sequence[int]) -> Callable[[Sequence[str]], tuple[str, ...]]:
    """What takes some cells out of a row."""
    if len(places) == 1:
        only = places[0]
        return lambda row: (row[only],)
    return itemgetter(*places) if places else lambda _: ()


def split_quoted(
    text: str, header: Header, places: Sequence[int], shown: str, findings: Findings
) -> Split | None:
    """Split text into rows as the standard of quoted cells says.

    Parameters
    ----------
    text : str
        The lines below the header.
    header : Header
        The header.
    places : sequence of int
        Which cells of a row are kept.
    shown : str
        The file's name for messages.
    findings : Findings
        Where a quote mark that is never closed, or a broken cell, is recorded.

    Returns
    -------
    Split or None
        None where a problem was recorded. Rows that are uneven are no problem yet.

    References
    ----------
    RFC 4180 (Shafranovich 2005), section 2, rules 5 to 7, with other separators.
    """
    with longer_cells():
        straight = _straight(text, header, places)
        return straight or _stepwise(RecordLines(text, header), places, shown, findings)


def _straight(text: str, header: Header, places: Sequence[int]) -> Split | None:
    """Rows where each takes one line and nothing stands between them; None where it is not so."""
    if header.separator == BLANK:
        return None
    pick, width = picker(places), len(header.names)
    split = Split()
    reader = reader_of(io.StringIO(text, newline="\n"), header.separator, strict=True)
    try:
        split.rows = [pick(row) for row in reader if len(row) == width]
    except csv.Error:
        return None
    height = len(split.rows)
    # A row over two lines, a blank line, or an uneven row: the lines are more than the rows. What
    # may be a remark is looked at line by line.
    if reader.line_num != height or any(
        sign in text and _may_begin_a_line(sign, text) for sign in (*header.remarks, " ", "\t")
    ):
        return None
    split.lines = list(range(header.first, header.first + height))
    return split


def _may_begin_a_line(sign: str, text: str) -> bool:
    """Whether a sign stands at the begin of a line."""
    return text.startswith(sign) or f"\n{sign}" in text


def _stepwise(
    source: RecordLines, places: Sequence[int], shown: str, findings: Findings
) -> Split | None:
    """Rows record by record, whatever stands between them."""
    header, pick = source.header, picker(places)
    width = len(header.names)
    split = Split(aside=source.aside, swallowed=source.swallowed)
    reader = reader_of(source, header.separator, strict=True)
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
            return split
        split.spanning += source.number > source.began
        if header.separator == BLANK and row[-1] == "" and source.line.endswith((" ", " \n")):
            del row[-1]  # what stands behind the last cell separates nothing
        if len(row) == width:
            split.rows.append(pick(row))
            split.lines.append(source.began)
        else:
            split.uneven.append((source.began, len(row)))


class RecordLines:
    """Lines for the standard reader; between records it steps over blank lines and remarks.

    It also remembers, of every record that runs over a line that would be a row by itself, the
    line on which the quote mark opens and that line.
    """

    def __init__(self, text: str, header: Header) -> None:
        self._lines = iter(io.StringIO(text, newline="\n"))
        self._between = True
        self._opened = header.first
        self.header = header
        self.number = header.first - 1
        self.line = ""
        self.began = header.first
        self.aside = SetAside()
        self.swallowed: list[tuple[int, int]] = []

    def begin(self) -> None:
        """The next line begins a record."""
        self._between = True

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        while True:
            self.line = line = next(self._lines)
            self.number += 1
            if not self._between:
                self._look_at(line)
                return line
            if not self.aside.takes(line, self.number, self.header):
                self._between = False
                self.began = self._opened = self.number
                return line

    def _look_at(self, line: str) -> None:
        """See whether a line inside a cell would be a row by itself."""
        # What stands behind the mark that closes the cell is the rest of the record's own row.
        plain = line.replace('""', "")
        inside = plain.split('"', 1)[0]
        if fields_in(inside, self.header.separator) == len(self.header.names) > 1 and (
            not self.swallowed or self.swallowed[-1][0] != self._opened
        ):
            self.swallowed.append((self._opened, self.number))
        marks = plain.count('"')
        if marks and marks % 2 == 0:  # one cell is closed, and another one opened
            self._opened = self.number
