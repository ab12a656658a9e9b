"""Another recording, the same one in the next log, or damage: which rows say what."""

from __future__ import annotations

from collections.abc import Sequence
from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from tests.ordering.recorded import Fixation, in_order, ordered

AGAIN = "a trial is recorded a second time"
TWICE = "the number comes twice in this trial"
ALTERNATE = "rows of two trials alternate"
HOWEVER = ("error", "first", "last")


def by_onset(*rows: tuple[int, float, int]) -> list[Fixation]:
    """Rows of trial, onset and file."""
    return [Fixation(trial, onset, file=file) for trial, onset, file in rows]


def by_number(*rows: tuple[int, int], file: int = 0) -> list[Fixation]:
    """Rows of trial and number in one file, without onsets."""
    return [Fixation(trial, float("nan"), number=number, file=file) for trial, number in rows]


def problems(findings: Findings) -> list[tuple[str, int | None]]:
    """Each error and its line."""
    return [(finding.problem, finding.line) for finding in findings.of("error")]


#: Rows that are a second recording, and the row at which it begins.
SECOND: dict[str, tuple[Sequence[Fixation], int]] = {
    "in the next file after other trials, on a later clock": (
        by_onset((0, 1000, 0), (0, 1250, 0), (1, 5000, 0), (0, 901_000, 1), (0, 901_250, 1)),
        3,
    ),
    "in the next file before other trials of it": (
        by_onset((1, 500, 0), (0, 1000, 0), (1, 901_000, 1), (0, 902_000, 1), (0, 902_300, 1)),
        2,
    ),
    "numbers over the whole log": (
        by_number((0, 1), (0, 2), (1, 3), (0, 4), (0, 5)),
        3,
    ),
    "numbers over each of two logs that happen to go on": (
        [
            *by_number((0, 1), (0, 2), (1, 3), (2, 4)),
            *by_number((2, 1), (1, 2), (0, 3), (0, 4), file=1),
        ],
        6,
    ),
    "right after a recording of one fixation": (
        [Fixation(0, 0, 100, 1), Fixation(0, 700, 100, 1), Fixation(0, 900, 100, 2)],
        1,
    ),
    "numbers over the whole log, begun anew with each file": (
        [*by_number((1, 1), (0, 2), (0, 3)), *by_number((0, 1), (0, 2), file=1)],
        3,
    ),
}


@pytest.mark.parametrize("way", SECOND)
def test_second_recording_is_never_merged(way: str) -> None:
    """A trial that was recorded again is told as such, wherever the second recording lies."""
    fixations, begins = SECOND[way]
    _, findings = ordered(fixations)
    assert (AGAIN, begins + 2) in problems(findings)
    assert {problem for problem, _ in problems(findings)} == {AGAIN}


@pytest.mark.parametrize("way", SECOND)
def test_first_and_last_take_one_recording_each(way: str) -> None:
    """Of the trial, the rows before the second recording are one, those from it on the other."""
    fixations, begins = SECOND[way]
    for repeated in ("first", "last"):
        found = in_order(fixations, repeated)
        trial = fixations[begins].trial
        used = {
            int(row)
            for row, aside in zip(found.rows, found.repeated, strict=True)
            if not aside and fixations[int(row)].trial == trial
        }
        own = {row for row, f in enumerate(fixations) if f.trial == trial}
        assert used == {row for row in own if (row < begins) == (repeated == "first")}


#: Rows that contradict each other: what is said, and of which row.
DAMAGED: dict[str, tuple[Sequence[Fixation], str, int]] = {
    "both eyes": (by_number((0, 1), (0, 1), (0, 2), (0, 2), (0, 3), (0, 3)), TWICE, 1),
    "both eyes on one clock": (
        [Fixation(0, 300 * n + eye, 200, n) for n in (1, 2, 3) for eye in (0, 4)],
        TWICE,
        1,
    ),
    "both eyes in a trial of one fixation": (by_number((0, 1), (0, 1)), TWICE, 1),
    "a row that is there twice": (by_number((0, 1), (0, 2), (0, 2), (0, 3)), TWICE, 2),
    "the first row twice": (by_number((0, 1), (0, 1), (0, 2), (0, 3)), TWICE, 1),
    "a stray row of a later number": (
        by_number((0, 1), (0, 2), (0, 3), (1, 1), (0, 3), (1, 2)),
        TWICE,
        4,
    ),
    "interleaved by onset": (
        by_onset((0, 1000, 0), (1, 5000, 0), (0, 1250, 0), (1, 5250, 0)),
        ALTERNATE,
        2,
    ),
    "row by row on one clock": (
        by_onset(*((row % 2, row * 300, 0) for row in range(6))),
        ALTERNATE,
        2,
    ),
    "numbers that neither go on nor begin anew": (
        by_number((0, 1), (0, 2), (1, 1), (0, 4), (0, 5), (1, 2)),
        ALTERNATE,
        3,
    ),
    "descending onsets": (
        by_onset((0, 1600, 0), (0, 1400, 0), (0, 1200, 0), (0, 1000, 0)),
        "the fixations of this trial go back again and again",
        1,
    ),
}


@pytest.mark.parametrize("repeated", HOWEVER)
@pytest.mark.parametrize("way", DAMAGED)
def test_damage_is_an_error_however_repeats_are_treated(way: str, repeated: str) -> None:
    """No choice of recordings turns damaged rows into a tiny trial; each trial is told once."""
    fixations, problem, row = DAMAGED[way]
    _, findings = ordered(fixations, repeated)
    assert problems(findings)[0] == (problem, row + 2)
    assert {said for said, _ in problems(findings)} == {problem}
    assert len(problems(findings)) <= len({fixation.trial for fixation in fixations})


def test_damage_names_trial_number_and_the_row_before() -> None:
    """The message says which fixation it is, where the other row stands, and the ways out."""
    _, findings = ordered(by_number((0, 1), (0, 2), (0, 2), (0, 3)), "last")
    assert findings.text() == (
        'a.tsv:4: the number comes twice in this trial; found "trial 1, fixation 2", expected each '
        "number once in a recording; the row of this trial above it is a.tsv:3\n"
        "    fix: if the log holds both eyes, name the one to use in [logs.where]; remove a row "
        "that is there twice; if the trial was recorded a second time, tell the two apart by a "
        "session\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("way", DAMAGED)
def test_damage_outside_the_study_is_nobodys_concern(way: str) -> None:
    """Rows of a practice trial may be as they like."""
    _, findings = ordered(DAMAGED[way][0], in_study=False)
    assert not {TWICE, ALTERNATE} & {problem for problem, _ in problems(findings)}


def test_trial_that_goes_on_in_the_next_file_is_warned_of() -> None:
    """Its last rows in one file and its first in the next are one recording, with a warning."""
    rows = by_onset((0, 1000, 0), (1, 2000, 0), (1, 2300, 1), (2, 9000, 1))
    found, findings = ordered(rows)
    assert not found.repeated.any()
    assert findings.lines() == [
        (
            'warning: b.tsv:4: a trial of a.tsv goes on here; found "trial 2"\n'
            "    fix: if it was begun anew there, tell the two apart by a session, or name the "
            "column that numbers fixations as [logs.columns] fixation"
        )
    ]


def test_numbered_trial_that_goes_on_in_the_next_file_is_noted() -> None:
    """The same where the log numbers its fixations, in whichever order."""
    rows = [*by_number((0, 1), (1, 2), (1, 1)), *by_number((2, 1), (1, 3), file=1)]
    found, findings = ordered(rows)
    assert (found.number.tolist(), found.rows.tolist()) == ([1, 1, 2, 3, 1], [0, 2, 1, 4, 3])
    assert findings.count("note") == 1
    assert not findings.failed


@st.composite
def numbered_sessions(draw: st.DrawFn) -> list[Fixation]:
    """Trials one after the other, with several fixations each, numbered in each trial."""
    counts = draw(st.lists(st.integers(2, 6), min_size=2, max_size=5))
    return by_number(*((t, n + 1) for t, count in enumerate(counts) for n in range(count)))


@given(numbered_sessions(), st.data())
def test_any_row_that_is_there_twice_is_refused(rows: list[Fixation], data: st.DataObject) -> None:
    """One row repeated right below itself stops the build, whatever is said of repeats."""
    at = data.draw(st.integers(0, len(rows) - 1))
    damaged = [*rows[: at + 1], rows[at], *rows[at + 1 :]]
    for repeated in HOWEVER:
        _, findings = ordered(damaged, repeated)
        assert [problem for problem, _ in problems(findings)] == [TWICE]


@given(numbered_sessions(), st.sampled_from(HOWEVER))
def test_both_eyes_are_refused(rows: list[Fixation], repeated: str) -> None:
    """Every row twice stops the build, with one error a trial."""
    _, findings = ordered([row for row in rows for _ in range(2)], repeated)
    assert {problem for problem, _ in problems(findings)} == {TWICE}
    assert findings.count("error") == len({row.trial for row in rows})


@given(numbered_sessions(), st.data(), st.randoms(use_true_random=False))
def test_shuffled_trials_may_straddle_files(
    rows: list[Fixation], data: st.DataObject, random: Random
) -> None:
    """Rows of any order in each of two files are put in order where numbers leave no gap."""
    cut = data.draw(st.integers(0, len(rows)))
    parts = [rows[:cut], [row._replace(file=1) for row in rows[cut:]]]
    # A part in which the numbers happen to ascend over several trials would be another case.
    for part in parts:
        random.shuffle(part)
        part.sort(key=lambda row: row.number == 1)
    shuffled = [row for part in parts for row in part]
    found = in_order(shuffled)
    assert not found.repeated.any()
    assert found.number.tolist() == [row.number for row in rows]


@pytest.mark.parametrize("step_ms", [0.1, 0.7, 1.3])
def test_contiguous_fixations_do_not_overlap_by_rounding(step_ms: float) -> None:
    """Where each fixation ends as the next begins, decimals make no overlap."""
    onsets = [round(1000.1 + row * step_ms, 1) for row in range(300)]
    assert in_order([Fixation(0, onset, step_ms) for onset in onsets]).overlapping.sum() == 0


def test_overlap_of_two_milliseconds_with_decimals_is_tolerated() -> None:
    """2 ms are 2 ms, though 1847.9 + 200.3 - 2046.2 is a little more in binary numbers."""
    assert in_order([Fixation(0, 1847.9, 200.3), Fixation(0, 2046.2, 200.3)]).overlapping.sum() == 1
