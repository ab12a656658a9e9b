"""The header of a delimited text: where it is, what separates its names, whether it is usable."""

from __future__ import annotations

import csv
import io
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches

from etl.errors import Findings

#: Field separators that are recognised, in order of preference where two fit equally well.
SEPARATORS = ("\t", ";", ",", "|", " ")
#: A line that begins so, blanks before it aside, is a comment (common practice, no source).
COMMENT = b"#"
_SAMPLE_LINES = 50
#: How much of a header a message repeats.
_MOST_SHOWN = 200


@dataclass(frozen=True, slots=True)
class Header:
    """The first line of a delimited text that is neither blank nor a comment.

    Attributes
    ----------
    names : tuple of str
        The columns, trimmed and composed (Unicode NFC).
    line : int
        The line on which it begins, from 1.
    separator : str
        What separates its fields.
    body : int
        Where the rows begin, as an offset into the text.
    first : int
        The line of the first row, from 1.
    """

    names: tuple[str, ...]
    line: int
    separator: str
    body: int
    first: int


@dataclass(slots=True)
class Remarks:
    """The comment lines below a header.

    Attributes
    ----------
    count : int
        How many there are.
    alike : list of int
        On which lines those are that have as many fields as the header.
    """

    count: int = 0
    alike: list[int] = field(default_factory=list)

    def add(self, line: str, number: int, header: Header) -> None:
        """Count a comment line."""
        self.count += 1
        if fields_in(line, header) == len(header.names) > 1:
            self.alike.append(number)


def fields_in(line: str, header: Header) -> int:
    """How many fields a line has, quote marks aside."""
    return line.count(header.separator) + 1


def find_header(data: bytes, delimiter: str | None) -> Header:
    r"""Find the header of a text, and what separates its fields where that is not stated.

    Parameters
    ----------
    data : bytes
        The text: UTF-8, line feeds.
    delimiter : str or None
        The separator, where it is known.

    Returns
    -------
    Header

    Examples
    --------
    >>> found = find_header(b"# recorded in May\nreader;dur\nP01;200\n", None)
    >>> found.names, found.line, found.separator
    (('reader', 'dur'), 2, ';')
    """
    start, line = _first_line(data)
    sample = data[start : _after_lines(data, start, _SAMPLE_LINES)].decode("utf-8", "replace")
    separator = delimiter or _separator_of(sample)
    names, spans = _names(sample, separator)
    return Header(names, line, separator, _after_lines(data, start, spans), line + spans)


def header_is_usable(
    header: Header, data: bytes, shown: str, findings: Findings, needed: Sequence[str] | None
) -> bool:
    """Whether names are unique and every needed one is there; says what is wrong.

    Parameters
    ----------
    header : Header
        The header.
    data : bytes
        The text that it is from.
    shown : str
        The file's name for messages.
    findings : Findings
        Where problems are recorded.
    needed : sequence of str or None
        The columns that must be there.

    Returns
    -------
    bool
    """
    named = [name for name in header.names if name]
    if len(set(named)) < len(named):
        if header.body >= len(data):
            findings.error(
                "the whole file is one line",
                path=shown,
                line=header.line,
                found=f"{len(header.names)} fields",
                expected="a header, and below it a line for each row",
                fix="export the file again, or copy it again without a change of line ends",
            )
        else:
            _tell_equal_names(header, shown, findings)
        return False
    wanted = list(dict.fromkeys(needed or ()))
    missing = [name for name in wanted if name not in named]
    listed = ", ".join(named)
    listed = listed if len(listed) <= _MOST_SHOWN else listed[: _MOST_SHOWN - 1] + "…"
    if len(missing) > 1 and missing == wanted:
        commented = any(_is_in_comment(name, header, data) for name in missing)
        findings.error(
            "the header has none of the columns that the study file names",
            path=shown,
            line=header.line,
            found=listed,
            expected=f"a header, separated by {spelled(header.separator)}, that has "
            + ", ".join(f'"{name}"' for name in missing),
            fix="remove the # before the names: it makes a comment of the line"
            if commented
            else "write the header's own names in [logs.columns], or correct the header; if the "
            "fields are separated otherwise, state [logs] delimiter",
        )
        return False
    for name in missing:
        near = get_close_matches(name, named, n=1, cutoff=0.6)
        findings.error(
            f'there is no column "{name}"',
            path=shown,
            line=header.line,
            found=listed,
            expected=f'a header, separated by {spelled(header.separator)}, that has "{name}"',
            fix=(f'did you mean "{near[0]}"? Write' if near else "write")
            + " the header's own name in the study file, or correct the header",
        )
    return not missing


def spelled(separator: str) -> str:
    """A separator in words."""
    words = {"\t": "tabs", ";": "semicolons", ",": "commas", "|": "bars", " ": "blanks"}
    return words.get(separator, f'"{separator}"')


def blanks(separator: str) -> bytes:
    """The signs that a line may hold and still be blank."""
    return b" " if separator == "\t" else b" \t"


def _is_in_comment(name: str, header: Header, data: bytes) -> bool:
    """Whether the comments above the header name a column, as where # stands before the header."""
    above = data.split(b"\n", header.line)[: header.line - 1]
    return any(
        name.encode("utf-8") in line.lstrip(b"# \t").split(header.separator.encode())
        for line in above
    )


def _tell_equal_names(header: Header, shown: str, findings: Findings) -> None:
    """Record every name that stands over two columns."""
    seen: dict[str, int] = {}
    for position, name in enumerate(header.names, start=1):
        if name and name in seen:
            findings.error(
                "two columns have the same name",
                path=shown,
                line=header.line,
                where="header",
                found=name,
                expected=f"a name of its own for each of columns {seen[name]} and {position}",
                fix="rename one of them in the file's header",
            )
        seen.setdefault(name, position)


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


def _after_lines(data: bytes, start: int, count: int) -> int:
    """Offset after ``count`` lines from ``start``."""
    for _ in range(count):
        end = data.find(b"\n", start)
        if end < 0:
            return len(data)
        start = end + 1
    return start


def _separator_of(sample: str) -> str:
    """The separator that splits the header, and the lines after it into as many fields."""
    best, best_score = "\t", (0.0, 0)
    for separator in SEPARATORS:
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


def _names(sample: str, separator: str) -> tuple[tuple[str, ...], int]:
    """The column names, and how many lines the header takes."""
    reader = csv.reader(io.StringIO(sample, newline=""), delimiter=separator)
    try:
        cells = next(reader, [])
    except csv.Error:
        cells = sample.split("\n", 1)[0].split(separator)
        return tuple(_composed(cell) for cell in cells), 1
    return tuple(_composed(cell) for cell in cells), max(reader.line_num, 1)


def _composed(name: str) -> str:
    """A name trimmed and in the one form in which equal letters are equal."""
    return unicodedata.normalize("NFC", name.strip())
