"""The codebook holds every column, says what is computed, and promises nothing that is not so."""

from __future__ import annotations

import json
import re
from collections import defaultdict
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import FaultError
from etl.handoff import codebook_entries as entries_of_codebook
from etl.handoff import write_codebook
from etl.handoff.codebook_cells import in_one_cell
from etl.measures import MEASURES, REASON_MEANINGS, TRIAL_MEASURES
from tests.end_to_end.building import copied_sample, rows_of
from tests.handoff.bundles import small_study
from tests.handoff.codebook_building import (
    Described,
    described,
    header_of,
    levels_in,
    planned,
    tables_of,
)
from tests.handoff.codebook_building import rows_of as csv_rows

TABLES = ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")


def test_every_column_of_every_file_is_in_the_codebook(any_described: Described) -> None:
    """Each table's columns stand there in their order, in both folders, and no others do."""
    for folder in any_described.folders:
        for path in tables_of(folder):
            assert header_of(path) == list(any_described.columns(path.stem)), path
        for table in TABLES:
            if rows := rows_of(folder, table):
                assert list(rows[0]) == list(any_described.columns(table)), table


def test_every_table_of_the_codebook_is_a_file(any_described: Described) -> None:
    """Nothing is described that is not there."""
    there = {path.stem for path in tables_of(any_described.folder)}
    assert {row["table"] for row in any_described.codebook} == there | set(TABLES)


def test_only_cells_that_may_be_are_empty(any_described: Described) -> None:
    """A column has an empty cell only where the codebook says when."""
    for path in tables_of(any_described.folder):
        rows = csv_rows(path)
        for name, column in any_described.columns(path.stem).items():
            if column["when_missing"] is None:
                assert all(row[name] is not None for row in rows), (path.stem, name)


def test_values_are_of_the_type_that_the_codebook_says(any_described: Described) -> None:
    """Levels are among those listed, flags are 0 or 1, and numbers are numbers."""
    patterns = {
        "flag": r"[01]",
        "integer": r"-?\d+",
        "number": r"-?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?",
    }
    for path in tables_of(any_described.folder):
        rows = csv_rows(path)
        for name, column in any_described.columns(path.stem).items():
            values = {str(row[name]) for row in rows if row[name] is not None}
            if column["type"] == "category":
                assert values <= set(levels_in(column["levels"])), (path.stem, name)
            elif pattern := patterns.get(str(column["type"])):
                odd = [value for value in values if not re.fullmatch(pattern, value)]
                assert odd == [], (path.stem, name)


def test_levels_are_in_the_order_of_the_study(awkward_described: Described) -> None:
    """The reference level is the first, whatever signs levels have."""
    for name, levels in awkward_described.design.factors.items():
        column = awkward_described.columns("outcomes")[name]
        assert tuple(levels_in(column["levels"])) == levels
    assert set(awkward_described.design.factors) == {"cue", "mood"}


def test_every_outcome_has_a_row_of_its_own(any_described: Described) -> None:
    """Of the long table the column of values is there for itself and for each outcome."""
    own = [r["outcome"] for r in any_described.codebook if r["column"] == "value"]
    assert own == [None, *sorted(MEASURES)]


@pytest.mark.parametrize("outside", ["ignore", "interrupt"])
@pytest.mark.parametrize("no_opportunity", ["missing", "zero"])
def test_outcomes_are_defined_as_computed(
    tmp_path: Path, outside: str, no_opportunity: str
) -> None:
    """Definition and reasons are those of the catalogue under the study's own options."""
    options = f'[measures]\noutside = "{outside}"\nno_opportunity = "{no_opportunity}"\n'
    study = described(small_study(tmp_path, {}, output=options), tmp_path / "o")
    told = {
        (row["table"], row["outcome"]): (row["meaning"], row["when_missing"], row["source"])
        for row in study.codebook
        if row["outcome"]
    }
    wanted = {}
    for table, catalogue in (
        ("outcomes", MEASURES),
        ("outcomes_wide", MEASURES),
        ("trials", TRIAL_MEASURES),
    ):
        for name, measure in catalogue.items():
            reasons = measure.reasons_under(no_opportunity)
            wanted[table, name] = (
                measure.definition_under(outside, no_opportunity),
                "; ".join(f"{r}: {REASON_MEANINGS[r]}" for r in reasons) or None,
                measure.source,
            )
    assert told == wanted
    page = (study.folder / "codebook.md").read_text(encoding="utf-8")
    assert f"(outside = {outside})" in page
    assert f"(no_opportunity = {no_opportunity})" in page
    assert ("A 0 says that the reader had the chance" in page) == (no_opportunity == "missing")


def test_values_are_missing_only_for_reasons_that_are_listed(orchard_described: Described) -> None:
    """The reasons that occur with an outcome are among those that its row names."""
    found: defaultdict[str, set[str]] = defaultdict(set)
    for row in rows_of(orchard_described.folder, "outcomes"):
        if row["missing"]:
            found[row["measure"]].add(row["missing"])
    listed = {r["outcome"]: str(r["when_missing"]) for r in orchard_described.codebook}
    assert found
    for name, reasons in found.items():
        assert all(f"{reason}: " in listed[name] for reason in reasons), name


def test_values_set_missing_by_a_rule_have_their_reason(tmp_path: Path) -> None:
    """Where outliers go missing, durations of regions say so, and nothing else does."""
    rules = "[screening.values]\noutlier_sd = 2.5\n"
    study = described(copied_sample("orchard", tmp_path, rules=rules), tmp_path / "o")
    with_outliers = {
        (row["table"], row["outcome"])
        for row in study.codebook
        if row["outcome"] and "outlier: " in str(row["when_missing"])
    }
    durations = [name for name, measure in MEASURES.items() if measure.kind == "duration"]
    tables = ("outcomes", "outcomes_wide")
    assert with_outliers == {(table, name) for table in tables for name in durations}
    assert "outlier" in {row["missing"] for row in rows_of(study.folder, "outcomes")}
    page = (study.folder / "codebook.md").read_text(encoding="utf-8")
    assert "| `outlier_sd` | value | a duration more than 2.5 standard deviations" in page


def test_page_shows_contrasts_as_the_tables_have_them(orchard_described: Described) -> None:
    """The matrix on the page is the one by which the columns were made."""
    page = (orchard_described.folder / "codebook.md").read_text(encoding="utf-8")
    assert "| Level | `cue_early` |\n|---|---:|\n| `early` | 1 |\n| `late` | -1 |\n" in page
    assert "| Level | `fit_odd` |\n|---|---:|\n| `fitting` | 0 |\n| `odd` | 1 |\n" in page
    pairs = {(r["cue"], r["cue_early"]) for r in rows_of(orchard_described.folder, "trials")}
    assert pairs == {("early", 1.0), ("late", -1.0)}


def test_page_has_the_mean_of_a_centred_covariate(orchard_described: Described) -> None:
    """The mean on the page is what was taken off, exactly."""
    page = (orchard_described.folder / "codebook.md").read_text(encoding="utf-8")
    found = re.search(r"\| `age` \| number \| the table of readers \| ([\d.]+) \|", page)
    assert found is not None
    rows = rows_of(orchard_described.folder, "trials")
    assert all(row["age_centred"] == row["age"] - float(found[1]) for row in rows)


def test_page_names_every_rule_with_its_limit(orchard_described: Described) -> None:
    """Who reads the page need not look into the study file for what was left out."""
    page = (orchard_described.folder / "codebook.md").read_text(encoding="utf-8")
    assert "| `under_ms` | fixation | shorter than 80 ms |" in page
    assert "| `outside_share_over` | trial | more than 30% of the fixations outside" in page
    for rule in orchard_described.design.left_out_by:
        assert f"| `{rule}` |" in page


def test_page_says_how_lines_are_told(
    passages_described: Described, orchard_described: Described
) -> None:
    """Only where texts have several lines is there anything to say about lines."""
    of_passages = (passages_described.folder / "codebook.md").read_text(encoding="utf-8")
    of_sentences = (orchard_described.folder / "codebook.md").read_text(encoding="utf-8")
    assert "(method = consensus)" in of_passages
    assert "Which line of a text" not in of_sentences


def test_page_has_whole_tables_whatever_signs_names_have(awkward_described: Described) -> None:
    """A bar in a name ends no cell: every row of a table has the cells of its header."""
    page = (awkward_described.folder / "codebook.md").read_text(encoding="utf-8")
    assert page.startswith("# Codebook: =Pears \\| \\*and\\* \\`plums\\`\n")
    tables = re.findall(r"(?:^\|.*\|\n)+", page, re.MULTILINE)
    assert len(tables) > 12
    for table in tables:
        widths = {len(re.findall(r"(?<!\\)\|", line)) for line in table.splitlines()}
        assert len(widths) == 1, table


def test_codebook_names_no_reader(
    orchard_described: Described, passages_described: Described
) -> None:
    """Neither page nor table lists ids of readers; that is left to the tables of data."""
    for study in (orchard_described, passages_described):
        for name in ("codebook.csv", "codebook.md"):
            text = (study.folder / name).read_text(encoding="utf-8")
            assert [r for r in study.design.ids["participant"].values if r in text] == []


def test_page_says_whether_ids_are_pseudonyms(orchard_described: Described, tmp_path: Path) -> None:
    """With pseudonyms the page says that they can be turned back; without, that ids are plain."""
    known = orchard_described
    write_codebook(tmp_path, known.design, replace(known.facts, pseudonyms=True))
    hidden = (tmp_path / "codebook.md").read_text(encoding="utf-8")
    plain = (known.folder / "codebook.md").read_text(encoding="utf-8")
    assert "keyed pseudonyms" in hidden
    assert "keyed pseudonyms" not in plain
    assert "as they stand in the logs" in plain


def test_same_study_gives_the_same_bytes(any_described: Described, tmp_path: Path) -> None:
    """Made again from a plan of its own, the codebook is the same."""
    write_codebook(tmp_path, any_described.design, any_described.facts)
    for name in ("codebook.csv", "codebook.md"):
        assert (tmp_path / name).read_bytes() == (any_described.folder / name).read_bytes()


def test_codebook_refuses_a_column_of_which_it_does_not_know_enough(
    orchard_described: Described, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A column that may be empty, and nobody says when, is a fault of the program."""
    monkeypatch.delitem(entries_of_codebook._EMPTY, "onset_ms")  # noqa: SLF001 - what it knows
    with pytest.raises(FaultError, match="when onset_ms of regressions is empty"):
        write_codebook(tmp_path, orchard_described.design, orchard_described.facts)


@given(st.lists(st.text(alphabet="ab |\\é=", min_size=1), min_size=1))
def test_texts_of_one_cell_can_be_told_apart(texts: list[str]) -> None:
    """Whatever bars, backslashes and blanks levels have, they come back as they were."""
    assert levels_in(in_one_cell(texts)) == texts


def test_origins_of_facts_are_told(orchard_described: Described) -> None:
    """Factors and covariates name the table that they come from."""
    columns = orchard_described.columns("trials")
    told = {name: columns[name]["source"] for name in ("cue", "group", "age", "verb_letters")}
    assert told == {
        "cue": "the trial list",
        "group": "the table of readers",
        "age": "the table of readers",
        "verb_letters": "the table of texts",
    }


def test_facts_are_those_of_the_run_record(orchard_described: Described) -> None:
    """The options that the page names are those that the run record has."""
    record = json.loads((orchard_described.folder / "run.json").read_text(encoding="utf-8"))
    assert orchard_described.facts.title == record["study"]["title"]
    assert orchard_described.facts.outside == record["study"]["measures"]["outside"]
    _, design = planned(orchard_described.plan.study)
    assert design.columns("trials") == orchard_described.design.columns("trials")
