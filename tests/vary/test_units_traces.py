"""Readers and trials that are shown with their traces: which, in what order, and in what words."""

from __future__ import annotations

import math
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.session.tracing import TrialKey
from etl.session.variant_hanging import (
    MOST_OFFERED,
    MOST_UNTOLD,
    HangingTrial,
    Hangs,
    ReaderHangs,
)
from etl.session.variant_traces import MOST_SHOWN, VariantTraces
from etl.variants.facts import Crossing, Setting
from tests.variants.making import crossed

SETTINGS = (
    Setting("screening.fixations.under_ms", ("80", "false"), 0),
    Setting("measures.outside", ('"ignore"', '"interrupt"'), 0),
)


class Told(VariantTraces):
    """Traces whose pages say which trial they are of, and under which variant."""

    def _drawn(self, trial: HangingTrial, variant: int, says: str) -> str:
        return f"{trial.participant} {trial.row} {variant}: {says}"

    def _key(self, trial: HangingTrial) -> TrialKey:
        return TrialKey("" if trial.participant == "R0" else "s1", str(trial.row), trial.row)

    def _item(self, trial: HangingTrial) -> str:
        return f"i{trial.row}"


def traces_in(folder: Path, *, full: bool = True) -> Told:
    """Four variants of two settings."""
    crossing = Crossing(SETTINGS, ("",) * 4, crossed([2, 2]).choices, 0)
    plan = SimpleNamespace(library=SimpleNamespace(region_names=("noun", "verb")))
    tasks = SimpleNamespace(by_name=dict)
    plans: Any = SimpleNamespace(plans=(plan,), gathered=(SimpleNamespace(tasks=tasks),))
    return Told(folder, plans, crossing, (2, 2) if full else (0, 0))


def hangs_of(first: int, second: int = 0) -> Hangs:
    """Ten cells, with so many pairs that differ for each setting."""
    return Hangs((first, second), first + second, 3, 10)


def trial_of(
    reader: str, row: int, first: int, changes: tuple[tuple[str, int, int, int], ...] = ()
) -> HangingTrial:
    """A trial that hangs on the first setting so much."""
    own = changes or (("went_back", 1, 0, 1),)
    return HangingTrial(reader, row, hangs_of(first), 0, 2, own)


def on_second(reader: str, row: int, second: int) -> HangingTrial:
    """A trial that is offered for the second setting, on which it hangs so much."""
    return HangingTrial(reader, row, hangs_of(9, second), 1, 1, (("went_back", 0, 1, 0),))


@pytest.mark.parametrize(
    ("states", "told"),
    [
        ([(0, 1)], ["went_back at verb: 0, with under_ms off 1"]),
        ([(NO_VALUE, 0)], ["went_back at verb: no value, with under_ms off 0"]),
        (
            [(1, NO_VALUE), (0, LEFT_OUT)],
            [
                "went_back at verb: 1, with under_ms off no value",
                "went_back at verb: 0, with under_ms off left out",
            ],
        ),
        ([(1, LEFT_OUT), (NO_VALUE, LEFT_OUT)], ["left out with under_ms off"]),
        (
            [(LEFT_OUT, 1), (LEFT_OUT, NO_VALUE)],
            ["left out in the study, kept with under_ms off"],
        ),
        (
            [(LEFT_OUT, 1), (0, 1)],
            [
                "went_back at verb: left out, with under_ms off 1",
                "went_back at verb: 0, with under_ms off 1",
            ],
        ),
        ([(0, 1)] * 4, ["went_back at verb: 0, with under_ms off 1"] * 4),
        ([(0, 1)] * 5, [*["went_back at verb: 0, with under_ms off 1"] * 4, "and 1 more"]),
        ([(0, 1)] * 7, [*["went_back at verb: 0, with under_ms off 1"] * 4, "and 3 more"]),
    ],
)
def test_changes_are_told_in_words(
    states: list[tuple[int, int]], told: list[str], tmp_path: Path
) -> None:
    """Four at most; a trial that is left out as a whole, or comes back, is told as one."""
    changes = tuple(("went_back", 1, *own) for own in states)
    trial = trial_of("R1", 3, 5, changes)
    reader = ReaderHangs("R1", hangs_of(5), trial)
    (of_reader,), (of_trial,) = traces_in(tmp_path).shown([reader], [trial])
    assert [*of_trial.changes] == told
    # Of a reader it is said first which trial this is.
    assert [*of_reader.changes] == [f"session s1, trial 3: {told[0]}", *told[1:]]
    other = ReaderHangs("R0", hangs_of(5), trial_of("R0", 3, 5, changes))
    (without_session,), _ = traces_in(tmp_path).shown([other], [])
    assert [*without_session.changes] == [f"trial 3: {told[0]}", *told[1:]]


def test_those_that_hang_most_are_shown_first(tmp_path: Path) -> None:
    """Readers without a trial that hangs are not shown; equal ones stay in their order."""
    trials = [trial_of(f"R{n}", n, first) for n, first in enumerate([4, 8, 4, 10])]
    readers = [
        ReaderHangs("R0", hangs_of(3), trials[0]),
        ReaderHangs("R1", hangs_of(1, 9), trials[1]),
        ReaderHangs("R2", hangs_of(3), trials[2]),
        ReaderHangs("R4", hangs_of(0), None),
        ReaderHangs("R3", hangs_of(5), trials[3]),
    ]
    of_readers, of_trials = traces_in(tmp_path).shown(readers, trials)
    assert [(one.participant, one.setting) for one in of_readers] == [
        *(("R1", 1), ("R3", 0), ("R0", 0), ("R2", 0)),
    ]
    assert of_readers[0].hangs == (1 / 20, 9 / 20)
    assert {(one.session, one.trial, one.item) for one in of_readers} == {("", "", "")}
    assert [(one.participant, one.session, one.trial, one.item) for one in of_trials] == [
        *(("R3", "s1", "3", "i3"), ("R1", "s1", "1", "i1")),
        *(("R0", "", "0", "i0"), ("R2", "s1", "2", "i2")),
    ]
    assert {(one.cells, one.of) for one in (*of_readers, *of_trials)} == {(3, 10)}


def test_no_more_than_some_are_shown(tmp_path: Path) -> None:
    """Twelve readers; four trials for each setting, the setting with the most first."""
    trials = [trial_of("R1", n, 3 + n) for n in range(MOST_OFFERED + 2)]
    others = [on_second("R1", n, 20 - n) for n in range(MOST_OFFERED + 2)]
    every = [trial_of("R1", n, 20 - n) for n in range(MOST_SHOWN + 2)]
    readers = [ReaderHangs(f"R{n}", hangs_of(20 - n), own) for n, own in enumerate(every, 1)]
    # Groups of readers offer theirs one after the other.
    offered = [*trials[:3], *others[:3], *trials[3:], *others[3:]]
    of_readers, of_trials = traces_in(tmp_path).shown(readers, offered)
    assert [one.participant for one in of_readers] == [f"R{n}" for n in range(1, MOST_SHOWN + 1)]
    assert [(one.setting, one.trial) for one in of_trials] == [
        *((1, str(n)) for n in range(MOST_OFFERED)),
        *((0, str(n + 2)) for n in reversed(range(MOST_OFFERED))),
    ]
    assert MOST_SHOWN == 12
    assert MOST_OFFERED == 4


def test_trial_may_be_shown_for_both_settings(tmp_path: Path) -> None:
    """Beside another variant each time, with what changes there; the study is drawn once."""
    first = HangingTrial("R1", 0, hangs_of(8, 2), 0, 2, (("went_back", 1, 0, 1),))
    second = HangingTrial("R1", 0, hangs_of(8, 2), 1, 1, (("went_back", 0, 1, 0),))
    _, (one, other) = traces_in(tmp_path).shown([], [second, first])
    assert (one.setting, other.setting) == (0, 1)
    assert one.hangs == other.hangs == (8 / 20, 2 / 20)
    assert one.changes == ("went_back at verb: 0, with under_ms off 1",)
    assert other.changes == ('went_back at noun: 1, with outside = "interrupt" 0',)
    assert one.pages[0] == other.pages[0] == ("as in the study", "traces/01_variant_1.html")
    assert [own.pages[1][1] for own in (one, other)] == [
        *("traces/02_variant_3.html", "traces/03_variant_2.html")
    ]


def test_each_trial_is_drawn_once_under_each_variant(tmp_path: Path) -> None:
    """A reader and a trial lead to the same pages; each page is of its trial and variant."""
    first, second, third = trial_of("R1", 0, 9), trial_of("R1", 1, 8), trial_of("R2", 0, 7)
    readers = [ReaderHangs("R1", hangs_of(9), first)]
    of_readers, of_trials = traces_in(tmp_path).shown(readers, [first, second, third])
    assert of_readers[0].pages == of_trials[0].pages
    assert of_trials[0].pages == (
        ("as in the study", "traces/01_variant_1.html"),
        ("with under_ms off", "traces/02_variant_3.html"),
    )
    texts = [
        [(tmp_path / name).read_text(encoding="utf-8") for _, name in one.pages]
        for one in of_trials
    ]
    assert texts == [
        [
            f"{who} 0: Under the study as it stands.",
            f"{who} 2: Variant 3, with under_ms off.",
        ]
        for who in ("R1 0", "R1 1", "R2 0")
    ]
    assert len([*(tmp_path / "traces").iterdir()]) == 6


def test_chances_are_missing_where_combinations_are(tmp_path: Path) -> None:
    """It cannot be told on which setting anything hangs."""
    own = HangingTrial("R1", 0, Hangs((0, 0), 4, 3, 10), -1, 1, (("went_back", 0, 0, 1),))
    readers = [ReaderHangs("R1", own.hangs, own)]
    of_readers, of_trials = traces_in(tmp_path, full=False).shown(readers, [own])
    assert [one.setting for one in (*of_readers, *of_trials)] == [-1, -1]
    assert all(math.isnan(one) for one in (*of_readers[0].hangs, *of_trials[0].hangs))
    assert of_trials[0].changes == ('went_back at noun: 0, with outside = "interrupt" 1',)


def test_twelve_trials_are_shown_where_combinations_are_missing(tmp_path: Path) -> None:
    """Those with the most changes, of a share of their cells."""
    changes = (("went_back", 0, 0, 1),)
    offered = [
        HangingTrial("R1", n, Hangs((0, 0), n, 3, 10 if n else 0), -1, 1, changes)
        for n in range(MOST_UNTOLD + 3)
    ]
    # A single cell that differs once is more than 14 of 10 cells over all variants are not.
    offered.append(HangingTrial("R1", 99, Hangs((0, 0), 4, 1, 1), -1, 1, changes))
    _, of_trials = traces_in(tmp_path, full=False).shown([], offered)
    expected = [99, *range(MOST_UNTOLD + 2, 3, -1)]
    assert [one.trial for one in of_trials] == [str(n) for n in expected]
    assert len(expected) == MOST_UNTOLD == 12
