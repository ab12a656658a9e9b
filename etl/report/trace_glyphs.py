"""Texts from a study made fit for a picture or a terminal: what may be shown, how wide it is."""

from __future__ import annotations

import unicodedata

#: Stands for a character that cannot be shown: controls, halves of surrogate pairs, and what XML
#: does not allow (XML 1.0, fifth edition, production 2).
REPLACEMENT = "\ufffd"

_ZERO_WIDTH_JOINER = "\u200d"


def printable(text: str) -> str:
    r"""A text without characters that would break a picture or command a terminal.

    Examples
    --------
    >>> printable("ve\x1b[31mrb")
    've\ufffd[31mrb'
    >>> printable("two\nlines")
    'two lines'
    """
    spaced = text.replace("\n", " ").replace("\t", " ")
    return "".join(
        REPLACEMENT
        if unicodedata.category(c) in {"Cc", "Cs"} or c in "\ufffe\uffff\u2028\u2029"
        else c
        for c in spaced
    )


def width_of(text: str) -> int:
    """How many columns of a terminal a text takes; in a picture, about so many letters.

    Wide characters and emoji take two (Unicode Standard Annex 11), marks and joiners none.

    Examples
    --------
    >>> width_of("pear"), width_of("梨"), width_of("e\u0301")
    (4, 2, 1)
    """
    return sum(_columns(character) for character in text)


def _columns(character: str) -> int:
    """Columns of one character."""
    if character.isascii():
        return 1
    if unicodedata.category(character) in {"Mn", "Me", "Cf"} or character == _ZERO_WIDTH_JOINER:
        return 0
    return 2 if unicodedata.east_asian_width(character) in {"W", "F"} else 1


def shortened(text: str, width: int, ellipsis: str = "…") -> str:
    """A text cut to a width, the cut marked.

    Examples
    --------
    >>> shortened("spillover", 6), shortened("verb", 6)
    ('spill…', 'verb')
    """
    if width_of(text) <= width:
        return text
    room, kept = width - width_of(ellipsis), ""
    for character in text:
        room -= _columns(character)
        if room < 0:
            break
        kept += character
    return (kept + ellipsis) if width >= width_of(ellipsis) else ""
