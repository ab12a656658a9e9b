"""The header of a delimited text: where it is, and what separates its names."""

from __future__ import annotations

import csv
from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, replace

from etl.files.separators import (
    BLANK,
    SEPARATORS,
    composed,
    reader_of,
    separator_of,
    spelled,
    split_line,
    without_last_blanks,
)
from etl.files.units import own_names

__all__ = ["BYTE_ORDER_MARK", "REMARKS", "Header", "find_header", "spelled"]

#: What a line begins with, blanks before it aside, that is a remark, where nothing else is said
#: (common practice, no source).
REMARKS = ("#",)
BYTE_ORDER_MARK = "\ufeff"
#: How many lines, and about how many bytes, are looked at to find out a separator.
_SAMPLE_LINES, _SAMPLE_BYTES = 50, 200_000
#: How many lines, blank ones and remarks aside, may stand above the header (our choice).
_SEARCHED_LINES = 300
#: How many lines a header may take, where line breaks stand in its quoted names (our choice).
_LONGEST_HEADER = 50


@dataclass(frozen=True, slots=True)
class Header:
    """The line of a delimited text that names its columns, and how its lines are to be read.

    Attributes
    ----------
    names : tuple of str
        The columns, trimmed and composed (Unicode NFC).
    line : int
        The line on which it begins, from 1.
    separator : str
        What separates its fields.
    start : int
        Where it begins, as an offset into the text.
    body : int
        Where the rows begin, as an offset into the text.
    first : int
        The line of the first row, from 1.
    remarks : tuple of str
        What a line begins with that is a remark.
    """

    names: tuple[str, ...]
    line: int
    separator: str
    start: int
    body: int
    first: int
    remarks: tuple[str, ...] = REMARKS

    @property
    def height(self) -> int:
        """How many lines it takes."""
        return self.first - self.line


def find_header(
    data: bytes,
    delimiter: str | None = None,
    needed: Sequence[str] = (),
    remarks: Sequence[str] = REMARKS,
) -> Header:
    r"""Find the header of a text, and what separates its fields where that is not stated.

    Parameters
    ----------
    data : bytes
        The text: UTF-8, line feeds.
    delimiter : str, optional
        The separator, where it is known.
    needed : sequence of str
        Columns that the header must have. Where they are known, the header is the first line that
        has all of them, else the first line that has most of them.
    remarks : sequence of str
        What a line begins with that is a remark.

    Returns
    -------
    Header
        The first line that is neither blank nor a remark where nothing else tells it.

    Examples
    --------
    >>> found = find_header(b"# recorded in May\nreader;dur\nP01;200\n")
    >>> found.names, found.line, found.separator
    (('reader', 'dur'), 2, ';')
    >>> find_header(b"Export, of May\n\nreader;dur\nP01;200\n", needed=["reader", "dur"]).line
    3
    """
    signs = tuple(sign.strip() for sign in remarks if sign.strip())
    wanted = tuple(dict.fromkeys(needed))
    best: Header | None = None
    score, first = (0, False, 0.0), True
    for start, line in _lines_that_may_be(data, signs) if wanted else ():
        found, has = _as_header(data, (start, line), delimiter, wanted)
        if found is not None and has == len(wanted):
            return replace(found, remarks=signs)
        # Below the first line, one name alone may stand there by chance; blanks between words are
        # weak evidence; and of two lines, that is more like a header which has less besides.
        if found is not None and has > (0 if first else 1):
            own = (has, found.separator != BLANK, has / len(found.names))
            if own > score:
                best, score = found, own
        first = False
    if best is None:
        start, line = next(_lines_that_may_be(data, signs), (len(data), data.count(b"\n") + 1))
        separator = delimiter or separator_of(_sample(data, start))
        best = _header_at(data, start, line, separator)
    return replace(best, remarks=signs)


def _as_header(
    data: bytes, place: tuple[int, int], delimiter: str | None, wanted: Collection[str]
) -> tuple[Header | None, int]:
    """A line as a header under the separator that fits best; how many wanted columns it has."""
    start, line = place
    text = composed(data[start : _after_lines(data, start, 1)].decode("utf-8", "replace"))
    known = [name for name in wanted if name in text or "\n" in name]
    readings: dict[str, tuple[Header, int]] = {}
    for separator in (delimiter,) if delimiter else SEPARATORS if known else ():
        if separator in text or len(wanted) == 1:
            header = _header_at(data, start, line, separator)
            readings[separator] = (header, len(own_names(known, header.names)))
    most = max((has for _, has in readings.values()), default=0)
    if not most:
        return None, 0
    fitting = [separator for separator, (_, has) in readings.items() if has == most]
    if len(fitting) > 1:
        fitting = [separator_of(_sample(data, start), fitting)]
    return readings[fitting[0]]


def _header_at(data: bytes, start: int, line: int, separator: str) -> Header:
    """The header that begins at an offset."""
    names, height = _names(data, start, separator)
    return Header(
        tuple(composed(name.removeprefix(BYTE_ORDER_MARK)) for name in names),
        line,
        separator,
        start,
        _after_lines(data, start, height),
        line + height,
    )


def _names(data: bytes, start: int, separator: str) -> tuple[list[str], int]:
    """The fields of the header, and how many lines it takes."""
    first = data[start : _after_lines(data, start, 1)].decode("utf-8", "replace")
    alone = first.removesuffix("\n")
    if '"' not in first:
        return split_line(alone, separator), 1
    lines = _lines_from(data, start)
    if separator == BLANK:
        lines = without_last_blanks(lines)
    reader = reader_of(lines, separator, strict=False)
    try:
        cells = next(reader, [])
    except csv.Error:
        return split_line(alone, separator), 1
    return cells, max(reader.line_num, 1)


def _lines_from(data: bytes, start: int) -> Iterator[str]:
    """The lines that a header may take."""
    for _ in range(_LONGEST_HEADER):
        end = _after_lines(data, start, 1)
        if end == start:
            return
        yield data[start:end].decode("utf-8", "replace").removeprefix(BYTE_ORDER_MARK)
        start = end


def _lines_that_may_be(data: bytes, signs: tuple[str, ...]) -> Iterator[tuple[int, int]]:
    """Offset and number of the first lines that are neither blank nor a remark."""
    marks = tuple(sign.encode("utf-8") for sign in signs)
    start, line, left = 0, 1, _SEARCHED_LINES
    while start < len(data) and left:
        end = _after_lines(data, start, 1)
        content = data[start:end].strip()
        if content and not content.startswith(marks):
            yield start, line
            left -= 1
        start, line = end, line + 1


def _sample(data: bytes, start: int) -> str:
    """The lines from an offset by which a separator is found out."""
    end = start
    for lines in range(_SAMPLE_LINES):
        if lines > 2 and end - start > _SAMPLE_BYTES:
            break
        end = _after_lines(data, end, 1)
    return data[start:end].decode("utf-8", "replace")


def _after_lines(data: bytes, start: int, count: int) -> int:
    """Offset after ``count`` lines from ``start``."""
    for _ in range(count):
        end = data.find(b"\n", start)
        if end < 0:
            return len(data)
        start = end + 1
    return start
