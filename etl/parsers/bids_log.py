"""Logs of the open standard (BIDS): recordings of gaze, with the events beside them."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.bids_names import RECORDING, BidsName, Place, events_beside, subject_folder
from etl.parsers.bids_recording import Recording, eye_counts, read_recording, recorded_eyes
from etl.parsers.bids_rows import read_run
from etl.parsers.bids_run import READER, SESSION, begin_run, note_of
from etl.parsers.bids_sidecars import EYE_TRACK, recording_type
from etl.parsers.bids_tables import read_headerless
from etl.parsers.bids_trials import event_columns
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.log_rows import RowReading


@dataclass(frozen=True, slots=True)
class BidsReader:
    """Reads one recording after another.

    Attributes
    ----------
    reading : RowReading
        How rows become fixations.
    sessions : dict of Path to bool
        Which datasets have sessions, as far as is known.

    References
    ----------
    BIDS 1.11, Modality specific files, "Physiological recordings", with ``PhysioType``
    ``"eyetrack"``.
    """

    reading: RowReading
    sessions: dict[Path, bool] = field(default_factory=dict)

    #: Sidecars say what is in a recording.
    reads_one_file = False

    def header(self, path: Path) -> tuple[str, ...]:
        """Columns of the events of the task, and entities of the recording's name."""
        name = BidsName.of(path.name)
        entities = {} if name is None else name.entities
        return tuple(dict.fromkeys((READER, SESSION, *entities, "eye", *event_columns(path))))

    def read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one recording.

        Parameters
        ----------
        path : Path
            Its samples, ``…_physio.tsv.gz``.
        shown : str
            The name, for messages, of the file whose lines count; see :func:`lines_of`.
        findings : Findings
            Where problems are recorded, each with its file.

        Returns
        -------
        CanonicalLog and LogNote, or None
            None where a problem was recorded. A recording of an eye that does not count has no
            fixations.
        """
        own = Findings()
        read = self._read(path, Place(path, shown, self.reading.pseudonyms), own)
        findings.extend(own)
        return None if own.failed else read

    def _read(
        self, path: Path, place: Place, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one recording; what is wrong is recorded as it is found."""
        logs = self.reading.logs
        named = self.reading.named(path, place.shown, findings)
        recording = read_recording(path, place, findings)
        if recording is None or findings.failed:
            return None
        eyes = recorded_eyes(recording, logs.files, place, findings)
        reader = self._reader(recording)
        wanted = None if logs.eye is None else self.reading.eyes.of_reader(reader)
        counts = None if findings.failed else eye_counts(recording, eyes, wanted, place, findings)
        if counts is None:
            return None
        file = lines_of(path, from_samples=logs.samples is not None)
        if file == path and logs.samples is None:
            findings.error(
                "the recording has no events that say which samples are a fixation",
                path=place.of(path),
                expected=f"{events_beside(path).name} beside it",
                fix="describe by [logs.samples] in the study file how fixations are found in the "
                "samples",
            )
            return None
        has_session = "ses" in recording.entities or self._has_sessions(path)
        if not counts:
            return self._other_eye(recording, file, place, (named, has_session), findings)
        run = begin_run(recording, self.reading, place, has_session, findings)
        return None if run is None else read_run(run, file, named, findings)

    def _reader(self, recording: Recording) -> str:
        """The reader as the study knows them."""
        label, pseudonyms = recording.entities["sub"], self.reading.pseudonyms
        return label if pseudonyms is None else pseudonyms.of_reader(label)

    def _has_sessions(self, path: Path) -> bool:
        """Whether any reader of a recording's dataset came in sessions."""
        subject = subject_folder(path)
        root = path.parent if subject is None else subject.parent
        if root not in self.sessions:
            pattern = "sub-*_ses-*" if subject is None else "sub-*/ses-*"
            self.sessions[root] = next(root.glob(pattern), None) is not None
        return self.sessions[root]

    def _other_eye(
        self,
        recording: Recording,
        file: Path,
        place: Place,
        known: tuple[dict[str, str], bool],
        findings: Findings,
    ) -> tuple[CanonicalLog, LogNote] | None:
        """A log without a fixation, of the eye that does not count."""
        table = read_headerless(file, place.of(file), recording.columns, findings)
        if table is None:
            return None
        note = note_of(table, recording.sidecar.parts)
        note.account.line("rows of the other eye", table.rows, 1)
        named, has_session = known
        columns = self.reading.headers()
        own = {name for name in ("trial", "item") if name in columns} | named.keys()
        if columns.get("session", SESSION) != SESSION or ("session" in columns and has_session):
            own.add("session")
        none, whole = np.zeros(0), np.zeros(0, dtype=np.int32)
        log = CanonicalLog(
            {
                "participant": Coded.constant(self._reader(recording), 0),
                **{name: Coded.absent(0) for name in sorted(own - {"participant"})},
            },
            {name: Coded.absent(0) for name in self.reading.facts},
            *(none, none, none, none, none),
            Coded.absent(0) if "label" in columns else None,
            whole,
            np.zeros(0, dtype=bool),
            whole,
        )
        return log, note


def lines_of(path: Path, *, from_samples: bool) -> Path:
    """The file whose lines are those of a recording's fixations.

    Parameters
    ----------
    path : Path
        The recording, ``…_physio.tsv.gz``.
    from_samples : bool
        Whether fixations are found in the samples, as the study's ``[logs.samples]`` describes.

    Returns
    -------
    Path
        The events beside it, where there are any and fixations are taken from there.
    """
    events = events_beside(path)
    return path if from_samples or not events.is_file() else events


def is_recording(path: Path) -> bool:
    """Whether a file is a recording of the eyes: others lie beside it in many datasets.

    Parameters
    ----------
    path : Path
        A file that the study's patterns find.

    Returns
    -------
    bool
    """
    return path.name.endswith(RECORDING) and recording_type(path) == EYE_TRACK
