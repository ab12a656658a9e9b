"""Readers and trials whose outcomes hang on settings, against loops over cells and variants."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest
from hypothesis import example, given, settings

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.session.outcome_work import Cells
from etl.session.variant_hanging import (
    MOST_OFFERED,
    HangingTrial,
    Hangs,
    ReaderHangs,
    readers_hanging,
    score_of,
)
from etl.session.variant_states import StateTable, Universe, changes_of
from etl.variants.facts import Crossing
from tests.variants.making import chosen, crossed
from tests.vary.stating import BINARY, MEASURES, Made, Readers, cases, made, pairs_apart

#: Regions counted together, variants that are not all combinations, no trial, and many trials.
SOME = (
    made(3, 6, True, True, 0.5),
    made(6, 6, False, False, 0.5),
    made(5, 0, False, True, 0.5),
    made(9, 30, False, True, 0.5),
)


def pairs_in_all(crossing: Crossing) -> tuple[int, ...]:
    """By setting, how many pairs of variants differ in it only; 0 where some are missing."""
    every = range(len(crossing.settings))
    return tuple(len(pairs_apart(crossing, at)) * crossing.full for at in every)


def found_in(own: Made) -> tuple[list[ReaderHangs], list[HangingTrial]]:
    """What is found of the readers."""
    changed = {name: changes_of(own.table, name, own.crossing)[0] for name in BINARY}
    using = own.crossing, pairs_in_all(own.crossing)
    return readers_hanging(own.readers, own.table.universe, changed, using)  # type: ignore[arg-type]


def cells_in(own: Made, trials: Sequence[int]) -> list[list[float]]:
    """All states of each binary cell of some trials."""
    return [
        [row[at] for row in own.states[name]]
        for name in BINARY
        for at in range(len(own.table.universe))
        if own.table.universe.cells.trial[at] in trials
    ]


def hangs_of(own: Made, trials: Sequence[int]) -> Hangs:
    """How much some trials hang, cell by cell and pair by pair."""
    cells, base = cells_in(own, trials), own.crossing.base
    return Hangs(
        tuple(
            sum(cell[a] != cell[b] for cell in cells for a, b in pairs_apart(own.crossing, at))
            * own.crossing.full
            for at in range(len(own.crossing.settings))
        ),
        sum(state != cell[base] for cell in cells for state in cell),
        sum(len({*cell}) > 1 for cell in cells),
        len(cells),
    )


def score(own: Made, trials: Sequence[int]) -> float:
    """The largest chance that a cell changes when a setting is chosen anew, or a mean count."""
    hangs = hangs_of(own, trials)
    if not hangs.of:
        return 0.0
    if not own.crossing.full:
        return hangs.differing / hangs.of
    every = zip(hangs.pairs, pairs_in_all(own.crossing), strict=True)
    return max(pairs / (hangs.of * whole) for pairs, whole in every)


def variant_to_show(own: Made, trial: int, setting: int) -> int:
    """The first of those in which most cells change, by one setting only where any does."""
    cells, base = cells_in(own, [trial]), own.crossing.base
    rows = own.crossing.choices.tolist()
    differing = [sum(cell[v] != cell[base] for cell in cells) for v in range(len(rows))]
    near = [
        v
        for v in range(len(rows))
        if differing[v]
        and setting >= 0
        and all(
            a == b
            for at, (a, b) in enumerate(zip(rows[v], rows[base], strict=True))
            if at != setting
        )
    ]
    return max(near or range(len(rows)), key=lambda v: (differing[v], -v))


@settings(deadline=None)
@given(cases())
@example(SOME[0])
@example(SOME[1])
@example(SOME[2])
@example(SOME[3])
def test_hanging_is_that_of_a_loop(own: Made) -> None:
    """Every reader in order, the trial of each that hangs most, and those that are offered."""
    readers, offered = found_in(own)
    starts = own.readers.trial_starts.tolist()
    scores = [score(own, [trial]) for trial in own.readers.trials]
    assert [reader.participant for reader in readers] == [*own.readers.participants]
    for number, reader in enumerate(readers):
        trials = range(starts[number], starts[number + 1])
        assert reader.hangs == hangs_of(own, trials)
        if any(scores[trial] > 0 for trial in trials):
            best = max(trials, key=lambda trial: (scores[trial], -trial))
            assert reader.most is not None
            assert_told(own, best, reader.most)
        else:
            assert reader.most is None
    best_first = sorted(own.readers.trials, key=lambda trial: -scores[trial])
    expected = [trial for trial in best_first if scores[trial] > 0][:MOST_OFFERED]
    assert len(offered) == len(expected)
    for trial, told in zip(expected, offered, strict=True):
        assert_told(own, trial, told)


def assert_told(own: Made, trial: int, told: HangingTrial) -> None:
    """One trial: whose, how much, on what, and what changes in the variant that is shown."""
    universe, base = own.table.universe, own.crossing.base
    reader = int(own.readers.reader_of_trial[trial])
    assert told.participant == own.readers.participants[reader]
    assert told.row == trial - own.readers.trial_starts[reader]
    assert told.hangs == hangs_of(own, [trial])
    setting = -1
    if own.crossing.full:
        every = zip(told.hangs.pairs, pairs_in_all(own.crossing), strict=True)
        shares = [pairs / whole for pairs, whole in every]
        setting = shares.index(max(shares))
    assert told.setting == setting
    assert told.variant == variant_to_show(own, trial, setting)
    assert [*told.changes] == [
        (name, int(universe.cells.code[at]), own.states[name][base][at], row[at])
        for name in BINARY
        for row in [own.states[name][told.variant]]
        for at in range(len(universe))
        if universe.cells.trial[at] == trial and own.states[name][base][at] != row[at]
    ]
    assert told.changes
    assert told.variant != base


def of_states(crossing: Crossing, trials: Sequence[Sequence[float]]) -> Made:
    """A reader's trials of one region each, by what the first outcome is in each variant."""
    width = len(trials)
    places = np.arange(width, dtype=np.int64)
    ones = np.ones(width, dtype=np.int64)
    cells = Cells(ones, places, ones.astype(np.int32), np.zeros(width, dtype=np.int32))
    universe = Universe(places, cells, ones * 0, ones * 0, (1, 1))
    table = StateTable(universe, len(crossing), MEASURES)
    states = {own.name: [[0.0] * width for _ in range(len(crossing))] for own in MEASURES}
    for measure in MEASURES:
        table.states[measure.name][:] = 0
    for at, own in enumerate(trials):
        table.states["went_back"][:, at] = own
        for variant, state in enumerate(own):
            states["went_back"][variant][at] = state
    readers = Readers(("R1",), np.array([0, width]), range(width))
    return Made(crossing, readers, table, states)


def test_variant_that_is_shown_differs_in_the_setting_only() -> None:
    """Though more of the cells change in one that differs in both.

    The outcome changes in both pairs that differ in the first setting only, and in one of two for
    the second; from the study as it stands, the first setting alone leads to variant 2.
    """
    own = of_states(crossed([2, 2]), [[0, 0, 1, NO_VALUE], [0, 0, 0, 1]])
    (reader,), offered = found_in(own)
    assert [one.row for one in offered] == [0, 1]
    assert (offered[0].setting, offered[0].variant) == (0, 2)
    assert offered[0].changes == (("went_back", 0, 0, 1),)
    # Only both together change the second trial: no variant beside the study shows it.
    assert (offered[1].setting, offered[1].variant) == (0, 3)
    assert reader.most == offered[0]


def test_equal_trials_are_offered_in_their_order_and_so_many_only() -> None:
    """More hang than are offered; the first are taken, and of the reader the very first."""
    own = of_states(crossed([2]), [[0, 0], *[[0, 1]] * (MOST_OFFERED + 3)])
    (reader,), offered = found_in(own)
    assert [one.row for one in offered] == [*range(1, MOST_OFFERED + 1)]
    assert reader.most == offered[0]
    later = of_states(crossed([2, 2]), [*[[0, 0, 0, 1]] * MOST_OFFERED, [0, 1, 0, 1], [0, 1, 0, 1]])
    (reader,), offered = found_in(later)
    expected = [MOST_OFFERED, MOST_OFFERED + 1, *range(MOST_OFFERED - 2)]
    assert [one.row for one in offered] == expected
    assert reader.most is not None
    assert reader.most.row == MOST_OFFERED


def test_best_trial_of_each_reader_is_there_though_it_is_not_offered() -> None:
    """Twelve trials of others hang more; the reader's own is told all the same."""
    own = of_states(crossed([2, 2]), [[0, 0, 0, 1], [0, 0, 0, 0], *[[0, 1, 0, 1]] * MOST_OFFERED])
    readers = Readers(("R1", "R2"), np.array([0, 2, MOST_OFFERED + 2]), own.readers.trials)
    (first, second), offered = found_in(Made(own.crossing, readers, own.table, own.states))
    assert {one.participant for one in offered} == {"R2"}
    assert first.most is not None
    assert (first.most.participant, first.most.row, first.most.variant) == ("R1", 0, 3)
    assert second.most == offered[0]
    assert second.most.row == 0


def test_named_variants_tell_of_no_setting() -> None:
    """Most cells change in the last variant, so it is shown; a share is a mean count of cells."""
    crossing = chosen([(0, 0), (1, 0), (1, 1)], [2, 2], named=True)
    own = of_states(crossing, [[0, 1, LEFT_OUT], [0, 0, 1]])
    (reader,), offered = found_in(own)
    assert [(one.row, one.setting, one.variant) for one in offered] == [(0, -1, 1), (1, -1, 2)]
    assert reader.hangs == Hangs((0, 0), 3, 2, 4)
    assert score_of(reader.hangs, (0, 0)) == (3 / 4, -1)


@pytest.mark.parametrize(
    ("hangs", "pairs", "expected"),
    [
        (Hangs((2, 3), 9, 4, 5), (4, 12), (2 / 20, 0)),
        (Hangs((1, 3), 9, 4, 5), (4, 12), (1 / 20, 0)),
        (Hangs((1, 4), 9, 4, 5), (4, 12), (4 / 60, 1)),
        (Hangs((0, 0), 0, 0, 5), (4, 12), (0.0, -1)),
        (Hangs((0, 0), 6, 2, 4), (0, 0), (1.5, -1)),
        (Hangs((0, 0), 0, 0, 0), (0, 0), (0.0, -1)),
    ],
)
def test_score_is_the_share_of_pairs(
    hangs: Hangs, pairs: tuple[int, ...], expected: tuple[float, int]
) -> None:
    """Of the setting with the largest share, the first of equal ones."""
    assert score_of(hangs, pairs) == expected
