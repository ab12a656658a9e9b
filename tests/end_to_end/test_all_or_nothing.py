"""Output appears all at once or not at all; an earlier build is kept or replaced as a whole."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

import etl
from etl.export.writers import TableWriters
from tests.end_to_end.building import PUBLISHED, PUBLISHED_WITH_CSV, build, files_of, write
from tests.end_to_end.odd_study import STUDY, odd_study


@pytest.fixture
def study_file(tmp_path: Path) -> Path:
    """A small study without a build."""
    return odd_study(tmp_path / "study")


@pytest.fixture
def built(study_file: Path) -> Path:
    """The output folder of a small study that was built once."""
    return build(study_file).folder


def spoil(study_file: Path, name: str, old: str, new: str) -> None:
    """Put a mistake into one of the study's files."""
    path = study_file.parent / name
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), encoding="utf-8", newline="\n")


MISTAKES = {
    "word in a log": ("log.csv", '"180.125"', '"long"', 'column "dur": this is no number'),
    "order with a gap": ("regions.csv", "c,Ende,3", "c,Ende,4", "order"),
    "level not listed": ("log.csv", '"early"', '"often"', "a level that is not listed"),
    "trial recorded twice": ("study.toml", '"first"', '"error"', "is recorded a second time"),
}


@pytest.mark.parametrize("mistake", MISTAKES)
def test_failing_build_leaves_the_earlier_one_as_it_was(
    study_file: Path, built: Path, mistake: str
) -> None:
    """Whatever is wrong, the earlier tables stay, byte for byte, and nothing else is left."""
    name, old, new, message = MISTAKES[mistake]
    before = files_of(built)
    beside = sorted(path.name for path in study_file.parent.iterdir())
    spoil(study_file, name, old, new)
    with pytest.raises(etl.DataError, match=message):
        build(study_file)
    assert files_of(built) == before
    assert sorted(path.name for path in study_file.parent.iterdir()) == beside


@pytest.mark.parametrize("mistake", MISTAKES)
def test_failing_first_build_writes_nothing(study_file: Path, mistake: str) -> None:
    """Without an earlier build there is no folder afterwards."""
    name, old, new, message = MISTAKES[mistake]
    spoil(study_file, name, old, new)
    with pytest.raises(etl.DataError, match=message):
        build(study_file)
    files = sorted(path.name for path in study_file.parent.iterdir())
    assert files == ["log.csv", "regions.csv", "study.toml"]


@pytest.mark.parametrize("stage", ["reading logs", "working on readers"])
def test_interrupted_build_leaves_the_earlier_one_as_it_was(
    study_file: Path, built: Path, stage: str
) -> None:
    """Ctrl-C at any stage leaves the earlier tables and no temporary folder."""
    before = files_of(study_file.parent)

    def interrupt(now: str, done: int, total: int) -> None:  # noqa: ARG001
        if now == stage:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        etl.build(etl.load_study(study_file), workers=1, progress=interrupt)
    assert files_of(study_file.parent) == before
    assert list(built.parent.glob(".*")) == []


def test_disk_that_fills_up_leaves_the_earlier_build_as_it_was(
    study_file: Path, built: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """An error while rows are written is like any other."""
    before = files_of(study_file.parent)

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(TableWriters, "add", full)
    with pytest.raises((OSError, etl.DataError), match="No space left"):
        build(study_file)
    assert files_of(study_file.parent) == before
    assert list(built.parent.glob(".*")) == []


@pytest.mark.parametrize("call", [1, 2], ids=["old one aside", "new one in place"])
def test_folder_that_cannot_be_moved_leaves_the_earlier_build_as_it_was(
    study_file: Path, built: Path, monkeypatch: pytest.MonkeyPatch, call: int
) -> None:
    """As on systems where a file that is open elsewhere cannot be renamed."""
    before = files_of(study_file.parent)
    real, calls = Path.replace, []
    monkeypatch.setattr("etl.export.swapping.exchange", lambda *_: False)

    def refuse(path: Path, target: Path) -> Path:
        calls.append(path)
        if len(calls) == call:
            raise PermissionError(13, "Permission denied")
        return real(path, target)

    monkeypatch.setattr(Path, "replace", refuse)
    with pytest.raises(etl.DataError, match="close programs that have files of it open"):
        build(study_file)
    assert files_of(study_file.parent) == before
    assert list(built.parent.glob(".*")) == []


def test_build_replaces_an_earlier_one_as_a_whole(study_file: Path, built: Path) -> None:
    """Nothing of the earlier build remains, such as tables in a format no longer asked for."""
    spoil(study_file, "study.toml", 'formats = ["parquet", "csv"]', 'formats = ["parquet"]')
    build(study_file)
    assert set(files_of(built)) == PUBLISHED


def test_file_added_to_an_earlier_build_is_not_lost(study_file: Path, built: Path) -> None:
    """A build replaces a folder as a whole, so one that holds somebody's file is refused."""
    (built / "remarks.txt").write_text("mine", encoding="utf-8")
    before = files_of(study_file.parent)
    with pytest.raises(etl.DataError, match=r'files that no build wrote.*found "remarks\.txt"'):
        build(study_file)
    assert files_of(study_file.parent) == before


def test_build_leaves_nothing_but_its_folder(study_file: Path) -> None:
    """Beside the study there are the output folder and what is kept for the next build."""
    build(study_file)
    files = sorted(path.name for path in study_file.parent.iterdir())
    assert files == ["log.csv", "out", "out.kept", "regions.csv", "study.toml"]


def test_empty_folder_is_a_place_to_build_into(study_file: Path, tmp_path: Path) -> None:
    """An empty folder is filled."""
    (tmp_path / "empty").mkdir()
    build(study_file, tmp_path / "empty")
    assert set(files_of(tmp_path / "empty")) == PUBLISHED_WITH_CSV


def test_folders_above_the_output_are_made(study_file: Path, tmp_path: Path) -> None:
    """A folder in folders that are not there yet."""
    build(study_file, tmp_path / "a" / "b" / "c")
    assert set(files_of(tmp_path / "a" / "b" / "c")) == PUBLISHED_WITH_CSV


def foreign_file(folder: Path) -> None:
    """A folder with a file of somebody else's."""
    write(folder, {"thesis.txt": "years of work\n"})


def foreign_record(folder: Path) -> None:
    """A folder with a run.json of another program."""
    write(folder, {"run.json": '{"program": "another"}\n', "thesis.txt": "years of work\n"})


def record_that_is_none(folder: Path) -> None:
    """A folder with a run.json that is no JSON."""
    write(folder, {"run.json": "{", "thesis.txt": "years of work\n"})


@pytest.mark.parametrize("make", [foreign_file, foreign_record, record_that_is_none])
def test_folder_of_somebody_else_is_refused(
    study_file: Path, tmp_path: Path, make: Callable[[Path], None]
) -> None:
    """A folder with contents that are not ours is left alone, and the message says why."""
    make(tmp_path / "theirs")
    before = files_of(tmp_path)
    with pytest.raises(etl.DataError, match="something else than an earlier build"):
        build(study_file, tmp_path / "theirs")
    assert files_of(tmp_path) == before


def test_file_in_the_place_of_the_output_is_refused(study_file: Path, tmp_path: Path) -> None:
    """A file is not replaced by a folder."""
    write(tmp_path, {"results": "mine\n"})
    before = files_of(tmp_path)
    with pytest.raises(etl.DataError, match="the output folder is a file"):
        build(study_file, tmp_path / "results")
    assert files_of(tmp_path) == before


def test_study_folder_itself_is_no_place_to_build_into(study_file: Path) -> None:
    """The inputs are never replaced by the output."""
    before = files_of(study_file.parent)
    with pytest.raises(etl.DataError, match="something else than an earlier build"):
        build(study_file, study_file.parent)
    assert files_of(study_file.parent) == before


@pytest.mark.parametrize(
    ("formats", "expected"),
    [
        ('["parquet"]', PUBLISHED),
        ('["csv", "parquet"]', PUBLISHED_WITH_CSV),
        ('["csv"]', PUBLISHED_WITH_CSV),
    ],
)
def test_parquet_is_always_written_and_csv_if_asked(
    tmp_path: Path, formats: str, expected: set[str]
) -> None:
    """Each table as Parquet and, if asked, as CSV."""
    study_file = odd_study(tmp_path)
    study = STUDY.replace('["parquet", "csv"]', formats)
    assert study != STUDY or "parquet" in formats
    write(tmp_path, {"study.toml": study})
    assert set(files_of(build(study_file).folder)) == expected


def test_check_writes_nothing(study_file: Path) -> None:
    """A check leaves the study's folder as it is."""
    before = files_of(study_file.parent)
    findings = etl.check(etl.load_study(study_file), workers=1)
    assert not findings.failed
    assert files_of(study_file.parent) == before
    assert not (study_file.parent / "out").exists()


@pytest.mark.parametrize("mistake", MISTAKES)
def test_check_finds_what_a_build_would_refuse(study_file: Path, mistake: str) -> None:
    """A check lists the same problems as the build that fails."""
    name, old, new, _ = MISTAKES[mistake]
    spoil(study_file, name, old, new)
    study = etl.load_study(study_file)
    with pytest.raises(etl.DataError) as refused:
        etl.build(study, workers=1)
    found = [f.text() for f in etl.check(study, workers=1).of("error")]
    assert found == [f.text() for f in refused.value.findings.of("error")]
