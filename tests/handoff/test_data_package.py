"""The data packages hold against the published profile and the standard's own validator."""

from __future__ import annotations

import hashlib
import json
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import dplib
import frictionless
import jsonschema
import pytest

from etl.handoff import DATA_PACKAGE, write_data_package
from tests.handoff.bundles import small_study
from tests.handoff.codebook_building import Described, described, files_of

PROFILES = Path(dplib.__file__).parent / "profiles"


def package_of(folder: Path) -> dict[str, Any]:
    """The data package of a folder."""
    package: dict[str, Any] = json.loads((folder / DATA_PACKAGE).read_text(encoding="utf-8"))
    return package


def resource_of(folder: Path, path: str) -> dict[str, Any]:
    """What a folder's data package says of one file."""
    (found,) = (own for own in package_of(folder)["resources"] if own["path"] == path)
    resource: dict[str, Any] = found
    return resource


def field_of(folder: Path, path: str, name: str) -> dict[str, Any]:
    """What a folder's data package says of one column."""
    (found,) = (own for own in resource_of(folder, path)["schema"]["fields"] if own["name"] == name)
    field: dict[str, Any] = found
    return field


def faults_of(folder: Path) -> list[tuple[str, str]]:
    """What the validator finds: the file and the kind of fault, each once."""
    report = frictionless.validate(str(folder / DATA_PACKAGE))
    found = [("", error.type) for error in report.errors]
    found += [(task.place, error.type) for task in report.tasks for error in task.errors]
    return sorted(set(found))


def test_validator_finds_no_fault(any_described: Described) -> None:
    """Both packages of each study are valid: descriptor, sizes, digests, every cell."""
    for folder in any_described.folders:
        assert faults_of(folder) == []


def test_validator_reads_every_table(passages_described: Described) -> None:
    """Every CSV file is read as a table to its last row; the others are held to their digests."""
    folder = passages_described.folder
    report = frictionless.validate(str(folder / DATA_PACKAGE))
    rows = {task.place: task.stats.get("rows") for task in report.tasks if task.type == "table"}
    assert set(rows) == {path.name for path in files_of(folder) if path.suffix == ".csv"}
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    # Of a table without rows the validator counts none.
    wanted = {f"{name}.csv": count or None for name, count in record["rows"].items()}
    assert wanted.items() <= rows.items()


@pytest.mark.parametrize("version", ["2.0", "1.0"])
def test_descriptor_has_the_published_profile(any_described: Described, version: str) -> None:
    """The JSON Schemas that the standard publishes, of either version, have no objection."""
    text = (PROFILES / version / "datapackage.json").read_text(encoding="utf-8")
    profile = jsonschema.Draft7Validator(json.loads(text))
    for folder in any_described.folders:
        assert [error.message for error in profile.iter_errors(package_of(folder))] == []


def a_level_that_is_none(rows: list[str]) -> None:
    """One factor's level is misspelled."""
    rows[3] = rows[3].replace('"late"', '"lat"').replace('"early"', '"earl"')


def a_row_twice(rows: list[str]) -> None:
    """One row is there again at the end."""
    rows.append(rows[5])


def a_flag_of_two(rows: list[str]) -> None:
    """The first outcome of a trial is 2."""
    at = rows[0].split(",").index('"any_regression"')
    cells = rows[2].split(",")
    cells[at] = "2"
    rows[2] = ",".join(cells)


def a_missing_reader(rows: list[str]) -> None:
    """A row is about nobody."""
    rows[4] = rows[4][rows[4].index(",") :]


def a_word_for_a_number(rows: list[str]) -> None:
    """A count is spelled out."""
    at = rows[0].split(",").index('"fixation_count"')
    cells = rows[2].split(",")
    cells[at] = "seven"
    rows[2] = ",".join(cells)


def a_column_renamed(rows: list[str]) -> None:
    """A column has another name."""
    rows[0] = rows[0].replace('"fit"', '"fits"')


@pytest.mark.parametrize(
    ("plant", "kind"),
    [
        (a_level_that_is_none, "constraint-error"),
        (a_row_twice, "primary-key"),
        (a_flag_of_two, "constraint-error"),
        (a_missing_reader, "constraint-error"),
        (a_word_for_a_number, "type-error"),
        (a_column_renamed, "incorrect-label"),
    ],
    ids=lambda value: value.__name__ if callable(value) else value,
)
def test_validator_finds_what_was_planted(
    orchard_described: Described, tmp_path: Path, plant: Callable[[list[str]], None], kind: str
) -> None:
    """A fault within a cell is found by what the schema says, though the digest is right."""
    source, folder = orchard_described.folder, tmp_path / "sent"
    folder.mkdir()
    rows = (source / "trials.csv").read_text(encoding="utf-8").splitlines()
    plant(rows)
    text = "\n".join(rows) + "\n"
    (folder / "trials.csv").write_text(text, encoding="utf-8", newline="\n")
    write_data_package(folder, orchard_described.design, orchard_described.facts, ["trials.csv"])
    assert ("trials.csv", kind) in faults_of(folder)


@pytest.mark.parametrize("name", ["trials.csv", "trials.parquet", "accounts.csv", "audit.html"])
def test_validator_finds_a_file_that_was_changed(
    awkward_described: Described, tmp_path: Path, name: str
) -> None:
    """Tables in either format and pages are held against their digests."""
    folder = tmp_path / "sent"
    shutil.copytree(awkward_described.folder, folder, ignore=shutil.ignore_patterns("handoff"))
    content = (folder / name).read_bytes()
    at = content.rindex(b"1")
    (folder / name).write_bytes(content[:at] + b"7" + content[at + 1 :])
    assert (name, "hash-count") in faults_of(folder)


def test_package_lists_what_lies_in_the_folder(any_described: Described) -> None:
    """Every file but the package itself is a resource, with its size and digest."""
    for folder in any_described.folders:
        there = {path.name: path.read_bytes() for path in files_of(folder)}
        del there[DATA_PACKAGE]
        resources = package_of(folder)["resources"]
        assert [own["path"] for own in resources] == sorted(there)
        assert len({own["name"] for own in resources}) == len(resources)
        for own in resources:
            if own["path"] in ("run.json", "start.R", "start.py"):
                assert "hash" not in own
                continue
            content = there[own["path"]]
            assert own["bytes"] == len(content)
            assert own["hash"] == f"sha256:{hashlib.sha256(content).hexdigest()}"


def test_two_builds_have_the_same_packages(tmp_path: Path) -> None:
    """No time and no path of a build is in a package; the run record, which has one, may differ."""
    study_file = small_study(tmp_path, {"cue": ("early", "late")})
    first, second = (described(study_file, tmp_path / name) for name in "ab")
    for own, other in zip(first.folders, second.folders, strict=True):
        assert (own / DATA_PACKAGE).read_bytes() == (other / DATA_PACKAGE).read_bytes()


def test_run_record_may_follow(tmp_path: Path, orchard_described: Described) -> None:
    """A package can list the record before it is there, for the record lists the package."""
    write_data_package(
        tmp_path, orchard_described.design, orchard_described.facts, ["run.json", DATA_PACKAGE]
    )
    (own,) = package_of(tmp_path)["resources"]
    assert own["path"] == "run.json"
    assert "bytes" not in own


def test_levels_are_spelled_as_in_each_file(awkward_described: Described) -> None:
    """What a spreadsheet would run has an apostrophe in CSV, and none in Parquet."""
    levels = ["=1+1", "a | b", "NA"]
    in_text = field_of(awkward_described.folder, "trials.csv", "cue")
    in_parquet = field_of(awkward_described.folder, "trials.parquet", "cue")
    assert in_text["constraints"]["enum"] == ["'=1+1", *levels[1:]]
    assert in_text["categories"] == ["'=1+1", *levels[1:]]
    assert in_parquet["categories"] == levels


def test_numbers_have_the_limits_that_they_must_have(orchard_described: Described) -> None:
    """A duration is never negative, a flag is 0 or 1; an onset is as the log counts it."""
    folder = orchard_described.folder
    limits = {
        name: field_of(folder, "fixations.csv", name).get("constraints", {})
        for name in ("duration_ms", "kept", "onset_ms")
    }
    assert limits == {
        "duration_ms": {"required": True, "minimum": 0},
        "kept": {"required": True, "minimum": 0, "maximum": 1},
        "onset_ms": {},
    }


def test_reasons_are_categories_with_labels(orchard_described: Described) -> None:
    """A program that knows categories shows what each reason means."""
    field = field_of(orchard_described.folder, "outcomes.csv", "missing")
    assert {"value": "refixated", "label": "the first pass has more than one fixation"} in (
        field["categories"]
    )


def test_empty_cells_are_the_only_missing_ones(orchard_described: Described) -> None:
    """Every table says that an empty cell, and nothing else, is no value."""
    for own in package_of(orchard_described.folder)["resources"]:
        if "schema" in own:
            assert own["schema"]["missingValues"] == [""]


def test_rows_are_told_apart_by_their_keys(awkward_described: Described) -> None:
    """The key of outcomes has the trial, the region's order and the outcome, and no text."""
    schema = resource_of(awkward_described.folder, "outcomes.csv")["schema"]
    assert schema["primaryKey"] == ["participant", "trial", "region_order", "measure"]


@pytest.mark.parametrize(
    ("title", "name"),
    [("Café: Part 2", "cafe-part-2"), ("", "reading-outcomes"), ("読書", "study")],
    ids=["letters with marks", "no title", "no Latin letter"],
)
def test_package_has_a_name_in_plain_letters(tmp_path: Path, title: str, name: str) -> None:
    """Names are letters, digits and hyphens; the title stays as it is."""
    study = described(small_study(tmp_path, {}, title=title), tmp_path / "o")
    package = package_of(study.folder)
    assert package["name"] == name
    assert package["title"] == (title or "Reading outcomes")
