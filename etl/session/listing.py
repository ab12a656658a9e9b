"""Lists in messages that do not go on for ever."""

from __future__ import annotations

from collections.abc import Sequence


def first_few(names: Sequence[str], most: int, *, of: str = "") -> str:
    """The first of some names, and how many there are besides.

    Parameters
    ----------
    names : sequence of str
        All of them.
    most : int
        How many are listed.
    of : str
        What the rest is called, with a blank before it; nothing where that is plain.

    Returns
    -------
    str
        The list.

    Examples
    --------
    >>> first_few(["a", "b", "c"], 2), first_few(["a"], 2)
    ('a, b and 1 more', 'a')
    """
    more = f" and {len(names) - most:,} more{of}" if len(names) > most else ""
    return ", ".join(names[:most]) + more
