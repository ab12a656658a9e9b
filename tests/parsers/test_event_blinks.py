"""Which fixations a blink of a log of events touches."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.parsers.event_blinks import Moments, touched_by_blinks
from tests.parsers.event_reading import (
    CLOSES,
    OPENS,
    PATTERNS,
    VISITOR,
    fates,
    read,
    reader_of,
    refusal,
    rested,
)

#: Three fixations: 1000 to 1200, 1250 to 1450, 1500 to 1700 ms.
THREE = (rested(1000), rested(1250), rested(1500))
SECOND = ("gate 2 opens on plum", rested(2000), CLOSES)


@pytest.mark.parametrize(
    ("blink", "touched"),
    [
        pytest.param("shut 1300 to 1350", [0, 1, 0], id="within one"),
        pytest.param("shut 1100 to 1300", [1, 1, 0], id="over two"),
        pytest.param("shut 1150 to 1550", [1, 1, 1], id="over three"),
        pytest.param("shut 1210 to 1240", [1, 1, 0], id="between two"),
        pytest.param("shut 1200 to 1250", [1, 1, 0], id="from one to the next"),
        pytest.param("shut 1240 to 1251", [0, 1, 0], id="into one"),
        pytest.param("shut 900 to 950", [1, 0, 0], id="before the first"),
        pytest.param("shut 1710 to 1790", [0, 0, 1], id="after the last"),
        pytest.param("shut 1300 to 1300", [0, 1, 0], id="of no length"),
    ],
)
def test_blink_with_times(tmp_path: Path, blink: str, touched: list[int]) -> None:
    """A blink touches what it overlaps; if nothing, the fixations before and after it."""
    log, note = read(tmp_path, [VISITOR, OPENS, *THREE, blink, CLOSES, *SECOND])
    assert log.blink.tolist() == [*map(bool, touched), False]
    assert note.counts["blinks"] == 1


@pytest.mark.parametrize(
    ("place", "touched"),
    [(0, [1, 0, 0]), (1, [1, 1, 0]), (2, [0, 1, 1]), (3, [0, 0, 1])],
    ids=["above all", "below the first", "below the second", "below all"],
)
def test_blink_without_times(tmp_path: Path, place: int, touched: list[int]) -> None:
    """A blink of which no time is said touches the fixations above and below its line."""
    lines = [*THREE[:place], "shut", *THREE[place:]]
    reader = reader_of({"blink": "^shut$"})
    log, _ = read(tmp_path, [VISITOR, OPENS, *lines, CLOSES, *SECOND], reader)
    assert log.blink.tolist() == [*map(bool, touched), False]


def test_blink_goes_by_lines_where_fixations_have_no_onset(tmp_path: Path) -> None:
    """Times of blinks say nothing where fixations have none."""
    fixation = r"^rest (?P<fixation>\d+) for (?P<duration>\d+) on (?P<x>\d+)/(?P<y>\d+)$"
    rests = [f"rest {number} for 200 on 50/25" for number in (1, 2, 3)]
    lines = [VISITOR, OPENS, *rests[:2], "shut 1 to 2", rests[2], CLOSES]
    log, _ = read(tmp_path, lines, reader_of({"fixation": fixation}))
    assert log.blink.tolist() == [False, True, True]
    assert log.number.tolist() == [1, 2, 3]


def test_blink_with_a_duration_in_the_unit_of_the_fixations(tmp_path: Path) -> None:
    """A blink's onset and duration are in the units of the columns."""
    reader = reader_of(
        {"blink": r"^shut at (?P<onset>[\d.]+) for (?P<duration>[\d.]+)$"},
        {
            "columns": {
                "onset": {"column": "onset", "unit": "s"},
                "end": {"column": "end", "unit": "s"},
            }
        },
    )
    lines = [rested(1, 0.2), rested(1.25, 0.2), rested(1.5, 0.2), "shut at 1.3 for 0.05"]
    log, _ = read(tmp_path, [VISITOR, OPENS, *lines, CLOSES], reader)
    assert log.blink.tolist() == [False, True, False]


@pytest.mark.parametrize(
    ("blink", "touched"),
    [("L shut", [1, 0, 1, 0]), ("R shut", [0, 1, 0, 1]), ("shut", [1, 1, 1, 1])],
    ids=["left", "right", "not said"],
)
def test_blink_of_an_eye(tmp_path: Path, blink: str, touched: list[int]) -> None:
    """A blink of one eye touches fixations of that eye only."""
    reader = reader_of(
        {
            "blink": r"^(?:(?P<eye>[LR]) )?shut$",
            "fixation": str(PATTERNS["fixation"]).replace("^", r"^(?P<eye>[LR]) "),
        }
    )
    before = [f"L {rested(1000)}", f"R {rested(1000)}"]
    after = [f"L {rested(1250)}", f"R {rested(1250)}"]
    log, _ = read(tmp_path, [VISITOR, OPENS, *before, blink, *after, CLOSES], reader)
    assert log.blink.tolist() == [bool(one) for one in touched]


def test_blink_of_the_eye_that_counts(tmp_path: Path) -> None:
    """Where a line tells of both eyes, only blinks of the one that is read touch it."""
    places = r"(?P<lx>\d+)/(?P<ly>\d+) (?P<rx>\d+)/(?P<ry>\d+)"
    reader = reader_of(
        {
            "blink": r"^(?P<eye>[LR]) shut$",
            "fixation": rf"^rested (?P<onset>\d+) to (?P<end>\d+) on {places}$",
        },
        {
            "eye": {
                "use": "R",
                "columns": {"L": {"x": "lx", "y": "ly"}, "R": {"x": "rx", "y": "ry"}},
            }
        },
    )
    rests = [f"rested {onset} to {onset + 100} on 1/2 3/4" for onset in (1000, 1200, 1400)]
    lines = [rests[0], "L shut", rests[1], "R shut", rests[2]]
    log, _ = read(tmp_path, [VISITOR, OPENS, *lines, CLOSES], reader)
    assert log.blink.tolist() == [False, True, True]


def test_blink_outside_every_trial(tmp_path: Path) -> None:
    """A blink between two trials touches nothing and is counted apart."""
    log, note = read(tmp_path, [VISITOR, OPENS, *THREE, CLOSES, "shut 1100 to 1300", *SECOND])
    assert not log.blink.any()
    assert fates(note)["blinks outside every trial"] == 1
    assert note.counts["blinks"] == 0


def test_blink_of_a_column_counts_too(tmp_path: Path) -> None:
    """What the line of a fixation says of blinks is added to the blinks' own lines."""
    fixation = str(PATTERNS["fixation"]).replace("$", r"( (?P<blink>blink|none))?$")
    reader = reader_of({"fixation": fixation}, {"missing": ["", "none"]})
    lines = [f"{rested(1000)} none", rested(1250), "shut 1300 to 1310", rested(1500)]
    log, _ = read(tmp_path, [VISITOR, OPENS, *lines, CLOSES], reader)
    assert log.blink.tolist() == [False, True, False]


def test_blink_that_ends_before_it_begins(tmp_path: Path) -> None:
    """Times of a blink that cannot be are told with their line."""
    assert refusal(tmp_path, [VISITOR, OPENS, *THREE, "shut 1300 to 1200", CLOSES]) == (
        'P01.log:6: the blink ends before it begins; found "from 1300 ms to 1200 ms", expected an '
        "end after its onset\n    fix: correct the line, or leave such lines out by a pattern of "
        "ignore\n1 problem; nothing was written"
    )


def test_blink_whose_time_is_no_number(tmp_path: Path) -> None:
    """A time of a blink that cannot be read is told as that of a fixation is."""
    reader = reader_of({"blink": r"^shut (?P<onset>\S+) to (?P<end>\S+)$"})
    assert refusal(tmp_path, [VISITOR, OPENS, *THREE, "shut 1300 to 13oo", CLOSES], reader) == (
        'P01.log:6: column "end": this is no number; found "13oo", expected a number in ms\n'
        "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
        "1 problem; nothing was written"
    )


def naive(fixations: Moments, blinks: Moments) -> list[bool]:
    """The definition, fixation by fixation and blink by blink."""
    touched = [False] * len(fixations)
    for blink in range(len(blinks)):
        for eye in sorted(set(fixations.eye.tolist())):
            if blinks.eye[blink] not in (-1, eye):
                continue
            own = [
                row
                for row in range(len(fixations))
                if fixations.eye[row] == eye and fixations.trial[row] == blinks.trial[blink]
            ]
            onset, end = blinks.onset_ms[blink], blinks.end_ms[blink]
            timed = not np.isnan(onset)
            over = [
                row
                for row in own
                if timed and fixations.onset_ms[row] < end and fixations.end_ms[row] > onset
            ]
            before = [
                row
                for row in own
                if (
                    fixations.end_ms[row] <= onset
                    if timed
                    else fixations.lines[row] < blinks.lines[blink]
                )
            ]
            after = [row for row in own if row not in before]
            for row in over or [*before[-1:], *after[:1]]:
                touched[row] = True
    return touched


@given(st.data())
def test_blinks_agree_with_the_definition(data: st.DataObject) -> None:
    """Whatever the trials, eyes and times, the arrays say what the definition says."""
    gaps = data.draw(st.lists(st.tuples(st.integers(0, 3), st.integers(1, 4)), max_size=12))
    trial = np.sort(data.draw(st.lists(st.integers(0, 2), min_size=len(gaps), max_size=len(gaps))))
    eye = data.draw(st.lists(st.integers(0, 1), min_size=len(gaps), max_size=len(gaps)))
    ends = np.cumsum([gap + duration for gap, duration in gaps], dtype=np.float64)
    onsets = ends - np.array([duration for _, duration in gaps], dtype=np.float64)
    lines = np.arange(len(gaps), dtype=np.int64) * 2
    fixations = Moments(
        lines, trial.astype(np.int64), np.array(eye, dtype=np.int32), onsets, ends.copy()
    )
    drawn = []
    for place in sorted(data.draw(st.lists(st.integers(0, len(gaps)), max_size=4))):
        # The line of a blink stands in a trial, as do the lines above and below it.
        first = int(trial[place - 1]) if place else 0
        last = int(trial[place]) if place < len(gaps) else 2
        onset = data.draw(st.sampled_from([np.nan, *np.arange(0.0, 40.0)]))
        end = onset + data.draw(st.integers(1, 9))
        own = data.draw(st.integers(first, last))
        drawn.append((2 * place - 1, own, data.draw(st.integers(-1, 1)), onset, end))
    columns = np.array(drawn, dtype=np.float64).reshape(-1, 5).T
    blinks = Moments(
        columns[0].astype(np.int64),
        columns[1].astype(np.int64),
        columns[2].astype(np.int32),
        columns[3],
        columns[4],
    )
    assert touched_by_blinks(fixations, blinks).tolist() == naive(fixations, blinks)


def test_eye_of_a_blink_where_fixations_have_none(tmp_path: Path) -> None:
    """Where lines of fixations do not say whose they are, blinks of either eye touch them."""
    lines = [VISITOR, OPENS, THREE[0], "L shut", THREE[1], CLOSES]
    log, _ = read(tmp_path, lines, reader_of({"blink": r"^(?P<eye>[LR]) shut$"}))
    assert log.blink.tolist() == [True, True]
