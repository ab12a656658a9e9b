"""Times of gaze samples: ascending in each recording of a trial, and at one rate."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers.detection.track import HOLE_INTERVALS, piece_bounds
from etl.parsers.time_checks import LONGEST_MS

#: Digits of a sampling interval in ms: nanoseconds, as times are read.
_INTERVAL_DIGITS = 6
#: From how many differences of times on the rate of a single recording of a trial is judged.
_ENOUGH_DIFFERENCES = 4


def check_sample_times(
    time_ms: NDArray[np.float64],
    run: NDArray[np.int64],
    cells: tuple[str, pa.Array],
    lines: NDArray[np.int32],
    shown: str,
    findings: Findings,
) -> None:
    """Check that every sample has a time, and that times ascend within a recording.

    Parameters
    ----------
    time_ms : (n,) float64 array, milliseconds
        When each sample was taken; NaN where the cell has no value.
    run : (n,) int64 array
        Which recording of a trial; non-decreasing.
    cells : tuple of str and (n,) pa.Array of text
        Header and cells of the column of times, for messages.
    lines : (n,) int32 array
        Line of each row.
    shown : str
        The log's name for messages.
    findings : Findings
        Where samples without a time, or of an absurd one, are recorded, and of every recording the
        first sample that is not later than the one before it.
    """
    header, column = cells

    def tell(rows: NDArray[np.int64], problem: str, expected: str, fix: str) -> None:
        for row in rows.tolist():
            findings.error(
                problem,
                path=shown,
                line=int(lines[row]),
                where=f'column "{header}"',
                found=column[row].as_py(),
                expected=expected.format(before=column[row - 1].as_py() if row else ""),
                fix=fix,
            )

    way_out = "correct the cell, remove the row, or leave such rows out by [logs.where]"
    tell(np.flatnonzero(np.isnan(time_ms)), "the sample has no time", "a time", way_out)
    tell(
        np.flatnonzero(np.abs(time_ms) > LONGEST_MS),
        "the time is too large to be told to the millisecond",
        f"a time below {LONGEST_MS:.0e} ms",
        way_out,
    )
    step = np.diff(time_ms)
    same = run[1:] == run[:-1]
    tell(
        _first_of_each(np.flatnonzero(same & (step < 0)) + 1, run),
        "the samples of a trial go back in time",
        'a time after "{before}", which the row before has',
        "put the rows in order; if two trials have one number, number them apart",
    )
    tell(
        _first_of_each(np.flatnonzero(same & (step == 0)) + 1, run),
        "two samples of a trial have the same time",
        'a time after "{before}", which the row before has',
        "remove what is there twice; if the rows are of two eyes, choose one by [logs.eye]; if "
        "times are rounded, have the recorder write them in a smaller unit",
    )


def _first_of_each(rows: NDArray[np.int64], run: NDArray[np.int64]) -> NDArray[np.int64]:
    """The first of some rows in each run."""
    return rows[np.flatnonzero(np.diff(run[rows], prepend=-1))]


def sampling_interval_ms(
    time_ms: NDArray[np.float64],
    run: NDArray[np.int64],
    frequency_hz: float | None,
    lines: NDArray[np.int32],
    shown: str,
    findings: Findings,
) -> float | None:
    """Time from one sample to the next.

    Parameters
    ----------
    time_ms : (n,) float64 array, milliseconds
        When each sample was taken; ascending within a run.
    run : (n,) int64 array
        Which recording of a trial; non-decreasing.
    frequency_hz : float or None
        Samples a second where the study file says so; else the median difference of the times of
        neighbours counts.
    lines : (n,) int32 array
        Line of each row.
    shown : str
        The log's name for messages.
    findings : Findings
        Where it is recorded that there are no neighbours, or that a recording has another rate.

    Returns
    -------
    float, milliseconds, or None
        None where a problem was recorded.
    """
    same = run[1:] == run[:-1]
    step = np.diff(time_ms)[same]
    if not step.size:
        findings.error(
            "no trial has two samples",
            path=shown,
            line=int(lines[0]),
            expected="gaze samples, many a trial",
            fix="remove [logs.samples] if the rows are fixations; correct trial in [logs.columns] "
            "if they are samples",
        )
        return None
    middle = float(np.round(np.median(step), _INTERVAL_DIGITS))
    interval = middle if frequency_hz is None else 1000.0 / frequency_hz
    if not interval / HOLE_INTERVALS <= middle <= interval * HOLE_INTERVALS:
        findings.error(
            "the samples do not come at the rate that the study file says",
            path=shown,
            where="logs.samples.frequency_hz",
            found=f"a sample every {middle:g} ms ({1000 / middle:.4g} a second)",
            expected=f"one every {interval:g} ms",
            fix="correct frequency_hz, or the unit of onset in [logs.columns]",
        )
        return None
    before = findings.count("error")
    owner = run[1:][same]
    bounds = piece_bounds(owner).tolist()
    for start, stop in pairwise(bounds):
        own = float(np.median(step[start:stop]))
        if stop - start < _ENOUGH_DIFFERENCES:
            continue
        if not interval / HOLE_INTERVALS <= own <= interval * HOLE_INTERVALS:
            findings.error(
                "the samples of a trial come at another rate than those of the log",
                path=shown,
                line=int(lines[np.searchsorted(run, owner[start])]),
                found=f"a sample every {own:g} ms",
                expected=f"one every {interval:g} ms",
                fix="leave the trial out by [logs.where], or give trials of each rate a log of "
                "their own",
            )
    return None if findings.count("error") > before else interval
