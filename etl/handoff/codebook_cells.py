"""Several texts in one cell, so that they can be told apart again."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Final

#: Stands between them, with a blank on either side.
BAR: Final = "|"
#: Stands before a bar, or before itself, within one of them.
BEFORE_BAR: Final = "\\"


def in_one_cell(texts: Iterable[str]) -> str:
    r"""Texts with a bar between two blanks between them.

    Parameters
    ----------
    texts : iterable of str
        Such as the levels of a factor.

    Returns
    -------
    str
        A bar or a backslash within a text has a backslash before it, so that a bar between two
        blanks is always a boundary. Empty without texts.

    Examples
    --------
    >>> print(in_one_cell(["early", "late"]), "/", in_one_cell(["a | b", "c"]))
    early | late / a \| b | c
    """
    return f" {BAR} ".join(
        text.replace(BEFORE_BAR, BEFORE_BAR * 2).replace(BAR, BEFORE_BAR + BAR) for text in texts
    )
