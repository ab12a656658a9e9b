"""The commands with pseudonyms: the console has the ids, what is written has pseudonyms."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from etl.cli import main
from tests.end_to_end.building import build, rows_of
from tests.lines.passages_study import STUDY, Passages, read_through
from tests.pseudonyms.named_study import DISTINCTIVE, write_study
from tests.pseudonyms.searching import found_in

IDS = ("Quillfeather07", "Brambleton12")
TRIALS = {(reader, "1"): read_through(seed) for seed, reader in enumerate(IDS, start=1)}
ASKED = STUDY + "[output]\npseudonyms = true\n"


def run(*words: str) -> Result:
    """Run the command."""
    return CliRunner().invoke(main, list(words))


def names_in(folder: Path) -> dict[str, str]:
    """What each reader is called, by the key file."""
    with (folder / "study_pseudonyms.csv").open(encoding="utf-8", newline="") as file:
        return {row["stands_for"]: row["name"] for row in csv.DictReader(file)}


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The folder of a built study of passages, in which the commands are called."""
    build(Passages(TRIALS, ASKED).written(tmp_path))
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_console_names_readers_and_logs_as_the_lab_does(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Check and build tell of the ids and files that the lab knows."""
    write_study(tmp_path)
    monkeypatch.chdir(tmp_path)
    for command in ("check", "build", "build"):
        said = run(command, "study.toml").stdout
        assert 'found "participant Brambleton-12, trial 5"' in said
        assert "note: logs/Quillfeather07.tsv:34: the log holds 32 lines" in said
        assert "readers Quillfeather07.xlsx#Brambleton-12:8: the reader is in the table" in said
        if command == "build":
            given = [name for name in names_in(tmp_path).values() if len(name) > 7]
            assert len(given) > 10
            assert [name for name in given if name in said] == []


def test_errors_name_readers_and_logs_as_the_lab_does(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What stops a build is told of the file in which it is."""
    write_study(tmp_path, {"trial_list.csv": "participant,trial,cue,block,owner\n7,1,late,a,b\n"})
    monkeypatch.chdir(tmp_path)
    said = run("build", "study.toml").stderr
    assert (
        "logs/Quillfeather07.tsv:2: trial_list.csv has no row for this participant and trial; "
        'found "participant Quillfeather07, trial 1"'
    ) in said


def test_near_id_is_offered(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A reader whom the table writes otherwise is told by the ids, not by what stands for them."""
    text = ASKED + '[participants]\ntable = "who.csv"\n[trials]\ncovariates = ["age"]\n'
    who = "participant,age\nQuilfeather07,40\nBrambleton12,50\n"
    Passages(TRIALS, text, more={"who.csv": who}).written(tmp_path)
    monkeypatch.chdir(tmp_path)
    assert '(it has "Quilfeather07")' in run("check", "study.toml").stderr


@pytest.mark.parametrize("by", ["id", "pseudonym"])
def test_trace_takes_either_and_shows_the_pseudonym(folder: Path, by: str) -> None:
    """A trial may be asked for by what the lab knows or by what the tables say."""
    name = names_in(folder)["Quillfeather07"]
    traced = run("trace", "study.toml", "Quillfeather07" if by == "id" else name, "1")
    assert traced.exit_code == 0
    assert name in traced.stdout
    assert "Quillfeather" not in traced.stdout


@pytest.mark.parametrize("kind", ["svg", "html"])
def test_picture_names_nobody(folder: Path, kind: str) -> None:
    """A picture may be handed on like the tables."""
    shown = folder / "shown"
    shown.mkdir()
    run("trace", "study.toml", "Quillfeather07", "1", "--picture", f"shown/one.{kind}")
    assert [path.name for path in shown.iterdir()] == [f"one.{kind}"]
    assert found_in(shown, IDS) == {}


def test_trace_needs_the_key(folder: Path) -> None:
    """Without it nobody could be shown by the pseudonym of the tables."""
    (folder / "study_pseudonyms.csv").unlink()
    traced = run("trace", "study.toml", "Quillfeather07", "1")
    assert (traced.exit_code, traced.stdout) == (2, "")
    assert traced.stderr == (
        "study_pseudonyms.csv: there is no key to the pseudonyms of this study yet; expected the "
        "file that a build writes beside the study file\n"
        "    fix: build the study first, or put the file back\n"
        "1 problem; nothing was written\n"
    )


@pytest.mark.usefixtures("folder")
def test_reader_who_is_not_there_is_told_by_id() -> None:
    """The list of readers, and the one who may be meant, are the lab's."""
    said = run("trace", "study.toml", "Quillfeather7", "1").stderr
    assert 'found "Quillfeather7"' in said
    assert "Brambleton12" in said
    assert 'did you mean "Quillfeather07"?' in said


def test_lines_are_written_by_pseudonym_and_read_by_either(folder: Path) -> None:
    """A table of lines may be handed round; who knows the ids may add rows by them."""
    name = names_in(folder)["Quillfeather07"]
    run("trace", "study.toml", "Quillfeather07", "1", "--lines", "hand.csv")
    with (folder / "hand.csv").open(encoding="utf-8-sig", newline="") as file:
        rows = list(csv.DictReader(file))
    assert {row["participant"] for row in rows} == {name}
    own = f"{name},1,5,3\nQuillfeather07,1,8,0\nBrambleton12,1,2,2\n"
    (folder / "hand.csv").write_text("participant,trial,fixation,line\n" + own, encoding="utf-8")
    study_file = folder / "study.toml"
    study_file.write_text(ASKED + '[lines]\ncorrections = "hand.csv"\n', encoding="utf-8")
    result = build(study_file)
    assert result.counts["lines set by hand"] == 3
    lines = {
        (row["participant"], row["fixation"]): row["line"]
        for row in rows_of(result.folder, "fixations")
    }
    assert (lines[name, 5], lines[name, 8]) == (3, None)
    assert lines[names_in(folder)["Brambleton12"], 2] == 2


def test_lines_that_are_there_by_id_are_not_added_again(folder: Path) -> None:
    """Rows of a reader count as there whether they name the id or the pseudonym."""
    head = "participant,trial,fixation,line\n"
    (folder / "hand.csv").write_text(head + "Quillfeather07,1,5,3\n", encoding="utf-8")
    said = run("trace", "study.toml", "Quillfeather07", "1", "--lines", "hand.csv").stdout
    assert "1 was there already" in said
    with (folder / "hand.csv").open(encoding="utf-8-sig", newline="") as file:
        numbers = [row["fixation"] for row in csv.DictReader(file)]
    assert numbers.count("5") == 1


def test_one_line_set_twice_by_both_names_is_refused(folder: Path) -> None:
    """An id and its pseudonym are one reader."""
    name = names_in(folder)["Quillfeather07"]
    rows = f"participant,trial,fixation,line\n{name},1,5,3\nQuillfeather07,1,5,2\n"
    (folder / "hand.csv").write_text(rows, encoding="utf-8")
    (folder / "study.toml").write_text(
        ASKED + '[lines]\ncorrections = "hand.csv"\n', encoding="utf-8"
    )
    said = run("check", "study.toml").stderr
    assert "hand.csv:3: the line of a fixation is set twice" in said
    assert 'found "participant Quillfeather07, trial 1, fixation 5"' in said


def test_table_of_lines_that_names_a_reader_has_another_name_in_the_output(
    folder: Path,
) -> None:
    """The ledger and the page name the table by which a line was set."""
    (folder / "by Quillfeather07.csv").write_text(
        "participant,trial,fixation,line\nBrambleton12,1,2,2\n", encoding="utf-8"
    )
    (folder / "study.toml").write_text(
        ASKED + '[lines]\ncorrections = "by Quillfeather07.csv"\n', encoding="utf-8"
    )
    result = build(folder / "study.toml")
    assert result.counts["lines set by hand"] == 1
    assert found_in(result.folder, (*IDS, *DISTINCTIVE)) == {}


def test_text_of_one_reader_is_found_by_the_pseudonym(folder: Path) -> None:
    """Region definitions may be keyed by reader: each saw a text of their own."""
    text = (folder / "regions.tsv").read_text(encoding="utf-8")
    head, row = text.splitlines()
    keyed = [f"participant\t{head}", *(f"{reader}\t{row}" for reader in IDS), ""]
    (folder / "regions.tsv").write_text("\n".join(keyed), encoding="utf-8")
    result = build(folder / "study.toml")
    assert result.counts["trials kept"] == 2
    assert found_in(result.folder, IDS) == {}


def test_study_file_that_names_a_reader_has_another_name_in_the_record(tmp_path: Path) -> None:
    """The name of the study file goes into the record, and that of the key into warnings."""
    study_file = Passages(TRIALS, ASKED).written(tmp_path)
    study_file = study_file.rename(tmp_path / "Quillfeather07.toml")
    build(study_file)
    key = tmp_path / "Quillfeather07_pseudonyms.csv"
    key.chmod(0o644)
    assert found_in(build(study_file).folder, IDS) == {}
