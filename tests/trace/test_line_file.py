"""The table of lines that ``trace`` writes for people to correct, and what a build makes of it."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pytest

import etl
from etl.errors import DataError
from etl.report.trace_input import TracedTrial
from etl.session import write_lines
from tests.end_to_end.building import build, rows_of
from tests.end_to_end.running import Ran
from tests.end_to_end.test_commands import Said
from tests.trace.tracing import BuiltStudy, by_hand, drifting, unsure_sample

HEADER = "participant,trial,fixation,line,line_told,confidence,x_px,y_px,word"
WHOLE = f"""\
{HEADER}
P1,7,1,1,1,0.990,150.0,128.0,plum
P1,7,2,1,1,0.990,250.0,131.0,plum
P1,7,3,1,1,0.990,350.0,150.0,plum
P1,7,4,2,2,0.990,250.0,165.0,plum
P1,7,5,2,2,0.900,120.0,185.0,plum
P1,7,6,2,2,0.624,250.0,225.0,plum
P1,7,7,0,0,0.950,350.0,400.0,
P1,7,8,3,2,1.000,130.0,248.0,plum
P1,7,9,3,3,1.000,150.0,252.0,plum
P1,7,10,3,3,0.970,250.0,262.0,plum
"""


@pytest.fixture(scope="module")
def study(unsure: BuiltStudy) -> etl.Study:
    """The study of texts of several lines."""
    return unsure.study


def rows_in(path: Path) -> list[dict[str, str]]:
    """The rows of a table with commas."""
    return list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8-sig"))))


def refused(traced: TracedTrial, path: Path, study: etl.Study) -> str:
    """What is said where nothing can be written."""
    with pytest.raises(DataError) as wrong:
        write_lines(traced, path, study)
    return str(wrong.value)


def test_new_table_as_a_whole(tmp_path: Path, study: etl.Study) -> None:
    """Every fixation with its line, the line told, and what helps to judge, in plain text."""
    write_lines(drifting(), tmp_path / "lines.csv", study)
    assert (tmp_path / "lines.csv").read_bytes() == WHOLE.encode()


def test_what_is_said_names_the_key(tmp_path: Path, study: etl.Study) -> None:
    """How many were written, what to do, and the lines of the study file to be added."""
    path = study.folder / "lines.csv"
    said = write_lines(drifting(), path, study)
    path.unlink()
    assert said.startswith(f"Written to {path}: 10 fixations of participant P1, trial 7, item i01.")
    assert "Change the column line where it is wrong; 0 is no line." in said
    assert said.endswith('\n[lines]\ncorrections = "lines.csv"')
    elsewhere = write_lines(drifting(), tmp_path / "lines.csv", study)
    assert "/lines.csv" in elsewhere.splitlines()[-1]
    assert "\\" not in elsewhere.splitlines()[-1]


def test_written_twice_is_written_once(tmp_path: Path, study: etl.Study) -> None:
    """A second call adds nothing, and says so."""
    path = tmp_path / "lines.csv"
    write_lines(drifting(), path, study)
    said = write_lines(drifting(), path, study)
    assert path.read_text(encoding="utf-8") == WHOLE
    assert "0 fixations" in said
    assert "10 were there already and stay as they are" in said


def test_edits_stay_and_what_is_missing_is_added(tmp_path: Path, study: etl.Study) -> None:
    """Rows that are there keep what a hand wrote; rows that were deleted come back at the end."""
    path = tmp_path / "lines.csv"
    edited = WHOLE.replace("P1,7,6,2,2", "P1,7,6,3,2").replace(
        "P1,7,2,1,1,0.990,250.0,131.0,plum\n", ""
    )
    path.write_text(edited, encoding="utf-8", newline="\n")
    write_lines(drifting(), path, study)
    added = "P1,7,2,1,1,0.990,250.0,131.0,plum\n"
    assert path.read_text(encoding="utf-8") == edited + added


def test_other_trials_are_added_below(tmp_path: Path, study: etl.Study) -> None:
    """One table serves all trials: a row is the same only if reader and trial are."""
    path = tmp_path / "lines.csv"
    for participant, trial in (("P1", "7"), ("P2", "7"), ("P1", "8")):
        write_lines(drifting(participant=participant, trial=trial), path, study)
    keys = [(row["participant"], row["trial"], row["fixation"]) for row in rows_in(path)]
    assert len(keys) == len(set(keys)) == 30


def test_table_keeps_its_own_columns_and_separator(tmp_path: Path, study: etl.Study) -> None:
    """As a spreadsheet program may have saved it: semicolons, other order, a column of its own."""
    path = tmp_path / "lines.csv"
    saved = "line;fixation;trial;participant;looked at by;word\r\n2;1;7;P1;Kim;\r\n"
    path.write_bytes(saved.encode("cp1252"))
    write_lines(drifting(), path, study)
    lines = path.read_text(encoding="utf-8").split("\n")
    assert lines[:2] == ["line;fixation;trial;participant;looked at by;word", "2;1;7;P1;Kim;"]
    assert lines[2] == "1;2;7;P1;;plum"
    assert len(lines) == 2 + 9 + 1


def test_names_beyond_ascii_are_marked_as_unicode(tmp_path: Path, study: etl.Study) -> None:
    """Spreadsheet programs know such a table by its mark; it is written once, at the beginning."""
    path = tmp_path / "lines.csv"
    for trial in ("7", "8"):
        write_lines(drifting(participant="Zoë, née B", trial=trial), path, study)
    data = path.read_bytes()
    assert data.startswith(b"\xef\xbb\xbfparticipant,")
    assert data.count(b"\xef\xbb\xbf") == 1
    assert {row["participant"] for row in rows_in(path)} == {"Zoë, née B"}


def test_sessions_have_a_column(tmp_path: Path, study: etl.Study) -> None:
    """Where readers came more than once, a row says which time."""
    path = tmp_path / "lines.tsv"
    write_lines(drifting(session="2"), path, study)
    write_lines(drifting(session="3"), path, study)
    header, first, *_ = path.read_text(encoding="utf-8").splitlines()
    assert header.split("\t")[:5] == ["participant", "session", "trial", "fixation", "line"]
    assert first.split("\t")[:5] == ["P1", "2", "7", "1", "1"]
    assert len(path.read_text(encoding="utf-8").splitlines()) == 21


def test_table_without_sessions_is_refused(tmp_path: Path, study: etl.Study) -> None:
    """Rows of two sessions could not be told apart; the table stays as it was."""
    path = tmp_path / "lines.csv"
    path.write_text(WHOLE, encoding="utf-8", newline="\n")
    said = refused(drifting(session="2"), path, study)
    assert 'lines.csv:1: there is no column "session"' in said
    assert path.read_text(encoding="utf-8") == WHOLE


def test_other_table_is_refused(tmp_path: Path, study: etl.Study) -> None:
    """A file that is no table of corrections is not written into."""
    path = tmp_path / "notes.csv"
    path.write_text("reader,remark\nP1,late\n", encoding="utf-8", newline="\n")
    said = refused(drifting(), path, study)
    assert 'there is no column "fixation"' in said
    assert path.read_text(encoding="utf-8") == "reader,remark\nP1,late\n"


@pytest.mark.parametrize("name", ["lines.xlsx", "lines"])
def test_kind_of_table_must_be_known(tmp_path: Path, study: etl.Study, name: str) -> None:
    """Only delimited text is written."""
    said = refused(drifting(), tmp_path / name, study)
    assert f'the kind of table is not known; found "{name}"' in said
    assert "expected a name that ends in .csv or .tsv" in said


def test_text_of_one_line_has_nothing_to_correct(tmp_path: Path, study: etl.Study) -> None:
    """No table is written."""
    said = refused(by_hand([1, 2], [200, 200], 2), tmp_path / "lines.csv", study)
    assert "there are no lines to correct" in said
    assert not list(tmp_path.iterdir())


def test_folder_that_is_not_there_is_told(tmp_path: Path, study: etl.Study) -> None:
    """The message says what to do."""
    said = refused(drifting(), tmp_path / "none" / "lines.csv", study)
    assert "the table cannot be written" in said
    assert "fix: name a file in a folder that is there" in said


@pytest.fixture(scope="module")
def corrected(tmp_path_factory: pytest.TempPathFactory, unsure: BuiltStudy) -> dict[str, list]:
    """Rows of fixations and ledger before and after: one line changed, one fixation on none."""
    root = tmp_path_factory.mktemp("corrected")
    study_file = unsure_sample(root)
    traced = etl.trace(etl.load_study(study_file), "P33", "3")
    table = study_file.parent / "by_hand.csv"
    write_lines(traced, table, etl.load_study(study_file))
    rows = rows_in(table)
    rows[9]["line"], rows[19]["line"] = "5", "0"
    with table.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, rows[0], delimiter=";")
        writer.writeheader()
        writer.writerows(rows)
    text = study_file.read_text(encoding="utf-8")
    study_file.write_text(
        text + '\n[lines]\ncorrections = "by_hand.csv"\n', encoding="utf-8", newline="\n"
    )
    build(study_file, root / "out")
    again = etl.trace(etl.load_study(study_file), "P33", "3")
    return {
        "before": [unsure.trace("P33", "3")],
        "after": [again],
        "rows": [r for r in rows_of(root / "out", "fixations") if r["participant"] == "P33"],
    }


def test_table_that_is_written_is_what_a_build_reads(corrected: dict[str, list]) -> None:
    """Edited, saved with semicolons and named in the study file, it changes what it should."""
    rows = [row for row in corrected["rows"] if row["trial"] == 3]
    (before,) = corrected["before"]
    changed = {
        row["fixation"]: row["line"]
        for row, fixation in zip(rows, before.fixations, strict=True)
        if (row["line"] or 0) != fixation.line
    }
    assert changed == {10: 5, 20: None}


def test_trace_tells_what_was_set_by_hand(corrected: dict[str, list]) -> None:
    """What was changed is marked; what a hand left as it was is by hand, too."""
    (after,), (before,) = corrected["after"], corrected["before"]
    assert all(fixation.by_hand for fixation in after.fixations)
    moved = {f.number: (f.line, f.line_told) for f in after.fixations if f.moved_by_hand}
    told = {f.number: f.line for f in before.fixations}
    assert moved == {10: (5, told[10]), 20: (0, told[20])}
    assert (after.lines.confidence, after.lines.sure) == (1.0, True)
    assert after.lines.corrections == "by_hand.csv"


@pytest.fixture
def said(capsys: pytest.CaptureFixture[str]) -> Said:
    """The command in this process."""
    return Said(capsys)


def test_command_writes_table_and_picture(tmp_path: Path, unsure: BuiltStudy, said: Said) -> None:
    """Both can be asked for at once; the drawing in characters is not shown then."""
    lines, picture = tmp_path / "lines.csv", tmp_path / "trial.svg"
    ran: Ran = said("trace", unsure.study.path, "P33", "1", "--lines", lines, "--picture", picture)
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.startswith(f"Written to {picture}\nWritten to {lines}: ")
    assert "from ms" not in ran.out
    assert picture.read_text(encoding="utf-8").startswith("<svg")
    assert len(rows_in(lines)) == len(unsure.trace("P33", "1").fixations)


def test_command_refuses_what_it_cannot_write(
    tmp_path: Path, unsure: BuiltStudy, said: Said
) -> None:
    """Status 2 and a message with what to do."""
    ran = said("trace", unsure.study.path, "P33", "1", "--lines", tmp_path / "lines.pdf")
    assert ran.status == 2
    assert "expected a name that ends in .csv or .tsv" in ran.err
