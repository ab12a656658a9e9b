"""What became of every cell of ``outcomes`` in every variant, and what is counted from it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.session.outcome_work import Cells
from etl.tables import MeasureColumn
from etl.variants.facts import Crossing
from etl.variants.shares import changing_pairs

_TYPES: Final = {"binary": np.int8, "count": np.int32, "duration": np.float64}

States = NDArray[Any]


@dataclass(frozen=True, slots=True, eq=False)
class Universe:
    """The cells of some readers that are there in the variant that leaves nothing out.

    Attributes
    ----------
    trials : (m,) int64 array
        The trials of the study among all of the readers' trials.
    cells : Cells
        Their regions.
    slot : (cells,) int64 array
        Under which region each is counted.
    condition : (all trials,) int64 array
        The combination of levels of each trial.
    sizes : tuple of int
        How many regions are counted, and how many combinations of levels there are.
    """

    trials: NDArray[np.int64]
    cells: Cells
    slot: NDArray[np.int64]
    condition: NDArray[np.int64]
    sizes: tuple[int, int]

    def __len__(self) -> int:
        return len(self.slot)

    @property
    def keys(self) -> NDArray[np.int64]:
        """(cells,) int64 array: region and combination of each, as one number."""
        return self.slot * self.sizes[1] + self.condition[self.cells.trial]


@dataclass(slots=True, eq=False)
class StateTable:
    """The state of every cell in every variant.

    Attributes
    ----------
    universe : Universe
        The cells.
    variants : int
        How many variants there are.
    measures : sequence of MeasureColumn
        What is measured.
    states : dict of str to (variants, cells) array
        By measure: the value, ``NO_VALUE`` or ``LEFT_OUT``.
    """

    universe: Universe
    variants: int
    measures: Sequence[MeasureColumn]
    states: dict[str, States] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for measure in self.measures:
            shape = (self.variants, len(self.universe))
            self.states[measure.name] = np.full(shape, LEFT_OUT, dtype=_TYPES[measure.kind])

    def fill(
        self,
        variant: int,
        kept: NDArray[np.bool_],
        values: Mapping[str, NDArray[np.float64]],
    ) -> None:
        """Write down one variant.

        Parameters
        ----------
        variant : int
            Which.
        kept : (all trials,) bool array
            The trials that it keeps.
        values : mapping of str to (cells of those,) float64 array
            By measure; NaN where there is none.
        """
        rows = kept[self.universe.cells.trial]
        for name, states in self.states.items():
            states[variant, rows] = np.where(np.isnan(values[name]), NO_VALUE, values[name])

    def changed(self, name: str, base: int) -> NDArray[np.int64]:
        """The cells of a measure that are not the same in all variants, ascending."""
        states = self.states[name]
        return np.flatnonzero((states != states[base]).any(axis=0))


def counts_of(states: States, keys: NDArray[np.int64], width: int) -> NDArray[np.int64]:
    """Zeros, ones and cells that are there, by key.

    Parameters
    ----------
    states : (variants, cells) array
        Of a binary outcome.
    keys : (cells,) int64 array
        Under which each cell is counted.
    width : int
        How many keys there are.

    Returns
    -------
    (variants, width, 3) int64 array
        Zeros, ones, and cells that are not left out.
    """
    counted = np.zeros((len(states), width, 3), dtype=np.int64)
    for place in range(len(states)):
        own = states[place]
        counted[place, :, 0] = np.bincount(keys[own == 0], minlength=width)
        counted[place, :, 1] = np.bincount(keys[own == 1], minlength=width)
        counted[place, :, 2] = np.bincount(keys[own != LEFT_OUT], minlength=width)
    return counted


@dataclass(slots=True, eq=False)
class ChangeCounts:
    """How many cells of one measure change, by region.

    Attributes
    ----------
    cells, changed, trials : (regions,) int64 array
        Cells that are there in any variant, those that are not the same in all, and trials that
        these are of.
    changed_by, trials_by : (variants, regions) int64 array
        Cells that are not as in the study as it stands, and trials that these are of.
    pairs : (settings, regions) int64 array
        Pairs of variants that differ in one setting only in which a cell differs, over all cells.
    """

    cells: NDArray[np.int64]
    changed: NDArray[np.int64]
    trials: NDArray[np.int64]
    changed_by: NDArray[np.int64]
    trials_by: NDArray[np.int64]
    pairs: NDArray[np.int64]

    def add(self, other: ChangeCounts) -> None:
        """Add those of other readers."""
        for name in ("cells", "changed", "trials", "changed_by", "trials_by", "pairs"):
            setattr(self, name, getattr(self, name) + getattr(other, name))


@dataclass(frozen=True, slots=True, eq=False)
class Changed:
    """The cells of one measure that are not the same in all variants.

    Attributes
    ----------
    rows : (k,) int64 array
        Which cells.
    states : (variants, k) array
        Their states.
    pairs : (k, settings) int64 array
        For each setting, pairs of variants that differ in it only and in which the cell differs;
        all 0 where not every combination is there.
    """

    rows: NDArray[np.int64]
    states: States
    pairs: NDArray[np.int64]


def changes_of(table: StateTable, name: str, crossing: Crossing) -> tuple[Changed, ChangeCounts]:
    """Which cells of a measure change, and how many by region.

    Parameters
    ----------
    table : StateTable
        All states.
    name : str
        The measure.
    crossing : Crossing
        The variants.

    Returns
    -------
    Changed and ChangeCounts
    """
    universe, states = table.universe, table.states[name]
    regions = universe.sizes[0]
    rows = table.changed(name, crossing.base)
    own = np.ascontiguousarray(states[:, rows])
    slot, trial = universe.slot[rows], universe.cells.trial[rows]
    there = (states != LEFT_OUT).any(axis=0)
    pairs = np.zeros((len(rows), len(crossing.settings)), dtype=np.int64)
    if crossing.full:
        pairs, _ = changing_pairs(own.T, crossing)
    differs = own != own[crossing.base]
    # A trial has a region once, but where regions are counted together.
    first = np.ones(len(rows), dtype=bool)
    first[1:] = (trial[1:] != trial[:-1]) | (regions > 1)
    starts = np.flatnonzero(first)
    of_trials = np.logical_or.reduceat(differs, starts, axis=1) if len(rows) else differs
    counts = ChangeCounts(
        np.bincount(universe.slot[there], minlength=regions),
        np.bincount(slot, minlength=regions),
        np.bincount(slot[starts], minlength=regions),
        _by_variant(differs, slot, regions),
        _by_variant(of_trials, slot[starts], regions),
        np.stack(
            [
                np.bincount(slot, own_pairs, minlength=regions).astype(np.int64)
                for own_pairs in pairs.T
            ]
        ),
    )
    return Changed(rows, own, pairs), counts


def _by_variant(
    differs: NDArray[np.bool_], slot: NDArray[np.int64], regions: int
) -> NDArray[np.int64]:
    """How many of some cells differ, by variant and region."""
    return np.stack([np.bincount(slot[own], minlength=regions) for own in differs])
