"""The same inputs give the same bytes, whatever the place, the order or the number of workers."""

from __future__ import annotations

import glob
import shutil
from pathlib import Path

import pandas as pd
import pytest

from tests.end_to_end.building import (
    PROJECT,
    TABLES,
    Sample,
    build,
    copied_sample,
    files_of,
    tables_of,
)
from tests.end_to_end.odd_study import odd_study

#: What the data package of a folder is called.
PACKAGE = "datapackage.json"


def different(folder: Path, other: Path) -> list[str]:
    """Names of the published files that differ; every table must be there in both formats."""
    one, two = tables_of(folder), tables_of(other)
    assert set(one) >= {f"{name}.{kind}" for name in TABLES for kind in ("parquet", "csv")}
    return sorted(name for name in one.keys() | two.keys() if one.get(name) != two.get(name))


@pytest.mark.slow
@pytest.mark.parametrize("workers", [2, 3])
def test_number_of_workers_changes_no_byte(orchard: Sample, tmp_path: Path, workers: int) -> None:
    """Two or three processes write what one writes."""
    again = build(orchard.folder / "study.toml", tmp_path / "built", workers=workers)
    assert different(orchard.result.folder, again.folder) == []
    assert again.counts == orchard.result.counts
    assert again.findings.lines() == orchard.result.findings.lines()


def test_building_again_changes_no_byte(sample: Sample, tmp_path: Path) -> None:
    """A second build writes the same."""
    again = build(sample.folder / "study.toml", tmp_path / "built")
    assert different(sample.result.folder, again.folder) == []


def test_place_of_the_study_changes_no_byte(sample: Sample, tmp_path: Path) -> None:
    """A copy of the study in a folder with an awkward name builds alike."""
    study_file = copied_sample(sample.name, tmp_path / "Bäume und so [2]")
    again = build(study_file, tmp_path / "built")
    assert different(sample.result.folder, again.folder) == []


def test_order_in_which_logs_are_named_changes_no_byte(orchard: Sample, tmp_path: Path) -> None:
    """Patterns the other way round, and overlapping ones, name the same logs."""
    changes = {'"logs/*.tsv", "logs/*.csv", "logs/*.gz"': '"logs/P2*", "logs/*.gz", "logs/P*"'}
    again = build(copied_sample("orchard", tmp_path, changes), tmp_path / "built")
    # The page shows the study as understood, and so the patterns themselves; the data packages
    # know the page by its digest.
    assert different(orchard.result.folder, again.folder) == sorted(
        f"{folder}{name}" for folder in ("", "handoff/") for name in ("audit.html", PACKAGE)
    )


def test_order_in_which_the_file_system_lists_logs_changes_no_byte(
    orchard: Sample, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Logs are taken by name, however the file system lists them."""
    real, listed = glob.glob, []

    def backwards(*arguments: object, **named: object) -> list[str]:
        listed.append(sorted(real(*arguments, **named), reverse=True))
        return listed[-1]

    monkeypatch.setattr("etl.session.log_files.glob.glob", backwards)
    again = build(orchard.folder / "study.toml", tmp_path / "built")
    assert different(orchard.result.folder, again.folder) == []
    assert sum(map(len, listed)) == 23


def test_order_of_trials_in_a_log_changes_only_their_lines(tmp_path: Path) -> None:
    """Trials in another order give the same tables; lines of the log, where told, are new."""
    one = build(odd_study(tmp_path / "one"))
    other = build(odd_study(tmp_path / "other", later_trials_first=True))
    lines = ["audit.html", PACKAGE, "exclusions.csv", "fixations.csv", "fixations.parquet"]
    assert different(one.folder, other.folder) == [*lines, *(f"handoff/{name}" for name in lines)]
    plain, moved = (r.fixations.drop(columns="source_line") for r in (one, other))
    assert plain.equals(moved)
    plain, moved = (
        pd.read_csv(r.folder / "exclusions.csv", encoding="utf-8").drop(columns="source_line")
        for r in (one, other)
    )
    assert plain.equals(moved)


def test_time_of_the_files_changes_no_byte(tmp_path: Path) -> None:
    """When the inputs were written is of no matter, and nothing of it is in the run record."""
    study_file = odd_study(tmp_path / "one")
    one = build(study_file)
    shutil.copytree(study_file.parent, tmp_path / "two", ignore=shutil.ignore_patterns("out"))
    two = build(tmp_path / "two" / "study.toml")
    assert different(one.folder, two.folder) == []


def test_nothing_of_this_machine_is_in_what_is_published(sample: Sample) -> None:
    """No published file names the folder of the study, not even the run record."""
    for name, content in files_of(sample.result.folder).items():
        for place in (PROJECT, sample.folder.parents[1]):
            assert str(place).encode() not in content, name
