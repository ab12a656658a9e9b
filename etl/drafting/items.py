"""Which column says which text was read: found where one does, asked for where several may."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from etl.drafting.columns import PooledColumn, share_of
from etl.drafting.meanings import NAMED, Meaning, Understanding, listed, shortened
from etl.drafting.structure import Structure, reader_codes
from etl.drafting.vocabulary import likeness

#: Fewer values are rather the levels of a factor (our choice).
_FEWEST_TEXTS = 5
#: Of the trials of a reader so many have a text of their own; of the texts so many are read by
#: several readers.
_OWN, _SHARED = 0.8, 0.5
#: Names that sound about as much like a text are rivals.
_CLOSE = 0.1


def find_item(
    structure: Structure, columns: Mapping[str, PooledColumn], found: Understanding
) -> None:
    """Find the column that says which text was read.

    Parameters
    ----------
    structure : Structure
        The rows.
    columns : mapping of str to PooledColumn
        The columns that mean nothing yet.
    found : Understanding
        Where it is recorded. The column that tells trials apart is never taken for the text as
        well, nor is one that only counts trials: whether it is the text is asked.
    """
    trial = found.header("trial")
    counting = None if trial is None else structure.rows.columns[trial]
    constant = {
        header: column
        for header, column in columns.items()
        if structure.constant(column) and len(column.distinct) > 1
    }
    named = {h: likeness(h, "item") for h in constant if likeness(h, "item") >= NAMED}
    sound = {h: score for h, score in named.items() if not _same(constant[h], counting)}
    best = max(sound, key=lambda header: sound[header], default=None)
    if best is not None:
        rivals = [
            header
            for header, score in sound.items()
            if score > sound[best] - _CLOSE and not _one_to_one(constant[header], constant[best])
        ]
        if not rivals:
            values = constant[best].distinct
            told = (
                f"the header says text, and it is the same in all rows of a trial; {len(values):,} "
                f"values: {shortened(values, 4)}"
            )
            found.meanings["item"] = Meaning(best, told)
            return
        _ask(found, [best, *rivals], trial)
        return
    by_cells = [h for h, c in constant.items() if h not in named and _texts(structure, c, counting)]
    of_trials = trial is not None and likeness(trial, "item") >= NAMED
    perhaps = [*([trial] if of_trials and trial is not None else []), *named, *by_cells]
    if perhaps:
        _ask(found, perhaps, trial)


def _ask(found: Understanding, candidates: list[str], trial: str | None) -> None:
    """Ask which column it is."""
    told = {trial: f'"{trial}" (which tells trials apart)'}
    each = listed((told.get(one, f'"{one}"') for one in candidates), "or")
    found.questions["item"] = (
        f"which column says which text was read? It may be {each}. If none does, remove this line: "
        "a trial list must say it ([trials] below)"
    )


def _same(column: PooledColumn, other: PooledColumn | None) -> bool:
    """Whether two columns hold the same number in each row, as where texts are only counted."""
    if other is None or not column.numeric or not other.numeric:
        return False
    return bool(np.array_equal(column.numbers, other.numbers, equal_nan=True))


def _one_to_one(one: PooledColumn, other: PooledColumn) -> bool:
    """Whether each value of a column goes with one of another, and the reverse."""
    pairs = np.unique(np.stack([one.coded.codes, other.coded.codes]), axis=1).shape[1]
    return bool(pairs == len(np.unique(one.coded.codes)) == len(np.unique(other.coded.codes)))


def _texts(structure: Structure, column: PooledColumn, counting: PooledColumn | None) -> bool:
    """Whether a column may name texts by its cells: one a trial, the same ones for all readers."""
    values = column.distinct
    if len(values) < _FEWEST_TEXTS or column.absent or _same(column, counting):
        return False
    rows = structure.rows
    reader = reader_codes(rows)
    reader = rows.file if reader is None else reader
    first = np.concatenate(([0], np.flatnonzero(np.diff(structure.run)) + 1))
    codes, readers = column.coded.codes[first], reader[first]
    pairs = np.unique(np.stack([readers, codes]), axis=1)
    if pairs.shape[1] < _OWN * len(first) or _counts(column, first, readers):
        return False
    if len(np.unique(readers)) < 2:
        return not column.numeric
    times_read = np.unique(pairs[1], return_counts=True)[1]
    return share_of(times_read > 1) >= _SHARED


def _counts(column: PooledColumn, first: NDArray[np.int64], readers: NDArray[np.int32]) -> bool:
    """Whether a number goes up by one from trial to trial of a reader."""
    moved = np.diff(column.numbers[first])[np.diff(readers) == 0]
    return column.numeric and share_of(moved == 1) >= _OWN
