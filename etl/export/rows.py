"""From a reader's arrays to rows of the tables.

A :class:`RowMaker` lives once in every process and makes record batches whose coded columns all
share the study's own lists of values, so that batches of different readers can be written one
after the other without a look at their texts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.export.row_columns import (
    CellMeasures,
    FixationColumns,
    LineColumns,
    RegressionColumns,
    TrialColumns,
)
from etl.screening.ledger import LEVELS, Entry
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
        self._id_values = {
            name: pa.array([int(v) for v in known.values], pa.int64())
            if known.type == "integer"
            else pa.array(known.values, pa.string())
            for name, known in design.ids.items()
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

    def ids(self, trials: TrialColumns) -> dict[str, pa.Array]:
        """The columns that identify trials, one row a trial."""
        columns: dict[str, pa.Array] = {}
        for name, known in self.design.ids.items():
            column = _coded(trials.ids[name], self._id_values[name])
            columns[name] = column.dictionary_decode() if known.type == "integer" else column
        return columns

    def facts(self, trials: TrialColumns) -> dict[str, pa.Array]:
        """The columns that describe trials of the study, ids first, one row a trial."""
        columns = self.ids(trials)
        for name, levels in self._levels.items():
            columns[name] = _coded(trials.factors[name], levels)
            if name in self._codings:
                numbers = self._codings[name][trials.factors[name]]
                for place, column in enumerate(self.design.codings[name].columns):
                    columns[column] = pa.array(numbers[:, place])
        for name, values in trials.covariates.items():
            columns[name] = (
                pa.array(values, from_pandas=True)
                if self.design.covariates[name].type == "number"
                else _coded(values.astype(np.int32), self._covariates[name])
            )
        for name, mean in self.design.centred.items():
            columns[centred_name(name)] = pa.array(trials.covariates[name] - mean, from_pandas=True)
        return columns

    def _repeated(
        self, facts: Mapping[str, pa.Array], trial: NDArray[np.int64], names: Sequence[str]
    ) -> list[pa.Array]:
        """Facts of each row's trial."""
        index = pa.array(trial)
        return [facts[name].take(index) for name in names]

    def outcomes(
        self,
        facts: Mapping[str, pa.Array],
        cells: tuple[NDArray[np.int64], NDArray[np.int32], NDArray[np.int32]],
        measured: CellMeasures,
    ) -> pa.RecordBatch:
        """Long rows: one a cell and measure.

        Parameters
        ----------
        facts : dict of str to pa.Array
            From :meth:`facts`, of the kept trials.
        cells : tuple of (cells,) arrays
            Trial, region order and region code of each cell.
        measured : CellMeasures
            The measures by name.
        """
        trial, order, code = cells
        width = len(self._measures)
        if not width:  # a study that asks for outcomes of trials only
            return pa.RecordBatch.from_pylist([], schema=self.schemas["outcomes"])
        values = np.stack([measured.values[n] for n in self._measures], axis=1).ravel()
        reasons = np.stack([measured.reasons[n] for n in self._measures], axis=1).ravel()
        names, kinds = self._tiled_names(len(trial))
        columns = [
            *self._repeated(facts, np.repeat(trial, width), self._of_outcomes),
            _coded(np.repeat(code, width), self._regions),
            pa.array(np.repeat(order, width).astype(np.int64)),
            names,
            kinds,
            pa.array(values, from_pandas=True),
            _coded(reasons.astype(np.int32) - 1, self._reasons),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas["outcomes"])

    def _tiled_names(self, cells: int) -> tuple[pa.Array, pa.Array]:
        """Names and kinds of the measures, over and over: the same for every reader."""
        rows = cells * len(self._measures)
        if len(self._tiles[0]) < rows:
            self._tiles = (
                _coded(np.tile(np.arange(len(self._measures), dtype=np.int32), cells), self._names),
                _coded(np.tile(self._kind_of_measure, cells), self._kinds),
            )
        return self._tiles[0].slice(0, rows), self._tiles[1].slice(0, rows)

    def outcomes_wide(
        self,
        facts: Mapping[str, pa.Array],
        cells: tuple[NDArray[np.int64], NDArray[np.int32], NDArray[np.int32]],
        measured: CellMeasures,
    ) -> pa.RecordBatch:
        """Wide rows: one a cell; parameters as for :meth:`outcomes`."""
        trial, order, code = cells
        columns = [
            *self._repeated(facts, trial, self._of_outcomes),
            _coded(code, self._regions),
            pa.array(order.astype(np.int64)),
            *(_measure(measured.values[m.name], m.kind) for m in self.design.measures),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas["outcomes_wide"])

    def trials(
        self,
        facts: Mapping[str, pa.Array],
        measured: CellMeasures,
        line_confidence: NDArray[np.float64] | None = None,
    ) -> pa.RecordBatch:
        """One row a kept trial; how sure its lines are where the study tells lines."""
        measures = self.design.trial_measures
        columns = [
            *(facts[name] for name in self._of_outcomes),
            *(_measure(measured.values[m.name], m.kind) for m in measures),
            *(() if line_confidence is None else [pa.array(line_confidence, from_pandas=True)]),
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

    def regressions(
        self, facts: Mapping[str, pa.Array], columns: RegressionColumns
    ) -> pa.RecordBatch:
        """One row a regressive saccade."""
        c = columns
        arrays = [
            *self._repeated(facts, c.trial, self._of_saccades),
            _coded(c.from_code, self._regions),
            pa.array(c.from_order.astype(np.int64)),
            _coded(c.to_code, self._regions),
            pa.array(c.to_order.astype(np.int64)),
            pa.array((c.from_order - c.to_order).astype(np.int64)),
            pa.array(c.ends_first_pass.astype(np.int8)),
            pa.array(c.launch_number),
            pa.array(c.landing_number),
            pa.array(c.onset_ms, from_pandas=True),
            pa.array(c.amplitude_px, from_pandas=True),
        ]
        return pa.RecordBatch.from_arrays(arrays, schema=self.schemas["regressions"])

    def fixations(self, facts: Mapping[str, pa.Array], columns: FixationColumns) -> pa.RecordBatch:
        """One row a fixation; ``facts`` are those of all trials of the reader."""
        c = columns
        kept = c.left_out_by < 0
        inside = kept & (c.region_order > 0)
        arrays = [
            *self._repeated(facts, c.trial, tuple(self.design.ids)),
            pa.array(c.number),
            pa.array(c.onset_ms, from_pandas=True),
            pa.array(c.duration_ms),
            pa.array(c.x_px, from_pandas=True),
            pa.array(c.y_px, from_pandas=True),
            pa.array(c.line.astype(np.int64), mask=c.line == 0),
            _coded(c.region_code, self._regions),
            pa.array(c.region_order.astype(np.int64), mask=c.region_order == 0),
            pa.array(c.visit.astype(np.int64), mask=c.visit == 0),
            pa.array(c.first_pass.astype(np.int8), mask=~inside),
            *(() if c.lines is None else _lines(c.lines)),
            pa.array(kept.astype(np.int8)),
            _coded(c.left_out_by, self._left_out_by),
            _coded(c.file, self._files),
            pa.array(c.source_line.astype(np.int64)),
        ]
        return pa.RecordBatch.from_arrays(arrays, schema=self.schemas["fixations"])

    def ledger(
        self,
        participant: int,
        trials: TrialColumns,
        entries: Sequence[Entry],
        source: tuple[NDArray[np.int32], NDArray[np.int32]],
    ) -> pa.RecordBatch:
        """One row a thing that was left out or changed.

        Parameters
        ----------
        participant : int
            Place of the reader among the study's readers.
        trials : TrialColumns
            All trials of the reader.
        entries : sequence of Entry
            The rows, in order.
        source : tuple of two (n,) int32 arrays
            Log and line of each fixation of the reader.
        """
        if not entries:
            return self._empty_ledger
        trial = np.array([entry.trial for entry in entries], dtype=np.int64)
        row = np.array([entry.row for entry in entries], dtype=np.int64)
        columns = [
            _coded(
                np.array([LEVELS.index(entry.level) for entry in entries], dtype=np.int32),
                pa.array(LEVELS, pa.string()),
            )
        ]
        for name, known in self.design.ids.items():
            own = trials.ids[name][trial] if len(trials) else trial.astype(np.int32)
            codes = np.where(trial >= 0, own, -1).astype(np.int32)
            if name == "participant":
                codes = np.full(len(entries), participant, dtype=np.int32)
            column = _coded(codes, self._id_values[name])
            columns.append(column.dictionary_decode() if known.type == "integer" else column)
        file, line = (np.where(row >= 0, part[row], -1).astype(np.int32) for part in source)
        rules = {rule: code for code, rule in enumerate(self.design.ledger_rules)}
        columns += [
            _coded(np.array([e.region for e in entries], dtype=np.int32), self._regions),
            _place([e.fixation for e in entries]),
            _coded(
                np.array([rules[e.rule] for e in entries], dtype=np.int32),
                pa.array(list(rules), pa.string()),
            ),
            _text([e.limit for e in entries]),
            _text([e.observed for e in entries]),
            _text([e.action for e in entries]),
            _coded(file, self._files),
            _place(line.tolist()),
            _text([e.also for e in entries]),
        ]
        return pa.RecordBatch.from_arrays(columns, schema=self.schemas[LEDGER])


def _lines(columns: LineColumns) -> tuple[pa.Array, ...]:
    """The columns of ``fixations`` about lines."""
    return (
        pa.array(columns.confidence, from_pandas=True),
        pa.array(columns.return_sweep.astype(np.int8)),
        pa.array(columns.undersweep.astype(np.int8)),
    )


def _text(texts: Sequence[str]) -> pa.Array:
    """Texts as codes; an empty one is missing."""
    return pa.array([text or None for text in texts], pa.string()).dictionary_encode().cast(CODED)


def _place(places: Sequence[int]) -> pa.Array:
    """Whole numbers; a negative one is missing."""
    return pa.array([place if place >= 0 else None for place in places], pa.int64())


def _coded(codes: NDArray[np.int32], values: pa.Array) -> pa.Array:
    """Codes with their texts; a negative code is missing."""
    some = len(codes) > 0 and codes.min() < 0
    indices = pa.array(codes, mask=codes < 0) if some else pa.array(codes)
    # The codes are ours: checking each of them again would cost as much as making the column.
    return pa.DictionaryArray.from_arrays(indices, values, safe=False)


def _measure(values: NDArray[np.float64], kind: str) -> pa.Array:
    """One measure in the type of its kind."""
    if kind == "duration":
        return pa.array(values, from_pandas=True)
    absent = np.isnan(values)
    whole = np.where(absent, 0, values).astype(np.int8 if kind == "binary" else np.int64)
    return pa.array(whole, mask=absent)
