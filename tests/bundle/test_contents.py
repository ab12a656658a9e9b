"""What lies in the bundle: copies of what was built, always with the CSV that scripts read."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path

import pytest

from etl.session import reader_groups
from tests.end_to_end.building import TABLES, files_of
from tests.handoff.bundles import bundle_of, small_study

#: Everything in a bundle but the tables.
BESIDES = {
    *("exclusions.csv", "accounts.csv", "log_accounts.csv", "codebook.csv", "codebook.md"),
    *("regions.csv", "datapackage.json", "readiness.csv", "readiness.json", "formulas.csv"),
    *("run.json", "audit.html", "start.R", "start.py", "README.md"),
}
#: What is written for the bundle, not copied from the build.
OWN = {"datapackage.json", "start.R", "start.py", "README.md"}
FACTORS = {"cue": ["early", "late"], "fit": ["=good", "'odd"]}


@pytest.fixture
def parquet_only(tmp_path: Path) -> Path:
    """The bundle of a study that wants its tables as Parquet only."""
    return bundle_of(small_study(tmp_path / "p", FACTORS, formats='["parquet"]'))


@pytest.fixture
def with_csv(tmp_path: Path) -> Path:
    """The bundle of the same study with its tables as CSV too."""
    return bundle_of(small_study(tmp_path / "c", FACTORS))


def test_bundle_has_parquet_and_the_csv_that_scripts_read(parquet_only: Path) -> None:
    """Without CSV among the formats only the two tables of the scripts are CSV too."""
    tables = {*(f"{table}.parquet" for table in TABLES), "outcomes_wide.csv", "trials.csv"}
    assert set(files_of(parquet_only)) == tables | BESIDES


def test_bundle_has_all_tables_in_the_formats_of_the_study(with_csv: Path) -> None:
    """With CSV among the formats all tables are there in both."""
    tables = {f"{table}.{ending}" for table in TABLES for ending in ("parquet", "csv")}
    assert set(files_of(with_csv)) == tables | BESIDES


def test_bundle_holds_what_the_build_holds(with_csv: Path) -> None:
    """Every file that the build has too has the same bytes."""
    built, bundled = files_of(with_csv.parent), files_of(with_csv)
    copied = bundled.keys() - OWN
    assert {name: bundled[name] for name in copied} == {name: built.get(name) for name in copied}


def test_bundled_files_are_copies(with_csv: Path) -> None:
    """What is done to a file of the bundle leaves the build alone."""
    linked = [p.name for p in with_csv.iterdir() if p.is_symlink() or p.stat().st_nlink > 1]
    assert linked == []


def test_csv_made_for_the_bundle_has_the_bytes_of_a_build_with_csv(
    parquet_only: Path, with_csv: Path
) -> None:
    """The scripts read the same file whatever formats the study asks for."""
    for table in ("outcomes_wide.csv", "trials.csv"):
        assert (parquet_only / table).read_bytes() == (with_csv / table).read_bytes()


def test_csv_made_from_several_row_groups_has_the_same_bytes(
    tmp_path: Path, with_csv: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A table that was written in parts is copied part by part, without a second header."""
    monkeypatch.setattr(reader_groups, "FIXATIONS_A_GROUP", 1)
    small = bundle_of(small_study(tmp_path / "s", FACTORS, formats='["parquet"]'))
    for table in ("outcomes_wide.csv", "trials.csv"):
        assert (small / table).read_bytes() == (with_csv / table).read_bytes()


def test_same_inputs_give_the_same_bundle(tmp_path: Path, with_csv: Path) -> None:
    """But for the time that the build took, two builds give the same bytes."""
    again = bundle_of(small_study(tmp_path / "again", FACTORS))
    assert files_of(again, besides="run.json") == files_of(with_csv, besides="run.json")


def test_run_record_lists_the_files_of_the_bundle(with_csv: Path) -> None:
    """The record names every file of the build and of the bundle but itself."""
    record = json.loads((with_csv / "run.json").read_text(encoding="utf-8"))
    assert set(record["files"]) == files_of(with_csv.parent).keys() - {"run.json"}


def test_run_record_has_a_digest_of_every_file(with_csv: Path) -> None:
    """By SHA-256, of all files of build and bundle but the record itself."""
    record = json.loads((with_csv / "run.json").read_text(encoding="utf-8"))
    built = files_of(with_csv.parent)
    assert record["sha256"] == {
        name: hashlib.sha256(own).hexdigest()
        for name, own in built.items()
        if name not in ("run.json", "handoff/run.json")
    }


def test_bundle_names_no_place_of_the_computer(with_csv: Path, tmp_path: Path) -> None:
    """Nobody who gets the bundle learns where the study lay."""
    found = [name for name, own in files_of(with_csv).items() if str(tmp_path).encode() in own]
    assert found == []
