"""One study in every dialect gives the same outcomes, byte for byte.

What a dialect cannot carry, and what its outcomes are therefore held against:

==============================  ==================================================================
numbers in place of onsets      nothing says which fixations lie outside the time of the text, so
                                that rule is off in what it is compared with
samples; bids, from samples     a fixation without a position cannot be found in samples, so the
                                study it is compared with has none; all else is the same bytes
bids, from samples              nothing says when there was a blink, so that rule is off, too
two sessions                    the session is a column of its own and trials are numbered anew in
                                each; all else is the same, row by row
==============================  ==================================================================

The dialects of areas carry no positions: a fixation past the edge of the screen is one outside
every region there, and outcomes are the same bytes all the same.
"""

from __future__ import annotations

import hashlib
from functools import partial
from pathlib import Path

import pandas as pd
import pytest

import etl
from tests.simulator.dialects import DIALECTS, RecordedStudy, Writer, recorded_study
from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.dialects.tables import TableDialect, write_tables

UNTIMED = TableDialect(study=partial(StudyFile, text_times=False))
UNBLINKING = TableDialect(study=partial(StudyFile, blinks=False))
#: The dialects that are not compared with the plain one.
UNLIKE = {
    "numbers in place of onsets": "no text times",
    "samples": "placed",
    "samples, gzipped, seconds, semicolons": "placed",
    "bids, from samples": "placed, no blinks",
}
SESSIONS = "two sessions"


@pytest.fixture(scope="module")
def study() -> RecordedStudy:
    """Six readers of eight texts."""
    return recorded_study()


@pytest.fixture(scope="module")
def expected(study: RecordedStudy, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """The outcomes that dialects are held against, by what is special about them."""
    made: dict[str, tuple[RecordedStudy, Writer]] = {
        "": (study, DIALECTS["plain"]),
        "no text times": (study, partial(write_tables, dialect=UNTIMED)),
        "placed": (study.placed(), DIALECTS["plain"]),
        "placed, no blinks": (study.placed(), partial(write_tables, dialect=UNBLINKING)),
    }
    return {
        name: outcomes(own, writer, tmp_path_factory.mktemp("expected"))
        for name, (own, writer) in made.items()
    }


def outcomes(study: RecordedStudy, writer: Writer, folder: Path) -> Path:
    """Write a study, build it, and give the file of its outcomes."""
    return etl.build(etl.load_study(writer(study, folder))).folder / "outcomes.parquet"


def digest(path: Path) -> str:
    """A file's digest."""
    return hashlib.sha256(path.read_bytes()).hexdigest()


@pytest.mark.parametrize("dialect", [name for name in DIALECTS if name != SESSIONS])
def test_outcomes_are_the_same_bytes(
    dialect: str, study: RecordedStudy, expected: dict[str, Path], tmp_path: Path
) -> None:
    """However the logs are written, the same was read."""
    built = outcomes(study, DIALECTS[dialect], tmp_path)
    assert digest(built) == digest(expected[UNLIKE.get(dialect, "")])


@pytest.mark.parametrize("special", ["no text times", "placed", "placed, no blinks"])
def test_what_cannot_be_carried_makes_a_difference(special: str, expected: dict[str, Path]) -> None:
    """A dialect is compared with other outcomes only where those are others."""
    assert digest(expected[special]) != digest(expected[""])


def test_outcomes_of_two_sessions_are_the_same_but_for_the_session(
    study: RecordedStudy, expected: dict[str, Path], tmp_path: Path
) -> None:
    """With a session for each half, and trials numbered anew in it, all else is the same."""
    built = pd.read_parquet(outcomes(study, DIALECTS[SESSIONS], tmp_path))
    plain = pd.read_parquet(expected[""])
    assert set(built["session"]) == {"autumn", "spring"}
    built["trial"] = [
        study.number_before(str(session), int(number))
        for session, number in zip(built["session"], built["trial"], strict=True)
    ]
    in_order = built.sort_values(["participant", "trial"], kind="stable", ignore_index=True)
    pd.testing.assert_frame_equal(in_order.drop(columns="session"), plain, check_exact=True)


@pytest.mark.slow
def test_hundreds_of_logs_give_what_one_log_gives(tmp_path: Path) -> None:
    """A log a trial, 240 in all, or one log for everybody."""
    study = recorded_study(readers=20, items=12)
    many = outcomes(study, DIALECTS["a log a trial, named so"], tmp_path / "many")
    assert len(list((tmp_path / "many" / "logs").iterdir())) == 240
    one = outcomes(study, DIALECTS["one log"], tmp_path / "one")
    assert digest(many) == digest(one)


def what_happened(study: RecordedStudy) -> dict[str, int]:
    """How often the recording shows what the dialects must carry."""
    fixations = [fixation for trial in study.trials for fixation in trial.fixations]
    timed = [(t, f) for t in study.trials for f in t.fixations]
    return {
        "blinks": sum(fixation.blink for fixation in fixations),
        "without a position": sum(fixation.x_px is None for fixation in fixations),
        "past the screen": sum(not 0 <= (f.x_px or 0) < 1920 for f in fixations),
        "outside the text's time": sum(
            not t.text_on_ms <= f.onset_ms < t.text_off_ms for t, f in timed
        ),
        "of no whole pixel": sum((f.x_px or 0) % 1 != 0 for f in fixations),
        "outside every region": sum(fixation.label == "elsewhere" for fixation in fixations),
    }


def test_study_has_some_of_everything(study: RecordedStudy) -> None:
    """The study shows what might be lost on the way: blinks, lost positions, decimals, …."""
    assert {what: count for what, count in what_happened(study).items() if count < 5} == {}
