"""Recordings of both eyes in the open standard (BIDS): two files of a run; one counts."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import Findings
from etl.parsers import EyeChoice, reader_for
from tests.parsers.bids_making import CLOCK_MS, RECORDING, RUN, Dataset, study_of, told

OTHER = "_task-read_recording-eye2"


@pytest.fixture
def both(tmp_path: Path) -> Dataset:
    """The right eye in the recording eye1, the left one in eye2, 100 px to the right."""
    data = Dataset(tmp_path)
    data.remove("physio.json")
    data.sidecar("recording-eye1_physio.json", RECORDING)
    data.sidecar("recording-eye2_physio.json", told(RECORDING, RecordedEye="left"))
    data.samples(((CLOCK_MS + ms, 500, 20, 3) for ms in range(500)), entities=OTHER)
    data.events([(CLOCK_MS + 110, 40, "fixation"), (CLOCK_MS, 9, "saccade")], entities=OTHER)
    return data


@pytest.mark.parametrize(("eye", "counts"), [("right", RUN), ("left", OTHER)])
def test_recording_of_the_chosen_eye_counts(both: Dataset, eye: str, counts: str) -> None:
    """The recording of the other eye has no fixation, and its lines are accounted for."""
    for entities in (RUN, OTHER):
        log, note = both.log(both.path("physio.tsv.gz", entities=entities), eye={"use": eye})
        if entities == counts:
            assert len(log) > 0
            continue
        assert len(log) == 0
        assert {fate: one.count for fate, one in note.account.lines.items()} == {
            "rows of the other eye": 2
        }


def test_eye_is_chosen_for_each_reader(both: Dataset) -> None:
    """[logs.eye] readers goes by the label of the reader."""
    log, _ = both.log(eye={"use": "right", "readers": {"P01": "left"}})
    assert len(log) == 0


def test_eye_may_come_from_the_reader_table(both: Dataset) -> None:
    """What the reader table says of a reader goes before what is said of all."""
    study = study_of(eye={"use": "right"})
    reader = reader_for(study.logs, None, (), EyeChoice.of(study.logs, {"P01": "left"}))
    findings = Findings()
    read = reader.read(both.path("physio.tsv.gz", entities=OTHER), "eye2", findings)
    assert read is not None
    assert read[0].x_px.tolist() == [500.0]


def test_both_eyes_without_a_choice_are_refused(both: Dataset) -> None:
    """Where both were recorded, the study must say which one counts."""
    assert both.refusal() == (
        f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz: logs.eye: both eyes were recorded, and "
        'nothing says which one counts for this reader; found "right, left", expected an eye\n'
        '    fix: add use = "right" to [logs.eye], or name the reader\'s eye in [logs.eye] '
        "readers\n"
        "1 problem; nothing was written"
    )


def test_both_eyes_without_a_choice_for_this_reader_are_refused(both: Dataset) -> None:
    """An eye named for other readers says nothing of this one."""
    said = both.refusal(eye={"readers": {"P02": "left"}})
    assert "nothing says which one counts for this reader" in said


def test_patterns_may_choose_the_eye(both: Dataset) -> None:
    """A pattern that finds one recording of each run leaves nothing to choose."""
    log, _ = both.log(files=["**/*_recording-eye1_physio.tsv.gz"])
    assert len(log) == 2


def test_eye_that_was_not_recorded_is_refused(tmp_path: Path) -> None:
    """A reader is not lost silently because the other eye was recorded."""
    said = Dataset(tmp_path).refusal(eye={"use": "left"})
    assert "the eye that counts for this reader was not recorded" in said
    assert 'found "right"' in said


def test_eye_that_patterns_pass_over_is_refused(both: Dataset) -> None:
    """The chosen eye must be among the logs of the study."""
    said = both.refusal(files=["**/*_recording-eye1_physio.tsv.gz"], eye={"use": "left"})
    assert "the eye that counts for this reader was not recorded" in said


def test_two_recordings_of_one_eye_are_refused(both: Dataset) -> None:
    """Two recordings of one run and one eye cannot be told apart."""
    both.sidecar("recording-eye2_physio.json", RECORDING)
    assert "two recordings of one run are of the same eye" in both.refusal(eye={"use": "right"})


def test_recording_of_something_else_is_no_eye(both: Dataset) -> None:
    """A recording of another type beside the gaze is passed over."""
    both.sidecar("recording-eye2_physio.json", told(RECORDING, PhysioType="generic"))
    log, _ = both.log()
    assert len(log) == 2
