"""A gaze recording of the open standard (BIDS): what its name and sidecars say, and whose eye."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fnmatch import fnmatch
from pathlib import Path, PurePosixPath

from etl.errors import Findings
from etl.parsers.bids_names import BidsName, Place, same_run, subject_folder
from etl.parsers.bids_samples import RECORDING_COLUMNS
from etl.parsers.bids_sidecars import (
    EYE_FIELDS,
    EYE_TRACK,
    RECORDING_FIELDS,
    Sidecar,
    read_sidecar,
    recording_type,
)

#: Eyes, and the systems of coordinates of which this program reads one (BIDS 1.11 schema,
#: ``objects.metadata.RecordedEye`` and ``SampleCoordinateSystem``).
EYES = ("left", "right", "cyclopean")
ON_SCREEN = "gaze-on-screen"


@dataclass(frozen=True, slots=True)
class Recording:
    """What is known of a recording before its samples are read.

    Attributes
    ----------
    path : Path
        The file of samples.
    entities : dict of str to str
        Of its name.
    sidecar : Sidecar
        What is said of it.
    columns : tuple of str
        Its columns.
    eye : {"left", "right", "cyclopean"}
        Whose it is.
    frequency_hz : float
        Samples a second.
    start_s : float, seconds
        When its first sample was taken, since the start of the acquisition.
    """

    path: Path
    entities: dict[str, str]
    sidecar: Sidecar
    columns: tuple[str, ...]
    eye: str
    frequency_hz: float
    start_s: float


def read_recording(path: Path, place: Place, findings: Findings) -> Recording | None:
    """Read what is said of a recording.

    Parameters
    ----------
    path : Path
        The file of samples.
    place : Place
        How files are called in messages.
    findings : Findings
        Where it is recorded what the standard requires and is not there, and what this program
        cannot read.

    Returns
    -------
    Recording or None
        None where a problem was recorded.
    """
    before = findings.count("error")
    entities = _entities(path, place, findings)
    sidecar = read_sidecar(path, place, findings)
    if sidecar is None:
        return None
    if sidecar.values.get("PhysioType") != EYE_TRACK:
        sidecar.refuse(
            "PhysioType",
            "the sidecar does not say that this is a recording of the eyes",
            f'"{EYE_TRACK}"',
            f'add "PhysioType": "{EYE_TRACK}", or take the file out of [logs] files',
            findings,
        )
    if not sidecar.require((*RECORDING_FIELDS, *EYE_FIELDS), findings):
        return None
    columns = sidecar.names("Columns", RECORDING_COLUMNS, findings)
    frequency_hz = sidecar.number("SamplingFrequency", findings, above=0)
    start_s = sidecar.number("StartTime", findings)
    eye = sidecar.choice("RecordedEye", EYES, "correct the sidecar", findings)
    sidecar.choice(
        "SampleCoordinateSystem",
        (ON_SCREEN,),
        "take the recording out of [logs] files: regions lie on the screen, and only gaze on the "
        "screen can be in them",
        findings,
    )
    if findings.count("error") > before or eye is None:
        return None
    assert frequency_hz is not None  # noqa: S101
    assert start_s is not None  # noqa: S101
    return Recording(path, entities, sidecar, columns, eye, frequency_hz, start_s)


def _entities(path: Path, place: Place, findings: Findings) -> dict[str, str]:
    """The entities of a recording's name; a name without a reader, or in wrong folders, is told."""
    name = BidsName.of(path.name)
    if name is None or "sub" not in name.entities:
        findings.error(
            "the file's name is none of the standard",
            path=place.shown,
            found=path.name,
            expected="sub-<label>[_ses-<label>]_task-<label>[_run-<index>][_recording-<label>]"
            "_physio.tsv.gz, labels of letters and digits",
            fix="rename the file and those that belong to it",
        )
        return {}
    subject = subject_folder(path)
    inside = () if subject is None else path.relative_to(subject.parent).parts[:-1]
    for key in ("sub", "ses"):
        for folder in (one for one in inside if one.startswith(f"{key}-")):
            if folder != f"{key}-{name.entities.get(key)}":
                findings.error(
                    "the file's name is not of the folder that it lies in",
                    path=place.shown,
                    found=folder,
                    expected=f"{key}-{name.entities.get(key, '<label>')} in both",
                    fix="move or rename the file",
                )
    return name.entities


def recorded_eyes(
    recording: Recording, patterns: Sequence[str], place: Place, findings: Findings
) -> dict[Path, str]:
    """The recordings of the same run that the study reads, each with its eye.

    Parameters
    ----------
    recording : Recording
        One of them.
    patterns : sequence of str
        The study's ``[logs] files``: what none of them finds is not read.
    place : Place
        How files are called in messages.
    findings : Findings
        Where sidecars that cannot be read are recorded.

    Returns
    -------
    dict of Path to str
    """
    found = {recording.path: recording.eye}
    for other in same_run(recording.path):
        asked = any(fnmatch(other.name, PurePosixPath(pattern).name) for pattern in patterns)
        if other == recording.path or not asked or recording_type(other) != EYE_TRACK:
            continue
        sidecar = read_sidecar(other, place, findings)
        if sidecar is not None:
            found[other] = str(sidecar.values.get("RecordedEye", ""))
    return found


def eye_counts(
    recording: Recording,
    eyes: dict[Path, str],
    wanted: str | None,
    place: Place,
    findings: Findings,
) -> bool | None:
    """Whether a recording is of the eye that counts.

    Parameters
    ----------
    recording : Recording
        The recording.
    eyes : dict of Path to str
        It and the others of its run, from :func:`recorded_eyes`.
    wanted : str or None
        The eye that counts for this reader; empty where the study names one for other readers
        only, None where it names none.
    place : Place
        How files are called in messages.
    findings : Findings
        Where it is recorded that nothing tells which counts.

    Returns
    -------
    bool or None
        None where a problem was recorded.
    """
    listed = ", ".join(eyes.values())
    if len(set(eyes.values())) < len(eyes):
        findings.error(
            "two recordings of one run are of the same eye",
            path=place.shown,
            found=f"{listed} in " + " and ".join(other.name for other in eyes),
            expected="one recording of each eye",
            fix="narrow [logs] files to the one that counts",
        )
        return None
    if not wanted:
        if len(eyes) == 1:
            return True
        findings.error(
            "both eyes were recorded, and nothing says which one counts for this reader",
            path=place.shown,
            where="logs.eye",
            found=listed,
            expected="an eye",
            fix=f'add use = "{recording.eye}" to [logs.eye], or name the reader\'s eye in '
            "[logs.eye] readers"
            if wanted is None
            else "add the reader to [logs.eye] readers, or add use",
        )
        return None
    if wanted not in eyes.values():
        findings.error(
            "the eye that counts for this reader was not recorded",
            path=place.shown,
            where="logs.eye",
            found=listed,
            expected=f'a recording of the eye "{wanted}" in this run, found by [logs] files',
            fix="name the other eye for this reader in [logs.eye] readers, or correct [logs] files",
        )
        return None
    return recording.eye == wanted
