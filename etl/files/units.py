"""Units in a column's name or in a row below the header, and names that are given without them.

:func:`units_in_row` tells whether a row is one of units, and which; reading and drafting ask it.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable, Mapping, Sequence
from typing import Final

from etl.files.numeric_cells import number_of

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
_IN_BRACKETS = re.compile(r"\[(?P<square>[^][]*)\]|\((?P<round>[^()]*)\)")
#: What stands in a row of units below a name that has none (common practice, no source).
_NO_UNIT: Final = ("", "-", "–", "—")
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


def units_in_row(
    cells: Mapping[str, str], numeric: Collection[str], missing: Collection[str] = ()
) -> dict[str, str]:
    """The units that a row names, where it is a row of units as it may stand below a header.

    Parameters
    ----------
    cells : mapping of str to str
        The row: its cells by the names of their columns.
    numeric : collection of str
        Those columns that hold numbers in the rows of the table.
    missing : collection of str
        What stands in a cell that has no value, besides nothing at all.

    Returns
    -------
    dict of str to str
        By column, as the study file writes the unit, or its symbol. Empty where it is no such row:
        where no column of numbers has a unit, alone or in brackets, where one has anything else
        than a unit or nothing, or where any cell is a number.

    Examples
    --------
    >>> row = {"reader": "", "start": "[ms]", "number": "", "gx": "px"}
    >>> units_in_row(row, ["start", "number", "gx"])
    {'start': 'ms', 'gx': 'px'}
    >>> units_in_row({**row, "number": "1"}, ["start", "number", "gx"])
    {}
    """
    units: dict[str, str] = {}
    for name, cell in cells.items():
        text = cell.strip()
        if number_of(text.replace(",", ".")) is not None and text not in missing:
            return {}
        if name not in numeric or text in missing:
            continue
        found = _IN_BRACKETS.fullmatch(text)
        word = (text if found is None else found["square"] or found["round"] or "").strip()
        if word in _NO_UNIT:
            continue
        unit = _UNIT_OF.get(word.casefold())
        if unit is None:
            return {}
        units[name] = unit
    return units


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
