"""Who read, by the names of the logs; and the patterns that find the logs."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

import etl
from etl.drafting.found_logs import find_named, patterns_for
from etl.drafting.readers import pattern_of
from etl.errors import Findings
from tests.drafting.small_logs import put, write_readers

NAMELESS = {"trial": "trial", "start": "onset", "dur": "duration", "x": "x", "y": "y"}


@pytest.mark.parametrize(
    ("names", "known", "said"),
    [
        pytest.param(
            ["P01.tsv", "P02.tsv"], (), {"participant": ("P01", "P02")}, id="letter and number"
        ),
        pytest.param(["12.csv", "7.csv"], (), {"participant": ("12", "7")}, id="number"),
        pytest.param(
            ["reader12_log.txt", "reader7_log.txt"],
            (),
            {"participant": ("12", "7")},
            id="number after a word",
        ),
        pytest.param(
            ["log_anna.txt", "log_ben.txt"], (), {"participant": ("anna", "ben")}, id="names"
        ),
        pytest.param(
            ["log_anna2.txt", "log_ben.txt"],
            (),
            {"participant": ("anna2", "ben")},
            id="names of different forms",
        ),
        pytest.param(
            ["P1_1.tsv", "P1_2.tsv", "P2_1.tsv", "P2_2.tsv"],
            ("trial",),
            {"participant": ("P1", "P1", "P2", "P2"), "session": ("1", "2", "1", "2")},
            id="sessions",
        ),
        pytest.param(
            ["day1_vp3.tsv", "day2_vp3.tsv", "day1_vp4.tsv"],
            ("trial",),
            {"participant": ("vp3", "vp3", "vp4"), "session": ("1", "2", "1")},
            id="the reader second",
        ),
        pytest.param(
            ["P1_trial07.tsv", "P1_trial12.tsv", "P2_trial07.tsv"],
            (),
            {"participant": ("P1", "P1", "P2"), "trial": ("07", "12", "07")},
            id="trials",
        ),
        pytest.param(
            ["P31_bees.csv", "P31_frost.csv", "P32_bees.csv"],
            ("trial",),
            {"participant": ("P31", "P31", "P32"), "item": ("bees", "frost", "bees")},
            id="texts",
        ),
        pytest.param(
            ["P31_bees.csv", "P31_frost.csv", "P32_bees.csv"],
            ("trial", "item"),
            {"participant": ("P31", "P31", "P32")},
            id="texts that a column names",
        ),
    ],
)
def test_pattern_takes_out_what_differs(
    names: list[str], known: tuple[str, ...], said: dict[str, tuple[str, ...]]
) -> None:
    """The parts in which names differ are the reader, and a session, a trial or a text."""
    found = pattern_of(names, known)
    assert found is not None
    assert found.said == said


@pytest.mark.parametrize("names", [["data.tsv"], ["a.tsv", "a.csv"], ["P1_2_3.t", "P4_5_6.t"]])
def test_no_pattern_is_made_up(names: list[str]) -> None:
    """One name, equal names, or three differing parts say nothing for certain."""
    assert pattern_of(names) is None


def test_reader_from_the_name_gives_the_pattern(tmp_path: Path) -> None:
    """Where no column says who read, the draft has the pattern, and no question."""
    drafted = etl.draft(write_readers(tmp_path, NAMELESS))
    logs = tomllib.loads(drafted.text)["logs"]
    assert logs["participant_from_name"] == r"(?P<participant>P\d+)"
    assert "participant" not in logs["columns"]


def test_single_log_without_a_reader_is_a_question(tmp_path: Path) -> None:
    """One name alone does not show which part of it is the reader."""
    drafted = etl.draft(write_readers(tmp_path, NAMELESS, readers=1))
    assert drafted.questions[0].key == "logs.columns.participant"


@pytest.mark.parametrize(
    ("files", "named", "patterns"),
    [
        pytest.param(["logs/a.tsv", "logs/b.tsv"], None, ["logs/*.tsv"], id="a folder"),
        pytest.param(
            ["logs/a.tsv", "logs/b.tsv", "logs/c.csv"],
            None,
            ["logs/*.tsv", "logs/c.csv"],
            id="two kinds",
        ),
        pytest.param(
            ["logs/P1.tsv", "logs/P2.tsv", "logs/key.tsv"],
            ["logs/P1.tsv", "logs/P2.tsv"],
            ["logs/P*.tsv"],
            id="other files beside them",
        ),
        pytest.param(
            ["logs/P1.tsv", "logs/P2.tsv", "logs/P3.tsv"],
            ["logs/P1.tsv", "logs/P3.tsv"],
            ["logs/P1.tsv", "logs/P3.tsv"],
            id="some of many",
        ),
        pytest.param(["r1/log.tsv", "r2/log.tsv"], None, ["*/*.tsv"], id="a folder a reader"),
        pytest.param(
            ["r1/a/log.tsv", "r2/log.tsv"], None, ["**/*.tsv"], id="folders of different depth"
        ),
        pytest.param(["a.tsv.gz", "b.tsv.gz"], None, ["*.tsv.gz"], id="packed"),
        pytest.param(["P[1].tsv"], None, ["P[[]1].tsv"], id="a name that looks like a pattern"),
        pytest.param(["one", "two"], None, ["one", "two"], id="names without an ending"),
    ],
)
def test_patterns_find_exactly_the_logs(
    files: list[str], named: list[str] | None, patterns: list[str], tmp_path: Path
) -> None:
    """A pattern where it finds these logs and no other file, and else their names."""
    for file in files:
        put(tmp_path / file, "text\n")
    found, _ = patterns_for([tmp_path / file for file in named or files], tmp_path)
    assert found == patterns


def test_patterns_are_relative_to_the_study_file(tmp_path: Path) -> None:
    """From another folder the way leads up, with forward slashes."""
    for name in ("P1.tsv", "P2.tsv"):
        put(tmp_path / "lab" / "logs" / name, "text\n")
    logs = sorted((tmp_path / "lab" / "logs").iterdir())
    assert patterns_for(logs, tmp_path / "studies")[0] == ["../lab/logs/*.tsv"]


def test_patterns_and_folders_are_expanded_here(tmp_path: Path) -> None:
    """Where a shell does not expand patterns, the program does; a folder means the files in it."""
    for name in ("P10.tsv", "P9.tsv", ".hidden", "notes.md", "Thumbs.db"):
        put(tmp_path / name, "text\n")
    wanted = [tmp_path / "P9.tsv", tmp_path / "P10.tsv"]
    assert find_named([tmp_path], Findings()) == (wanted, set(wanted))
    named = [str(tmp_path / "P*.tsv"), tmp_path / "P9.tsv"]
    assert find_named(named, Findings()) == (wanted, set())


@pytest.mark.parametrize(
    ("named", "said"),
    [
        ("logs/*.csv", "logs/*.csv: no file has a name like this"),
        ("logs", "logs: there is no log in this folder"),
        ("logs/P1.tsv", "logs/P1.tsv: there is no such file"),
    ],
)
def test_names_of_nothing_are_refused(
    named: str, said: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A pattern, a folder or a file that is not there is told by its name."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "logs").mkdir()
    with pytest.raises(etl.DataError) as wrong:
        etl.draft([named])
    assert str(wrong.value).startswith(said)


def test_files_of_a_folder_that_are_no_logs_are_left_out(tmp_path: Path) -> None:
    """What lies beside the logs is named with why it is none, and the pattern finds the logs."""
    columns = {"reader": "participant", **NAMELESS}
    write_readers(tmp_path, columns)
    put(tmp_path / "readers.tsv", "participant\tage\nP01\t30\nP02\t31\n")
    (tmp_path / "photo.bin").write_bytes(b"\x89PNG\r\n\x1a\n")
    drafted = etl.draft(tmp_path)
    warned = {Path(one.path).name: one.problem for one in drafted.findings}
    assert warned == {
        "photo.bin": "this file of the folder was left out: this is no text file: it begins like "
        "a picture (PNG)",
        "readers.tsv": "this file of the folder has other columns than most, and was left out",
    }
    assert drafted.logs == 3
    files = tomllib.loads(drafted.text)["logs"]["files"]
    assert [Path(name).name for name in files] == ["P*.tsv"]
