"""What separates the fields of a line, and how a line is split."""

from __future__ import annotations

import csv
import io
import unicodedata
from collections.abc import Iterable, Iterator, Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from _csv import Reader

#: Field separators that are recognised, in order of preference where two fit equally well.
SEPARATORS = ("\t", ";", ",", "|", " ")
#: The one separator of which a run counts as one, as in tables that are aligned by blanks.
BLANK = " "


def spelled(separator: str) -> str:
    """A separator in words."""
    words = {"\t": "tabs", ";": "semicolons", ",": "commas", "|": "bars", " ": "blanks"}
    return words.get(separator, f'"{separator}"')


def blanks(separator: str) -> str:
    """The signs that a line may hold and still be blank."""
    return " " if separator == "\t" else " \t"


def split_line(line: str, separator: str) -> list[str]:
    """The fields of a line in which a quote mark means nothing.

    Parameters
    ----------
    line : str
        The line, without its end.
    separator : str
        The separator. Of blanks, a run counts as one, and those at both ends do not count.

    Returns
    -------
    list of str

    Examples
    --------
    >>> split_line("  P01   200 ", " "), split_line("P01;;200", ";")
    (['P01', '200'], ['P01', '', '200'])
    """
    if separator == BLANK:
        return [cell for cell in line.split(BLANK) if cell]
    return line.split(separator)


def fields_in(line: str, separator: str) -> int:
    """How many fields a line has, quote marks aside."""
    return len(split_line(line, separator)) if separator == BLANK else line.count(separator) + 1


def reader_of(lines: Iterable[str], separator: str, *, strict: bool) -> Reader:
    """The standard library's reader of lines."""
    return csv.reader(
        lines, delimiter=separator, skipinitialspace=separator == BLANK, strict=strict
    )


def without_last_blanks(lines: Iterable[str]) -> Iterator[str]:
    """Lines without the blanks before their ends, which separate nothing."""
    return (line.rstrip(" \n") + "\n" for line in lines)


def separator_of(sample: str, among: Sequence[str] = SEPARATORS) -> str:
    r"""The separator that splits the first line, and the lines after it into as many fields.

    Parameters
    ----------
    sample : str
        The first lines of a table.
    among : sequence of str
        The separators that come into question, the preferred ones first.

    Returns
    -------
    str
        The first of them where none splits the first line.

    Examples
    --------
    >>> separator_of("x, left;y\n1,5;2,5\n")
    ';'
    """
    best, best_score = among[0], (0.0, 0)
    for separator in among:
        lines: Iterable[str] = io.StringIO(sample)
        if separator == BLANK:
            lines = without_last_blanks(lines)
        try:
            rows = [row for row in reader_of(lines, separator, strict=False) if row]
        except csv.Error:
            continue
        width = len(rows[0]) if rows else 0
        if width < 2:
            continue
        even = sum(len(row) == width for row in rows) / len(rows)
        # A separator inside every cell (a decimal comma) splits rows but not the header; one that
        # splits both into equal parts is right. Blanks inside names are the weakest evidence.
        score = (even if separator != BLANK else even / 2, width)
        if score > best_score:
            best, best_score = separator, score
    return best


def composed(name: str) -> str:
    """A name trimmed and in the one form (Unicode NFC) in which equal letters are equal."""
    return unicodedata.normalize("NFC", name.strip())
