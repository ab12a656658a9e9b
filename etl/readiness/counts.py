"""The counts that facts are made from: one binary outcome in one region."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

#: What a grouping column is called in sentences.
UNIT_WORDS = {"participant": "reader", "item": "item"}


@dataclass(frozen=True, eq=False)
class Conditions:
    """The combinations of the factors' levels.

    Attributes
    ----------
    factors : tuple of str
        Their names; none in a study without factors, which has one condition.
    levels : tuple of tuple of str
        The levels of each factor, in order.
    codes : (conditions, factors) int64 array
        The place of each factor's level in each condition, conditions in ascending order.
    """

    factors: tuple[str, ...]
    levels: tuple[tuple[str, ...], ...]
    codes: Ints

    def named(self, condition: int) -> tuple[str, ...]:
        """The level of each factor in one condition."""
        return tuple(
            own[code] for own, code in zip(self.levels, self.codes[condition].tolist(), strict=True)
        )

    def __len__(self) -> int:
        return len(self.codes)


@dataclass(frozen=True, slots=True, eq=False)
class UnitCells:
    """Values of readers, or of items, by condition; only pairs that occur.

    Attributes
    ----------
    unit : str
        The grouping column: ``participant`` or ``item``.
    owner : (pairs,) int64 array
        Which reader or item.
    condition : (pairs,) int64 array
        Which condition.
    values : (pairs, 2) int64 array
        Zeros and ones.
    """

    unit: str
    owner: Ints
    condition: Ints
    values: Ints


@dataclass(frozen=True, eq=False)
class OutcomeCounts:
    """Counts of one binary outcome in one region.

    Attributes
    ----------
    outcome, region : str
        Names; the region is empty for an outcome of trials.
    conditions : Conditions
        The rows of ``cells``.
    cells : (conditions, 3) int64 array
        Zeros, ones and missing values.
    units : tuple of UnitCells
        Readers, and items where the study knows them.
    """

    outcome: str
    region: str
    conditions: Conditions
    cells: Ints
    units: tuple[UnitCells, ...]

    @cached_property
    def values(self) -> Ints:
        """How many values each condition has."""
        own: Ints = self.cells[:, :2].sum(axis=1)
        return own

    @cached_property
    def active(self) -> tuple[tuple[int, ...], ...]:
        """For each factor the places of its levels that have any value."""
        codes = self.conditions.codes[self.values > 0]
        return tuple(tuple(np.unique(codes[:, place]).tolist()) for place in range(codes.shape[1]))

    @property
    def varying(self) -> tuple[int, ...]:
        """The places of the factors that have two levels or more with values."""
        return tuple(place for place, own in enumerate(self.active) if len(own) > 1)

    @property
    def rarer(self) -> int:
        """The place of the rarer value: 1, or 0 where there are fewer zeros than ones."""
        zeros, ones, _ = self.cells.sum(axis=0).tolist()
        return 0 if zeros < ones else 1


def cell_of(level_codes: Ints, sizes: tuple[int, ...]) -> Ints:
    """Codes of levels as one code a row.

    Parameters
    ----------
    level_codes : (rows, factors) int64 array
        The place of each factor's level.
    sizes : tuple of int
        How many levels each factor has.

    Returns
    -------
    (rows,) int64 array
        The last factor runs fastest; 0 in all rows without factors.

    Examples
    --------
    >>> cell_of(np.array([[0, 1], [1, 2]]), (2, 3)).tolist()
    [1, 5]
    """
    code = np.zeros(len(level_codes), dtype=np.int64)
    for place, size in enumerate(sizes):
        code = code * size + level_codes[:, place]
    return code
