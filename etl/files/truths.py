"""Cells that say yes or no."""

from __future__ import annotations

from typing import Final

from etl.files.numeric_cells import number_of

TRUE_WORDS: Final = frozenset({"1", "true", "yes", "y", "t", "correct", "right"})
FALSE_WORDS: Final = frozenset({"0", "false", "no", "n", "f", "wrong", "incorrect"})


def truth_of(text: str) -> bool | None:
    """Read a word for yes or no, in any case.

    Parameters
    ----------
    text : str
        A cell, trimmed.

    Returns
    -------
    bool or None
        None where the word is neither.

    Examples
    --------
    >>> [truth_of(word) for word in ("Yes", "0", "1.0", "perhaps")]
    [True, False, True, None]
    """
    word = text.casefold()
    if word in TRUE_WORDS or word in FALSE_WORDS:
        return word in TRUE_WORDS
    number = number_of(word)
    return bool(number) if number in (0.0, 1.0) else None
