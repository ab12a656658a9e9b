"""A build never replaces what people have put into the bundle, or changed there."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest

import etl
from etl.export.earlier import check_target
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
    "name",
    [
        "my_model.R",
        *(".RData", "Rplots.pdf", ".Rproj.user/a/unsaved", ".ipynb_checkpoints/a.ipynb"),
        *("__pycache__/notes.txt", "figures/rates.png", "start.R/notes.txt"),
    ],
    ids=str,
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


@pytest.mark.parametrize(
    "name",
    [
        *("handoff/start.R", "handoff/start.py", "handoff/README.md", "handoff/codebook.md"),
        *("handoff/outcomes_wide.csv", "codebook.md", "outcomes.csv", "audit.html"),
    ],
)
def test_changed_file_stops_a_build(study_file: Path, bundle: Path, name: str) -> None:
    """A script, page or table that somebody worked on is named and stays as it is."""
    changed = bundle.parent / name
    changed.write_bytes(changed.read_bytes() + b"# mine\n")
    before = files_of(bundle.parent)
    with pytest.raises(
        etl.DataError,
        match=f'were changed since .*found "{name}"(?s:.*)undo the changes or delete these files',
    ):
        etl.build(etl.load_study(study_file), into=bundle.parent)
    assert files_of(bundle.parent) == before


def test_changed_value_of_the_same_length_is_seen(study_file: Path, bundle: Path) -> None:
    """Neither size nor time of a file tell whether somebody worked on it."""
    table = bundle / "trials.csv"
    times = (table.stat().st_atime_ns, table.stat().st_mtime_ns)
    table.write_bytes(table.read_bytes().replace(b"late", b"LATE", 1))
    os.utime(table, ns=times)
    with pytest.raises(etl.DataError, match=r'were changed since .*found "handoff/trials\.csv"'):
        etl.build(etl.load_study(study_file), into=bundle.parent)


def test_changed_file_that_was_deleted_stops_no_build(study_file: Path, bundle: Path) -> None:
    """A table that a spreadsheet spoiled is deleted, and the build makes it anew."""
    before = (bundle / "outcomes.csv").read_bytes()
    (bundle / "outcomes.csv").unlink()
    etl.build(etl.load_study(study_file), into=bundle.parent)
    assert (bundle / "outcomes.csv").read_bytes() == before


def test_file_that_cannot_be_read_stops_a_build(
    study_file: Path, bundle: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A table that another program holds is told of, without a traceback."""

    def held(_: Path) -> str:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("etl.export.earlier.digest_of", held)
    with pytest.raises(etl.DataError, match="close programs that have files of it open"):
        etl.build(etl.load_study(study_file), into=bundle.parent)


def test_untouched_bundle_is_replaced(study_file: Path, bundle: Path) -> None:
    """A second build needs no tidying up after the first."""
    litter = (".DS_Store", ".Rhistory", "__pycache__/start.cpython-311.pyc")
    write(bundle, dict.fromkeys(litter, "what programs leave behind"))
    etl.build(etl.load_study(study_file), into=bundle.parent)
    assert [name for name in litter if (bundle / name).exists()] == []
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
