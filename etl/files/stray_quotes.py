"""Quote marks in cells without quotes, as where the mark that opens a cell is lost."""

from __future__ import annotations

import re

import numpy as np

from etl.files.headers import Header
from etl.files.quoted import Split
from etl.files.separators import BLANK

_MARK, _LINE_FEED = ord('"'), ord("\n")


def sound_row(separator: str) -> re.Pattern[str]:
    r"""What a row is by the standard: quote marks stand around cells, and doubled inside them.

    Parameters
    ----------
    separator : str
        What separates the cells.

    Returns
    -------
    re.Pattern
        For whole rows, without the line end.

    References
    ----------
    RFC 4180 (Shafranovich 2005), section 2, rules 5 to 7, with other separators.

    Examples
    --------
    >>> rows = ['"a ""ripe"" fig",1', 'a ""ripe"" fig",1']
    >>> [sound_row(",").fullmatch(row) is not None for row in rows]
    [True, False]
    """
    mark = re.escape(separator)
    field = rf'(?:"(?:[^"]|"")*"|[^"{mark}]*)'
    return re.compile(rf"{field}(?:{mark}{field})*")


def cells_open(text: str, separator: str) -> bool:
    """Whether any cell begins with a quote mark; else marks may stand for inches.

    Parameters
    ----------
    text : str
        The lines below a header.
    separator : str
        What separates the cells.

    Returns
    -------
    bool
    """
    return re.search(rf'(?m)(?:^|{re.escape(separator)})"', text) is not None


def stray_marks(body: bytes, text: str, header: Header, split: Split) -> list[int]:
    """The rows with quote marks in a cell without quotes.

    They are of note only where other cells have quotes: see :func:`cells_open`.

    Parameters
    ----------
    body : bytes
        The lines below the header, in UTF-8.
    text : str
        The same ones.
    header : Header
        The header.
    split : Split
        How the standard splits them: no row uneven.

    Returns
    -------
    list of int
        The lines on which they begin.
    """
    if not split.lines:
        return []
    lines = text.removesuffix("\n").split("\n") if split.aside.remarks else []
    # Marks in remarks would hide others from a look at the bytes alone.
    remarks = any('"' in lines[number - header.first] for number in split.aside.remarks)
    if not remarks and not _may_have_stray_marks(body, header.separator):
        return []
    sound = sound_row(header.separator)
    lines = lines or text.removesuffix("\n").split("\n")
    aside = {*split.aside.blank, *split.aside.remarks}
    found = []
    for begin, after in zip(
        split.lines, [*split.lines[1:], header.first + len(lines)], strict=True
    ):
        end = after
        while end - 1 in aside and end - 1 > begin:
            end -= 1
        row = "\n".join(lines[begin - header.first : end - header.first])
        if header.separator == BLANK:
            row = row.strip(BLANK)
        if '"' in row and sound.fullmatch(row) is None:
            found.append(begin)
    return found


def _may_have_stray_marks(body: bytes, separator: str) -> bool:
    """Whether some mark neither opens nor closes a cell nor is doubled: a look at the bytes.

    As long as no mark is stray, every other mark opens a cell, or is the second one of a doubled
    mark; those between close it, or are the first one. The first stray mark has another sign
    before it.
    """
    if not separator.isascii():
        return True
    signs = np.frombuffer(body, dtype=np.uint8)
    marks = np.flatnonzero(signs == _MARK)
    beside = np.zeros(256, dtype=bool)
    beside[[ord(separator), _LINE_FEED, _MARK]] = True
    opening, closing = marks[0::2], marks[1::2]
    last = len(signs) - 1
    opens = beside[signs[np.maximum(opening - 1, 0)]] | (opening == 0)
    closes = beside[signs[np.minimum(closing + 1, last)]] | (closing == last)
    return not (len(opening) == len(closing) and opens.all() and closes.all())
