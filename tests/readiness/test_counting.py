"""Counts and design facts of finished tables, against loops over the same rows."""

from __future__ import annotations

from itertools import product
from pathlib import Path

import pytest

from etl.readiness.facts import ALL_REGIONS, OutcomeReadiness
from etl.session.readiness import MOST_CELLS, MOST_REGIONS, readiness_of
from tests.readiness.making import MadeStudy, design_of, random_study, write_study
from tests.readiness.naive_counting import both_vary, constant, tally, varies

SEEDS = range(60)


@pytest.fixture(scope="module")
def judged(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[MadeStudy, OutcomeReadiness]]:
    """Every outcome × region of many random studies, with its study."""
    out = []
    with pytest.MonkeyPatch.context() as patch:
        for seed in SEEDS:
            study = random_study(seed)
            folder = tmp_path_factory.mktemp("study")
            write_study(study, folder, patch)
            out += [(study, one) for one in readiness_of(folder, study.design).outcomes]
    return out


def rows_of(study: MadeStudy, one: OutcomeReadiness) -> list[dict[str, object]]:
    """The rows that an outcome is about."""
    if not one.region:
        return study.trials
    return [row for row in study.wide if row["region"] == one.region]


def in_cell(rows: list[dict[str, object]], factors: dict[str, str]) -> list[dict[str, object]]:
    """The rows of one combination of levels."""
    return [row for row in rows if all(row[name] == level for name, level in factors.items())]


def test_zeros_ones_and_missing_are_those_of_a_loop(
    judged: list[tuple[MadeStudy, OutcomeReadiness]],
) -> None:
    """All together and in every combination of levels, also empty ones."""
    for study, one in judged:
        rows = rows_of(study, one)
        total = one.total
        assert (total.zeros, total.ones, total.missing) == tally(rows, one.outcome)
        assert [cell.levels for cell in one.cells] == list(product(*study.design.factors.values()))
        for cell in one.cells:
            own = in_cell(rows, dict(zip(study.design.factors, cell.levels, strict=True)))
            assert (cell.zeros, cell.ones, cell.missing) == tally(own, one.outcome)


def test_constant_units_are_those_of_a_loop(
    judged: list[tuple[MadeStudy, OutcomeReadiness]],
) -> None:
    """Readers and items with one value only, all together and within each combination."""
    for study, one in judged:
        rows = rows_of(study, one)
        expected = [unit for unit in ("participant", "item") if unit in study.design.ids]
        assert [own.unit for own in one.units] == expected
        cells = [
            in_cell(rows, dict(zip(study.design.factors, cell.levels, strict=True)))
            for cell in one.cells
        ]
        for units, own in zip((one.units, *one.cell_units), (rows, *cells), strict=True):
            for unit in units:
                told = unit.units, unit.all_zero, unit.all_one
                assert told == constant(own, one.outcome, unit.unit)


def test_variation_is_that_of_a_loop(judged: list[tuple[MadeStudy, OutcomeReadiness]]) -> None:
    """In how many readers and items a factor, or an interaction of two, varies."""
    looked_at = 0
    for study, one in judged:
        rows = rows_of(study, one)
        for own in one.variations:
            if len(own.factors) == 1:
                expected = varies(rows, one.outcome, own.unit, own.factors[0])
            elif len(own.factors) == 2:
                expected = both_vary(rows, one.outcome, own.unit, own.factors)
            else:
                continue
            assert (own.varying, own.units) == expected
            assert own.varying <= own.several <= own.units
            kinds = {own.units: "within", 0: "between"}
            assert own.kind == kinds.get(own.varying, "within some")
            looked_at += 1
    assert looked_at > 500


def test_regions_come_in_reading_order(tmp_path: Path) -> None:
    """Not in the order in which the study names them."""
    study = random_study(3)
    write_study(study, tmp_path)
    order = {row["region"]: row["region_order"] for row in study.wide}
    told = [one.region for one in readiness_of(tmp_path, study.design).outcomes][: len(order)]
    assert told == sorted(order, key=lambda region: order[region])


def test_first_region_of_regressions_out_has_no_values(tmp_path: Path) -> None:
    """Where the outcome is never possible there is no ladder, and the sentence says so."""
    study = random_study(3)
    write_study(study, tmp_path)
    facts = readiness_of(tmp_path, study.design)
    first = next(one for one in facts.outcomes if one.outcome == "regression_out")
    assert (first.verdict, first.ladder, first.start) == ("no values", (), 0)
    assert "has a value: the outcome is not possible here" in first.sentences[0]


def test_many_regions_are_counted_together(tmp_path: Path) -> None:
    """With more names than the page shows, every outcome has one entry for all regions."""
    study = random_study(5, regions=MOST_REGIONS + 1)
    write_study(study, tmp_path)
    facts = readiness_of(tmp_path, study.design)
    told = [(one.outcome, one.region) for one in facts.outcomes]
    assert facts.together
    assert told == [
        ("first_pass_skip", ALL_REGIONS),
        ("regression_out", ALL_REGIONS),
        ("any_skip", ""),
    ]
    total = facts.outcomes[0].total
    assert (total.zeros, total.ones, total.missing) == tally(study.wide, "first_pass_skip")
    assert any("so they are counted together" in text for text in facts.outcomes[0].sentences)


def test_combinations_beyond_number_are_listed_where_they_occur(tmp_path: Path) -> None:
    """A factor with very many levels does not fill the table with empty cells."""
    levels = [f"l{n}" for n in range(MOST_CELLS)]
    ids = {"participant": ["P1", "P2"], "trial": ["1", "2"]}
    design = design_of(ids, {"a": levels, "b": ["x", "y"]}, ["r"])
    study = MadeStudy(design)
    for reader, first, second in (("P1", "l7", "y"), ("P2", "l3", "x")):
        key = {"participant": reader, "trial": 1, "a": first, "b": second, "fixation_count": 1}
        study.trials.append({**key, "any_skip": 1, "missing": None})
        values = {"first_pass_skip": 1, "regression_out": 0}
        study.wide.append({**key, "region": "r", "region_order": 1, **values})
    write_study(study, tmp_path)
    for one in readiness_of(tmp_path, design).outcomes:
        assert [cell.levels for cell in one.cells] == [("l3", "x"), ("l7", "y")]
        assert [cell.values for cell in one.cells] == [1, 1]


def test_study_without_kept_trials_has_no_values(tmp_path: Path) -> None:
    """Empty tables are told of, not stumbled over."""
    design = design_of({"participant": ["P1"], "trial": ["1"]}, {"cue": ["early", "late"]}, ["r"])
    write_study(MadeStudy(design), tmp_path)
    facts = readiness_of(tmp_path, design)
    assert {one.verdict for one in facts.outcomes} == {"no values"}
    assert facts.outcomes[0].sentences == (
        "There is no row: no trial that was kept has this region.",
    )


def test_study_without_binary_outcomes_of_regions_has_those_of_trials(tmp_path: Path) -> None:
    """Durations alone may be asked for; outcomes of trials are always written."""
    ids = {"participant": ["1", "2"], "trial": ["1"]}
    design = design_of(ids, {}, ["r"], outcomes=())
    study = MadeStudy(design)
    for reader in (1, 2):
        key = {"participant": reader, "trial": 1, "fixation_count": 1}
        study.trials.append({**key, "any_skip": reader - 1, "missing": None})
        study.wide.append({**key, "region": "r", "region_order": 1})
    write_study(study, tmp_path)
    (one,) = readiness_of(tmp_path, design).outcomes
    assert (one.outcome, one.total.zeros, one.total.ones) == ("any_skip", 1, 1)
    assert one.ladder[0].formula == "any_skip ~ 1 + (1 | participant)"


def test_factor_without_any_level_is_no_stumbling_block(tmp_path: Path) -> None:
    """Where no trial is left a factor may have no level at all."""
    design = design_of({"participant": [], "trial": []}, {"cue": []}, ["r"])
    write_study(MadeStudy(design), tmp_path)
    facts = readiness_of(tmp_path, design)
    assert {(one.verdict, one.cells) for one in facts.outcomes} == {("no values", ())}
