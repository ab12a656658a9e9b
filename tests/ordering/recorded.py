"""Fixations of one reader as a log may hold them, and their order."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from etl.errors import Findings
from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.session.ordered import OrderedFixations
from etl.session.ordering import ReaderLog, TrialNames, order_fixations


class Fixation(NamedTuple):
    """One row: its trial from 0, onset, duration, number in the trial, and file from 0."""

    trial: int
    onset_ms: float
    duration_ms: float = 100.0
    number: float = np.nan
    file: int = 0


def reader_log(fixations: Sequence[Fixation]) -> ReaderLog:
    """The rows of a reader, in the order of the files; the first row is line 2."""
    trial, onset, duration, number, file = (
        np.array(column, dtype=np.float64) for column in zip(*fixations, strict=True)
    )
    nowhere = np.full(len(fixations), np.nan)
    log = CanonicalLog(
        {"participant": Coded.constant("P01", len(fixations))},
        {},
        onset,
        number,
        duration,
        nowhere,
        nowhere,
        None,
        np.arange(2, len(fixations) + 2, dtype=np.int32),
        np.zeros(len(fixations), dtype=bool),
        np.full(len(fixations), -1, dtype=np.int32),
    )
    logs = file.astype(np.int32)
    return ReaderLog(log, logs, ("a.tsv", "b.tsv"), trial.astype(np.int64), logs)


def ordered(
    fixations: Sequence[Fixation], repeated: str = "error", *, in_study: bool = True
) -> tuple[OrderedFixations, Findings]:
    """Bring fixations into order; trials are called trial 1, trial 2, and so on."""
    reader = reader_log(fixations)
    count = int(reader.trial.max()) + 1
    findings = Findings()
    trials = TrialNames(np.full(count, in_study), lambda index: f"trial {index + 1}")
    return order_fixations(reader, trials, repeated, findings), findings


def in_order(
    fixations: Sequence[Fixation], repeated: str = "error", *, in_study: bool = True
) -> OrderedFixations:
    """Bring fixations into order in which nothing may be wrong."""
    found, findings = ordered(fixations, repeated, in_study=in_study)
    assert not findings.failed, findings.text()
    return found
