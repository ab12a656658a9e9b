"""One recording of the open standard (BIDS) into rows: its fixations, or its samples."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.bids_names import Place, described_by
from etl.parsers.bids_recording import Recording
from etl.parsers.bids_samples import (
    RECORDING_COLUMNS,
    SampleClock,
    read_clock,
)
from etl.parsers.bids_screen import find_screen
from etl.parsers.bids_sidecars import PLACE_UNITS, Sidecar, read_sidecar
from etl.parsers.bids_tables import Headerless, read_headerless
from etl.parsers.bids_trials import RunTrials, find_task_events, read_events, trials_in
from etl.parsers.canonical import LogNote
from etl.parsers.log_rows import RowReading

Floats = NDArray[np.float64]

#: What the name of a recording says, by the standard's own names for these columns.
READER, SESSION = "participant_id", "session_id"
_STAMP, _X, _Y = RECORDING_COLUMNS


@dataclass(frozen=True, slots=True)
class Run:
    """A recording made ready for its fixations.

    Attributes
    ----------
    recording : Recording
        What is said of it.
    place : Place
        How files are called in messages.
    reading : RowReading
        How rows become fixations, with the units and the screen of this recording.
    samples : Headerless
        Its samples.
    clock : SampleClock
        When they were taken.
    x, y : (samples,) float64 array
        Where the eye was, in the units of the recording; NaN where it is not known.
    trials : RunTrials
        The trials of the run.
    parts : tuple of (str, str, str)
        Name, role and digest of every file that was read besides the recording.
    unsaid : dict of str to str
        What the name of another recording of the dataset says, and this one's does not.
    """

    recording: Recording
    place: Place
    reading: RowReading
    samples: Headerless
    clock: SampleClock
    x: Floats
    y: Floats
    trials: RunTrials
    parts: tuple[tuple[str, str, str], ...]
    unsaid: dict[str, str]

    def entities(self) -> dict[str, str]:
        """What the recording's name says, by the headers of columns."""
        said = dict(self.recording.entities)
        said[READER], said["eye"] = said.pop("sub"), self.recording.eye
        if "ses" in said:
            said[SESSION] = said.pop("ses")
        return said


def note_of(table: Headerless, parts: Iterable[tuple[str, str, str]]) -> LogNote:
    """What is told of a file whose lines count.

    Parameters
    ----------
    table : Headerless
        The file.
    parts : iterable of (str, str, str)
        What was read besides.

    Returns
    -------
    LogNote
        With every line below the rows accounted for, and none of the rows.
    """
    text = table.text
    note = LogNote(
        text.shown, text.sha256, text.encoding, "\t", columns=table.columns, parts=tuple(parts)
    )
    note.ends_open = table.ends_open
    note.account.total = table.rows + table.blank
    note.account.line("blank lines", table.blank, table.rows + 1)
    return note


def begin_run(
    recording: Recording,
    reading: RowReading,
    place: Place,
    has_session: bool,  # noqa: FBT001
    findings: Findings,
) -> Run | None:
    """Read the samples of a recording and the trials of its run.

    Parameters
    ----------
    recording : Recording
        What is said of it.
    reading : RowReading
        How the study describes rows.
    place : Place
        How files are called in messages.
    has_session : bool
        Whether the dataset has sessions.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Run or None
        None where a problem was recorded.
    """
    path, bids, missing = recording.path, reading.logs.bids, reading.missing()
    assert bids is not None  # noqa: S101
    samples = read_headerless(path, place.of(path), recording.columns, findings)
    file = find_task_events(path, place, findings)
    asked = bids.trials
    told = None
    cells = None
    if file is not None:
        cells = read_events(file, place.of(file), [*reading.needed(), *asked], findings)
        if described_by(file, "events", ".json"):
            told = read_sidecar(file, place, findings)
    if samples is None:
        return None
    numbers = samples.numbers(list(RECORDING_COLUMNS), missing, findings)
    if numbers is None or cells is None:
        return None
    clock = read_clock(
        numbers[_STAMP],
        samples,
        recording.sidecar,
        bids.onset_unit,
        recording.frequency_hz,
        findings,
    )
    own = _own_reading(reading, recording, told, place, findings)
    if clock is None or own is None or findings.failed:
        return None
    start = (float(clock.time_ms[0]), recording.start_s)
    trials = trials_in(cells, told, asked, start, missing, findings)
    if trials is None or not _ids_are_there(trials, own, findings):
        return None
    own, unsaid = _with_session(own, recording, has_session)
    parts = [*recording.sidecar.parts, (cells.shown, "trials", cells.text.sha256)]
    parts += () if told is None else told.parts
    return Run(
        *(recording, place, own, samples, clock),
        *(numbers[_X], numbers[_Y], trials, tuple(dict.fromkeys(parts)), unsaid),
    )


def _with_session(
    reading: RowReading,
    recording: Recording,
    has_session: bool,  # noqa: FBT001
) -> tuple[RowReading, dict[str, str]]:
    """The session as the name says it, or none where the dataset has none.

    Where a dataset has sessions and this recording is of none, its session is an empty text.
    """
    columns = reading.logs.columns
    if columns.session is None or columns.session.column != SESSION:
        return reading, {}
    if has_session and "ses" in recording.entities:
        return reading, {}
    logs = reading.logs.model_copy(update={"columns": columns.model_copy(update={"session": None})})
    return replace(reading, logs=logs), {"session": ""} if has_session else {}


def _own_reading(
    reading: RowReading,
    recording: Recording,
    told: Sidecar | None,
    place: Place,
    findings: Findings,
) -> RowReading | None:
    """How rows of this recording become fixations: in its own units, on its own screen."""
    columns, before = reading.logs.columns, findings.count("error")
    units: dict[str, str] = {}
    for name, header in (("x", _X), ("y", _Y)):
        column = getattr(columns, name)
        stated = column.unit if column is not None and "unit" in column.model_fields_set else None
        said = recording.sidecar.unit(header, PLACE_UNITS, findings)
        if said is not None and stated is not None and said != stated:
            recording.sidecar.refuse(
                header,
                "the sidecar and the study say different units",
                f'"{stated}" as in [logs.columns]',
                "correct one of the two, or take the unit out of [logs.columns]",
                findings,
            )
        elif said is None and stated is None and findings.count("error") == before:
            recording.sidecar.refuse(
                header,
                "nothing says the unit of the positions",
                f'"{header}": {{"Units": "pixel"}} or "deg"',
                "add the unit to the sidecar",
                findings,
            )
        units[name] = said or stated or ""
    if findings.count("error") == before and len(set(units.values())) > 1:
        recording.sidecar.refuse(
            _Y, "x and y have different units", units["x"], "give both the same unit", findings
        )
    if findings.count("error") > before:
        return None
    screen = find_screen(told, reading.screen, units["x"], place.of(recording.path), findings)
    if screen is None:
        return None
    changed = {
        name: getattr(columns, name).model_copy(update={"unit": unit})
        for name, unit in units.items()
        if getattr(columns, name) is not None
    }
    samples = reading.logs.samples
    if samples is not None:
        # What a sample has none of; the sampling frequency is known from the sidecar.
        changed |= {"duration": None, "blink": None}
        if samples.frequency_hz is None:
            samples = samples.model_copy(update={"frequency_hz": recording.frequency_hz})
    logs = reading.logs.model_copy(
        update={
            "columns": columns.model_copy(update=changed),
            "samples": samples,
            "decimal": ".",
            # The eye is chosen by whole recordings.
            "eye": None,
        }
    )
    return replace(reading, logs=logs, screen=screen)


def _ids_are_there(trials: RunTrials, reading: RowReading, findings: Findings) -> bool:
    """Whether each trial has its name and its text; says which have not."""
    before = findings.count("error")
    for name in ("trial", "item", "session"):
        header = reading.headers().get(name)
        if header not in trials.cells:
            continue
        coded = Coded.of(trials.cells[header], reading.missing())
        for at in np.flatnonzero(coded.codes < 0).tolist():
            findings.error(
                f"the {name} is missing",
                path=trials.shown,
                line=int(trials.line[at]),
                where=f'column "{header}"',
                found=trials.cells[header][at].as_py(),
                expected=f"the {name} of each row that is a trial",
                fix="fill in the cell, or say by [logs.bids] trials which rows are trials",
            )
    return findings.count("error") == before
