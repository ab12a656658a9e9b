"""From arrays to rows of the tables.

A :class:`RowMaker` lives once in every process and makes record batches whose coded columns all
share the study's own lists of values, so that batches can be written one after the other without a
look at their texts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.export.arrays import Fact, array_of, coded_of, numbers_of
from etl.export.row_columns import (
    CellMeasures,
    FixationColumns,
    LineColumns,
    RegressionColumns,
    TrialColumns,
)
from etl.screening.entries import LEVELS, Entry
from etl.tables import CODED, LEDGER, TABLES, TableDesign, centred_name, written_schema

__all__ = [
    "CellMeasures",
    "FixationColumns",
    "LineColumns",
    "RegressionColumns",
    "RowMaker",
    "TrialColumns",
]


class RowMaker:
    """Makes the rows of all tables of one study.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    """

    def __init__(self, design: TableDesign) -> None:
        self.design = design
        self.schemas = {name: written_schema(design.columns(name)) for name in (*TABLES, LEDGER)}
        self._id_texts = {
            name: pa.array(known.values, pa.string())
            for name, known in design.ids.items()
            if known.type != "integer"
        }
        self._id_numbers = {
            name: np.array([int(value) for value in known.values], dtype=np.int64)
            for name, known in design.ids.items()
            if known.type == "integer"
        }
        self._levels = {n: pa.array(levels, pa.string()) for n, levels in design.factors.items()}
        self._codings = {
            factor: np.array(coding.matrix).reshape(len(coding.levels), len(coding.columns))
            for factor, coding in design.codings.items()
        }
        described = (*design.id_columns(), *design.factor_columns())
        self._of_saccades = tuple(column.name for column in described)
        self._of_outcomes = (*self._of_saccades, *(c.name for c in design.covariate_columns()))
        self._covariates = {
            n: pa.array(c.values, pa.string()) for n, c in design.covariates.items()
        }
        self._regions = pa.array(design.regions, pa.string())
        self._reasons = pa.array(design.reasons[1:], pa.string())
        self._left_out_by = pa.array(design.left_out_by, pa.string())
        self._files = pa.array(design.files, pa.string())
        by_name = sorted(design.measures, key=lambda m: m.name)
        self._measures = tuple(m.name for m in by_name)
        kinds = sorted({m.kind for m in design.measures})
        self._kind_of_measure = np.array([kinds.index(m.kind) for m in by_name], dtype=np.int32)
        self._names = pa.array(self._measures, pa.string())
        self._kinds = pa.array(kinds, pa.string())
        none = pa.array([], CODED)
        self._tiles = (none, none)
        self._empty_ledger = pa.RecordBatch.from_pylist([], schema=self.schemas[LEDGER])

    def ids(self, trials: TrialColumns) -> dict[str, Fact]:
        """The columns that identify trials, one row a trial."""
        return {name: self._id(name, trials.ids[name]) for name in self.design.ids}

    def _id(self, name: str, codes: NDArray[np.int32]) -> Fact:
        """One of the columns that identify."""
        if name in self._id_numbers:
            return Fact.of_whole(codes, self._id_numbers[name])
        return Fact.of_codes(codes, self._id_texts[name])

    def facts(self, trials: TrialColumns) -> dict[str, Fact]:
        """The columns that describe trials of the study, ids first, one row a trial."""
        columns = self.ids(trials)
        for name, levels in self._levels.items():
            columns[name] = Fact.of_codes(trials.factors[name], levels)
            if name in self._codings:
                numbers = self._codings[name][trials.factors[name]]
                for place, column in enumerate(self.design.codings[name].columns):
                    columns[column] = Fact(numbers[:, place], array_of)
        for name, values in trials.covariates.items():
            columns[name] = (
                Fact.of_numbers(values.astype(np.float64, copy=False))
                if self.design.covariates[name].type == "number"
                else Fact.of_codes(values.astype(np.int32), self._covariates[name])
            )
        for name, mean in self.design.centred.items():
            numbers = trials.covariates[name].astype(np.float64, copy=False)
            columns[centred_name(name)] = Fact.of_numbers(numbers - mean)
        return columns

    def outcomes(
        self,
        facts: Mapping[str, Fact],
        cells: tuple[NDArray[np.int64], NDArray[np.int32], NDArray[np.int32]],
        measured: CellMeasures,
    ) -> pa.RecordBatch:
        """Long rows: one a cell and measure.

        Parameters
        ----------
        facts : dict of str to Fact
            From :meth:`facts`, of the kept trials.
        cells : tuple of arrays
            How many cells each trial has; region order and region code of each cell.
        measured : CellMeasures
            The measures by name.
        """
        counts, order, code = cells
        width = len(self._measures)
        if not width:  # a study that asks for outcomes of trials only
            return pa.RecordBatch.from_pylist([], schema=self.schemas["outcomes"])
        values = np.empty((len(order), width))
        missing = np.empty((len(order), width), dtype=np.int32)
        for place, name in enumerate(self._measures):
            values[:, place] = measured.values[name]
            missing[:, place] = measured.reasons[name]
        missing -= 1
        names, kinds = self._tiled_names(len(order))
        columns = [
            *(facts[name].repeated(counts * width) for name in self._of_outcomes),
            coded_of(np.repeat(code, width), self._regions, whole=True),
            array_of(np.repeat(order.astype(np.int64), width)),
            names,
            kinds,
            numbers_of(values.ravel()),
            coded_of(missing.ravel(), self._reasons),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas["outcomes"])

    def _tiled_names(self, cells: int) -> tuple[pa.Array, pa.Array]:
        """Names and kinds of the measures, over and over: the same for all readers."""
        rows = cells * len(self._measures)
        if len(self._tiles[0]) < rows:
            places = np.arange(len(self._measures), dtype=np.int32)
            self._tiles = (
                coded_of(np.tile(places, cells), self._names),
                coded_of(np.tile(self._kind_of_measure, cells), self._kinds),
            )
        return self._tiles[0].slice(0, rows), self._tiles[1].slice(0, rows)

    def outcomes_wide(
        self,
        facts: Mapping[str, Fact],
        cells: tuple[NDArray[np.int64], NDArray[np.int32], NDArray[np.int32]],
        measured: CellMeasures,
    ) -> pa.RecordBatch:
        """Wide rows: one a cell; parameters as for :meth:`outcomes`."""
        counts, order, code = cells
        columns = [
            *(facts[name].repeated(counts) for name in self._of_outcomes),
            coded_of(code, self._regions, whole=True),
            array_of(order.astype(np.int64)),
            *(_measure(measured.values[m.name], m.kind) for m in self.design.measures),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas["outcomes_wide"])

    def trials(
        self,
        facts: Mapping[str, Fact],
        measured: CellMeasures,
        line_confidence: NDArray[np.float64] | None = None,
    ) -> pa.RecordBatch:
        """One row a kept trial; how sure its lines are where the study tells lines."""
        measures = self.design.trial_measures
        columns = [
            *(facts[name].column() for name in self._of_outcomes),
            *(_measure(measured.values[m.name], m.kind) for m in measures),
            *(() if line_confidence is None else [numbers_of(line_confidence)]),
            self._why_missing(measured),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas["trials"])

    def _why_missing(self, measured: CellMeasures) -> pa.Array:
        """The reasons of a trial's missing outcomes in one text."""
        names = [m.name for m in self.design.trial_measures if m.name in measured.reasons]
        reasons = np.stack([measured.reasons[name] for name in names], axis=1)
        texts: list[str | None] = [None] * len(reasons)
        for row in np.flatnonzero(reasons.any(axis=1)).tolist():
            texts[row] = "; ".join(
                f"{name}: {self.design.reasons[code]}"
                for name, code in zip(names, reasons[row].tolist(), strict=True)
                if code
            )
        return pa.array(texts, pa.string()).dictionary_encode().cast(CODED)

    def regressions(self, facts: Mapping[str, Fact], columns: RegressionColumns) -> pa.RecordBatch:
        """One row a regressive saccade."""
        c = columns
        arrays = [
            *(facts[name].taken(c.trial) for name in self._of_saccades),
            coded_of(c.from_code, self._regions, whole=True),
            array_of(c.from_order.astype(np.int64)),
            coded_of(c.to_code, self._regions, whole=True),
            array_of(c.to_order.astype(np.int64)),
            array_of((c.from_order - c.to_order).astype(np.int64)),
            array_of(c.ends_first_pass.astype(np.int8)),
            array_of(c.launch_number),
            array_of(c.landing_number),
            numbers_of(c.onset_ms),
            numbers_of(c.amplitude_px),
        ]
        return pa.RecordBatch.from_arrays(arrays, schema=self.schemas["regressions"])

    def fixations(self, facts: Mapping[str, Fact], columns: FixationColumns) -> pa.RecordBatch:
        """One row a fixation; ``facts`` are those of all trials, left out or not."""
        c = columns
        kept = c.left_out_by < 0
        arrays = [
            *(facts[name].taken(c.trial) for name in self.design.ids),
            array_of(c.number),
            numbers_of(c.onset_ms),
            array_of(c.duration_ms),
            numbers_of(c.x_px),
            numbers_of(c.y_px),
            array_of(c.line.astype(np.int64), c.line > 0),
            coded_of(c.region_code, self._regions),
            array_of(c.region_order.astype(np.int64), c.region_order > 0),
            array_of(c.visit.astype(np.int64), c.visit > 0),
            array_of(c.first_pass.astype(np.int8), kept & (c.region_order > 0)),
            *(() if c.lines is None else _lines(c.lines)),
            array_of(kept.astype(np.int8)),
            coded_of(c.left_out_by, self._left_out_by),
            coded_of(c.file, self._files, whole=True),
            array_of(c.source_line.astype(np.int64)),
        ]
        return pa.RecordBatch.from_arrays(arrays, schema=self.schemas["fixations"])

    def ledger(
        self,
        participants: NDArray[np.int32],
        trials: TrialColumns,
        entries: Sequence[Entry],
        source: tuple[NDArray[np.int32], NDArray[np.int32]],
    ) -> pa.RecordBatch:
        """One row a thing that was left out or changed.

        Parameters
        ----------
        participants : (readers,) int32 array
            Place of each reader among the study's readers.
        trials : TrialColumns
            All trials of the readers.
        entries : sequence of Entry
            The rows, in order.
        source : tuple of two (n,) int32 arrays
            Log and line of each fixation of the readers.
        """
        if not entries:
            return self._empty_ledger
        trial = np.array([entry.trial for entry in entries], dtype=np.int64)
        row = np.array([entry.row for entry in entries], dtype=np.int64)
        columns = [
            coded_of(
                np.array([LEVELS.index(entry.level) for entry in entries], dtype=np.int32),
                pa.array(LEVELS, pa.string()),
            )
        ]
        for name in self.design.ids:
            own = trials.ids[name][trial] if len(trials) else trial.astype(np.int32)
            codes = np.where(trial >= 0, own, -1).astype(np.int32)
            if name == "participant":
                codes = participants[[entry.reader for entry in entries]]
            columns.append(self._id(name, codes).column())
        file, line = (np.where(row >= 0, part[row], -1).astype(np.int32) for part in source)
        rules = {rule: code for code, rule in enumerate(self.design.ledger_rules)}
        columns += [
            coded_of(np.array([e.region for e in entries], dtype=np.int32), self._regions),
            _place([e.fixation for e in entries]),
            coded_of(
                np.array([rules[e.rule] for e in entries], dtype=np.int32),
                pa.array(list(rules), pa.string()),
            ),
            _text([e.limit for e in entries]),
            _text([e.observed for e in entries]),
            _text([e.action for e in entries]),
            coded_of(file, self._files),
            _place(line.tolist()),
            _text([e.also for e in entries]),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas[LEDGER])


def _lines(columns: LineColumns) -> tuple[pa.Array, ...]:
    """The columns of ``fixations`` about lines."""
    return (
        numbers_of(columns.confidence),
        array_of(columns.return_sweep.astype(np.int8)),
        array_of(columns.undersweep.astype(np.int8)),
    )


def _text(texts: Sequence[str]) -> pa.Array:
    """Texts as codes; an empty one is missing."""
    return pa.array([text or None for text in texts], pa.string()).dictionary_encode().cast(CODED)


def _place(places: Sequence[int]) -> pa.Array:
    """Whole numbers; a negative one is missing."""
    return pa.array([place if place >= 0 else None for place in places], pa.int64())


def _measure(values: NDArray[np.float64], kind: str) -> pa.Array:
    """One measure in the type of its kind."""
    if kind == "duration":
        return numbers_of(values)
    there = ~np.isnan(values)
    whole = np.where(there, values, 0).astype(np.int8 if kind == "binary" else np.int64)
    return array_of(whole, there)
