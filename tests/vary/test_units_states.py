"""States of cells over variants, and what is counted of them, against loops."""

from __future__ import annotations

import numpy as np
from hypothesis import example, given
from hypothesis import strategies as st

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.session.variant_states import StateTable, changes_of, counts_of
from tests.vary.stating import BINARY, COMBINATIONS, MEASURES, Made, cases, made, pairs_apart

#: Variants that are not all combinations, regions counted together, and no trial at all.
SOME = (made(3, 6, True, False, 0.5), made(4, 6, False, True, 1.0), made(5, 0, False, True, 0.5))


def changing(own: Made, name: str) -> list[int]:
    """The cells of a measure that have more than one state, one by one."""
    rows = own.states[name]
    return [at for at in range(len(own.table.universe)) if len({row[at] for row in rows}) > 1]


@given(cases())
@example(SOME[0])
@example(SOME[1])
@example(SOME[2])
def test_table_holds_what_was_filled_in(own: Made) -> None:
    """Cell by cell, however wide the numbers; and which cells change."""
    for measure in MEASURES:
        assert own.table.states[measure.name].tolist() == own.states[measure.name]
        found = own.table.changed(measure.name, own.crossing.base)
        assert found.tolist() == changing(own, measure.name)


def test_cells_that_no_variant_fills_are_left_out() -> None:
    """Nothing else is known of them, whatever the kind of the measure."""
    universe = SOME[1].table.universe
    table = StateTable(universe, 2, MEASURES)
    for measure in MEASURES:
        assert (table.states[measure.name] == LEFT_OUT).all()
        assert table.states[measure.name].shape == (2, len(universe))


@given(cases())
@example(SOME[0])
@example(SOME[1])
@example(SOME[2])
def test_counts_are_those_of_a_loop(own: Made) -> None:
    """Zeros, ones and cells that are there, by region and combination of levels."""
    universe = own.table.universe
    width = universe.sizes[0] * COMBINATIONS
    for name in BINARY:
        counted = counts_of(own.table.states[name], universe.keys, width)
        expected = np.zeros((len(own.crossing), width, 3), dtype=int).tolist()
        for variant, row in enumerate(own.states[name]):
            for at, state in enumerate(row):
                trial = int(universe.cells.trial[at])
                key = int(universe.slot[at]) * COMBINATIONS + int(universe.condition[trial])
                if state != LEFT_OUT:
                    expected[variant][key][2] += 1
                if state in (0, 1):
                    expected[variant][key][int(state)] += 1
        assert counted.tolist() == expected


@given(cases(), st.sampled_from([own.name for own in MEASURES]))
@example(SOME[0], "went_back")
@example(SOME[1], "time_spent")
@example(SOME[2], "looks")
def test_changes_are_those_of_a_loop(own: Made, name: str) -> None:
    """Which cells change, with which settings, and how many by region and variant."""
    crossing, universe, rows = own.crossing, own.table.universe, own.states[name]
    base, regions = crossing.base, universe.sizes[0]
    changed, counts = changes_of(own.table, name, crossing)
    cells = changing(own, name)
    assert changed.rows.tolist() == cells
    assert changed.states.tolist() == [[row[at] for at in cells] for row in rows]
    settings = range(len(crossing.settings))
    pairs = [
        [
            sum(rows[one][at] != rows[other][at] for one, other in pairs_apart(crossing, setting))
            * crossing.full
            for setting in settings
        ]
        for at in cells
    ]
    assert changed.pairs.tolist() == pairs
    for region in range(regions):
        here = [at for at in range(len(universe)) if universe.slot[at] == region]
        there = [at for at in here if any(row[at] != LEFT_OUT for row in rows)]
        assert counts.cells[region] == len(there)
        own_cells = [at for at in cells if at in here]
        assert counts.changed[region] == len(own_cells)
        assert counts.trials[region] == len({int(universe.cells.trial[at]) for at in own_cells})
        for variant, row in enumerate(rows):
            others = [at for at in own_cells if row[at] != rows[base][at]]
            assert counts.changed_by[variant, region] == len(others)
            trials = {int(universe.cells.trial[at]) for at in others}
            assert counts.trials_by[variant, region] == len(trials)
        for setting in settings:
            whole = sum(pairs[cells.index(at)][setting] for at in own_cells)
            assert counts.pairs[setting, region] == whole
    assert counts.changed_by.shape == counts.trials_by.shape == (len(crossing), regions)
    assert counts.pairs.shape == (len(settings), regions)


def test_readers_add_up() -> None:
    """Counts of two groups of readers are those of both together."""
    one, other = made(1, 6, False, True, 0.5), made(1, 6, False, True, 1.0)
    first, second = (changes_of(each.table, "looks", each.crossing)[1] for each in (one, other))
    alone = changes_of(one.table, "looks", one.crossing)[1]
    first.add(second)
    for name in ("cells", "changed", "trials", "changed_by", "trials_by", "pairs"):
        whole = getattr(alone, name) + getattr(second, name)
        assert getattr(first, name).tolist() == whole.tolist()
        assert whole.any()


def test_missing_and_left_out_are_not_the_same() -> None:
    """A cell that is there without a value changes where its trial is left out."""
    assert LEFT_OUT != NO_VALUE
    own = SOME[1]
    states = own.table.states["went_back"]
    both = (states == LEFT_OUT).any(axis=0) & (states == NO_VALUE).any(axis=0)
    assert both.any()
    assert {*np.flatnonzero(both).tolist()} <= {*changing(own, "went_back")}
