"""Pseudonyms change names and the order of rows, and nothing else."""

from __future__ import annotations

import csv
from functools import partial
from pathlib import Path

import pandas as pd
import pytest

from etl.session import Result
from tests.end_to_end.building import TABLES, build, tables_of
from tests.pseudonyms.named_study import write_study
from tests.pseudonyms.searching import ask_for_pseudonyms, with_ids
from tests.simulator.dialects import DIALECTS, RecordedStudy, recorded_study

IDS = ("10", "9", "8", "Zoë", "b-2", "B-1")
#: Of one reader a log, of several, of many readers in one, of both eyes, of samples, of lines.
SOME = (
    *("plain", "trials that straddle logs", "one log", "a row an eye, by the table"),
    *("two sessions", "a trial begun again", "samples", "events in sentences"),
)


@pytest.fixture(scope="module")
def study() -> RecordedStudy:
    """Six readers of eight texts, whose ids are partly numbers."""
    return with_ids(recorded_study(), IDS)


def in_one_order(frame: pd.DataFrame) -> pd.DataFrame:
    """Rows sorted by all that they hold, as text."""
    text = frame.astype(str)
    return text.sort_values(list(text.columns), ignore_index=True)


def originals_of(result: Result) -> dict[str, str]:
    """Whose each pseudonym is, by the key file."""
    assert result.key is not None
    with result.key.open(encoding="utf-8", newline="") as file:
        return {row["name"]: row["stands_for"] for row in csv.DictReader(file)}


@pytest.mark.parametrize("dialect", SOME)
def test_tables_are_the_same_but_for_names_and_order(
    dialect: str, study: RecordedStudy, tmp_path: Path
) -> None:
    """Turned back by the key and sorted, every table is what it is without pseudonyms."""
    write = DIALECTS[dialect]
    plain = build(write(study, tmp_path / "plain"))
    hidden = build(ask_for_pseudonyms(write(study, tmp_path / "hidden")))
    names = originals_of(hidden)
    for table in TABLES:
        frame = hidden.table(table)
        for name in {"participant", "source_file"} & set(frame.columns):
            frame[name] = frame[name].map(names)
        pd.testing.assert_frame_equal(in_one_order(frame), in_one_order(plain.table(table)))
    assert dict(hidden.counts) == dict(plain.counts)


def test_rows_are_sorted_by_pseudonym(study: RecordedStudy, tmp_path: Path) -> None:
    """The order of the ids is lost; pseudonyms are text, also where ids are numbers."""
    result = build(ask_for_pseudonyms(DIALECTS["plain"](study, tmp_path)))
    readers = list(dict.fromkeys(result.trials["participant"]))
    assert readers == sorted(readers)
    assert result.trials["participant"].map(type).eq(str).all()


@pytest.mark.slow
@pytest.mark.parametrize("dialect", ["one log", "trials that straddle logs", "bids, both eyes"])
def test_any_number_of_workers_gives_the_same_bytes(dialect: str, tmp_path: Path) -> None:
    """Workers know the key, and what they learn comes back."""
    study = with_ids(recorded_study(), [f"P{number}" for number in range(6)])
    study_file = ask_for_pseudonyms(DIALECTS[dialect](study, tmp_path))
    one = build(study_file)
    key = (tmp_path / "study_pseudonyms.csv").read_bytes()
    two = build(study_file, tmp_path / "two", workers=2)
    assert tables_of(two.folder) == tables_of(one.folder)
    assert (tmp_path / "study_pseudonyms.csv").read_bytes() == key
    assert two.findings.lines() == one.findings.lines()


@pytest.mark.slow
def test_workers_name_the_readers_of_the_first_build(tmp_path: Path) -> None:
    """The key file of a first build by several processes holds what one process writes."""
    study_file = write_study(tmp_path)
    build(study_file, workers=2)
    before = (tmp_path / "study_pseudonyms.csv").read_bytes()
    build(study_file)
    assert (tmp_path / "study_pseudonyms.csv").read_bytes() == before


@pytest.mark.parametrize("table", TABLES)
def test_false_is_as_if_nothing_was_said(table: str, tmp_path: Path) -> None:
    """Tables without pseudonyms are the same bytes whether the key is false or absent."""
    write = partial(DIALECTS["plain"], recorded_study())
    absent = build(write(tmp_path / "absent"))
    study_file = ask_for_pseudonyms(write(tmp_path / "false"))
    text = study_file.read_text(encoding="utf-8").replace("pseudonyms = true", "pseudonyms = false")
    study_file.write_text(text, encoding="utf-8", newline="\n")
    said = build(study_file)
    file = f"{table}.parquet"
    assert (said.folder / file).read_bytes() == (absent.folder / file).read_bytes()
