"""What the columns of logs that are tables mean, by their names and by their cells."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from etl.drafting.columns import MISSING_WORDS, Pooled
from etl.drafting.layout_guess import Extent
from etl.drafting.meanings import Understanding, counted
from etl.drafting.places import find_both_eyes, find_places, sides
from etl.drafting.readers import NamePattern, find_facts, find_readers
from etl.drafting.structure import Structure, find_structure
from etl.drafting.times import find_times

_NUMBERS = ("onset", "end", "duration", "x", "y", "fixation")
#: A number that stands in at least this many cells and lies far off all others is a mark.
_MARKS = frozenset((-1.0, -99.0, -999.0, -9999.0, -32768.0, 9999.0, 99999.0))
_SEVERAL = 3


@dataclass(frozen=True)
class UnderstoodTables:
    """Logs that are tables, as they are understood.

    Attributes
    ----------
    found : Understanding
        What each column means.
    structure : Structure
        Which rows belong together.
    names : NamePattern or None
        What the names of the logs say.
    extent : Extent or None
        Where nearly all fixations lie, in the log's own unit.
    """

    found: Understanding
    structure: Structure
    names: NamePattern | None
    extent: Extent | None


def understand(pooled: Pooled) -> UnderstoodTables:
    """Find out what the columns of logs mean.

    Parameters
    ----------
    pooled : Pooled
        Rows from the beginning of each log.

    Returns
    -------
    UnderstoodTables
    """
    found = Understanding()
    structure = find_structure(pooled, found)
    rows = structure.rows
    pairs = sides(rows.headers)
    # The columns of the other eye are taken over at the end.
    other = {pair["right"] for pair in pairs.values()}

    def free() -> list[str]:
        return [h for h in rows.headers if h not in found.used() and h not in other]

    find_times(structure, free(), found)
    names = find_readers(structure, found)
    find_places(structure, free(), found)
    ordered = {"onset", "fixation", "end"} & found.meanings.keys()
    if not ordered:
        found.questions.setdefault(
            "onset",
            "which column says when a fixation began? If none does, remove this line and name the "
            "column that numbers the fixations of a trial: fixation",
        )
    find_both_eyes(pairs, rows.columns, found)
    if found.samples:
        for name in ("duration", "end", "fixation", "label"):
            found.meanings.pop(name, None)
            found.questions.pop(name, None)
    _find_missing(structure, found)
    find_facts(structure, found)
    for header in other - found.used():
        found.facts.pop(header, None)
    _tell_units(structure, found)
    return UnderstoodTables(found, structure, names, _extent(structure, found))


def _find_missing(structure: Structure, found: Understanding) -> None:
    """Words that stand for no value in columns of numbers, and numbers that may."""
    own = [found.meanings, *found.eyes.values()]
    headers = {columns[n].header for columns in own for n in _NUMBERS if n in columns}
    words: dict[str, int] = {}
    for header in sorted(headers):
        column = structure.rows.columns[header]
        for word, count in column.words.items():
            if word in MISSING_WORDS or count >= _SEVERAL:
                words[word] = words.get(word, 0) + count
        for value in _MARKS:
            count = int((column.numbers == value).sum())
            rest = column.values[column.values != value]
            apart = len(rest) > 0 and (value < rest.min() or value > 2 * rest.max())
            if count >= _SEVERAL and apart:
                found.remarks.append(
                    f'{counted(count, "cell")} of "{header}" hold {value:g}; if that stands for no '
                    f'value, add "{value:g}" to missing'
                )
    found.missing = tuple(words)


def _tell_units(structure: Structure, found: Understanding) -> None:
    """Say of each unit that a row below the header names that it does so."""
    units = structure.rows.units
    for columns in (found.meanings, *found.eyes.values()):
        for name, meaning in columns.items():
            unit = units.get(meaning.header)
            if unit is not None and meaning.unit == unit:
                told = f'{meaning.evidence}; the row below the header says "{unit}"'
                columns[name] = replace(meaning, evidence=told)


def _extent(structure: Structure, found: Understanding) -> Extent | None:
    """Where nearly all fixations lie."""
    columns = next(iter(found.eyes.values()), found.meanings)
    x, y = columns.get("x"), columns.get("y")
    if x is None or y is None:
        return None
    numbers = [structure.rows.columns[one.header].numbers for one in (x, y)]
    return Extent.of(*(np.asarray(values) for values in numbers))
