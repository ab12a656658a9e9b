"""Units that stand in a column's name, and names that are given without them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import Final

#: Spellings of units, by the way the study file writes them, or by their symbol where it knows
#: none. Times and lengths: The International System of Units, 9th edition (2019), tables 2 and 8;
#: the rest is common practice, no source.
_SPELLINGS: Final = {
    "ms": ("ms", "msec", "msecs", "millisecond", "milliseconds"),
    "s": ("s", "sec", "secs", "second", "seconds"),
    "us": ("us", "µs", "μs", "usec", "microsecond", "microseconds"),
    "ns": ("ns", "nsec", "nanosecond", "nanoseconds"),
    "min": ("min", "mins", "minute", "minutes"),
    "px": ("px", "pix", "pxl", "pixel", "pixels"),
    "deg": ("deg", "degs", "degree", "degrees", "°", "dva"),
    "arcmin": ("arcmin", "arcmins"),
    "rad": ("rad", "radian", "radians"),
    "mm": ("mm", "millimetre", "millimetres", "millimeter", "millimeters"),
    "cm": ("cm", "centimetre", "centimetres", "centimeter", "centimeters"),
    "in": ("inch", "inches"),
}
_UNIT_OF: Final = {word: unit for unit, words in _SPELLINGS.items() for word in words}
_BRACKETED = re.compile(r"(?P<bare>.*\S)\s*(?:\[(?P<square>[^][]+)\]|\((?P<round>[^()]+)\))")
_SLASHED = re.compile(r"(?P<bare>.*\S)\s*/\s*(?P<slash>[^/\s]+)")


def unit_in(name: str) -> str | None:
    """The unit that a column's name gives in brackets or after a slash.

    Parameters
    ----------
    name : str
        The name, trimmed.

    Returns
    -------
    str or None
        The unit as the study file writes it, or its symbol; None where the name gives none, or one
        that is not known.

    Examples
    --------
    >>> [unit_in(name) for name in ("dur [msec]", "x (px)", "t/s", "dur_ms", "words/line")]
    ['ms', 'px', 's', None, None]
    """
    found = _BRACKETED.fullmatch(name) or _SLASHED.fullmatch(name)
    if found is None:
        return None
    spelling = next(text for text in found.groups()[1:] if text is not None)
    return _UNIT_OF.get(spelling.strip().casefold())


def bare_name(name: str) -> str:
    """A column's name without a known unit in brackets.

    Parameters
    ----------
    name : str
        The name, trimmed.

    Returns
    -------
    str

    Examples
    --------
    >>> bare_name("dur [ms]"), bare_name("dur [fast]"), bare_name("t/s")
    ('dur', 'dur [fast]', 't/s')
    """
    found = _BRACKETED.fullmatch(name)
    return name if found is None or unit_in(name) is None else found["bare"]


def own_names(asked: Iterable[str], header: Sequence[str]) -> dict[str, str]:
    """The header's own name for each column that is asked for.

    Parameters
    ----------
    asked : iterable of str
        Names as the study file gives them.
    header : sequence of str
        The names of a file.

    Returns
    -------
    dict of str to str
        By the name asked for. A name stands for itself, or else for the one column that bears it
        with a known unit in brackets; one that the header lacks is not in it.

    Examples
    --------
    >>> own_names(["trial", "dur", "x"], ["trial", "dur [ms]", "x [px]", "x [deg]"])
    {'trial': 'trial', 'dur': 'dur [ms]'}
    """
    known = set(header)
    found = {name: name for name in asked if name in known}
    lacking = [name for name in asked if name not in known]
    if not lacking:
        return found
    bare: dict[str, list[str]] = {}
    for name in known:
        bare.setdefault(bare_name(name), []).append(name)
    for name in lacking:
        if len(bare.get(name, ())) == 1:
            found[name] = bare[name][0]
    return found
