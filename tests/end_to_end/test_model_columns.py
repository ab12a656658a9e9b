"""Factors as numbers and centred covariates in the published tables."""

from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import duckdb
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

import etl
from etl.coding import coding_of
from etl.errors import Findings
from etl.measures import MEASURES, TRIAL_MEASURES
from etl.session.model_columns import measure_column
from etl.session.plan import Plan, make_plan
from etl.tables import BARE_DESIGN, CovariateColumn, MeasureColumn
from tests.end_to_end.building import TABLES, build, files_of, rows_of
from tests.end_to_end.model_study import OF_STUDY, STUDY, model_study

ROOT2, ROOT20 = math.sqrt(2), math.sqrt(20)
#: For each contrast of each factor, the columns, and the numbers of each level written by hand.
#: The levels are stated: of cue middle, early, late; of step high, low, mid, top.
BY_HAND = {
    'cue = "treatment"': (
        "cue",
        {
            "cue_early": {"middle": 0, "early": 1, "late": 0},
            "cue_late": {"middle": 0, "early": 0, "late": 1},
        },
    ),
    'cue = "sum"': (
        "cue",
        {
            "cue_middle": {"middle": 1, "early": 0, "late": -1},
            "cue_early": {"middle": 0, "early": 1, "late": -1},
        },
    ),
    'cue = "helmert"': (
        "cue",
        {
            "cue_early": {"middle": -1, "early": 1, "late": 0},
            "cue_late": {"middle": -1, "early": -1, "late": 2},
        },
    ),
    'fit = "polynomial"': ("fit", {"fit_linear": {"good": -1 / ROOT2, "bad": 1 / ROOT2}}),
    "fit = [0.5, -0.5]": ("fit", {"fit_contrast": {"good": 0.5, "bad": -0.5}}),
    "cue = { edge = [-2, 1, 1], time = [0, -0.5, 0.5] }": (
        "cue",
        {
            "cue_edge": {"middle": -2, "early": 1, "late": 1},
            "cue_time": {"middle": 0, "early": -0.5, "late": 0.5},
        },
    ),
    'step = "sum"': (
        "step",
        {
            "step_high": {"high": 1, "low": 0, "mid": 0, "top": -1},
            "step_low": {"high": 0, "low": 1, "mid": 0, "top": -1},
            "step_mid": {"high": 0, "low": 0, "mid": 1, "top": -1},
        },
    ),
    'step = "polynomial"': (
        "step",
        {
            "step_linear": dict(
                zip(
                    ("high", "low", "mid", "top"), [n / ROOT20 for n in (-3, -1, 1, 3)], strict=True
                )
            ),
            "step_quadratic": {"high": 0.5, "low": -0.5, "mid": -0.5, "top": 0.5},
            "step_cubic": dict(
                zip(
                    ("high", "low", "mid", "top"), [n / ROOT20 for n in (-1, 3, -3, 1)], strict=True
                )
            ),
        },
    ),
}
WITH_FACTORS = ("outcomes", "outcomes_wide", "trials", "regressions")
#: Roots and quotients by hand are rounded once more than those of the program.
NEAR = 4e-16


@pytest.fixture(scope="module")
def without(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The study as built without any of the keys."""
    return build(model_study(tmp_path_factory.mktemp("without"))).folder


@pytest.mark.parametrize("wanted", BY_HAND)
def test_numbers_stand_beside_their_factor(tmp_path: Path, without: Path, wanted: str) -> None:
    """Right after the factor, in each table that has it, and of its level in each row."""
    folder = build(model_study(tmp_path, f"contrasts = {{ {wanted} }}\n")).folder
    factor, columns = BY_HAND[wanted]
    for table in WITH_FACTORS:
        names = pq.read_schema(without / f"{table}.parquet").names
        after = names.index(factor) + 1
        told = pq.read_table(folder / f"{table}.parquet")
        assert told.column_names == [*names[:after], *columns, *names[after:]]
        assert told.num_rows > 0
        for column, numbers in columns.items():
            assert told.schema.field(column) == pa.field(column, pa.float64(), nullable=False)
            for level, number in zip(
                told[factor].to_pylist(), told[column].to_pylist(), strict=True
            ):
                assert abs(number - numbers[level]) <= NEAR, (table, column, level)


def test_treatment_of_levels_found_goes_by_their_sorted_order(tmp_path: Path) -> None:
    """Treatment contrasts need no stated order: the first of the sorted levels is the reference."""
    study = STUDY.replace('fit = ["good", "bad"]\n', "")
    folder = build(model_study(tmp_path, 'contrasts = { fit = "treatment" }\n', study)).folder
    told = pq.read_table(folder / "trials.parquet", columns=["fit", "fit_good"]).to_pydict()
    assert set(zip(told["fit"], told["fit_good"], strict=True)) == {("bad", 0.0), ("good", 1.0)}


@pytest.mark.parametrize("table", TABLES)
def test_all_other_columns_are_as_without(tmp_path: Path, without: Path, table: str) -> None:
    """New columns change no other one, and no row."""
    output = 'contrasts = { cue = "sum", step = "helmert" }\ncentred = ["age", "height"]\n'
    folder = build(model_study(tmp_path, output)).folder
    before = pq.read_table(without / f"{table}.parquet")
    after = pq.read_table(folder / f"{table}.parquet")
    assert after.select(before.column_names).equals(before)


@pytest.mark.parametrize("table", ["outcomes", "outcomes_wide", "trials"])
def test_centred_covariates_stand_after_the_covariates(tmp_path: Path, table: str) -> None:
    """In the order of the list, after all covariates; missing where the covariate is."""
    folder = build(model_study(tmp_path, 'centred = ["age", "height"]\n')).folder
    names = pq.read_schema(folder / f"{table}.parquet").names
    at = names.index("height")
    assert names[at : at + 4] == ["height", "age", "age_centred", "height_centred"]
    rows = rows_of(folder, table)
    for name, place in (("age", 6), ("height", 7)):
        # The mean over all eight trials of the study: screening leaves one of them out.
        values = [Fraction(float(trial[place])) for trial in OF_STUDY if trial[place]]
        mean = float(sum(values, Fraction(0)) / len(values))
        for row in rows:
            value = row[name]
            assert row[f"{name}_centred"] == (None if value is None else value - mean)
    assert any(row["height_centred"] is None for row in rows)
    assert "age_centred" not in pq.read_schema(folder / "regressions.parquet").names


def test_screening_shifts_no_mean(tmp_path: Path) -> None:
    """A trial more that is left out leaves the centred values of the others as they are."""
    output = 'centred = ["age"]\n'
    few = build(model_study(tmp_path / "few", output)).folder
    stricter = STUDY.replace("fewest_fixations = 2", "fewest_fixations = 4")
    fewer = build(model_study(tmp_path / "fewer", output, stricter)).folder
    kept = {
        (row["participant"], row["trial"]): row["age_centred"] for row in rows_of(few, "trials")
    }
    left = rows_of(fewer, "trials")
    assert 0 < len(left) < len(kept)
    assert all(row["age_centred"] == kept[row["participant"], row["trial"]] for row in left)


def test_csv_holds_the_same_numbers(tmp_path: Path) -> None:
    """Every digit of a number is in the CSV too, by the reader of another program."""
    output = 'contrasts = { step = "polynomial" }\ncentred = ["height"]\n'
    folder = build(model_study(tmp_path, output)).folder
    columns = "step_linear, step_quadratic, step_cubic, height_centred"
    told = duckdb.read_csv(str(folder / "trials.csv"))
    by_csv = told.select(*(f'"{name}"' for name in columns.split(", "))).fetchall()
    rows = rows_of(folder, "trials")
    assert by_csv == [tuple(row[name] for name in columns.split(", ")) for row in rows]


def test_workers_change_no_byte(tmp_path: Path) -> None:
    """One worker or two: the same tables."""
    study = model_study(tmp_path, 'contrasts = { step = "polynomial" }\ncentred = ["height"]\n')
    one = build(study, tmp_path / "one")
    two = build(study, tmp_path / "two", workers=2)
    wanted = [f"{table}.{form}" for table in TABLES for form in ("parquet", "csv")]
    first, second = files_of(one.folder), files_of(two.folder)
    assert [first[name] for name in wanted] == [second[name] for name in wanted]


def test_factor_with_one_level_is_told(tmp_path: Path) -> None:
    """Where nothing varies there is no contrast, and a warning says so at the key."""
    study = STUDY.replace('"step"]', '"step", "text"]').replace(
        "skip = { item = [", 'skip = { trial = ["1", "3", "4"], item = ['
    )
    result = build(model_study(tmp_path, 'contrasts = { text = "treatment" }\n', study))
    [told] = [f for f in result.findings.of("warning") if "no contrast" in f.problem]
    assert told.problem == "the factor text has no contrast: it has only one level"
    assert told.fix == "remove it from [output] contrasts, or correct its levels"
    assert (told.line, told.found) == (study.count("\n") + 1, "plum")
    assert [n for n in pq.read_schema(result.folder / "trials.parquet").names if "text" in n] == [
        "text"
    ]


OPTIONS = """
[measures]
outside = "interrupt"
no_opportunity = "zero"
[screening.values]
outlier_sd = 3
"""


def planned(study_file: Path) -> Plan:
    """A study with its tables and regions read."""
    plan, _ = make_plan(etl.load_study(study_file), Findings())
    assert plan is not None
    return plan


def test_design_tells_outcomes_as_computed(tmp_path: Path) -> None:
    """Definition, source and reasons of an outcome are those under the options of the study."""
    usual = planned(model_study(tmp_path / "usual"))
    changed = planned(model_study(tmp_path / "changed", study=STUDY + OPTIONS))
    skip, back, first = (
        MEASURES[name] for name in ("first_pass_skip", "regression_out", "first_pass_time")
    )
    assert measure_column(usual, back) == MeasureColumn(
        back.name, "binary", "0 or 1", back.definition, back.source, back.reasons
    )
    assert measure_column(usual, first).reasons == ("not_reached", "skipped")
    assert measure_column(changed, first).reasons == ("not_reached", "skipped", "outlier")
    assert measure_column(changed, back).reasons == ("no_earlier_region",)
    assert measure_column(changed, back).definition == back.definition_under("interrupt", "zero")
    assert measure_column(changed, back).definition != back.definition
    assert measure_column(changed, skip).reasons == ()


def test_trials_have_no_outliers(tmp_path: Path) -> None:
    """The rule sets values of regions missing, never a trial's reading time."""
    plan = planned(model_study(tmp_path, study=STUDY + OPTIONS))
    reading = TRIAL_MEASURES["reading_time"]
    assert "outlier" not in measure_column(plan, reading).reasons


def test_design_gives_every_factor_a_coding() -> None:
    """As asked for, else treatment-coded, which is in no table then."""
    asked = coding_of("cue", ("a", "b"), "sum")
    design = replace(
        BARE_DESIGN, factors={"cue": ("a", "b"), "fit": ("x", "y")}, codings={"cue": asked}
    )
    assert design.coding("cue") is asked
    assert design.coding("fit").columns == ("fit_y",)
    assert [column.name for column in design.factor_columns()] == ["cue", "cue_a", "fit"]
    assert design.factor_columns()[1].meaning == "cue as sum contrast: a 1, b -1"
    with pytest.raises(KeyError, match="sky"):
        design.coding("sky")


def test_meaning_of_a_centred_covariate_has_its_mean() -> None:
    """Whoever adds the mean gets the covariate back."""
    design = replace(
        BARE_DESIGN, covariates={"age": CovariateColumn("number")}, centred={"age": 100 / 3}
    )
    assert design.covariate_columns()[1].meaning == (
        "age minus 33.333333333333336, its mean over the trials of the study as read, before "
        "screening"
    )
