"""What is told of the recordings of the open standard (BIDS) that a study's patterns find."""

from __future__ import annotations

import glob
from collections.abc import Collection, Sequence
from pathlib import Path

from etl.errors import Findings
from etl.parsers.bids_names import RECORDING, RECORDING_EVENTS, subject_folder
from etl.pseudonyms import Pseudonyms
from etl.study import Study
from etl.trials.facts import shown_path


def tell_of_other_recordings(
    study: Study,
    pattern: tuple[int, str],
    found: tuple[Collection[Path], Sequence[Path]],
    pseudonyms: Pseudonyms | None,
    findings: Findings,
) -> bool:
    """Say which recordings that a pattern finds are not of the eyes.

    Parameters
    ----------
    study : Study
        As loaded.
    pattern : tuple of int and str
        Its place in the study file, and the pattern.
    found : tuple of collection of Path and sequence of Path
        What the pattern finds that is no log, and the logs that it finds.
    pseudonyms : Pseudonyms or None
        What gives other names to files, where the study asks for it.
    findings : Findings
        Where it is noted that there are such recordings; an error where there is nothing else.

    Returns
    -------
    bool
        Whether an error was recorded.
    """
    others, files = found
    recordings = sorted(path for path in others if path.name.endswith(RECORDING))
    for path in recordings:
        if not path.exists():
            findings.error(
                "this is a link that leads nowhere",
                path=shown_path(study, path.absolute()),
                expected="a recording",
                fix="put the recording there: some programs fetch it only when asked",
            )
    passed = [path for path in recordings if path.is_file()]
    if not passed:
        return False
    shown = shown_path(study, passed[0].absolute())
    if pseudonyms is not None:
        shown = pseudonyms.of_file(shown, "file")
    count = f"{len(passed):,} recording{'' if len(passed) == 1 else 's'}"
    if files:
        findings.note(
            f"{count} of another type than the eyes passed over, such as this", path=shown
        )
        return False
    findings.error(
        "no recording that this finds is one of the eyes",
        path=study.shown,
        line=study.line_of("logs", "files", pattern[0]),
        where="logs.files",
        found=pattern[1],
        expected=f'"PhysioType": "eyetrack" in the sidecar of recordings such as {shown}',
        fix="add it to the sidecar, or correct the pattern",
    )
    return True


def tell_of_lost_recordings(study: Study, pattern: str, findings: Findings) -> None:
    """Record events whose recording is not there: else a reader would be lost with it.

    Parameters
    ----------
    study : Study
        As loaded.
    pattern : str
        One of the patterns of the study.
    findings : Findings
        Where it is recorded.
    """
    of_events = pattern.removesuffix(RECORDING) + RECORDING_EVENTS
    if of_events == pattern + RECORDING_EVENTS:
        of_events = pattern
    full = str(Path(glob.escape(str(study.folder))) / of_events)
    for name in sorted(glob.glob(full, recursive=True)):  # noqa: PTH207
        if not name.endswith(RECORDING_EVENTS):
            continue
        recording = Path(name.removesuffix(RECORDING_EVENTS) + RECORDING)
        if not recording.is_file():
            findings.error(
                "the recording of these events is missing",
                path=shown_path(study, Path(name).absolute()),
                expected=f"{recording.name} beside it",
                fix="put the recording there, or take the events away",
            )


def tell_of_datasets(study: Study, logs: Sequence[Path], findings: Findings) -> None:
    """Record logs of several datasets: one label is then of several readers.

    Parameters
    ----------
    study : Study
        As loaded.
    logs : sequence of Path
        All its logs.
    findings : Findings
        Where it is recorded.
    """
    folders = dict.fromkeys(
        path.parent if subject is None else subject.parent
        for path, subject in ((path.absolute(), subject_folder(path.absolute())) for path in logs)
    )
    if len(folders) > 1:
        findings.error(
            "the logs are of several datasets",
            path=study.shown,
            line=study.line_of("logs", "files"),
            where="logs.files",
            found=", ".join(shown_path(study, folder) for folder in folders),
            expected="one dataset, in which a label is of one reader",
            fix="build each dataset by a study file of its own",
        )
