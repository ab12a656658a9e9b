"""Return sweeps and undersweeps: on paper, against a loop, and what must not change them."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import FaultError
from etl.lines.return_sweeps import Sweeps, label_sweeps

NAN = float("nan")
#: Line, x in px and recording of a fixation.
Look = tuple[int, float, int]


def labelled(looks: list[Look], *, right_to_left: bool = False) -> Sweeps:
    """The labels of fixations given as (line, x, recording)."""
    line, x_px, trial = zip(*looks, strict=True) if looks else ((), (), ())
    return label_sweeps(
        np.array(line, np.int32),
        np.array(x_px, np.float64),
        np.array(trial, np.int64),
        right_to_left=right_to_left,
    )


def spelled(sweeps: Sweeps) -> str:
    """A letter a fixation: R return sweep, U undersweep, . neither."""
    assert not (sweeps.undersweep & ~sweeps.return_sweep).any()
    return "".join(
        "U" if under else "R" if swept else "."
        for swept, under in zip(sweeps.return_sweep, sweeps.undersweep, strict=True)
    )


def by_loop(looks: list[Look], *, right_to_left: bool) -> str:
    """The same by the definitions, one fixation at a time."""
    found = ["."] * len(looks)
    on_lines = [at for at, (line, _, _) in enumerate(looks) if line >= 1]

    def against_reading(earlier: Look, later: Look) -> bool:
        gone_right = later[1] > earlier[1]
        gone_left = later[1] < earlier[1]
        return later[2] == earlier[2] and (gone_right if right_to_left else gone_left)

    for place in range(1, len(on_lines)):
        before, here = looks[on_lines[place - 1]], looks[on_lines[place]]
        if here[0] <= before[0] or not against_reading(before, here):
            continue
        found[on_lines[place]] = "R"
        if place + 1 < len(on_lines):
            after = looks[on_lines[place + 1]]
            if after[0] == here[0] and against_reading(here, after):
                found[on_lines[place]] = "U"
    return "".join(found)


PAPER: dict[str, tuple[list[tuple[int, float]], str]] = {
    "back and down a line": ([(1, 50), (1, 400), (2, 50), (2, 150)], "..R."),
    "short of the beginning": ([(1, 50), (1, 400), (2, 120), (2, 50), (2, 150)], "..U.."),
    "corrected twice": ([(1, 400), (2, 150), (2, 100), (2, 50), (2, 150)], ".U..."),
    "corrected on another line": ([(1, 400), (2, 150), (3, 50), (3, 150)], ".RR."),
    "last of the trial": ([(1, 400), (2, 120)], ".R"),
    "two lines on": ([(1, 400), (3, 50)], ".R"),
    "to an earlier line": ([(2, 400), (1, 50)], ".."),
    "back on the line": ([(1, 400), (1, 50)], ".."),
    "down and on": ([(1, 50), (2, 400)], ".."),
    "straight down": ([(1, 50), (2, 50)], ".."),
    "corrected by nothing": ([(1, 400), (2, 50), (2, 50)], ".R."),
    "one fixation": ([(1, 50)], "."),
    "none": ([], ""),
    "stepped over in the sweep": ([(1, 400), (0, 200), (2, 120), (2, 50)], "..U."),
    "stepped over in the correction": ([(1, 400), (2, 120), (0, 80), (2, 50)], ".U.."),
    "not known is stepped over too": ([(1, 400), (-1, 9), (2, 50)], "..R"),
    "no line at all": ([(0, 400), (-1, 50)], ".."),
    "x not known where it comes down": ([(1, 400), (2, NAN), (2, 50)], "..."),
    "x not known before": ([(1, NAN), (2, 50)], ".."),
}


@pytest.mark.parametrize("name", PAPER)
def test_labels_on_paper(name: str) -> None:
    """Later line and to the left; an undersweep where the next one goes further left on it."""
    looks, expected = PAPER[name]
    assert spelled(labelled([(line, x, 0) for line, x in looks])) == expected


@pytest.mark.parametrize("name", PAPER)
def test_text_read_from_right_to_left(name: str) -> None:
    """Mirrored, and read the other way, the labels are the same; read as before there are none."""
    looks, expected = PAPER[name]
    mirrored = [(line, -x, 0) for line, x in looks]
    assert spelled(labelled(mirrored, right_to_left=True)) == expected


def test_no_saccade_from_one_recording_to_the_next() -> None:
    """Neither a sweep nor a correction goes from one to the other."""
    assert spelled(labelled([(1, 400, 0), (2, 120, 1), (2, 50, 1)])) == "..."
    assert spelled(labelled([(1, 400, 0), (2, 120, 0), (2, 50, 1)])) == ".R."


def looks() -> st.SearchStrategy[list[Look]]:
    """Fixations of up to three recordings, on few lines and few places, so that ties occur."""
    place = st.integers(0, 6).map(float) | st.just(NAN)
    one = st.tuples(st.integers(-1, 3), place)
    recordings = st.lists(st.lists(one, max_size=12), max_size=3)
    return recordings.map(
        lambda every: [(line, x, n) for n, own in enumerate(every) for line, x in own]
    )


@given(looks(), st.booleans())
def test_labels_are_those_of_the_loop(every: list[Look], right_to_left: bool) -> None:
    """Whatever the fixations."""
    found = labelled(every, right_to_left=right_to_left)
    assert spelled(found) == by_loop(every, right_to_left=right_to_left)


@given(looks(), st.data())
def test_fixation_on_no_line_changes_no_label(every: list[Look], data: st.DataObject) -> None:
    """Put anywhere within a recording, it has no label, and all others keep theirs."""
    at = data.draw(st.integers(0, len(every)))
    trial = every[at - 1][2] if at else 0
    more = [*every[:at], (0, data.draw(st.integers(0, 6).map(float)), trial), *every[at:]]
    before = spelled(labelled(every))
    assert spelled(labelled(more)) == f"{before[:at]}.{before[at:]}"


def test_random_fixations_have_labels_of_each_kind() -> None:
    """The loop is held against something: seeded readings have sweeps and undersweeps."""
    rng = np.random.default_rng(11)
    counts = {"R": 0, "U": 0, ".": 0}
    for _ in range(1000):
        line = rng.integers(-1, 4, 40)
        every = [
            (int(one), float(x), n // 20)
            for n, (one, x) in enumerate(zip(line, rng.integers(0, 9, 40), strict=True))
        ]
        found = spelled(labelled(every))
        assert found == by_loop(every, right_to_left=False)
        for letter in counts:
            counts[letter] += found.count(letter)
    assert min(counts.values()) > 200


def test_arrays_of_other_lengths_are_refused() -> None:
    """A fault of the caller is told as one."""
    short = np.zeros(2)
    with pytest.raises(FaultError, match="line, x_px and trial must be as long as each other"):
        label_sweeps(np.ones(3, np.int32), short, np.zeros(3, np.int64), right_to_left=False)
