"""Readiness of the tables that were built: read them again, count, and write what was found."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import prod
from pathlib import Path
from typing import Any, Final

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.parquet as pq
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.export.readiness_files import write_readiness_files
from etl.measures.dependence import Conventions, shared_fixations
from etl.readiness import Conditions, OutcomeCounts, UnitCells, outcome_readiness
from etl.readiness.counts import cell_of
from etl.readiness.facts import ALL_REGIONS, Dependence, Readiness
from etl.tables import TableDesign

#: With more region names than this they are counted together, as on the audit page.
MOST_REGIONS: Final = 20
#: With more combinations of levels than this only those that occur are listed.
MOST_CELLS: Final = 400
#: The grouping columns.
_UNITS: Final = ("participant", "item")
_MISSING: Final = 2

Codes = NDArray[np.int64]


@dataclass(eq=False)
class _Pairs:
    """Counts of all outcomes by reader (or item) × condition × region."""

    unit: str
    keys: Codes  # owner * conditions + condition, ascending
    values: NDArray[np.int32]  # pairs × regions, outcomes, zeros and ones


class _Counting:
    """Counts the rows of one table."""

    def __init__(
        self, outcomes: Sequence[str], regions: int, conditions: int, pairs: dict[str, Codes]
    ) -> None:
        self.outcomes = tuple(outcomes)
        self.regions = regions
        self.cells = np.zeros((conditions * regions, len(outcomes), 3), dtype=np.int64)
        self.pairs = [
            _Pairs(unit, keys, np.zeros((len(keys) * regions, len(outcomes), 2), dtype=np.int32))
            for unit, keys in pairs.items()
        ]
        self.conditions = conditions

    def add(
        self, states: Sequence[Codes], condition: Codes, region: Codes, owners: dict[str, Codes]
    ) -> None:
        """Count some rows, of which the outcomes are 0, 1 or missing."""
        cell = condition * self.regions + region
        for place, state in enumerate(states):
            size = self.cells.shape[0] * 3
            counted = np.bincount(cell * 3 + state, minlength=size)
            self.cells[:, place] += counted.reshape(-1, 3)
        for own in self.pairs:
            owner = owners[own.unit]
            known = owner >= 0
            wanted = owner * self.conditions + condition
            pair = np.minimum(np.searchsorted(own.keys, wanted), len(own.keys) - 1)
            if len(own.keys) == 0 or (own.keys[pair[known]] != wanted[known]).any():
                if known.any():
                    raise FaultError("a row of outcomes_wide has no row in trials")
                continue
            pair = pair * self.regions + region
            if not known.any():
                continue
            # Rows come sorted by reader, so a group of them touches few pairs.
            low, high = int(pair[known].min()), int(pair[known].max()) + 1
            for place, state in enumerate(states):
                use = known & (state < _MISSING)
                key = (pair[use] - low) * 2 + state[use]
                counted = np.bincount(key, minlength=(high - low) * 2)
                own.values[low:high, place] += counted.reshape(-1, 2).astype(np.int32)

    def counts(
        self, outcome: str, region: tuple[int, str], conditions: Conditions
    ) -> OutcomeCounts:
        """The counts of one outcome in one region."""
        place, (at, name) = self.outcomes.index(outcome), region
        units = []
        for own in self.pairs:
            owner, condition = np.divmod(own.keys, self.conditions)
            values = own.values[at :: self.regions, place].astype(np.int64)
            some = values.any(axis=1)
            units.append(UnitCells(own.unit, owner[some], condition[some], values[some]))
        cells = self.cells[at :: self.regions, place]
        return OutcomeCounts(outcome, name, conditions, cells, tuple(units))


def readiness_of(
    folder: Path, design: TableDesign, conventions: Conventions | None = None
) -> Readiness:
    """What is to be known of all binary outcomes of a study before the first fit.

    Parameters
    ----------
    folder : Path
        Where ``outcomes_wide.parquet`` and ``trials.parquet`` are, finished.
    design : TableDesign
        What the tables have in common.
    conventions : tuple of str or None
        What the study does with fixations outside every region, and where there was no
        opportunity; for None dependences are told that hold whatever it does.

    Returns
    -------
    Readiness
        Outcomes of regions in the order of the catalogue, over the design's regions in
        their order; then those of trials.
    """
    trials = pq.ParquetFile(folder / "trials.parquet", read_dictionary=_texts(design))
    wide = pq.ParquetFile(folder / "outcomes_wide.parquet", read_dictionary=_texts(design))
    with trials, wide:
        conditions, pairs = _conditions_and_pairs(trials, design)
        codings = {name: design.coding(name) for name in design.factors}
        of_trials = _binary(design.trial_measures)
        counted = _Counting(of_trials, 1, len(conditions), pairs)
        for group in _groups(trials, design, of_trials, ()):
            counted.add(
                _states(group, of_trials),
                _condition(group, conditions),
                np.zeros(len(group), dtype=np.int64),
                _owners(group, design),
            )
        of_regions = _binary(design.measures)
        together = len(design.regions) > MOST_REGIONS
        regions = [(0, ALL_REGIONS)] if together else list(enumerate(design.regions))
        counting = _Counting(of_regions, max(len(regions), 1), len(conditions), pairs)
        rows = np.zeros(max(len(regions), 1), dtype=np.int64)
        extra = () if together else ("region",)
        for group in _groups(wide, design, of_regions, extra) if of_regions else ():
            region = np.zeros(len(group), dtype=np.int64)
            if not together:
                region = _codes(group, "region", design.regions)
                rows += np.bincount(region, minlength=len(rows))
            counting.add(
                _states(group, of_regions),
                _condition(group, conditions),
                region,
                _owners(group, design),
            )
    if not together:
        # A region that no kept trial has is left out.
        regions = [region for region in regions if rows[region[0]]] or regions
    outcomes = [
        outcome_readiness(counting.counts(name, region, conditions), codings)
        for name in of_regions
        for region in regions
    ]
    outcomes += [
        outcome_readiness(counted.counts(name, (0, ""), conditions), codings) for name in of_trials
    ]
    names = tuple(m.name for m in design.measures), tuple(m.name for m in design.trial_measures)
    shared = tuple(Dependence(*pair) for pair in shared_fixations(*names, conventions))
    return Readiness(tuple(design.factors), tuple(outcomes), shared, together)


def write_readiness(readiness: Readiness, folder: Path) -> None:
    """Write ``readiness.csv``, ``readiness.json`` and ``formulas.csv`` into a folder.

    Parameters
    ----------
    readiness : Readiness
        From :func:`readiness_of`.
    folder : Path
        Where they go; files of these names are replaced.
    """
    write_readiness_files(readiness, folder)


def _binary(measures: Sequence[Any]) -> tuple[str, ...]:
    """The names of the binary outcomes."""
    return tuple(measure.name for measure in measures if measure.kind == "binary")


def _texts(design: TableDesign) -> list[str]:
    """The columns of text that are read as codes."""
    return [name for name in _UNITS if name in design.ids and design.ids[name].type == "text"]


def _groups(
    file: pq.ParquetFile, design: TableDesign, outcomes: Sequence[str], extra: Sequence[str]
) -> Iterator[pa.Table]:
    """The rows of a table, a row group at a time, with the columns that are counted."""
    units = [name for name in _UNITS if name in design.ids]
    names = [*units, *design.factors, *extra, *outcomes]
    for group in range(file.num_row_groups):
        yield file.read_row_group(group, columns=names)


def _array(column: pa.ChunkedArray, instead: int) -> Codes:
    """Whole numbers, with something where they are missing."""
    whole = column.combine_chunks()
    if whole.null_count:
        whole = pc.fill_null(whole, instead)
    return np.asarray(whole).astype(np.int64, copy=False)


def _codes(group: pa.Table, name: str, values: Sequence[str]) -> Codes:
    """The place of each text among those that the study has; -1 where there is none."""
    column = group.column(name)
    known = pa.array(list(values), pa.string())
    if pa.types.is_integer(column.type):
        # Whole numbers lie in ascending order.
        numbers = np.array([int(value) for value in values], dtype=np.int64)
        wanted = _array(column, -1)
        place = np.searchsorted(numbers, wanted)
        there = place < len(numbers)
        there[there] = numbers[place[there]] == wanted[there]
        return np.where(there, place, -1)
    parts = [np.zeros(0, dtype=np.int64)]
    for chunk in column.chunks:
        own = chunk if pa.types.is_dictionary(chunk.type) else chunk.dictionary_encode()
        texts = own.dictionary.cast(pa.string())
        lookup = np.asarray(pc.fill_null(pc.index_in(texts, value_set=known), -1), dtype=np.int64)
        codes = np.asarray(pc.fill_null(own.indices, len(lookup)), dtype=np.int64)
        parts.append(np.append(lookup, -1)[codes])
    return np.concatenate(parts)


def _level_codes(group: pa.Table, levels: dict[str, tuple[str, ...]]) -> Codes:
    """The place of each factor's level in each row."""
    columns = [_codes(group, name, own) for name, own in levels.items()]
    return np.stack(columns, axis=1) if columns else np.zeros((len(group), 0), dtype=np.int64)


def _owners(group: pa.Table, design: TableDesign) -> dict[str, Codes]:
    """Which reader and which item each row is of."""
    return {
        name: _codes(group, name, design.ids[name].values) for name in _UNITS if name in design.ids
    }


def _states(group: pa.Table, outcomes: Sequence[str]) -> list[Codes]:
    """The values of each outcome: 0, 1, or that it is missing."""
    return [_array(group.column(name), _MISSING) for name in outcomes]


def _conditions_and_pairs(
    trials: pq.ParquetFile, design: TableDesign
) -> tuple[Conditions, dict[str, Codes]]:
    """The conditions, and which readers and items have trials in which."""
    levels = dict(design.factors)
    groups = [
        (_level_codes(group, levels), _owners(group, design))
        for group in _groups(trials, design, (), ())
    ]
    none = np.zeros((0, len(levels)), dtype=np.int64)
    codes = np.concatenate([none, *(own for own, _ in groups)])
    sizes = tuple(len(own) for own in levels.values())
    if prod(sizes) <= MOST_CELLS:
        rows = np.stack(np.unravel_index(np.arange(prod(sizes)), sizes), axis=1) if sizes else none
        rows = rows if sizes else np.zeros((1, 0), dtype=np.int64)
    else:
        rows = np.unique(codes, axis=0)
    conditions = Conditions(tuple(levels), tuple(levels.values()), rows)
    where = _among(codes, conditions)
    pairs = {}
    for unit in _UNITS:
        if unit in design.ids:
            owner = np.concatenate([np.zeros(0, np.int64), *(own[unit] for _, own in groups)])
            known = owner >= 0
            pairs[unit] = np.unique(owner[known] * len(conditions) + where[known])
    return conditions, pairs


def _condition(group: pa.Table, conditions: Conditions) -> Codes:
    """The condition of each row."""
    levels = dict(zip(conditions.factors, conditions.levels, strict=True))
    return _among(_level_codes(group, levels), conditions)


def _among(codes: Codes, conditions: Conditions) -> Codes:
    """The place of each combination of levels among the conditions."""
    if not conditions.factors:
        return np.zeros(len(codes), dtype=np.int64)
    sizes = tuple(len(own) for own in conditions.levels)
    if prod(sizes) == len(conditions):
        return cell_of(codes, sizes)
    both, place = np.unique(np.concatenate([conditions.codes, codes]), axis=0, return_inverse=True)
    if len(both) > len(conditions):
        raise FaultError("outcomes_wide has a combination of levels that trials has not")
    return place.reshape(-1)[len(conditions) :]
