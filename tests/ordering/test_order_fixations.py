"""Fixations in time order, by onset or by number; trials that straddle files or come again."""

from __future__ import annotations

from random import Random

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.ordering.recorded import Fixation, in_order, ordered


@st.composite
def sessions(draw: st.DrawFn) -> list[Fixation]:
    """A sound session: trials one after the other, fixations that never overlap, numbered."""
    fixations = []
    now = draw(st.integers(0, 10_000_000))
    for trial in range(draw(st.integers(1, 5))):
        for number in range(1, draw(st.integers(1, 6)) + 1):
            duration = draw(st.integers(1, 500))
            fixations.append(Fixation(trial, now, duration, number))
            now += duration + draw(st.integers(0, 100))
    return fixations


@given(sessions())
def test_sound_session_stays_in_order(session: list[Fixation]) -> None:
    """A log that is in order by onset is left as it is, and numbered from 1 in each trial."""
    found = in_order([f._replace(number=np.nan) for f in session])
    assert found.rows.tolist() == list(range(len(session)))
    assert found.trial.tolist() == [f.trial for f in session]
    assert found.number.tolist() == [f.number for f in session]
    assert not found.repeated.any()
    assert found.overlapping.sum() == 0


@given(sessions(), st.randoms(use_true_random=False))
def test_numbers_put_shuffled_rows_in_order(session: list[Fixation], random: Random) -> None:
    """Rows in any order are sorted by trial and number where the log numbers its fixations."""
    shuffled = list(session)
    random.shuffle(shuffled)
    found = in_order(shuffled)
    assert [shuffled[row] for row in found.rows] == session
    assert not found.repeated.any()


@given(sessions(), st.randoms(use_true_random=False))
def test_numbers_are_enough_without_onsets(session: list[Fixation], random: Random) -> None:
    """A log without onsets is put in order by its numbers."""
    bare = [f._replace(onset_ms=np.nan) for f in session]
    random.shuffle(bare)
    found = in_order(bare)
    assert [(bare[row].trial, bare[row].number) for row in found.rows] == [
        (f.trial, f.number) for f in session
    ]


@given(sessions(), st.integers(0, 30))
def test_trial_may_straddle_files(session: list[Fixation], cut: int) -> None:
    """Where one file ends and the next begins makes no difference."""
    split = [f._replace(number=np.nan, file=int(i >= cut)) for i, f in enumerate(session)]
    found = in_order(split)
    assert found.rows.tolist() == list(range(len(session)))
    assert not found.repeated.any()


@given(sessions())
def test_numbers_may_go_on_in_the_next_file(session: list[Fixation]) -> None:
    """A numbered trial may straddle files too."""
    split = [f._replace(file=int(i >= len(session) // 2)) for i, f in enumerate(session)]
    assert in_order(split).rows.tolist() == list(range(len(session)))


def test_onsets_may_count_from_each_trial() -> None:
    """Time may begin anew in every trial."""
    found = in_order([Fixation(0, 0), Fixation(0, 200), Fixation(1, 0), Fixation(1, 200)])
    assert found.number.tolist() == [1, 2, 1, 2]


def test_trials_may_stand_in_any_order() -> None:
    """Trials are told apart by their name, not by their place in the log."""
    found = in_order([Fixation(1, 0), Fixation(1, 200), Fixation(0, 500), Fixation(0, 700)])
    assert found.rows.tolist() == [2, 3, 0, 1]
    assert found.trial.tolist() == [0, 0, 1, 1]


def test_seven_digit_onsets_are_told_in_full() -> None:
    """A message gives onsets with all their digits."""
    _, findings = ordered(
        [Fixation(0, 12_345_678.5), Fixation(0, 12_345_999), Fixation(0, 12_345_700)]
    )
    assert findings.items[0].found == "onset 12345700 ms after 12345999 ms"


@pytest.mark.parametrize(
    ("overlap_ms", "refused", "counted"),
    [(0, 0, 0), (1, 0, 1), (2, 0, 1), (2.5, 1, 0), (50, 1, 0)],
)
def test_overlap_is_tolerated_to_two_milliseconds(
    overlap_ms: float, refused: int, counted: int
) -> None:
    """An overlap of up to 2 ms is rounding and is counted; more is an error."""
    found, findings = ordered([Fixation(0, 1000, 200), Fixation(0, 1200 - overlap_ms, 100)])
    assert (findings.count("error"), found.overlapping.sum()) == (refused, counted)


def test_overlap_across_trials_is_none() -> None:
    """The last fixation of a trial may be cut by the next trial's first."""
    found = in_order([Fixation(0, 1000, 500), Fixation(1, 1200, 100)])
    assert found.overlapping.sum() == 0


def test_equal_onsets_overlap() -> None:
    """Two fixations cannot begin at once."""
    _, findings = ordered([Fixation(0, 1000, 200), Fixation(0, 1000, 200)])
    assert findings.count("error") == 1


#: Ways in which a trial is recorded twice: the rows of trial 0, and which rows each recording has.
AGAIN = {
    "after another trial": [
        Fixation(0, 1000),
        Fixation(0, 1200),
        Fixation(1, 2000),
        Fixation(0, 3000),
        Fixation(0, 3200),
    ],
    "in the next file, with time begun anew": [
        Fixation(0, 1000),
        Fixation(0, 1200),
        Fixation(1, 2000),
        Fixation(0, 500, file=1),
        Fixation(0, 700, file=1),
    ],
    "at once, with time begun anew": [
        Fixation(1, 100),
        Fixation(0, 1000),
        Fixation(0, 1200),
        Fixation(0, 1000),
        Fixation(0, 1200),
    ],
    "with the same numbers": [
        Fixation(1, 100, number=1),
        Fixation(0, 1000, number=1),
        Fixation(0, 1200, number=2),
        Fixation(0, 3000, number=1),
        Fixation(0, 3200, number=2),
    ],
}


@pytest.mark.parametrize("way", AGAIN)
def test_second_recording_is_an_error(way: str) -> None:
    """A trial that was recorded twice is refused, with both places."""
    _, findings = ordered(AGAIN[way])
    (finding,) = findings.items
    assert finding.problem == "a trial is recorded a second time"
    assert finding.found == "trial 1"
    own = [row for row, fixation in enumerate(AGAIN[way]) if fixation.trial == 0]
    file = "b.tsv" if AGAIN[way][own[2]].file else "a.tsv"
    assert (finding.path, finding.line) == (file, own[2] + 2)
    assert finding.expected.endswith(f"the first begins in a.tsv:{own[0] + 2}")


@pytest.mark.parametrize("way", AGAIN)
@pytest.mark.parametrize(("repeated", "aside"), [("first", [2, 3]), ("last", [0, 1])])
def test_one_recording_is_used(way: str, repeated: str, aside: list[int]) -> None:
    """Of two recordings the first or the last is used, as stated; no fixation is lost."""
    fixations = AGAIN[way]
    own = [row for row, fixation in enumerate(fixations) if fixation.trial == 0]
    found = in_order(fixations, repeated)
    assert sorted(found.rows.tolist()) == list(range(len(fixations)))
    assert sorted(found.rows[found.repeated].tolist()) == [own[i] for i in aside]


@pytest.mark.parametrize("way", AGAIN)
def test_trial_outside_the_study_may_come_again(way: str) -> None:
    """A practice trial that was done twice is nobody's concern."""
    assert not in_order(AGAIN[way], in_study=False).repeated.any()


def test_three_recordings() -> None:
    """With more than two recordings the first and the last are still well defined."""
    trials = (0, 0, 1, 0, 0, 2, 0, 0)
    fixations = [Fixation(trial, row * 200) for row, trial in enumerate(trials)]
    last = in_order(fixations, "last")
    first = in_order(fixations, "first")
    assert sorted(last.rows[last.repeated].tolist()) == [0, 1, 3, 4]
    assert sorted(first.rows[first.repeated].tolist()) == [3, 4, 6, 7]


def test_time_that_goes_back_is_named_where_it_does() -> None:
    """Each fixation that begins before the one above it is named."""
    _, findings = ordered(
        [Fixation(0, 1000), Fixation(0, 1400), Fixation(0, 1200), Fixation(0, 1600)]
    )
    (finding,) = findings.items
    assert (finding.path, finding.line) == ("a.tsv", 4)
    assert finding.found == "onset 1200 ms after 1400 ms"


def test_one_slip_in_an_onset_is_one_problem() -> None:
    """An onset that lacks a digit is told as going back in time, not as an overlap too."""
    _, findings = ordered([Fixation(0, onset_ms) for onset_ms in (1000, 1200, 1050, 1600)])
    assert [finding.line for finding in findings] == [4]
