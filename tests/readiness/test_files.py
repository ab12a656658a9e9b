"""The three files: what stands in them, and that they say the same."""

from __future__ import annotations

import csv
import json
from pathlib import Path
from typing import Any

import pytest

from etl.export.readiness_files import COUNTS, EVERYTHING, FORMULA_COLUMNS, FORMULAS
from etl.readiness.facts import Dependence, Readiness
from etl.session.readiness import readiness_of, write_readiness
from tests.readiness.making import crossed, judged, random_study, write_study

CUE = {"cue": ["early", "=late"]}


def read(path: Path) -> list[dict[str, str]]:
    """Rows as they stand in a CSV file."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.fixture
def made() -> Readiness:
    """An outcome of a region that is ready, and one of trials that is constant."""
    rows = crossed(CUE, 20, 20)
    ones = [(reader, item, levels, 1) for reader, item, levels, _ in rows]
    return Readiness(
        ("cue",),
        (judged(CUE, rows), judged(CUE, ones, outcome="any_skip", region="", items=False)),
        (Dependence("regression_out", "any_skip", "both rest on something"),),
        together=False,
    )


@pytest.fixture
def written(made: Readiness, tmp_path: Path) -> Path:
    """The folder with the files."""
    write_readiness(made, tmp_path)
    return tmp_path


def test_counts_have_a_row_for_all_and_one_for_each_condition(
    made: Readiness, written: Path
) -> None:
    """The row for all comes first, names no level, and alone has the verdict and why."""
    rows = read(written / COUNTS)
    assert list(rows[0]) == [
        *("outcome", "region", "cue", "zeros", "ones", "missing", "rate", "rate_low", "rate_high"),
        *("state", "readers", "readers_all_zero", "readers_all_one", "items", "items_all_zero"),
        *("items_all_one", "verdict", "why"),
    ]
    heads = [(row["outcome"], row["region"], row["cue"], row["verdict"]) for row in rows]
    assert heads == [
        ("regression_out", "verb", "", "ready"),
        ("regression_out", "verb", "early", ""),
        ("regression_out", "verb", "'=late", ""),
        ("any_skip", "", "", "constant"),
        ("any_skip", "", "early", ""),
        ("any_skip", "", "'=late", ""),
    ]
    total = made.outcomes[0].total
    assert (int(rows[0]["zeros"]), int(rows[0]["ones"])) == (total.zeros, total.ones)
    assert float(rows[0]["rate"]) == total.ones / 400
    assert (float(rows[0]["rate_low"]), float(rows[0]["rate_high"])) == (total.low, total.high)
    assert [row["why"] for row in rows] == [
        *("Nothing speaks against step 1 of 5, the maximal formula.", "", ""),
        *("All 400 values are 1: there is nothing to model.", "", ""),
    ]
    last = rows[-1]
    assert (last["state"], last["readers_all_one"], last["items"]) == ("all 1", "20", "")


def test_formulas_mark_one_step_as_the_start(made: Readiness, written: Path) -> None:
    """A step a row; nothing for an outcome that is constant."""
    rows = read(written / FORMULAS)
    ladder = made.outcomes[0].ladder
    assert tuple(rows[0]) == FORMULA_COLUMNS
    assert [row["formula"] for row in rows] == [step.formula for step in ladder]
    assert [row["step"] for row in rows if row["start"] == "1"] == [str(made.outcomes[0].start)]
    assert [float(row["ones_per_parameter"]) for row in rows] == [
        step.ones_per_parameter for step in ladder
    ]
    assert {row["outcome"] for row in rows} == {"regression_out"}


def test_json_holds_everything(made: Readiness, written: Path) -> None:
    """What the tables have, and the sentences, separations, variations and dependences."""
    told: dict[str, Any] = json.loads((written / EVERYTHING).read_text(encoding="utf-8"))
    assert list(told) == ["verdicts", "rows", "factors", "outcomes", "dependences", "together"]
    first, facts = told["outcomes"][0], made.outcomes[0]
    assert first["sentences"] == list(facts.sentences)
    assert first["cells"][1]["levels"] == ["=late"]
    assert first["cells"][1]["rate"] == facts.cells[1].rate
    assert [own["supported"] for own in first["variations"]] == [True, True]
    assert told["dependences"][0]["why"] == "both rest on something"


def test_json_has_null_where_there_is_no_rate(tmp_path: Path) -> None:
    """Not a number is no number of JSON: a strict reader takes the file."""
    nothing = [(reader, item, levels, None) for reader, item, levels, _ in crossed(CUE, 3, 3)]
    write_readiness(Readiness(("cue",), (judged(CUE, nothing),), (), together=False), tmp_path)
    text = (tmp_path / EVERYTHING).read_text(encoding="utf-8")
    told = json.loads(text, parse_constant=lambda name: pytest.fail(f"{name} in JSON"))
    assert told["outcomes"][0]["total"]["rate"] is None
    assert read(tmp_path / COUNTS)[0]["rate"] == ""


def test_study_without_factors_has_one_row_an_outcome(tmp_path: Path) -> None:
    """A row for all conditions and one for the only condition would be the same twice."""
    facts = Readiness((), (judged({}, crossed({}, 9, 9)),), (), together=False)
    write_readiness(facts, tmp_path)
    assert len(read(tmp_path / COUNTS)) == 1


def test_same_tables_give_the_same_bytes(tmp_path: Path) -> None:
    """Whatever the row groups: no clock, no order of sets."""
    study = random_study(11)
    texts = []
    for name in ("whole", "groups"):
        folder = tmp_path / name
        folder.mkdir()
        with pytest.MonkeyPatch.context() as patch:
            write_study(study, folder, patch if name == "groups" else None)
        write_readiness(readiness_of(folder, study.design), folder)
        texts.append([(folder / file).read_bytes() for file in (COUNTS, FORMULAS, EVERYTHING)])
    assert texts[0] == texts[1]
