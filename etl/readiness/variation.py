"""Which factors, and which interactions, vary within readers and within items."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from math import prod
from typing import Literal

import numpy as np

from etl.readiness.counts import Flags, Ints, OutcomeCounts, UnitCells, cell_of
from etl.readiness.facts import UnitCount, Variation
from etl.readiness.terms import Term, design_matrix, terms_of

#: With more combinations than this a set of them is no longer told by a number that counts.
_MOST_BITS = 16


@dataclass(frozen=True, slots=True)
class Behind:
    """A variation, and what stands behind slopes for it.

    Attributes
    ----------
    variation : Variation
        The factor or interaction, and the unit.
    rarer : float
        Rarer values for each combination of levels in each unit in which it varies, on average.
    """

    variation: Variation
    rarer: float


def unit_counts(counts: OutcomeCounts) -> tuple[UnitCount, ...]:
    """How many readers, and items, have values, and how many have one value only."""
    return tuple(_counted(own.unit, _by_owner(own)) for own in counts.units)


def cell_unit_counts(counts: OutcomeCounts) -> tuple[tuple[UnitCount, ...], ...]:
    """The same within each condition."""
    width = len(counts.conditions)
    tables = []
    for own in counts.units:
        some = own.values > 0
        kinds = {
            "units": some.any(axis=1),
            "all_zero": some[:, 0] & ~some[:, 1],
            "all_one": some[:, 1] & ~some[:, 0],
        }
        tables.append({k: np.bincount(own.condition[v], minlength=width) for k, v in kinds.items()})
    return tuple(
        tuple(
            UnitCount(own.unit, *(int(table[kind][place]) for kind in table))
            for own, table in zip(counts.units, tables, strict=True)
        )
        for place in range(width)
    )


def _counted(unit: str, values: Ints) -> UnitCount:
    """Units by what values they have."""
    zeros, ones = values[:, 0] > 0, values[:, 1] > 0
    either, only_zeros, only_ones = zeros | ones, zeros & ~ones, ones & ~zeros
    return UnitCount(unit, int(either.sum()), int(only_zeros.sum()), int(only_ones.sum()))


def _by_owner(own: UnitCells) -> Ints:
    """Zeros and ones of each unit."""
    width = int(own.owner.max(initial=-1)) + 1
    columns = [np.bincount(own.owner, own.values[:, value], width) for value in (0, 1)]
    return np.stack(columns, axis=1).astype(np.int64)


def variations(counts: OutcomeCounts, order: int) -> tuple[Behind, ...]:
    """Whether factors and interactions vary within readers and within items.

    A factor varies within a unit that has values in two levels or more; an interaction where the
    unit's own combinations of levels let it be told from the effects within it: of two factors
    with two levels each, all four. Of an interaction every factor then varies within the unit
    (Barr 2013).

    Parameters
    ----------
    counts : OutcomeCounts
        With values.
    order : int
        Of how many factors interactions are looked at.

    Returns
    -------
    tuple of Behind
        For each unit in turn, main effects first. Factors with one level that has values are left
        out. Units count that have a value; one with a single value is one in which nothing varies.

    References
    ----------
    Barr (2013). Random effects structure for testing interactions in linear mixed-effects models.
    Frontiers in Psychology, 4, 328. doi:10.3389/fpsyg.2013.00328
    """
    return tuple(
        _variation(counts, own, term)
        for own in counts.units
        for term in terms_of([counts.conditions.factors[p] for p in counts.varying], order)
    )


def _variation(counts: OutcomeCounts, own: UnitCells, term: Term) -> Behind:
    """One term within one kind of unit."""
    places = [counts.conditions.factors.index(name) for name in term]
    sizes = tuple(len(counts.active[place]) for place in places)
    owner = own.owner
    units = int(owner.max(initial=-1)) + 1
    total = own.values[:, 0] + own.values[:, 1]
    some = total > 0
    codes = np.stack(
        [
            np.searchsorted(counts.active[p], counts.conditions.codes[own.condition[some], p])
            for p in places
        ],
        axis=1,
    )
    seen = np.zeros((units, prod(sizes)), dtype=np.bool_)
    seen[owner[some], cell_of(codes, sizes)] = True
    values = np.bincount(owner, total, units)
    varies = _vary(seen, sizes)
    varying, eligible = int(varies.sum()), int((values > 0).sum())
    kind: Literal["within", "between", "within some"] = "within some"
    if not varying:
        kind = "between"
    elif varying == eligible:
        kind = "within"
    repeated = bool((values > seen.sum(axis=1))[varies].sum() * 2 > varying)
    rarer = np.bincount(owner, own.values[:, counts.rarer], units)[varies].sum()
    return Behind(
        Variation(
            term, own.unit, kind, varying, eligible, repeated, several=int((values >= 2).sum())
        ),
        float(rarer) / (varying * prod(sizes)) if varying else 0.0,
    )


def _vary(seen: Flags, sizes: tuple[int, ...]) -> Flags:
    """Whether a term varies, by the combinations that each unit has."""
    if len(sizes) == 1:
        two: Flags = seen.sum(axis=1) >= 2
        return two
    varies: Flags = np.asarray(seen.all(axis=1), dtype=np.bool_)
    rest = np.flatnonzero(~varies)
    if len(rest):
        patterns, which = _patterns(seen[rest])
        varies[rest] = _told_apart(patterns, sizes)[which]
    return varies


def _patterns(seen: Flags) -> tuple[Flags, Ints]:
    """The sets of combinations that occur, and which of them each unit has."""
    if seen.shape[1] > _MOST_BITS:
        distinct, which = np.unique(seen, axis=0, return_inverse=True)
        return distinct, which.reshape(-1)
    # A set as one whole number: there are very many units and few sets.
    number = seen @ (1 << np.arange(seen.shape[1], dtype=np.int64))
    there = np.flatnonzero(np.bincount(number, minlength=1))
    return (there[:, None] >> np.arange(seen.shape[1]) & 1).astype(np.bool_), np.searchsorted(
        there, number
    )


def _told_apart(patterns: Flags, sizes: Sequence[int]) -> Flags:
    """Whether an interaction can be told from what is within it, for each set of combinations."""
    return np.array([_told(tuple(sizes), row.tobytes()) for row in patterns], dtype=np.bool_)


@lru_cache(maxsize=65_536)
def _told(sizes: tuple[int, ...], pattern: bytes) -> bool:
    """The same for one set: the interaction must make the rank of the columns larger."""
    there = np.flatnonzero(np.frombuffer(pattern, dtype=np.bool_))
    if not len(there):
        return False
    codes = np.stack(np.unravel_index(there, sizes), axis=1)
    # With the interaction every combination has a coefficient of its own.
    rank = int(np.linalg.matrix_rank(design_matrix(codes, sizes, len(sizes) - 1)))
    return len(there) > rank
