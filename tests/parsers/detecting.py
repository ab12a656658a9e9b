"""Fixations found in samples that are given as lists, without a log."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pyarrow as pa

from etl.errors import Findings
from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.parsers.canonical import LogNote
from etl.parsers.detection import SampleRows, log_of_samples
from etl.study.models import Samples

#: Onset and duration in ms, x and y in px.
Fixation = tuple[float, float, float, float]


@dataclass(frozen=True)
class Found:
    """What is found in samples."""

    log: CanonicalLog | None
    note: LogNote
    findings: Findings

    @property
    def fixations(self) -> list[Fixation]:
        """Onset, duration, x and y of each."""
        log = self.log
        if log is None:
            return []
        columns = (log.onset_ms, log.duration_ms, log.x_px, log.y_px)
        return list(zip(*(column.tolist() for column in columns), strict=True))

    @property
    def times(self) -> list[tuple[float, float]]:
        """Onset and duration of each."""
        return [fixation[:2] for fixation in self.fixations]


def found_in(
    time_ms: Sequence[float],
    x_px: Sequence[float],
    y_px: Sequence[float],
    *,
    trials: Sequence[int] | None = None,
    blink: Sequence[bool] | None = None,
    facts: Sequence[str] | None = None,
    **settings: Any,
) -> Found:
    """Look for fixations in samples of one reader; the first is on line 2 of a log."""
    count = len(time_ms)
    samples = Samples(**{"method": "engbert_kliegl", **settings})
    times = pa.array([f"{time:g}" for time in time_ms])
    named = [str(trial) for trial in trials or [1] * count]
    rows = SampleRows(
        {
            "participant": Coded.constant("P01", count),
            "trial": Coded.of(pa.array(named), ()),
        },
        {} if facts is None else {"cue": Coded.of(pa.array(facts), {""})},
        np.array(time_ms, dtype=float),
        (np.array(x_px, dtype=float), np.array(y_px, dtype=float)),
        np.arange(2, count + 2, dtype=np.int32),
        np.array(blink if blink is not None else [False] * count),
        None,
        ("time", times),
    )
    note, findings = LogNote("P01.tsv"), Findings()
    note.account.total = count
    note.account.line("fixations", count, 2)
    log = log_of_samples(rows, samples, samples.dispersion_px or 0.0, note, findings)
    assert note.account.balances()
    return Found(log, note, findings)
