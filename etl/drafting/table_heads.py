"""Whether the beginning of a log is a table, where its header is, and which lines are remarks."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from etl.drafting.heads import Head
from etl.errors import Findings
from etl.files import Cells, cells_of
from etl.files.headers import REMARKS, find_header
from etl.files.separators import (
    BLANK,
    SEPARATORS,
    composed,
    reader_of,
    spelled,
    split_line,
)

#: How many lines are looked at to find the header, and among how many it may stand.
_LINES, _HEADER_LINES = 400, 300
#: How many lines below a header it is compared with.
_COMPARED = 60
#: Of the lines below a header at least this share is split into as many fields.
_EVEN = 0.8
#: Signs with which lines may begin that are remarks (common practice, no source).
_REMARK_SIGNS = ("#", "%", "//", "**", "!", ";", ">", "--")
#: Of the cells of a header at most this share has no letter; more, and it is a row of numbers.
_NAMELESS = 0.3
#: By how much less a table looks like one where most lines stand above its header.
_DOUBTFUL = 0.9
#: What is said of rows that have other numbers of fields than their header.
_UNEVEN = ("the row has too few fields", "the row has too many fields")
_DIGITS = re.compile(r"\d+([.,]\d+)?")


@dataclass(frozen=True, slots=True)
class TableHead:
    """The beginning of a log that is a table.

    Attributes
    ----------
    head : Head
        The beginning of the log.
    cells : Cells
        Its rows.
    remarks : tuple of str
        What a line begins with that is a remark.
    """

    head: Head
    cells: Cells
    remarks: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Place:
    """Where a header may be."""

    names: tuple[str, ...]
    separator: str
    even: float
    line: int

    @property
    def rank(self) -> tuple[float, int]:
        """How much it looks like one; blanks inside names are the weakest separators."""
        return (self.even / (1 if self.separator != BLANK else 1.5), len(self.names))


def as_table(head: Head, findings: Findings) -> TableHead | None:
    """Read the beginning of a log as a table.

    Parameters
    ----------
    head : Head
        The beginning.
    findings : Findings
        Where it is recorded why it is none.

    Returns
    -------
    TableHead or None
        None where a problem was recorded.
    """
    lines = head.lines()[:_LINES]
    remarks = _remark_signs(lines)
    place = _find_header(lines, remarks)
    cells = _of_several_lines(head, remarks)
    if cells is not None:
        return TableHead(head, cells, remarks)
    if place is None:
        tell_no_log(head, findings)
        return None
    needed = [name for name in place.names if name]
    cells = cells_of(
        head.text,
        findings,
        delimiter=place.separator,
        needed=list(dict.fromkeys(needed)),
        wary=True,
        remarks=remarks,
    )
    if cells is None:
        return None
    if not len(cells):
        findings.error(
            "the log has a header but no row",
            path=head.shown,
            line=cells.header_line,
            fix="remove the file from the folder, or copy it again",
        )
        return None
    return TableHead(head, cells, remarks)


def taken_for_table(head: Head, findings: Findings) -> Findings:
    """Say of a log some rows of which are too short or too long why it was taken for a table.

    Parameters
    ----------
    head : Head
        Its beginning.
    findings : Findings
        Why it cannot be read as a table.

    Returns
    -------
    Findings
        The same, but that one finding stands for all those rows.
    """
    uneven = [one for one in findings.of("error") if one.problem in _UNEVEN]
    lines = head.lines()
    place = _find_header(lines[:_LINES], _remark_signs(lines[:_LINES]))
    if not uneven or place is None:
        return findings
    told = Findings()
    for one in findings:
        if one.problem not in _UNEVEN:
            told.add(one)
    first = uneven[0].line or 1
    fields = f"{len(place.names):,} fields between {spelled(place.separator)}"
    told.error(
        f"the log was taken for a table, because {place.even:.0%} of the lines below line "
        f"{place.line + 1} have {fields} as that line has, but other lines have not",
        path=head.shown,
        line=first,
        found=lines[first - 1] if first <= len(lines) else uneven[0].found,
        expected=f"a row below the header {', '.join(place.names)}",
        fix="correct such rows if it is a table. If its lines tell of events, no lines were found "
        "that tell of fixations, by their times and durations, and others with which trials start: "
        'write the study file by hand then, with kind = "events" and [logs.patterns]',
    )
    return told


def tell_no_log(head: Head, findings: Findings) -> None:
    """Record that a file looks like no log.

    Parameters
    ----------
    head : Head
        Its beginning.
    findings : Findings
        Where it is recorded.
    """
    findings.error(
        "this looks like no table of fixations, and no lines of events",
        path=head.shown,
        line=1,
        found=head.lines()[0],
        expected="a line with the names of the columns above rows of as many fields, or lines "
        "that each tell of an event",
        fix="name logs only; if the file is a table without a header, add a line with a name for "
        "each column",
    )


def _of_several_lines(head: Head, remarks: tuple[str, ...]) -> Cells | None:
    """A table whose header has line breaks in its quoted names; None where it has none."""
    if not head.text.data.lstrip().startswith(b'"'):
        return None
    header = find_header(head.text.data, remarks=remarks)
    if header.height < 2 or len(header.names) < 2:
        return None
    cells = cells_of(head.text, Findings(), wary=True, remarks=remarks)
    return None if cells is None or not len(cells) else cells


def how_even(lines: Sequence[str]) -> float:
    """How much lines look like a table: the share that has as many fields as the header, or 0.

    Examples
    --------
    >>> how_even(["reader;dur", "P01;200", "P01;180"])
    1.0
    """
    lines = lines[:_LINES]
    place = _find_header(lines, _remark_signs(lines))
    if place is None:
        return 0.0
    # Few lines that happen to be alike below many that are not are hardly a table.
    return place.even if 2 * place.line < len(lines) else _DOUBTFUL * place.even


def described(cells: Cells) -> str:
    """How a log is written, in words."""
    return f"{cells.text.encoding}, separated by {spelled(cells.delimiter)}"


def _remark_signs(lines: Sequence[str]) -> tuple[str, ...]:
    """What remarks begin with: the usual sign, and others that begin lines unlike the rest."""
    begins = Counter(
        sign for line in lines for sign in _REMARK_SIGNS if line.lstrip().startswith(sign)
    )
    # A sign that begins most lines is no remark's, nor is one in a table that begins rows by it.
    others = [sign for sign, count in begins.items() if count <= len(lines) / 2]
    return tuple(dict.fromkeys((*REMARKS, *(sign for sign in others if sign not in REMARKS))))


def _find_header(lines: Sequence[str], remarks: Sequence[str]) -> _Place | None:
    """The line of names above rows of as many fields."""
    left = [
        (number, line)
        for number, line in enumerate(lines)
        if line.strip() and not line.lstrip().startswith(tuple(remarks))
    ]
    found = [
        place for separator in SEPARATORS if (place := _header_under(left, separator)) is not None
    ]
    return max(found, key=lambda place: place.rank, default=None)


def _header_under(left: Sequence[tuple[int, str]], separator: str) -> _Place | None:
    """The first line under a separator that most lines after it are as wide as."""
    if not any(separator in line for _, line in left):
        return None
    rows = [_split(line, separator) for _, line in left]
    widths = [len(row) for row in rows]
    for place, row in enumerate(rows[: min(len(rows) - 1, _HEADER_LINES)]):
        width = len(row)
        below = widths[place + 1 :]
        if width < 2 or not below:
            continue
        even = below.count(width) / len(below)
        if even < _EVEN:
            continue
        nameless = sum(not any(sign.isalpha() for sign in cell) for cell in row)
        if nameless > _NAMELESS * width or _like_rows(row, rows[place + 1 :]):
            return None
        return _Place(tuple(composed(cell) for cell in row), separator, even, left[place][0])
    return None


def _like_rows(row: Sequence[str], below: Sequence[Sequence[str]]) -> bool:
    """Whether cells are those of the rows below but for their digits: then they are no names."""
    own = [_DIGITS.sub("0", cell) for cell in row]
    alike = [
        sum(_DIGITS.sub("0", cell) == mine for cell, mine in zip(other, own, strict=True))
        for other in below[:_COMPARED]
        if len(other) == len(row)
    ]
    return sum(alike) > 0.5 * len(row) * max(len(alike), 1)


def _split(line: str, separator: str) -> list[str]:
    """The fields of one line."""
    if '"' not in line:
        return split_line(line, separator)
    try:
        return next(reader_of([line.rstrip(" ")], separator, strict=False), [])
    except csv.Error:
        return line.split(separator)
