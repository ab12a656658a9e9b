"""Rows of ``changed_cells`` against a loop over cells."""

from __future__ import annotations

import csv
import io
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from etl.export.changed_cells import LEFT_OUT, NO_VALUE, ChangedCells, ChangedRows
from etl.export.parts import Part
from etl.export.rows import TrialColumns
from etl.session.variant_states import changes_of
from etl.tables import IdColumn, TableDesign
from tests.vary.stating import MEASURES, Made, cases, made, pairs_apart

NAMES = ("verb", "noun", "ending", "comma")
#: Some that hang on three settings, one that changes nowhere, and one without trials.
SOME = (made(1, 6, False, True, 0.5), made(2, 6, False, True, 0.0), made(5, 0, False, True, 0.5))


def design_of(trials: int) -> TableDesign:
    """The tables of a study with these measures; trials are called by numbers."""
    ids = {
        "participant": IdColumn.of([f"R{n}" for n in range(trials)]),
        "trial": IdColumn.of([str(n) for n in range(trials)]),
    }
    return TableDesign(ids, {}, {}, NAMES, MEASURES, (), (), (), ())


def columns_of(trials: int) -> TrialColumns:
    """As much of trials as is asked for: each has a reader of its own, the last trial first."""
    codes = np.arange(trials, dtype=np.int32)
    none = np.zeros(trials)
    return TrialColumns(
        *({"participant": codes, "trial": codes[::-1].copy()}, {}, {}, codes),
        *(none, none, none, ("",) * trials, ("",) * trials),
    )


def part_of(own: Made, formats: tuple[str, ...]) -> Part:
    """The rows of all readers."""
    cells, trials = own.table.universe.cells, len(own.readers.trials)
    every = [changes_of(own.table, one.name, own.crossing)[0] for one in MEASURES]
    rows = {
        measure.name: ChangedRows(
            *(cells.trial[one.rows], cells.order[one.rows], cells.code[one.rows]),
            *(one.states, one.pairs),
        )
        for measure, one in zip(MEASURES, every, strict=True)
    }
    settings = range(len(own.crossing.settings))
    hangs_on = {f"hangs_on_{at}": f"setting_{at}" for at in settings}
    pairs = [len(pairs_apart(own.crossing, at)) * own.crossing.full for at in settings]
    maker = ChangedCells(design_of(trials), hangs_on, pairs, formats)
    return maker.part(columns_of(trials), rows, own.crossing.base)


def expected_rows(own: Made) -> list[dict[str, Any]]:
    """Trial by trial, region by region, measures by their names."""
    cells, base, trials = own.table.universe.cells, own.crossing.base, len(own.readers.trials)
    found = []
    for at in range(len(own.table.universe)):
        for name in sorted(own.states):
            states = [row[at] for row in own.states[name]]
            if len({*states}) == 1:
                continue
            usual = states[base]
            others = [state for state in states if state != usual]
            row = {
                "participant": f"R{cells.trial[at]}",
                "trial": trials - 1 - int(cells.trial[at]),
                "region": NAMES[cells.code[at]],
                "region_order": int(cells.order[at]),
                "measure": name,
                "value": usual if usual >= 0 else None,
                "in_study": {LEFT_OUT: "left out", NO_VALUE: "missing"}.get(int(usual), "value"),
                "variants_same": states.count(usual),
                "variants_other_value": sum(state >= 0 for state in others),
                "variants_missing": others.count(NO_VALUE),
                "variants_left_out": others.count(LEFT_OUT),
            }
            for setting in range(len(own.crossing.settings)):
                pairs = pairs_apart(own.crossing, setting)
                differing = sum(states[one] != states[other] for one, other in pairs)
                chance = differing / len(pairs) if own.crossing.full else None
                row[f"hangs_on_{setting}"] = chance
            found.append(row)
    return found


@given(cases(together=False))
@example(SOME[0])
@example(SOME[1])
@example(SOME[2])
def test_rows_are_those_of_a_loop(own: Made) -> None:
    """In the order of ``outcomes``; without chances where not every combination is there."""
    part = part_of(own, ("parquet",))
    expected = expected_rows(own)
    assert part.parquet is not None
    rows = pq.read_table(pa.BufferReader(part.parquet)).to_pylist()
    assert part.rows == len(rows) == len(expected)
    assert rows == expected


def test_csv_has_the_same_rows() -> None:
    """What is missing is empty."""
    part = part_of(SOME[0], ("csv",))
    assert part.parquet is None
    assert part.csv is not None
    expected = expected_rows(SOME[0])
    read = [*csv.reader(io.StringIO(part.csv.decode("utf-8")))]
    assert len(read) == len(expected) > 20
    for row, own in zip(read, expected, strict=True):
        for text, cell in zip(row, own.values(), strict=True):
            if isinstance(cell, float):
                assert float(text) == pytest.approx(cell, abs=1e-12)
            else:
                assert text == ("" if cell is None else str(cell))


@given(st.integers(0, 4))
def test_cells_that_do_not_change_have_no_rows(trials: int) -> None:
    """Whatever they are."""
    part = part_of(made(11, trials, False, True, 0.0), ("csv",))
    assert (part.rows, part.csv) == (0, b"")
