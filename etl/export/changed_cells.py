"""Rows of ``changed_cells``: the cells of ``outcomes`` that are not the same in all variants."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.export.arrays import array_of, coded_of, numbers_of
from etl.export.parts import Part, TableParts
from etl.export.rows import RowMaker, TrialColumns
from etl.export.writers import TableWriter
from etl.tables import TableDesign, written_schema
from etl.tables.variants import CHANGED_CELLS, IN_STUDY, changed_cell_columns

#: States of a cell besides its value: left out with its trial or reader, or there without a value.
LEFT_OUT: Final = -1
NO_VALUE: Final = -2


@dataclass(frozen=True, slots=True, eq=False)
class ChangedRows:
    """Cells of one measure that change.

    Attributes
    ----------
    trial : (k,) int64 array
        The trial of each.
    order, code : (k,) int32 arrays
        Place of its region in reading order, and code of its name.
    states : (variants, k) array
        Its value in each variant, ``NO_VALUE`` or ``LEFT_OUT``.
    pairs : (k, settings) int64 array
        For each setting, pairs of variants that differ in it only and in which the cell differs.
    """

    trial: NDArray[np.int64]
    order: NDArray[np.int32]
    code: NDArray[np.int32]
    states: NDArray[Any]
    pairs: NDArray[np.int64]


class ChangedCells:
    """Makes the rows of ``changed_cells``.

    Parameters
    ----------
    design : TableDesign
        The tables of the study.
    hangs_on : mapping of str to str
        For each setting, its column and its key.
    pairs : sequence of int
        By setting, how many pairs of variants differ in it only; 0 where not every combination is
        there.
    formats : collection of str
        In which the table is wanted.
    """

    def __init__(
        self,
        design: TableDesign,
        hangs_on: Mapping[str, str],
        pairs: Sequence[int],
        formats: Collection[str],
    ) -> None:
        self._design = design
        self._pairs = np.array(pairs, dtype=np.float64)
        columns = changed_cell_columns(design, hangs_on)
        self._schema = written_schema(columns)
        self._parts = TableParts(columns, formats)
        self._names = sorted(m.name for m in design.measures)

    def part(self, trials: TrialColumns, changed: Mapping[str, ChangedRows], base: int) -> Part:
        """The rows of some readers, in the order of ``outcomes``.

        Parameters
        ----------
        trials : TrialColumns
            All trials of the readers.
        changed : mapping of str to ChangedRows
            By measure.
        base : int
            The variant that is the study as it stands.

        Returns
        -------
        Part
        """
        every = [changed[name] for name in self._names]
        lengths = [len(own.trial) for own in every]
        if not sum(lengths):
            return self._parts.part(None)
        measure = np.repeat(np.arange(len(every), dtype=np.int32), lengths)
        trial = np.concatenate([own.trial for own in every])
        order = np.concatenate([own.order for own in every])
        rows = np.lexsort((measure, order, trial))
        value, state, counts = (
            np.concatenate(parts)[rows]
            for parts in zip(*(_told(own.states, base) for own in every), strict=True)
        )
        with np.errstate(invalid="ignore"):
            chances = np.concatenate([own.pairs for own in every])[rows] / self._pairs
        code = np.concatenate([own.code for own in every])[rows]
        ids = RowMaker(self._design).ids(trials)
        columns = [
            *(ids[name].taken(trial[rows]) for name in self._design.ids),
            coded_of(
                code.astype(np.int32), pa.array(self._design.regions, pa.string()), whole=True
            ),
            array_of(order[rows].astype(np.int64)),
            coded_of(measure[rows], pa.array(self._names, pa.string()), whole=True),
            numbers_of(value),
            coded_of(state.astype(np.int32), pa.array(IN_STUDY, pa.string()), whole=True),
            *(array_of(np.ascontiguousarray(own)) for own in counts.T),
            *(numbers_of(np.ascontiguousarray(own)) for own in chances.T),
        ]
        return self._parts.part(pa.RecordBatch.from_arrays(columns, schema=self._schema))


def _told(
    states: NDArray[Any], base: int
) -> tuple[NDArray[np.float64], NDArray[np.int8], NDArray[np.int64]]:
    """Value and state in the study, and how many variants have it so, otherwise, or not at all."""
    own = states[base]
    same = states == own
    state = np.select([own == LEFT_OUT, own == NO_VALUE], [2, 1], 0).astype(np.int8)
    counts = [
        same,
        ~same & (states >= 0),
        ~same & (states == NO_VALUE),
        ~same & (states == LEFT_OUT),
    ]
    value = np.where(own >= 0, own, np.nan).astype(np.float64)
    return value, state, np.stack([which.sum(axis=0) for which in counts], axis=1)


def changed_cell_writer(
    folder: Path, design: TableDesign, hangs_on: Mapping[str, str], formats: Collection[str]
) -> TableWriter:
    """What writes ``changed_cells`` into a folder, part by part.

    Parameters
    ----------
    folder : Path
        Where it goes.
    design : TableDesign
        The tables of the study.
    hangs_on : mapping of str to str
        For each setting, its column and its key.
    formats : collection of str
        In which the table is wanted.

    Returns
    -------
    TableWriter
    """
    columns = changed_cell_columns(design, hangs_on)
    return TableWriter(
        columns,
        folder / f"{CHANGED_CELLS}.parquet" if "parquet" in formats else None,
        folder / f"{CHANGED_CELLS}.csv" if "csv" in formats else None,
        TableParts(columns, formats).part(None),
    )
