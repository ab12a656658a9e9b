"""Trials of the open standard (BIDS): rows of the events of a task, in the recording's clock."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Cells, Coded, NumberReading, cells_of, header_of, numbers_in
from etl.parsers.bids_names import Place, described_by
from etl.parsers.bids_samples import DIGITS
from etl.parsers.bids_sidecars import TIME_UNITS, Sidecar
from etl.parsers.bids_tables import read_utf8
from etl.parsers.time_checks import in_ms


@dataclass(frozen=True, slots=True)
class RunTrials:
    """The trials of one run, in the order of time.

    Attributes
    ----------
    shown : str
        The file of events, for messages.
    cells : dict of str to (trials,) pa.Array of text
        Those of its columns that are asked for.
    header : tuple of str
        All its columns.
    row, line : (trials,) int32 array
        The row of each trial in the file, from 0, and its line.
    start_ms, end_ms : (trials,) float64 array, milliseconds
        When each began and ended, in the recording's clock.
    """

    shown: str
    cells: dict[str, pa.Array]
    header: tuple[str, ...]
    row: NDArray[np.int32]
    line: NDArray[np.int32]
    start_ms: NDArray[np.float64]
    end_ms: NDArray[np.float64]

    def of(self, onset_ms: NDArray[np.float64]) -> NDArray[np.int64]:
        """The trial in which each time lies, its end not included; -1 where there is none."""
        at = np.searchsorted(self.start_ms, onset_ms, "right") - 1
        return np.where((at >= 0) & (onset_ms < self.end_ms[at]), at, -1)


def find_task_events(path: Path, place: Place, findings: Findings) -> Path | None:
    """The events of the task during which a recording was made.

    Parameters
    ----------
    path : Path
        The recording.
    place : Place
        How files are called in messages.
    findings : Findings
        Where it is recorded that there are none, or two in one folder.

    Returns
    -------
    Path or None
        None where a problem was recorded. As with sidecars, the nearest one applies.
    """
    found = described_by(path, "events", ".tsv")
    if not found:
        findings.error(
            "no events of the task say which trials there were",
            path=place.shown,
            expected="a file …_events.tsv for the same reader, task and run",
            fix="write it: a row a trial, with onset and duration in seconds",
        )
        return None
    if len(found[-1]) > 1:
        findings.error(
            f"two files of events of the task apply to {place.shown}",
            path=place.of(found[-1][1]),
            expected=f"one; {place.of(found[-1][0])} applies too",
            fix="rename one of the two, or put it elsewhere",
        )
        return None
    return found[-1][0]


def event_columns(path: Path) -> tuple[str, ...]:
    """The columns of the events of a recording's task; empty where they cannot be read.

    Parameters
    ----------
    path : Path
        The recording.

    Returns
    -------
    tuple of str
    """
    findings = Findings()
    events = find_task_events(path, Place(path, path.name), findings)
    text = None if events is None else read_utf8(events, events.name, findings)
    return () if text is None else header_of(text, "\t")


def read_events(path: Path, shown: str, needed: Sequence[str], findings: Findings) -> Cells | None:
    """Read the events of a task.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    needed : sequence of str
        Columns that the study asks for; which of them must be here is told by who joins them.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Cells or None
        None where a problem was recorded.
    """
    text = read_utf8(path, shown, findings)
    if text is None:
        return None
    known = header_of(text, "\t")
    cells = cells_of(
        text,
        findings,
        delimiter="\t",
        needed=["onset", "duration", *(name for name in needed if name in known)],
    )
    if cells is None or len(cells):
        return cells
    findings.error(
        "the events have a header and no row",
        path=shown,
        line=cells.header_line,
        expected="a row for each trial",
        fix="complete the file, or take the recording out of [logs] files",
    )
    return None


def trials_in(
    cells: Cells,
    sidecar: Sidecar | None,
    asked: Mapping[str, Sequence[str]],
    clock: tuple[float, float],
    missing: frozenset[str],
    findings: Findings,
) -> RunTrials | None:
    """The trials among the events of a task.

    Parameters
    ----------
    cells : Cells
        The events.
    sidecar : Sidecar or None
        What is said of them, where anything is.
    asked : mapping of str to sequence of str
        Which rows are trials: columns, and the values of which a row must have one.
    clock : tuple of float
        The time of the recording's first sample, in ms in its own clock, and in seconds since
        the start of the acquisition (``StartTime``), from which the events are counted.
    missing : frozenset of str
        What stands for no value.
    findings : Findings
        Where rows without times, and trials that overlap, are recorded.

    Returns
    -------
    RunTrials or None
        None where a problem was recorded.
    """
    rows = _asked_for(cells, asked, findings)
    if rows is None:
        return None
    before = findings.count("error")
    times: dict[str, NDArray[np.float64]] = {}
    for name in ("onset", "duration"):
        # Seconds by the standard; a sidecar that says otherwise is believed.
        unit = sidecar.unit(name, TIME_UNITS, findings) if sidecar is not None else None
        reading = NumberReading(cells.shown, cells.lines[rows], missing, ".")
        own = cells.column(name).take(pa.array(rows))
        values = numbers_in(own, name, reading, findings, expected="a number of seconds or n/a")
        if values is None:
            continue
        times[name] = in_ms(values, unit or "s")
        with np.errstate(invalid="ignore"):
            wrong = ~np.isfinite(values) if name == "onset" else ~(values > 0)
        for at in np.flatnonzero(wrong).tolist():
            findings.error(
                f"the trial has no {name}",
                path=cells.shown,
                line=int(cells.lines[rows[at]]),
                where=f'column "{name}"',
                found=own[at].as_py(),
                expected="a number of seconds" + (" above 0" if name == "duration" else ""),
                fix="fill in the cell, or say by [logs.bids] trials which rows are trials",
            )
    if findings.count("error") > before:
        return None
    start_ms = np.round(times["onset"] + (clock[0] - 1000.0 * clock[1]), DIGITS)
    end_ms = np.round(start_ms + times["duration"], DIGITS)
    order = np.argsort(start_ms, kind="stable")
    start_ms, end_ms, rows = start_ms[order], end_ms[order], rows[order]
    for at in (np.flatnonzero(start_ms[1:] < end_ms[:-1]) + 1).tolist():
        findings.error(
            "the trial begins before the one before it is over",
            path=cells.shown,
            line=int(cells.lines[rows[at]]),
            found=f"{end_ms[at - 1] - start_ms[at]:g} ms too early",
            expected=f"a start after the end of the trial in line {cells.lines[rows[at - 1]]}",
            fix="correct the times, or say by [logs.bids] trials which rows are trials",
        )
    if findings.count("error") > before:
        return None
    picked = pa.array(rows)
    columns = {name: cells.column(name).take(picked) for name in cells.table.column_names}
    return RunTrials(
        cells.shown,
        columns,
        cells.header,
        rows.astype(np.int32),
        cells.lines[rows],
        start_ms,
        end_ms,
    )


def _asked_for(
    cells: Cells, asked: Mapping[str, Sequence[str]], findings: Findings
) -> NDArray[np.int64] | None:
    """The rows that are trials; None where there is none."""
    mask = np.ones(len(cells), dtype=bool)
    for name, values in asked.items():
        if name not in cells.header:
            near = get_close_matches(name, cells.header, n=1)
            findings.error(
                f'there is no column "{name}", by which the study tells trials',
                path=cells.shown,
                line=cells.header_line,
                found=", ".join(cells.header),
                expected=f'a column "{name}"',
                fix=f'did you mean "{near[0]}"?' if near else "correct [logs.bids] trials",
            )
            return None
        coded = Coded.of(cells.column(name), ())
        mask &= coded.among(values)
        if not mask.any():
            findings.error(
                "no row is a trial by [logs.bids] trials",
                path=cells.shown,
                where=f'column "{name}"',
                found=", ".join(coded.values[:5]),
                expected=" or ".join(values),
                fix="correct [logs.bids] trials in the study file",
            )
            return None
    return np.flatnonzero(mask)
