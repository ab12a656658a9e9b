"""Zeros and ones in finished tables: counted a row group at a time, by whichever worker."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from math import prod
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.readiness import Conditions, OutcomeCounts, UnitCells
from etl.readiness.counts import cell_of
from etl.tables import TableDesign

#: The grouping columns.
UNITS = ("participant", "item")
_MISSING = 2

Codes = NDArray[np.int64]
Counts = NDArray[np.unsignedinteger]


@dataclass(frozen=True, slots=True)
class GroupTask:
    """A row group to be counted.

    Attributes
    ----------
    table : str
        Which table it is of.
    group : int
        Its number in the file.
    """

    table: str
    group: int


@dataclass(frozen=True, slots=True, eq=False)
class PairCounts:
    """Counts by reader (or item) × condition.

    Attributes
    ----------
    keys : (pairs,) int64 array
        Owner × number of conditions + condition, ascending.
    values : (pairs, regions, outcomes, 2) array of whole numbers
        Zeros and ones.
    """

    keys: Codes
    values: Counts


@dataclass(frozen=True, slots=True, eq=False)
class GroupCounts:
    """What was counted in one row group.

    Attributes
    ----------
    table : str
        Which table it is of.
    rows : (regions,) int64 array
        Rows of each region.
    cells : (conditions, regions, outcomes, 3) int64 array
        Zeros, ones and missing values.
    units : dict of str to PairCounts
        The same by reader and by item, without missing values.
    """

    table: str
    rows: Codes
    cells: Codes
    units: dict[str, PairCounts]


@dataclass(frozen=True, slots=True, eq=False)
class Counted:
    """What is to be counted in one table.

    Attributes
    ----------
    outcomes : tuple of str
        The binary outcomes.
    regions : tuple of str
        The regions that are told apart; one without a name where none are.
    """

    outcomes: tuple[str, ...]
    regions: tuple[str, ...] = ("",)

    @property
    def together(self) -> bool:
        """Whether regions are not told apart."""
        return self.regions == ("",)


class GroupCounting:
    """Counts row groups.

    Parameters
    ----------
    folder : Path
        Where the finished tables are.
    design : TableDesign
        What they have in common.
    conditions : Conditions or None
        The conditions; for None the combinations of levels that occur are looked for instead.
    wanted : dict of str to Counted
        What is to be counted, by table.
    """

    def __init__(
        self,
        folder: Path,
        design: TableDesign,
        conditions: Conditions | None,
        wanted: dict[str, Counted],
    ) -> None:
        self._folder = folder
        self._design = design
        self._conditions = conditions
        self._wanted = wanted

    def __call__(self, task: GroupTask) -> GroupCounts:
        """Count one row group."""
        wanted = self._wanted[task.table]
        units = tuple(name for name in UNITS if name in self._design.ids)
        extra = () if wanted.together else ("region",)
        rows = self._read(task, (*units, *self._design.factors, *extra, *wanted.outcomes))
        levels = self._levels(rows)
        if self._conditions is None:
            found = np.unique(levels, axis=0)
            return GroupCounts(task.table, np.zeros(0, np.int64), found, {})
        condition = among(levels, self._conditions)
        region = np.zeros(len(rows), dtype=np.int64)
        if not wanted.together:
            region = _codes(rows, "region", wanted.regions)
        shape = (len(self._conditions), len(wanted.regions))
        table = (shape[1], len(wanted.outcomes))
        pairs = {}
        for unit in units:
            owner = _codes(rows, unit, self._design.ids[unit].values)
            known = np.flatnonzero(owner >= 0)
            keys = owner[known] * shape[0] + condition[known]
            pairs[unit] = (known, *_placed(keys))
        cells = np.zeros((shape[0] * shape[1], len(wanted.outcomes), 3), dtype=np.int64)
        values = {
            unit: np.zeros((len(keys) * shape[1], len(wanted.outcomes), 2), dtype=np.int64)
            for unit, (_, keys, _) in pairs.items()
        }
        for place, name in enumerate(wanted.outcomes):
            state = _array(rows.column(name), _MISSING)
            _add(cells[:, place], (condition * shape[1] + region) * 3 + state)
            for unit, (known, _, pair) in pairs.items():
                own = state[known]
                there = own < _MISSING
                key = (pair * shape[1] + region[known]) * 2 + own
                _add(values[unit][:, place], key[there])
        return GroupCounts(
            task.table,
            np.bincount(region, minlength=shape[1]),
            cells.reshape(shape[0], *table, 3),
            {
                unit: PairCounts(keys, _small(values[unit].reshape(len(keys), *table, 2)))
                for unit, (_, keys, _) in pairs.items()
            },
        )

    def _read(self, task: GroupTask, columns: Sequence[str]) -> pa.Table:
        """The rows of a group, with some columns."""
        with opened(self._folder, task.table, self._design) as file:
            return file.read_row_group(task.group, columns=list(columns))

    def _levels(self, rows: pa.Table) -> Codes:
        """The place of each factor's level in each row."""
        columns = [_codes(rows, name, own) for name, own in self._design.factors.items()]
        return np.stack(columns, axis=1) if columns else np.zeros((len(rows), 0), dtype=np.int64)


def opened(folder: Path, table: str, design: TableDesign) -> pq.ParquetFile:
    """A finished table, whose texts are read as codes.

    Parameters
    ----------
    folder : Path
        Where it is.
    table : str
        Its name.
    design : TableDesign
        What the tables have in common.

    Returns
    -------
    pq.ParquetFile
        To be closed.
    """
    texts = [name for name in UNITS if name in design.ids and design.ids[name].type == "text"]
    return pq.ParquetFile(folder / f"{table}.parquet", read_dictionary=texts)


@dataclass(slots=True, eq=False)
class _Merging:
    """Counts by reader, or by item, of many row groups: added up whenever they have doubled."""

    parts: list[PairCounts] = field(default_factory=list)
    merged: int = 0

    def add(self, own: PairCounts) -> None:
        """Take in those of one more row group."""
        self.parts.append(own)
        if sum(len(part.keys) for part in self.parts) > 2 * self.merged + 10_000:
            self.merge()

    def merge(self) -> PairCounts:
        """The counts so far."""
        if len(self.parts) > 1:
            self.parts = [_merged(self.parts)]
        self.merged = sum(len(part.keys) for part in self.parts)
        return self.parts[0]


class TableCounts:
    """What was counted in all row groups of a table.

    Parameters
    ----------
    wanted : Counted
        What is counted.
    conditions : Conditions
        The conditions.
    units : sequence of str
        The grouping columns that the study has.
    """

    def __init__(self, wanted: Counted, conditions: Conditions, units: Sequence[str]) -> None:
        self.wanted = wanted
        self._conditions = conditions
        shape = (len(wanted.regions), len(wanted.outcomes))
        self.rows = np.zeros(shape[0], dtype=np.int64)
        self._cells = np.zeros((len(conditions), *shape, 3), dtype=np.int64)
        none = PairCounts(np.zeros(0, np.int64), np.zeros((0, *shape, 2), np.uint8))
        self._units = {unit: _Merging([none]) for unit in units}

    def add(self, own: GroupCounts) -> None:
        """Take in one row group."""
        self.rows += own.rows
        self._cells += own.cells
        for unit, pairs in own.units.items():
            self._units[unit].add(pairs)

    def keys(self, unit: str) -> Codes:
        """The pairs of reader (or item) and condition that occur."""
        return self._units[unit].merge().keys

    def counts(self, outcome: str, region: int, name: str) -> OutcomeCounts:
        """The counts of one outcome in one region.

        Parameters
        ----------
        outcome : str
            Its name.
        region : int
            The region's place among those that are counted.
        name : str
            What the region is called.

        Returns
        -------
        OutcomeCounts
        """
        place = self.wanted.outcomes.index(outcome)
        units = []
        for unit, merging in self._units.items():
            pairs = merging.merge()
            values = pairs.values[:, region, place]
            some = (values[:, 0] | values[:, 1]) > 0
            owner, condition = np.divmod(pairs.keys[some], len(self._conditions))
            units.append(UnitCells(unit, owner, condition, values[some].astype(np.int64)))
        cells = self._cells[:, region, place]
        return OutcomeCounts(outcome, name, self._conditions, cells, tuple(units))


def among(codes: Codes, conditions: Conditions) -> Codes:
    """The place of each combination of levels among the conditions.

    Parameters
    ----------
    codes : (rows, factors) int64 array
        The place of each factor's level.
    conditions : Conditions
        All that there are.

    Returns
    -------
    (rows,) int64 array
    """
    if not conditions.factors:
        return np.zeros(len(codes), dtype=np.int64)
    sizes = tuple(len(own) for own in conditions.levels)
    if prod(sizes) == len(conditions):
        return cell_of(codes, sizes)
    both, place = np.unique(np.concatenate([conditions.codes, codes]), axis=0, return_inverse=True)
    if len(both) > len(conditions):
        raise FaultError("outcomes_wide has a combination of levels that trials has not")
    return place.reshape(-1)[len(conditions) :]


def _placed(keys: Codes) -> tuple[Codes, Codes]:
    """The distinct keys, ascending, and the place of each key among them."""
    if not len(keys):
        return keys, keys
    low = int(keys.min())
    span = int(keys.max()) - low + 1
    if span > 4 * len(keys):
        distinct, place = np.unique(keys, return_inverse=True)
        return distinct, place
    # Rows come sorted by reader, so a group of them has keys that lie close together.
    there = np.bincount(keys - low, minlength=span) > 0
    return np.flatnonzero(there) + low, (np.cumsum(there) - 1)[keys - low]


def _add(table: Codes, keys: Codes) -> None:
    """Add to a table how often each of its cells occurs among keys."""
    table += np.bincount(keys, minlength=table.size).reshape(table.shape)


def _small(counts: Codes) -> Counts:
    """Counts in the smallest whole numbers that hold them."""
    return counts.astype(np.min_scalar_type(int(counts.max(initial=0))))


def _merged(parts: Sequence[PairCounts]) -> PairCounts:
    """The sums of some counts."""
    keys = np.unique(np.concatenate([part.keys for part in parts]))
    most = sum(int(part.values.max(initial=0)) for part in parts)
    values = np.zeros((len(keys), *parts[0].values.shape[1:]), dtype=np.min_scalar_type(most))
    for part in parts:
        values[np.searchsorted(keys, part.keys)] += part.values.astype(values.dtype)
    return PairCounts(keys, values)


def _array(column: pa.ChunkedArray, instead: int) -> Codes:
    """Whole numbers, with something where they are missing."""
    whole = column.combine_chunks()
    if whole.null_count:
        whole = pc.fill_null(whole, instead)
    return np.asarray(whole).astype(np.int64, copy=False)


def _codes(group: pa.Table, name: str, values: Sequence[str]) -> Codes:
    """The place of each text among those that the study has; -1 where there is none."""
    column = group.column(name)
    if pa.types.is_integer(column.type):
        # Whole numbers lie in ascending order.
        numbers = np.array([int(value) for value in values], dtype=np.int64)
        wanted = _array(column, -1)
        place = np.searchsorted(numbers, wanted)
        there = place < len(numbers)
        there[there] = numbers[place[there]] == wanted[there]
        return np.where(there, place, -1)
    known = pa.array(list(values), pa.string())
    parts = [np.zeros(0, dtype=np.int64)]
    for chunk in column.chunks:
        own = chunk if pa.types.is_dictionary(chunk.type) else chunk.dictionary_encode()
        texts = own.dictionary.cast(pa.string())
        lookup = np.asarray(pc.fill_null(pc.index_in(texts, value_set=known), -1), dtype=np.int64)
        codes = np.asarray(pc.fill_null(own.indices, len(lookup)), dtype=np.int64)
        parts.append(np.append(lookup, -1)[codes])
    return np.concatenate(parts)
