"""Studies whose tables lie in workbooks: the same outcomes as from text, and what is recorded."""

from __future__ import annotations

import csv
import hashlib
import json
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.worksheet import Worksheet

import etl
from etl.errors import DataError
from tests.end_to_end.building import build, copied_sample, tables_of, write
from tests.trials.test_facts_of_trials import LOG, REGIONS, STUDY, facts_of

LEDGER = "exclusions.csv"
#: The tables of a sample study, and how its study file names them: as they are, and as workbooks.
SAMPLE_TABLES = {
    'table = "participants.csv"': 'table = "people.xlsx#Readers"',
    'table = "items.csv"': 'table = "items.xlsx"',
    'table = "trial_list.csv"': 'table = "lists.xlsx#Trials"',
    'notes = "notes.csv"': 'notes = "notes.xlsx#June"',
    'file = "../../region_definitions/orchard.csv"': 'file = "regions.xlsx#Texts"',
}


def as_typed(text: str) -> object:
    """A cell as a spreadsheet program takes it when it is typed in."""
    if text.isascii() and text.isdecimal():
        return int(text)
    return text or None


def table_to_workbook(text: Path, book: Path, sheet: str | None, *, second: bool) -> None:
    """Type a CSV file into a sheet of a workbook, the second one where that is asked for."""
    made = Workbook()
    own = made.worksheets[0]
    if second:
        own.title = "Read me"
        own.append(["The lists of the orchard study"])
        own = made.create_sheet()
    own.title = sheet or "Sheet1"
    with text.open(encoding="utf-8", newline="") as rows:
        for row in csv.reader(rows):
            own.append([as_typed(cell) for cell in row])
    made.save(book)


def quoted(setting: str) -> str:
    """What stands in quotes in a line of a study file."""
    return setting.split('"')[1]


@pytest.mark.slow
def test_sample_study_from_workbooks_has_the_same_outcomes(tmp_path: Path) -> None:
    """Trial list, readers, items, notes and regions as workbooks change no byte of any table."""
    from_text = copied_sample("orchard", tmp_path / "text", rules=None)
    from_books = copied_sample("orchard", tmp_path / "books", SAMPLE_TABLES, rules=None)
    for before, after in SAMPLE_TABLES.items():
        text = from_books.parent / quoted(before)
        file, _, sheet = quoted(after).partition("#")
        table_to_workbook(text, from_books.parent / file, sheet or None, second=bool(sheet))
        text.unlink()
    texts, books = (
        build(file, tmp_path / name) for file, name in ((from_text, "one"), (from_books, "two"))
    )
    one, two = tables_of(texts.folder), tables_of(books.folder)
    assert one.keys() == two.keys()
    # The page shows the study file's own names, and the ledger those of the notes; data packages
    # know both by their digests.
    differ = sorted(name for name in one if one[name] != two[name])
    changed = ("audit.html", "datapackage.json", LEDGER)
    assert differ == [f"{folder}{name}" for folder in ("", "handoff/") for name in changed]
    assert one[LEDGER] == two[LEDGER].replace(b"notes.xlsx#June", b"notes.csv")
    assert texts.counts == books.counts
    said = "\n".join(books.findings.lines())
    for text, book in (("notes.csv", "notes.xlsx#June"), ("trial_list.csv", "lists.xlsx#Trials")):
        said = said.replace(book, text)
    assert said == "\n".join(texts.findings.lines())
    inputs = json.loads((books.folder / "run.json").read_text(encoding="utf-8"))["inputs"]
    recorded = [(i["file"], i["role"], i["sha256"]) for i in inputs if ".xlsx" in i["file"]]
    roles = {"notes.xlsx#June": "notes", "regions.xlsx#Texts": "regions"}
    expected_inputs = [
        (name, roles.get(name, "facts"), digest_of(from_books.parent / name.partition("#")[0]))
        for name in map(quoted, SAMPLE_TABLES.values())
    ]
    assert sorted(recorded) == sorted(expected_inputs)


def digest_of(path: Path) -> str:
    """The digest of a file."""
    return hashlib.sha256(path.read_bytes()).hexdigest()


def study_with_list(folder: Path, fill: Callable[[Worksheet], object]) -> Path:
    """A tiny study of two trials whose list is a sheet, Trials, of a workbook."""
    settings = (
        '\n[trials]\ntable = "lists.xlsx#Trials"\nfactors = ["part"]\ncovariates = ["share"]\n'
    )
    file = write(
        folder, {"study.toml": STUDY + settings, "regions.csv": REGIONS, "logs/P01.tsv": LOG}
    )
    book = Workbook()
    sheet = book.worksheets[0]
    sheet.title = "Trials"
    sheet.append(["participant", "trial", "part", "share"])
    sheet.append(["P01", 1, "first", 0.5])
    sheet.append(["P01", 2.0, "second", 1])
    fill(sheet)
    book.save(folder / "lists.xlsx")
    return file


def nothing_more(sheet: Worksheet) -> None:
    """Leave a list as it is."""


def test_numbers_of_trials_match_those_of_the_logs(tmp_path: Path) -> None:
    """A 2.0 that the sheet shows as 2 is the trial 2 of the log."""
    build(study_with_list(tmp_path, nothing_more))
    facts = facts_of(tmp_path, "part", "share")
    assert facts == {"1": ("first", 0.5), "2": ("second", 1.0)}


def test_facts_are_as_the_sheet_shows_them(tmp_path: Path) -> None:
    """A factor's level that shows as 007 is the level 007."""

    def show(sheet: Worksheet) -> None:
        for cell in ("C2", "C3"):
            sheet[cell].value = 7
        sheet["C3"].number_format = "000"

    build(study_with_list(tmp_path, show))
    assert facts_of(tmp_path, "part") == {"1": ("7",), "2": ("007",)}


@pytest.mark.parametrize(
    ("cell", "value", "message"),
    [
        (
            "C3",
            "#N/A",
            'lists.xlsx#Trials:3: column "part": the cell shows an error in place of a value',
        ),
        (
            "B3",
            "=B2+1",
            'lists.xlsx#Trials:3: column "trial": the result of the formula is not stored',
        ),
        ("A3", None, 'lists.xlsx#Trials:3: column "participant": the participant is missing'),
        ("B3", 1, "lists.xlsx#Trials:3: two rows have the same participant and trial"),
        ("B1", "trail", 'lists.xlsx#Trials:1: there is no column "trial"'),
    ],
    ids=["error_value", "formula", "no_key", "same_key", "no_column"],
)
def test_what_is_wrong_in_a_sheet_is_told_with_its_place(
    tmp_path: Path, cell: str, value: object, message: str
) -> None:
    """File, sheet and row are named, as file and line of a text file are."""

    def spoil(sheet: Worksheet) -> None:
        sheet[cell] = value

    study = etl.load_study(study_with_list(tmp_path, spoil))
    with pytest.raises(DataError) as refusal:
        etl.build(study)
    assert message in str(refusal.value)
    assert not (tmp_path / "out").exists()


def test_check_tells_of_hidden_rows(tmp_path: Path) -> None:
    """A row that a filter hides belongs to the study all the same."""

    def hide(sheet: Worksheet) -> None:
        sheet.row_dimensions[3].hidden = True

    findings = etl.check(etl.load_study(study_with_list(tmp_path, hide)))
    assert any(
        line.startswith("warning: lists.xlsx#Trials:3: a hidden row was read")
        for line in findings.lines(["warning"])
    )


def test_several_tables_may_share_a_workbook(tmp_path: Path) -> None:
    """Each table is a sheet of its own; the workbook is recorded once for each."""
    file = study_with_list(tmp_path, nothing_more)
    book = load_workbook(tmp_path / "lists.xlsx")
    readers = book.create_sheet("Readers")
    readers.append(["participant", "age"])
    readers.append(["P01", 40])
    book.save(tmp_path / "lists.xlsx")
    text = file.read_text(encoding="utf-8").replace('["share"]', '["share", "age"]')
    text += '\n[participants]\ntable = "lists.xlsx#Readers"\n'
    file.write_text(text, encoding="utf-8", newline="\n")
    built = build(file)
    assert facts_of(tmp_path, "age") == {"1": (40.0,), "2": (40.0,)}
    inputs = json.loads((built.folder / "run.json").read_text(encoding="utf-8"))["inputs"]
    digests = {i["file"]: i["sha256"] for i in inputs if i["role"] == "facts"}
    digest = digest_of(tmp_path / "lists.xlsx")
    assert digests == {"lists.xlsx#Trials": digest, "lists.xlsx#Readers": digest}


def test_log_that_is_a_workbook_is_refused(tmp_path: Path) -> None:
    """Logs are text: a recorder's own export, not what a spreadsheet program made of it."""
    file = study_with_list(tmp_path, nothing_more)
    text = file.read_text(encoding="utf-8")
    assert text.count("logs/*.tsv") == 1
    file.write_text(text.replace("logs/*.tsv", "*.xlsx"), encoding="utf-8", newline="\n")
    findings = etl.check(etl.load_study(file))
    refusals = [finding for finding in findings.of("error") if finding.path == "lists.xlsx"]
    assert len(refusals) == 1
    assert "workbook" in refusals[0].text()
