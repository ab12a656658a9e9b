"""The arrays that rows are made of: trials, fixations, regressions, measures."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import chain

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class TrialColumns:
    """What is known of trials, one row a trial, in the order of the tables.

    Attributes
    ----------
    ids : dict of str to (trials,) int32 array
        Place of each id in the design's list of values; -1 where a trial has none.
    factors : dict of str to (trials,) int32 array
        Place of each level in the design's list; of no meaning for trials that are skipped.
    covariates : dict of str to (trials,) array
        Numbers, NaN where missing, or places in the design's list of texts, -1 where missing.
    text : (trials,) int32 array
        The text that was read; -1 for a trial that is no part of the study.
    came_ms, went_ms, answer : (trials,) float64 array
        When the text came up and went away, and whether the answer was right; NaN where unknown.
    notes : tuple of str
        The experimenter's note on each trial, empty where there is none.
    skipped_by : tuple of str
        Why each trial is no part of the study, empty where it is.
    """

    ids: Mapping[str, NDArray[np.int32]]
    factors: Mapping[str, NDArray[np.int32]]
    covariates: Mapping[str, NDArray[np.float64] | NDArray[np.int32]]
    text: NDArray[np.int32]
    came_ms: NDArray[np.float64]
    went_ms: NDArray[np.float64]
    answer: NDArray[np.float64]
    notes: tuple[str, ...]
    skipped_by: tuple[str, ...]

    def __len__(self) -> int:
        return len(self.text)

    def take(self, rows: NDArray[np.int64]) -> TrialColumns:
        """Some of the trials."""
        return TrialColumns(
            {name: codes[rows] for name, codes in self.ids.items()},
            {name: codes[rows] for name, codes in self.factors.items()},
            {name: values[rows] for name, values in self.covariates.items()},
            self.text[rows],
            self.came_ms[rows],
            self.went_ms[rows],
            self.answer[rows],
            tuple([self.notes[row] for row in rows.tolist()]),
            tuple([self.skipped_by[row] for row in rows.tolist()]),
        )

    @classmethod
    def joined(cls, parts: Sequence[TrialColumns]) -> TrialColumns:
        """The trials of several readers, one below the other."""
        if len(parts) == 1:
            return parts[0]
        first = parts[0]
        return cls(
            {name: np.concatenate([p.ids[name] for p in parts]) for name in first.ids},
            {name: np.concatenate([p.factors[name] for p in parts]) for name in first.factors},
            {n: np.concatenate([p.covariates[n] for p in parts]) for n in first.covariates},
            np.concatenate([part.text for part in parts]),
            np.concatenate([part.came_ms for part in parts]),
            np.concatenate([part.went_ms for part in parts]),
            np.concatenate([part.answer for part in parts]),
            tuple(chain.from_iterable(part.notes for part in parts)),
            tuple(chain.from_iterable(part.skipped_by for part in parts)),
        )


@dataclass(frozen=True, slots=True)
class CellMeasures:
    """Measures over cells: a cell is a trial × region, or a trial.

    Attributes
    ----------
    values : dict of str to (cells,) float64 array
        NaN where missing.
    reasons : dict of str to (cells,) uint8 array
        Index into the design's reasons.
    """

    values: Mapping[str, NDArray[np.float64]]
    reasons: Mapping[str, NDArray[np.uint8]]


@dataclass(frozen=True, slots=True)
class LineColumns:
    """What ``fixations`` says of lines, beside their numbers; NaN is missing."""

    confidence: NDArray[np.float64]
    return_sweep: NDArray[np.bool_]
    undersweep: NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class FixationColumns:
    """The columns of ``fixations``; 0 in an order, line or visit is missing."""

    trial: NDArray[np.int64]
    number: NDArray[np.int64]
    onset_ms: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    x_px: NDArray[np.float64]
    y_px: NDArray[np.float64]
    line: NDArray[np.int32]
    region_code: NDArray[np.int32]
    region_order: NDArray[np.int32]
    visit: NDArray[np.int32]
    first_pass: NDArray[np.bool_]
    left_out_by: NDArray[np.int32]
    file: NDArray[np.int32]
    source_line: NDArray[np.int32]
    lines: LineColumns | None = None


@dataclass(frozen=True, slots=True)
class RegressionColumns:
    """The columns of ``regressions``."""

    trial: NDArray[np.int64]
    from_code: NDArray[np.int32]
    from_order: NDArray[np.int32]
    to_code: NDArray[np.int32]
    to_order: NDArray[np.int32]
    ends_first_pass: NDArray[np.bool_]
    launch_number: NDArray[np.int64]
    landing_number: NDArray[np.int64]
    onset_ms: NDArray[np.float64]
    amplitude_px: NDArray[np.float64]
