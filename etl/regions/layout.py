"""Where the characters of a text stand on the screen, in monospaced type.

Columns are counted in characters from the start of a line, in reading direction. A boundary
between two characters is one number, computed one way, so that neighbours share their edge exactly.
"""

from __future__ import annotations

import itertools
import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from etl.study.models import Layout

Space = Literal["following", "preceding"]

WHITE = re.compile(r"\s+")

#: Characters that have no place in a line of monospaced type: controls, line and paragraph
#: separators, halves of surrogate pairs.
NO_PLACE = re.compile("[\x00-\x09\x0b-\x1f\x7f-\x9f\u2028\u2029\ud800-\udfff]")

ZERO_WIDTH_JOINER = "\u200d"

#: Format characters that are drawn although their category is Cf: the number signs of the Arabic,
#: Syriac and Kaithi scripts (Unicode Standard, property Prepended_Concatenation_Mark).
DRAWN_FORMAT = frozenset(
    "\u0600\u0601\u0602\u0603\u0604\u0605\u06dd\u070f\u0890\u0891\u08e2\U000110bd\U000110cd"
)


@dataclass(frozen=True, slots=True)
class Span:
    """One region's stretch on one line: columns ``start`` up to, not including, ``stop``."""

    order: int
    line: int
    start: int
    stop: int


def columns(line: str) -> Sequence[int]:
    r"""The column at which each character of a line starts, and the column after the last.

    Combining marks, format characters, the second half of a flag, whatever an emoji joins to
    itself, and the vowels and finals of decomposed Hangul take no room; every other character
    takes one column, wide scripts too, for there the study's character width is theirs.

    Parameters
    ----------
    line : str
        One line, without line breaks.

    Returns
    -------
    sequence of int, length ``len(line) + 1``

    Examples
    --------
    >>> list(columns("e\u0301t"))
    [0, 1, 1, 2]
    """
    if line.isascii():
        return range(len(line) + 1)
    out = [0]
    before = ""
    half_a_flag = False
    for character in line:
        flag = "\U0001f1e6" <= character <= "\U0001f1ff"
        room = 0 if flag and half_a_flag else _room(character, before)
        half_a_flag = flag and room == 1
        out.append(out[-1] + room)
        before = character
    return out


def _room(character: str, before: str) -> int:
    """Columns that a character takes after another."""
    if character.isascii():
        return 1
    category = unicodedata.category(character)
    if category in {"Mn", "Me", "Cf"}:
        return int(character in DRAWN_FORMAT)
    if "\u1160" <= character <= "\u11ff" or "\ud7b0" <= character <= "\ud7ff":
        return 0
    if "\U0001f3fb" <= character <= "\U0001f3ff" and before:
        return int(unicodedata.category(before) != "So")
    return int(not (before == ZERO_WIDTH_JOINER and category == "So"))


def lay_out(text: str, owners: Sequence[int], space: Space) -> tuple[list[Span], list[int]]:
    r"""Find the columns of every region on every line.

    White space inside a region is the region's own. White space outside goes, with ``following``,
    to the region of the character after it on its line (an indentation, too), with ``preceding``
    to the region of the character before it; where that character is in no region, or where there
    is none, the white space is nobody's. A region has no stretch on a line where all it has is
    white space.

    Parameters
    ----------
    text : str
        The text as shown, ``\n`` between lines.
    owners : sequence of int, length ``len(text)``
        The order of each character's region, from 1; 0 outside.
    space : {"following", "preceding"}
        Whose the space between two words is.

    Returns
    -------
    spans : list of Span
        By line, then by column. Lines are counted from 1, blank ones included.
    lines : list of int
        The lines that carry text.

    Examples
    --------
    >>> spans, lines = lay_out("ab cd", [1, 1, 0, 2, 2], "following")
    >>> [(s.order, s.start, s.stop) for s in spans]
    [(1, 0, 2), (2, 2, 5)]
    """
    spans: list[Span] = []
    carrying: list[int] = []
    at = 0
    for number, line in enumerate(text.split("\n"), start=1):
        own = _with_spaces(line, list(owners[at : at + len(line)]), space)
        at += len(line) + 1
        if not line.strip():
            continue
        carrying.append(number)
        column = columns(line)
        start = 0
        for order, run in itertools.groupby(own):
            stop = start + len(list(run))
            if order and column[stop] > column[start] and line[start:stop].strip():
                spans.append(Span(order, number, column[start], column[stop]))
            start = stop
    return spans, carrying


def _with_spaces(line: str, own: list[int], space: Space) -> list[int]:
    """The owners of a line's characters, the white space outside regions shared out."""
    for match in WHITE.finditer(line):
        start, stop = match.span()
        if space == "following":
            for i in range(min(stop, len(line) - 1) - 1, start - 1, -1):
                own[i] = own[i] or own[i + 1]
        else:
            for i in range(max(start, 1), stop):
                own[i] = own[i] or own[i - 1]
    return own


def edge_px(layout: Layout, column: int) -> float:
    """Where the boundary before a column lies, in px.

    Examples
    --------
    Left to right, the first character starts at ``left_px``; right to left, ``left_px`` is the
    left edge of the first character all the same, so the text starts one character further right.

    >>> from types import SimpleNamespace
    >>> edge_px(SimpleNamespace(left_px=200, character_width_px=14, direction="ltr"), 3)
    242
    >>> edge_px(SimpleNamespace(left_px=200, character_width_px=14, direction="rtl"), 0)
    214
    """
    if layout.direction == "rtl":
        return layout.left_px + (1 - column) * layout.character_width_px
    return layout.left_px + column * layout.character_width_px


def span_extent_px(layout: Layout, span: Span) -> tuple[float, float, float, float]:
    """Left, top, right and bottom of a span, in px."""
    first, last = edge_px(layout, span.start), edge_px(layout, span.stop)
    top, bottom = line_extent_px(layout, span.line)
    return min(first, last), top, max(first, last), bottom


def line_extent_px(layout: Layout, line: int) -> tuple[float, float]:
    """Top and bottom of a line's box, in px; lines from 1."""
    return (
        layout.top_px + (line - 1) * layout.line_height_px,
        layout.top_px + line * layout.line_height_px,
    )
