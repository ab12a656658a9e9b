"""Where the trials of a log of events begin and end, and what lies outside."""

from pathlib import Path

import pytest

from tests.parsers.event_reading import (
    CLOSES,
    OPENS,
    TRIAL,
    VISITOR,
    fates,
    read,
    read_and_told,
    reader_of,
    refusal,
    rested,
    texts,
)

SECOND = "gate 2 opens on plum"


def test_fixations_outside_every_trial_are_set_aside(tmp_path: Path) -> None:
    """What lies before the first start, and between an end and the next start, is counted."""
    lines = [VISITOR, rested(100), OPENS, rested(1000), CLOSES, rested(1300), rested(1600)]
    log, note = read(tmp_path, [*lines, SECOND, rested(2000), CLOSES, rested(2300)])
    assert log.source_line.tolist() == [4, 9]
    assert log.recording.tolist() == [0, 1]
    tally = note.account.lines["fixations outside every trial"]
    assert (tally.count, tally.first_line, fates(note)["fixations"]) == (4, 2, 2)


def test_without_ends_a_trial_lasts_until_the_next(tmp_path: Path) -> None:
    """Where no line says that a trial ends, all fixations below its start are its own."""
    lines = [VISITOR, OPENS, rested(1000), rested(1300), SECOND, rested(2000)]
    log, note = read(tmp_path, lines, reader_of({"trial_end": None}))
    assert texts(log, "trial") == ["1", "1", "2"]
    assert "trials that do not end" not in note.counts


def test_trial_that_starts_again_is_another_recording(tmp_path: Path) -> None:
    """A trial that ended may come again; each start begins a recording."""
    log, _ = read(tmp_path, [*TRIAL, SECOND, rested(2000), CLOSES, OPENS, rested(3000), CLOSES])
    assert texts(log, "trial") == ["1", "1", "2", "1"]
    assert log.recording.tolist() == [0, 0, 1, 2]


@pytest.mark.parametrize(
    "between", [[], [SECOND, rested(1500), CLOSES]], ids=["at once", "after another trial"]
)
def test_trial_broken_off_and_started_again(tmp_path: Path, between: list[str]) -> None:
    """A trial that does not end is no mistake where it starts again later."""
    lines = [VISITOR, OPENS, rested(1000), *between, OPENS, rested(2000), CLOSES]
    log, note = read(tmp_path, lines)
    assert texts(log, "trial") == ["1", *["2"] * bool(between), "1"]
    assert len(set(log.recording.tolist())) == len(log)
    assert note.counts["trials that do not end"] == 1


def test_another_session_is_not_the_same_trial(tmp_path: Path) -> None:
    """A trial of the same number in another session does not start it again."""
    patterns = {"trial_start": r"^gate (?P<trial>\d+) of (?P<session>\w+) opens on (?P<item>\w+)$"}
    lines = [VISITOR, "gate 1 of May opens on pear", rested(1000)]
    lines += ["gate 1 of June opens on pear", rested(2000), CLOSES]
    said = refusal(tmp_path, lines, reader_of(patterns))
    assert said.startswith("P01.log:2: a trial starts and does not end; ")


UNFINISHED_FIX = (
    '    fix: copy the log again; if trials may break off, add unfinished = "keep" to '
    "[logs.patterns]\n"
)


def test_trial_that_does_not_end(tmp_path: Path) -> None:
    """A trial without an end, which may be cut short or mixed with the next, stops the build."""
    assert refusal(tmp_path, [VISITOR, OPENS, rested(1000), SECOND, rested(2000)]) == (
        'P01.log:2: a trial starts and does not end; found "trial 1", expected its end before the '
        f"next one starts in line 4\n{UNFINISHED_FIX}"
        'P01.log:4: a trial starts and does not end; found "trial 2", expected its end before the '
        f"log ends; it may be cut short\n{UNFINISHED_FIX}"
        "2 problems; nothing was written"
    )


def test_trial_that_does_not_end_is_kept_where_the_study_says_so(tmp_path: Path) -> None:
    """With unfinished = "keep" its fixations up to the next start are its own, and it is told."""
    lines = [VISITOR, OPENS, rested(1000), SECOND, rested(2000)]
    log, note, said = read_and_told(tmp_path, lines, reader_of({"unfinished": "keep"}))
    assert texts(log, "trial") == ["1", "2"]
    assert note.counts["trials that do not end"] == 2
    assert said == (
        'note: P01.log:2: a trial does not end and is kept; found "trial 1"\n'
        'note: P01.log:4: a trial does not end and is kept; found "trial 2"'
    )


@pytest.mark.parametrize(
    ("lines", "line", "expected"),
    [
        pytest.param([VISITOR, CLOSES, *TRIAL[1:]], 2, "no trial starts above it", id="first"),
        pytest.param(
            [*TRIAL, CLOSES], 6, "the one that starts in line 2 ended in line 5", id="twice"
        ),
    ],
)
def test_end_without_a_start(tmp_path: Path, lines: list[str], line: int, expected: str) -> None:
    """An end that belongs to no trial shows that a start is lost."""
    assert refusal(tmp_path, lines) == (
        f"P01.log:{line}: a trial ends that has not started; expected the start of a trial first; "
        f"{expected}\n    fix: look for the line with which the trial starts; or correct "
        "trial_start or trial_end in [logs.patterns]\n1 problem; nothing was written"
    )


def test_trial_without_fixations_is_told(tmp_path: Path) -> None:
    """A trial in which nothing was recorded is counted and warned of."""
    log, note, said = read_and_told(
        tmp_path, [VISITOR, OPENS, CLOSES, SECOND, rested(2000), CLOSES]
    )
    assert (texts(log, "trial"), log.recording.tolist()) == (["2"], [1])
    assert (note.counts["trials"], note.counts["trials without a fixation"]) == (2, 1)
    assert said == (
        'warning: P01.log:2: a trial has no fixation; found "trial 1"\n'
        "    fix: if there should be some, look at the lines below this one"
    )


def test_log_whose_fixations_lie_in_no_trial(tmp_path: Path) -> None:
    """Patterns by which all fixations would be set aside are wrong."""
    assert refusal(tmp_path, [VISITOR, rested(1000), OPENS, CLOSES]) == (
        "P01.log:2: no fixation lies within a trial; expected lines as trial_start describes them "
        "above those of fixations\n    fix: correct trial_start or trial_end in [logs.patterns], "
        'or remove the log\nwarning: P01.log:3: a trial has no fixation; found "trial 1"\n'
        "    fix: if there should be some, look at the lines below this one\n"
        "1 problem; nothing was written"
    )


def test_line_that_fell_out_of_its_trial(tmp_path: Path) -> None:
    """A fixation below the end of a trial that is older than the trial's last one is misplaced."""
    lines = [VISITOR, OPENS, rested(100_000), rested(100_600), CLOSES, rested(100_300)]
    assert refusal(tmp_path, lines) == (
        "P01.log:6: the fixation stands below the end of the trial during which it began; found "
        '"onset 100300 ms", expected an onset after 100600 ms, when the last fixation of the trial '
        "began that starts in line 2\n"
        "    fix: bring the lines into the order of time\n1 problem; nothing was written"
    )


def test_eyes_are_late_on_their_own(tmp_path: Path) -> None:
    """A fixation of one eye that is told after the end of the trial is held against that eye."""
    eyes = r"^(?P<eye>[LR]) rested (?P<onset>\d+) to (?P<end>\d+) on (?P<x>\d+)/(?P<y>\d+)$"
    reader = reader_of({"fixation": eyes}, {"eye": {"use": "R"}})
    lines = [
        VISITOR,
        OPENS,
        f"L {rested(1000)}",
        f"R {rested(1010, 100)}",
        f"R {rested(1300, 100)}",
    ]
    log, note = read(tmp_path, [*lines, CLOSES, f"L {rested(1250)}"], reader)
    assert log.onset_ms.tolist() == [1010, 1300]
    assert fates(note)["fixations outside every trial"] == 1
