"""Counts over conditions that are made reader by reader and added up."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field
from itertools import pairwise, product
from typing import Any

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.tables import TableDesign

Ints = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class RateCounts:
    """How often binary outcomes were 1, by condition and region; only rows that occur.

    Attributes
    ----------
    keys : (rows,) int64 array
        Condition × number of region names + place of the region in ``design.regions``, ascending.
    ones, n : (rows, outcomes) int64 array
        How many values are 1, and how many values there are.
    """

    keys: Ints
    ones: Ints
    n: Ints

    def __add__(self, other: RateCounts) -> RateCounts:
        """The counts of both.

        Examples
        --------
        >>> one = RateCounts(np.array([0, 2]), np.array([[1], [0]]), np.array([[1], [1]]))
        >>> both = one + one
        >>> both.keys.tolist(), both.ones.tolist(), both.n.tolist()
        ([0, 2], [[2], [0]], [[2], [2]])
        """
        at = np.searchsorted(self.keys, other.keys)
        at = np.minimum(at, max(len(self.keys) - 1, 0))
        if len(self.keys) and (self.keys[at] == other.keys).all():
            # After a few readers there is mostly nothing new, and each key occurs once.
            ones, n = self.ones.copy(), self.n.copy()
            ones[at] += other.ones
            n[at] += other.n
            return RateCounts(self.keys, ones, n)
        keys, place = np.unique(np.concatenate([self.keys, other.keys]), return_inverse=True)
        width = self.ones.shape[1]
        ones = np.zeros((len(keys), width), dtype=np.int64)
        n = np.zeros_like(ones)
        np.add.at(ones, place, np.concatenate([self.ones, other.ones]))
        np.add.at(n, place, np.concatenate([self.n, other.n]))
        return RateCounts(keys, ones, n)


@dataclass(slots=True)
class StudyCounts:
    """What is counted over all readers.

    Attributes
    ----------
    trials : Counter
        Trials by condition and rule (its place in ``design.left_out_by``, -1 where kept).
    rates : RateCounts
        Binary outcomes.
    missing : (outcomes, reasons) int64 array
        Rows of ``outcomes`` by measure, in the order of ``design.measures``, and reason; column 0
        counts those with a value.
    """

    trials: Counter[tuple[int, int]] = field(default_factory=Counter)
    rates: RateCounts = field(
        default_factory=lambda: RateCounts(
            np.zeros(0, np.int64), np.zeros((0, 0), np.int64), np.zeros((0, 0), np.int64)
        )
    )
    missing: Ints = field(default_factory=lambda: np.zeros((0, 0), dtype=np.int64))

    def add(self, other: StudyCounts) -> None:
        """Add the counts of one more reader."""
        self.trials.update(other.trials)
        first = self.missing.size == 0
        self.rates = other.rates if first else self.rates + other.rates
        self.missing = other.missing if first else self.missing + other.missing


def binary_measures(design: TableDesign) -> tuple[str, ...]:
    """The binary outcomes of regions, in the order of the tables."""
    return tuple(measure.name for measure in design.measures if measure.kind == "binary")


def conditions(design: TableDesign) -> list[tuple[int, ...]]:
    """Every combination of the factors' levels, by the code of the condition.

    Returns
    -------
    list of tuple of int
        The place of each factor's level; one empty tuple where there are no factors.
    """
    return list(product(*(range(len(levels)) for levels in design.factors.values())))


def condition_codes(levels: list[NDArray[np.int32]], design: TableDesign, rows: int) -> Ints:
    """The condition of each row.

    Parameters
    ----------
    levels : list of (rows,) int32 array
        The level of each factor in each row, factors in the order of the design.
    design : TableDesign
        The study's factors.
    rows : int
        How many rows there are, for studies without factors.
    """
    code = np.zeros(rows, dtype=np.int64)
    for own, names in zip(levels, design.factors.values(), strict=True):
        code = code * len(names) + own
    return code


def codes_of(batch: pa.RecordBatch, name: str) -> NDArray[np.int32]:
    """The codes of a coded column; -1 where missing."""
    return np.asarray(filled(batch.column(name).indices, -1), dtype=np.int32)


def filled(column: pa.Array, value: float) -> NDArray[Any]:
    """A column as an array, with a value where cells are missing."""
    return np.asarray(column if column.null_count == 0 else column.fill_null(value))


def reader_of(starts: Ints) -> Ints:
    """The reader of each row.

    Parameters
    ----------
    starts : (readers + 1,) int64 array
        Where the rows of each reader begin, and how many there are.

    Returns
    -------
    (rows,) int64 array
        From 0.

    Examples
    --------
    >>> reader_of(np.array([0, 2, 2, 3])).tolist()
    [0, 0, 2]
    """
    return np.repeat(np.arange(len(starts) - 1), np.diff(starts))


def rate_counts(
    wide: pa.RecordBatch, design: TableDesign, reader: Ints, readers: int
) -> list[RateCounts]:
    """Count binary outcomes in rows of ``outcomes_wide``, reader by reader.

    Parameters
    ----------
    wide : pa.RecordBatch
        Rows of some readers.
    design : TableDesign
        The tables of the study.
    reader : (rows,) int64 array
        The reader of each row, from 0; non-decreasing.
    readers : int
        How many readers there are.

    Returns
    -------
    list of RateCounts
        One a reader.
    """
    condition = condition_codes([codes_of(wide, f) for f in design.factors], design, len(wide))
    width = len(design.regions)
    for levels in design.factors.values():
        width *= len(levels)
    key = condition * len(design.regions) + codes_of(wide, "region") + reader * width
    keys, place = np.unique(key, return_inverse=True)
    names = binary_measures(design)
    ones = np.zeros((len(keys), len(names)), dtype=np.int64)
    n = np.zeros_like(ones)
    for column, name in enumerate(names):
        values = filled(wide.column(name), -1)
        ones[:, column] = np.bincount(place[values == 1], minlength=len(keys))
        n[:, column] = np.bincount(place[values >= 0], minlength=len(keys))
    starts = np.searchsorted(keys, np.arange(readers + 1) * width)
    return [
        RateCounts(keys[start:stop] - own * width, ones[start:stop], n[start:stop])
        for own, (start, stop) in enumerate(pairwise(starts.tolist()))
    ]


def missing_counts(outcomes: pa.RecordBatch, design: TableDesign, starts: Ints) -> list[Ints]:
    """Count the rows of ``outcomes`` by measure and reason, reader by reader.

    Parameters
    ----------
    outcomes : pa.RecordBatch
        Rows of some readers.
    design : TableDesign
        The tables of the study.
    starts : (readers + 1,) int64 array
        Where the rows of each reader begin, and how many there are.

    Returns
    -------
    list of (outcomes, reasons) int64 array
        One a reader. Measures in the order of ``design.measures``; column 0 counts rows with a
        value.
    """
    by_name = sorted(measure.name for measure in design.measures)
    width = len(design.reasons)
    # Codes of the column count from the first true reason; the empty one is a missing cell.
    code = codes_of(outcomes, "measure") * np.int64(width) + codes_of(outcomes, "missing") + 1
    rows = [by_name.index(measure.name) for measure in design.measures]
    size = len(by_name) * width
    return [
        np.bincount(code[start:stop], minlength=size).reshape(len(by_name), width)[rows]
        for start, stop in pairwise(starts.tolist())
    ]
