"""A build never replaces what people have put into the bundle, or changed there."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

import etl
from etl.export.publish import check_target
from tests.end_to_end.building import files_of, write
from tests.handoff.bundles import bundle_of, small_study

FIX = r"move these files elsewhere, or name another folder, by \[output\] folder or --into"


@pytest.fixture(scope="session")
def study_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A small study."""
    return small_study(tmp_path_factory.mktemp("kept"), {"cue": ["early", "late"]})


@pytest.fixture
def bundle(study_file: Path, tmp_path: Path) -> Path:
    """The bundle of a build of it, in a folder of its own."""
    return etl.build(etl.load_study(study_file), into=tmp_path / "out").folder / "handoff"


@pytest.mark.parametrize(
    "name", ["my_model.R", ".RData", "figures/rates.png", "start.R/notes.txt"], ids=str
)
def test_file_of_a_statistician_in_the_bundle_stops_a_build(
    study_file: Path, tmp_path: Path, name: str
) -> None:
    """A file, or a folder, that no build wrote is named and stays, and so does everything else."""
    bundle = etl.build(etl.load_study(study_file), into=tmp_path / "out").folder / "handoff"
    if name.startswith("start.R"):
        (bundle / "start.R").unlink()
    write(bundle, {name: "weeks of work\n"})
    before = files_of(tmp_path)
    shown = f"handoff/{name.partition('/')[0]}"
    with pytest.raises(etl.DataError, match=f'no build wrote.*found "{shown}",(?s:.*){FIX}'):
        etl.build(etl.load_study(study_file), into=tmp_path / "out")
    assert files_of(tmp_path) == before


@pytest.mark.parametrize("name", ["start.R", "start.py"])
def test_changed_script_stops_a_build(study_file: Path, bundle: Path, name: str) -> None:
    """A starter script that somebody worked on is named and stays as it is."""
    changed = bundle / name
    changed.write_bytes(changed.read_bytes() + b"# mine\n")
    before = files_of(bundle.parent)
    with pytest.raises(etl.DataError, match=f'were changed since .*found "handoff/{name}"'):
        etl.build(etl.load_study(study_file), into=bundle.parent)
    assert files_of(bundle.parent) == before


def test_untouched_bundle_is_replaced(study_file: Path, bundle: Path) -> None:
    """A second build needs no tidying up after the first."""
    write(bundle, {".DS_Store": "what a computer leaves behind"})
    etl.build(etl.load_study(study_file), into=bundle.parent)
    assert not (bundle / ".DS_Store").exists()
    assert (bundle / "start.R").exists()


def test_build_by_an_earlier_version_is_replaced(tmp_path: Path) -> None:
    """A record without a bundle lists names only; they are known all the same."""
    record = json.dumps({"program": "trialwright", "files": ["outcomes.csv"]})
    write(tmp_path, {"run.json": record, "outcomes.csv": "x\n"})
    check_target(tmp_path, "out")


def test_file_in_a_bundle_of_an_earlier_version_stops_a_build(tmp_path: Path) -> None:
    """Where no build wrote a bundle, a folder of that name is somebody's own."""
    record = json.dumps({"program": "trialwright", "files": ["outcomes.csv"]})
    write(tmp_path, {"run.json": record, "outcomes.csv": "x\n", "handoff/a.R": "mine\n"})
    with pytest.raises(etl.DataError, match='found "handoff",'):
        check_target(tmp_path, "out")


def test_damaged_list_of_files_makes_everything_strange(tmp_path: Path) -> None:
    """A record that lists nothing sensible vouches for nothing."""
    write(tmp_path, {"run.json": '{"program": "trialwright", "files": 3}', "a.csv": "x\n"})
    with pytest.raises(etl.DataError, match=r'found "a\.csv",'):
        check_target(tmp_path, "out")


def test_folder_that_was_sent_away_is_no_place_to_build_into(
    study_file: Path, bundle: Path
) -> None:
    """A bundle by itself has a run record, and is no output folder."""
    before = files_of(bundle)
    with pytest.raises(etl.DataError, match="no build wrote"):
        etl.build(etl.load_study(study_file), into=bundle)
    assert files_of(bundle) == before


def test_bundle_is_made_anew_every_time(tmp_path: Path) -> None:
    """What is no longer written is gone after the next build."""
    study_file = small_study(tmp_path, {"cue": ["early", "late"]})
    assert (bundle_of(study_file) / "outcomes.csv").exists()
    text = study_file.read_text(encoding="utf-8").replace('["parquet", "csv"]', '["parquet"]')
    study_file.write_text(text, encoding="utf-8", newline="\n")
    assert not (bundle_of(study_file) / "outcomes.csv").exists()
