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
    MOST_UNTOLD,
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
    universe = own.table.universe
    there = np.array([is_there(own, at) for at in range(len(universe))], dtype=bool)
    return readers_hanging(own.readers, universe, changed, there, using)  # type: ignore[arg-type]


def is_there(own: Made, at: int) -> bool:
    """Whether any variant keeps the trial of a cell."""
    return any(row[at] != LEFT_OUT for name in BINARY for row in own.states[name])


def cells_in(own: Made, trials: Sequence[int]) -> list[list[float]]:
    """All states of each binary cell of some trials that is there in any variant."""
    return [
        [row[at] for row in own.states[name]]
        for name in BINARY
        for at in range(len(own.table.universe))
        if own.table.universe.cells.trial[at] in trials and is_there(own, at)
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


def scores_of(own: Made, trials: Sequence[int]) -> dict[int, float]:
    """By setting the chance that a cell changes when it is chosen anew; or a mean count, for -1."""
    hangs = hangs_of(own, trials)
    if not own.crossing.full:
        return {-1: hangs.differing / max(hangs.of, 1)}
    every = zip(hangs.pairs, pairs_in_all(own.crossing), strict=True)
    return {at: pairs / (max(hangs.of, 1) * whole) for at, (pairs, whole) in enumerate(every)}


def variant_to_show(own: Made, trial: int, setting: int) -> int:
    """The first of those in which most cells change.

    Of those that differ in the setting only, where a cell changes in any; else of those that differ
    in it and others; else of all.
    """
    cells, base = cells_in(own, [trial]), own.crossing.base
    rows = own.crossing.choices.tolist()
    differing = [sum(cell[v] != cell[base] for cell in cells) for v in range(len(rows))]
    apart = [
        {at for at, (a, b) in enumerate(zip(row, rows[base], strict=True)) if a != b}
        for row in rows
    ]
    changing = [v for v in range(len(rows)) if differing[v]]
    anew = [v for v in changing if setting in apart[v]]
    alone = [v for v in anew if len(apart[v]) == 1]
    return max(alone or anew or changing, key=lambda v: (differing[v], -v))


@settings(deadline=None)
@given(cases())
@example(SOME[0])
@example(SOME[1])
@example(SOME[2])
@example(SOME[3])
def test_hanging_is_that_of_a_loop(own: Made) -> None:
    """Every reader in order, the trial of each, and those that are offered for each setting.

    The trial of a reader hangs most on the setting that the reader hangs most on.
    """
    readers, offered = found_in(own)
    starts = own.readers.trial_starts.tolist()
    scores = [scores_of(own, [trial]) for trial in own.readers.trials]
    assert [reader.participant for reader in readers] == [*own.readers.participants]
    for number, reader in enumerate(readers):
        trials = range(starts[number], starts[number + 1])
        assert reader.hangs == hangs_of(own, trials)
        of_reader = scores_of(own, trials)
        setting = max(of_reader, key=lambda at: (of_reader[at], -at))
        if of_reader[setting] > 0:
            best = max(trials, key=lambda trial: (scores[trial][setting], -trial))
            assert reader.most is not None
            assert_told(own, best, setting, reader.most)
        else:
            assert reader.most is None
    expected = []
    for setting in range(len(own.crossing.settings)) if own.crossing.full else (-1,):
        best_first = sorted(own.readers.trials, key=lambda trial: -scores[trial][setting])
        hanging = [
            trial
            for trial in best_first
            if scores[trial][setting] > 0
            and setting == max(scores[trial], key=lambda at, own=scores[trial]: (own[at], -at))
        ]
        most = MOST_OFFERED if own.crossing.full else MOST_UNTOLD
        expected += [(trial, setting) for trial in hanging[:most]]
    assert len(offered) == len(expected)
    for (trial, setting), told in zip(expected, offered, strict=True):
        assert_told(own, trial, setting, told)


def assert_told(own: Made, trial: int, setting: int, told: HangingTrial) -> None:
    """One trial: whose, how much, on what, and what changes in the variant that is shown."""
    universe, base = own.table.universe, own.crossing.base
    reader = int(own.readers.reader_of_trial[trial])
    assert told.participant == own.readers.participants[reader]
    assert told.row == trial - own.readers.trial_starts[reader]
    assert told.hangs == hangs_of(own, [trial])
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
    # The second trial hangs on both alike: the first setting is named.
    assert [(one.row, one.setting, one.variant) for one in offered] == [(0, 0, 2), (1, 0, 3)]
    assert offered[0].changes == (("went_back", 0, 0, 1),)
    assert reader.most == offered[0]
    # One variant alone is not as the study: the other settings, chosen anew, take it back.
    alone = of_states(crossed([2, 2, 2]), [[0, 0, 0, 0, 1, 0, 0, 0]])
    _, offered = found_in(alone)
    assert [(one.setting, one.variant) for one in offered] == [(0, 4)]


def test_equal_trials_are_offered_in_their_order_and_so_many_only() -> None:
    """More hang than are offered; the first are taken, and of the reader the very first.

    The last two trials hang on the second setting only, and twice as much as the others.
    """
    own = of_states(crossed([2]), [[0, 0], *[[0, 1]] * (MOST_OFFERED + 3)])
    (reader,), offered = found_in(own)
    assert [one.row for one in offered] == [*range(1, MOST_OFFERED + 1)]
    assert reader.most == offered[0]
    later = of_states(crossed([2, 2]), [*[[0, 0, 0, 1]] * MOST_OFFERED, [0, 1, 0, 1], [0, 1, 0, 1]])
    (reader,), offered = found_in(later)
    assert [(one.setting, one.row) for one in offered] == [
        *((0, row) for row in range(MOST_OFFERED)),
        *((1, row) for row in (MOST_OFFERED, MOST_OFFERED + 1)),
    ]
    # The reader hangs most on the second.
    assert reader.most == offered[MOST_OFFERED]
    assert (reader.most.row, reader.most.setting) == (MOST_OFFERED, 1)


def test_trial_of_a_reader_is_of_the_setting_that_the_reader_hangs_on() -> None:
    """Though another trial hangs more on the other setting.

    The first trial changes in both pairs for the second setting; the two others in both for the
    first.
    """
    own = of_states(crossed([2, 2]), [[0, 1, 0, 1], [0, 0, 1, 1], [0, 0, 1, 1]])
    (reader,), offered = found_in(own)
    assert [(one.setting, one.row, one.variant) for one in offered] == [
        *((0, 1, 2), (0, 2, 2), (1, 0, 1)),
    ]
    assert reader.most == offered[0]


def test_cells_that_no_variant_has_do_not_count() -> None:
    """Of three trials of one region one is left out in all variants, and one in half of them."""
    gone = [LEFT_OUT] * 4
    own = of_states(crossed([2, 2]), [gone, [0, LEFT_OUT, 0, LEFT_OUT], [0, 0, 0, 0]])
    for name in BINARY:
        for variant in range(4):
            own.table.states[name][variant, 0] = LEFT_OUT
            own.states[name][variant][0] = LEFT_OUT
    (reader,), offered = found_in(own)
    # Two trials of one region and two outcomes; one cell changes in two pairs of variants.
    assert reader.hangs == Hangs((0, 2), 2, 1, 4)
    assert score_of(reader.hangs, (2, 2)) == (2 / (4 * 2), 1)
    assert [(one.row, one.setting, one.hangs.of) for one in offered] == [(1, 1, 2)]
    nothing = of_states(crossed([2, 2]), [gone])
    for name in BINARY:
        nothing.table.states[name][:] = LEFT_OUT
        nothing.states[name][:] = [[float(LEFT_OUT)] for _ in range(4)]
    assert found_in(nothing) == ([ReaderHangs("R1", Hangs((0, 0), 0, 0, 0), None)], [])


def test_best_trial_of_each_reader_is_there_though_it_is_not_offered() -> None:
    """As many of others hang more as are offered; the reader's own is told all the same."""
    own = of_states(crossed([2, 2]), [[0, 0, 0, 1], [0, 0, 0, 0], *[[0, 1, 0, 1]] * MOST_OFFERED])
    readers = Readers(("R1", "R2"), np.array([0, 2, MOST_OFFERED + 2]), own.readers.trials)
    (first, second), offered = found_in(Made(own.crossing, readers, own.table, own.states))
    # The others' trials hang on the second setting only: for the first one R1's own is offered.
    assert [(one.setting, one.participant) for one in offered] == [
        *((0, "R1"), *[(1, "R2")] * MOST_OFFERED),
    ]
    assert first.most is not None
    assert (first.most.participant, first.most.row, first.most.variant) == ("R1", 0, 3)
    assert second.most == offered[1]
    assert second.most.row == 0


def test_named_variants_tell_of_no_setting() -> None:
    """Most cells change in the last variant, so it is shown; a share is a mean count of cells."""
    crossing = chosen([(0, 0), (1, 0), (1, 1)], [2, 2], named=True)
    own = of_states(crossing, [[0, 1, LEFT_OUT], [0, 0, 1]])
    (reader,), offered = found_in(own)
    assert [(one.row, one.setting, one.variant) for one in offered] == [(0, -1, 1), (1, -1, 2)]
    assert reader.hangs == Hangs((0, 0), 3, 2, 4)
    assert score_of(reader.hangs, (0, 0)) == (3 / 4, -1)
    many = of_states(crossing, [[0, 1, 1], *[[0, 1, 0]] * (MOST_UNTOLD + 2)])
    _, offered = found_in(many)
    assert [one.row for one in offered] == [*range(MOST_UNTOLD)]


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
