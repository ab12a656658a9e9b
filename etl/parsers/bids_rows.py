"""Rows of a recording of the open standard (BIDS): its fixations, or its samples."""

from __future__ import annotations

from difflib import get_close_matches
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers.bids_fixations import FIXATION_COLUMNS, ROWS, EventReading, touched_by_blinks
from etl.parsers.bids_run import READER, SESSION, Run, note_of
from etl.parsers.bids_samples import DIGITS, RECORDING_COLUMNS, mean_positions
from etl.parsers.bids_sidecars import EVENTS_FIELDS, read_sidecar
from etl.parsers.bids_tables import read_headerless
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.log_rows import LogRows

Floats = NDArray[np.float64]

_STAMP, _X, _Y = RECORDING_COLUMNS
#: Gaze after the last fixation for no longer than this, in ms, is one that was not over when the
#: recording was: longer than nearly all fixations of reading (our choice).
_LONGEST_UNFINISHED_MS = 500.0


def read_run(
    run: Run, file: Path, named: dict[str, str], findings: Findings
) -> tuple[CanonicalLog, LogNote] | None:
    """Turn a recording into canonical fixations.

    Parameters
    ----------
    run : Run
        The recording.
    file : Path
        The file whose lines count: its samples, or the events beside it.
    named : dict of str to str
        What the file's name says by the study's own pattern.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    CanonicalLog and LogNote, or None
        None where a problem was recorded.
    """
    if file == run.recording.path:
        read = _from_samples(run, findings)
    else:
        read = _from_events(run, file, findings)
    if read is None:
        return None
    rows, note = read
    log = run.reading.canonical(rows, {**run.unsaid, **named}, note, findings)
    return None if log is None else (log, note)


def _from_samples(run: Run, findings: Findings) -> tuple[LogRows, LogNote] | None:
    """The samples that were taken in a trial, a row each."""
    trial = run.trials.of(run.clock.time_ms)
    row = np.flatnonzero(trial >= 0)
    note = note_of(run.samples, run.parts)
    if not row.size:
        _tell_no_trial(run, run.clock.time_ms, "sample", findings)
        return None
    _tell_bare_trials(run, trial[row], "sample", note, findings)
    outside = np.flatnonzero(trial < 0)
    note.account.line("fixations", len(row), int(row[0]) + 1)
    if outside.size:
        note.account.line("samples outside every trial", len(outside), int(outside[0]) + 1)
    cells = run.samples.cells(list(RECORDING_COLUMNS), findings)
    if cells is None:
        return None
    picked = pa.array(row)
    onset = cells[_STAMP].take(picked)
    if run.clock.unit != "ms":
        onset = _as_text(run.clock.time_ms[row])
    own = {"onset": onset, _X: cells[_X].take(picked), _Y: cells[_Y].take(picked)}
    return _rows(run, own, {}, (row, trial[row]), note, findings)


def _from_events(run: Run, file: Path, findings: Findings) -> tuple[LogRows, LogNote] | None:
    """The fixations that began in a trial, a row each, at the mean of their samples."""
    shown, logs = run.place.of(file), run.reading.logs
    sidecar = read_sidecar(file, run.place, findings)
    if sidecar is None or not sidecar.require(EVENTS_FIELDS, findings):
        return None
    columns = sidecar.names("Columns", FIXATION_COLUMNS, findings)
    source = sidecar.choice(
        "OnsetSource",
        (*run.recording.columns, ROWS),
        f"name a column of {run.place.of(run.recording.path)}",
        findings,
    )
    table = read_headerless(file, shown, columns, findings) if columns else None
    if table is None or source is None:
        return None
    indexed = None
    if source not in (ROWS, _STAMP):
        read = run.samples.numbers([source], run.reading.missing(), findings)
        if read is None:
            return None
        indexed = read[source]
    blink = "blink" if logs.columns.blink is None else logs.columns.blink.column
    assert logs.bids is not None  # noqa: S101
    missing = run.reading.missing()
    events = EventReading(table, sidecar, run.clock, indexed, logs.bids, missing, blink).fixations(
        findings
    )
    if events is None:
        return None
    trial = run.trials.of(events.onset_ms)
    inside = np.flatnonzero(trial >= 0)
    if not inside.size:
        _tell_no_trial(run, events.onset_ms, "fixation", findings)
        return None
    samples = run.samples.text
    parts = (*run.parts, (samples.shown, "samples", samples.sha256), *sidecar.parts)
    note = note_of(table, dict.fromkeys(parts))
    for fate, rows in events.fates.items():
        if rows.size:
            note.account.line(fate, len(rows), int(rows[0]) + 1)
    outside = events.row[trial < 0]
    if outside.size:
        note.account.line("fixations outside every trial", len(outside), int(outside[0]) + 1)
    note.account.line("fixations", len(inside), int(events.row[inside[0]]) + 1)
    _tell_bare_trials(run, trial[inside], "fixation", note, findings)
    _tell_gaze_after_events(run, events.last_ms, shown, findings)
    onset_ms, duration_ms = events.onset_ms[inside], events.duration_ms[inside]
    end_ms = np.round(onset_ms + duration_ms, DIGITS)
    picked = pa.array(inside)
    cells = {name: cell.take(picked) for name, cell in events.cells.items()}
    x, y = mean_positions(run.clock.time_ms, run.x, run.y, onset_ms, end_ms)
    touched = touched_by_blinks(onset_ms, end_ms, trial[inside], events.blinks_ms)
    own = {
        "onset": _as_text(onset_ms),
        "duration": _as_text(duration_ms),
        _X: _as_text(x),
        _Y: _as_text(y),
        blink: pc.if_else(pa.array(touched), "1", "0"),
    }
    return _rows(run, own, cells, (events.row[inside], trial[inside]), note, findings)


def _tell_bare_trials(
    run: Run, trial: NDArray[np.int64], what: str, note: LogNote, findings: Findings
) -> None:
    """Warn of trials in which nothing was recorded: no table of the output will have them."""
    bare = np.setdiff1d(np.arange(len(run.trials.row)), trial)
    note.counts[f"trials without a {what}"] = len(bare)
    if bare.size:
        findings.warning(
            f"{len(bare):,} trial{' has' if len(bare) == 1 else 's have'} no {what}",
            path=run.trials.shown,
            line=int(run.trials.line[bare].min()),
            expected=f"a {what} in each row that is a trial",
            fix="say by [logs.bids] trials which rows are trials of reading",
        )


def _tell_gaze_after_events(run: Run, last_ms: float, shown: str, findings: Findings) -> None:
    """Warn where a reader went on reading when events had ended, as where they are cut short."""
    times = run.clock.time_ms
    seen = ~(np.isnan(run.x) | np.isnan(run.y)) & (times >= last_ms)
    went_on = int((run.trials.of(times[seen]) >= 0).sum()) * run.clock.step_ms
    if went_on > _LONGEST_UNFINISHED_MS:
        findings.warning(
            f"the samples show {went_on:.0f} ms of gaze in trials after the last fixation",
            path=shown,
            expected="events until the end of the recording",
            fix="copy the events again if this is not how they were recorded",
        )


def _tell_no_trial(run: Run, time_ms: Floats, what: str, findings: Findings) -> None:
    """Record that nothing was recorded in any trial: the clocks do not go together."""
    trials = run.trials
    findings.error(
        f"no {what} lies in a trial",
        path=run.place.shown,
        found=f"{what}s from {time_ms.min():.10g} to {time_ms.max():.10g} ms",
        expected=f"some in the trials of {trials.shown}, which lie from {trials.start_ms[0]:.10g} "
        f"to {trials.end_ms[-1]:.10g} ms in the recording's clock",
        fix="correct StartTime in the recording's sidecar, which says when its first sample was "
        "taken in the time of the events; or the units of the times",
    )


def _as_text(values: Floats) -> pa.Array:
    """Numbers as cells that are read back as the same numbers; n/a where missing."""
    cells = pc.cast(pa.array(values), pa.string())
    return pc.if_else(pa.array(np.isnan(values)), "n/a", cells)


def _rows(
    run: Run,
    own: dict[str, pa.Array],
    beside: dict[str, pa.Array],
    place: tuple[NDArray[np.int64], NDArray[np.int64]],
    note: LogNote,
    findings: Findings,
) -> tuple[LogRows, LogNote] | None:
    """Rows with all that the study asks for; ``place``: the row in the file, and the trial.

    Of columns with one name, those of fixations go before what the name of the file says of the
    reader, that before the events of the task, these before the other entities of the name and
    the events of the recording.
    """
    row, trial = place
    said = run.entities()
    first = {name: said.pop(name) for name in (READER, SESSION, "eye") if name in said}
    columns: dict[str, pa.Array] = {}
    which = pa.array(trial)
    for header in dict.fromkeys(run.reading.needed()):
        if header in own:
            columns[header] = own[header]
        elif header in first:
            columns[header] = pa.repeat(first[header], len(row))
        elif header in run.trials.cells:
            columns[header] = run.trials.cells[header].take(which)
        elif header in said:
            columns[header] = pa.repeat(said[header], len(row))
        elif header in beside:
            columns[header] = beside[header]
        else:
            listed = [*run.trials.header, *first, *said, *beside]
            near = get_close_matches(header, listed, n=1)
            findings.error(
                f'there is no column "{header}"',
                path=run.trials.shown,
                line=1,
                found=", ".join(run.trials.header),
                expected=f'a column "{header}" of the events of the task',
                fix=f'did you mean "{near[0]}"?' if near else "correct the name in the study file",
            )
    if findings.failed:
        return None
    recording = run.trials.row[trial]
    return LogRows(columns, (row + 1).astype(np.int32), recording), note
