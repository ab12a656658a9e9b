"""Every cell of the tables anew, by a naive loop over the rows of ``fixations``.

The loop (``tests/measures/naive.py``) is written from the definitions and shares nothing with the
program; the lengths of the texts come from the simulator's own layout.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from itertools import product

import pytest

from tests.end_to_end.building import (
    TABLES,
    Recomputed,
    Row,
    Sample,
    build,
    copied_sample,
    recomputed,
    rows_of,
)


@dataclass(frozen=True)
class Both:
    """The tables of a study under some convention, and what the loop makes of its fixations."""

    tables: dict[str, list[Row]]
    naive: Recomputed
    no_opportunity: str


CONVENTIONS = [
    *product(["orchard"], ["ignore", "interrupt"], ["missing", "zero"]),
    # All fixations of the passages are inside a region, so that "interrupt" changes nothing there.
    *product(["passages"], ["ignore"], ["missing", "zero"]),
]


@pytest.fixture(scope="module", params=CONVENTIONS, ids="-".join)
def both(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Both:
    """A sample under each pair of conventions in turn."""
    name, outside, no_opportunity = request.param
    sample: Sample = request.getfixturevalue(name)
    outcomes = 'outcomes = ["binary", "count", "duration"]\n'
    changes = {outcomes: f'{outcomes}outside = "{outside}"\nno_opportunity = "{no_opportunity}"\n'}
    if name == "orchard":
        changes = {
            'outside = "ignore"': f'outside = "{outside}"',
            'no_opportunity = "missing"': f'no_opportunity = "{no_opportunity}"',
        }
    root = tmp_path_factory.mktemp("-".join(request.param))
    result = build(copied_sample(name, root, changes), root / "built")
    tables = {table: rows_of(result.folder, table) for table in TABLES}
    naive = recomputed(tables["fixations"], sample, outside, no_opportunity)
    return Both(tables, naive, no_opportunity)


def test_every_cell_of_outcomes(both: Both) -> None:
    """Values and reasons of the long table, cell by cell, and no cell too many."""
    told = {
        (r["participant"], r["trial"], r["region_order"], r["measure"]): (
            r["value"],
            r["missing"] or "",
        )
        for r in both.tables["outcomes"]
    }
    assert told == both.naive.outcomes
    assert len(told) == len(both.tables["outcomes"]) > 30_000


def test_every_cell_of_outcomes_wide(both: Both) -> None:
    """The wide table holds the same values, and nothing where the long one has a reason."""
    measures = {key[3] for key in both.naive.outcomes}
    told = {
        (r["participant"], r["trial"], r["region_order"], measure): r[measure]
        for r in both.tables["outcomes_wide"]
        for measure in measures
    }
    assert told == {key: cell[0] for key, cell in both.naive.outcomes.items()}


def test_every_cell_of_trials(both: Both) -> None:
    """Values of the trials' table, and the reasons in its last column."""
    measures = sorted({key[2] for key in both.naive.trials})
    told = {}
    for row in both.tables["trials"]:
        reasons = dict(part.split(": ") for part in (row["missing"] or "").split("; ") if part)
        for measure in measures:
            key = row["participant"], row["trial"], measure
            told[key] = row[measure], reasons.get(measure, "")
    assert told == both.naive.trials


def test_every_cell_of_regressions(both: Both) -> None:
    """Rows of regressive saccades in their order, with numbers, onsets and amplitudes."""
    columns = (
        *("participant", "trial", "from_region", "from_order", "to_region", "to_order"),
        *("regions_crossed", "ends_first_pass", "launch_fixation", "landing_fixation"),
        *("onset_ms", "amplitude_px"),
    )
    told = [tuple(row[column] for column in columns) for row in both.tables["regressions"]]
    assert told == both.naive.regressions
    assert len(told) > 100


def test_visits_and_first_passes_of_fixations(both: Both) -> None:
    """Visit and first pass of each kept fixation; none for one outside or left out."""
    told = {
        (r["participant"], r["trial"], r["fixation"]): (r["visit"], r["first_pass"])
        for r in both.tables["fixations"]
    }
    out = {key: told.pop(key) for key in set(told) - set(both.naive.visits)}
    assert told == both.naive.visits
    assert set(out.values()) <= {(None, None)}


def test_both_sides_have_something_to_compare(both: Both) -> None:
    """Ones, zeros and every reason that the convention leaves occur in the tables."""
    reasons = Counter(row["missing"] for row in both.tables["outcomes"])
    always = {"no_earlier_region", "no_later_region", "skipped", "refixated", "never_fixated"}
    assert always <= set(reasons)
    assert ("not_passed" in reasons) == (both.no_opportunity == "missing")


def test_outside_convention_makes_a_difference(
    orchard: Sample, tmp_path_factory: pytest.TempPathFactory
) -> None:
    """The sample has outside fixations that interrupt visits, so the two conventions differ."""
    root = tmp_path_factory.mktemp("interrupt")
    changes = {'outside = "ignore"': 'outside = "interrupt"'}
    result = build(copied_sample("orchard", root, changes), root / "built")
    assert rows_of(result.folder, "fixations") != orchard.tables["fixations"]
    assert len(rows_of(result.folder, "regressions")) < len(orchard.tables["regressions"])
