"""Sheets read as tables: header, rows, hidden and merged cells, formulas, which sheet."""

from __future__ import annotations

import warnings
from datetime import date, datetime
from pathlib import Path

import pandas as pd
import pytest
from openpyxl import Workbook
from openpyxl.chartsheet import Chartsheet
from openpyxl.utils.datetime import MAC_EPOCH
from openpyxl.worksheet.worksheet import Worksheet

from etl.errors import Findings
from etl.files import file_and_sheet, header_of_table, read_table
from tests.files.making_workbooks import (
    SHEET,
    Change,
    read,
    refused,
    replace_in,
    share_texts,
    sound,
    told,
    workbook_of,
)

HEADER = ["participant", "trial", "cue"]
ROWS: list[list[object]] = [HEADER, ["P01", 1, "early"], ["P02", 2, "late"]]


@pytest.fixture
def path(tmp_path: Path) -> Path:
    """Where a workbook is saved."""
    return tmp_path / "lists.xlsx"


def test_cells_are_text_and_lines_are_rows(path: Path) -> None:
    """A table comes out as from a text file; each row knows its row in the sheet."""
    cells, findings = read(workbook_of(path, ROWS))
    assert findings.lines() == []
    assert cells is not None
    assert cells.header == ("participant", "trial", "cue")
    assert cells.table.to_pydict() == {
        "participant": ["P01", "P02"],
        "trial": ["1", "2"],
        "cue": ["early", "late"],
    }
    assert (cells.header_line, cells.lines.tolist()) == (1, [2, 3])
    assert (cells.shown, cells.delimiter) == ("lists.xlsx", "")


def test_values_equal_those_of_another_reader(path: Path) -> None:
    """In the format General, cells are what pandas reads, written out."""
    rows: list[list[object]] = [
        ["whole", "decimal", "text", "truth", "day", "moment"],
        [1, 2.5, "a", True, date(2026, 5, 1), datetime.fromisoformat("2026-05-01T09:30")],
        [
            -20,
            1e-7,
            "007",
            False,
            date(1999, 12, 31),
            datetime.fromisoformat("1999-12-31T23:59:59"),
        ],
        [
            123456789012,
            0.125,
            " b\nc",
            True,
            date(1900, 3, 1),
            datetime.fromisoformat("2001-01-01T00:00:01"),
        ],
    ]
    ours = sound(workbook_of(path, rows))
    theirs = pd.read_excel(path, dtype={"text": str})
    assert [float(text) for text in ours["whole"]] == theirs["whole"].tolist()
    assert ours["whole"] == [str(number) for number in theirs["whole"]]
    assert [float(text) for text in ours["decimal"]] == theirs["decimal"].tolist()
    assert ours["text"] == theirs["text"].tolist()
    assert ours["truth"] == [str(truth).upper() for truth in theirs["truth"]]
    assert ours["day"] == theirs["day"].dt.strftime("%Y-%m-%d").tolist()
    assert ours["moment"] == theirs["moment"].dt.strftime("%Y-%m-%dT%H:%M:%S").tolist()


def test_numbers_are_as_their_formats_show_them(path: Path) -> None:
    """An item that shows as 007 is the item 007 of the logs."""
    rows = [["item", "size"], [7, 1.5], [12, 2.0]]
    formats = {"A2": "000", "A3": "000", "B2": "0.00", "B3": "0.00"}
    assert sound(workbook_of(path, rows, formats)) == {
        "item": ["007", "012"],
        "size": ["1.50", "2.00"],
    }


def test_blank_rows_and_remarks_are_left_out(path: Path) -> None:
    """As in a text file; the table may begin anywhere."""
    rows: list[list[object]] = [
        ["# the list of May"],
        [],
        [None, *HEADER],
        [None, "P01", 1, "early"],
        ["   "],
        [None, "# checked up to here"],
        [None, "P02", 2, "#2"],
    ]
    cells, findings = read(workbook_of(path, rows))
    assert findings.lines() == []
    assert cells is not None
    assert cells.header == ("", "participant", "trial", "cue")
    assert cells.header_line == 3
    assert cells.lines.tolist() == [4, 7]
    assert cells.texts("cue") == ["early", "#2"]


def test_remark_that_looks_like_a_row_is_warned_of(path: Path) -> None:
    """Where a row's first cell begins with #, it might have been meant as a row."""
    assert told(workbook_of(path, [*ROWS, ["#3", 3, "late"]])) == (
        "warning: lists.xlsx:4: a row begins with # and fills more than one cell; expected remarks,"
        " which are not read\n"
        "    fix: if this is a row of the table, begin it with something else"
    )


def test_missing_cells_are_empty(path: Path) -> None:
    """A cell that is not there is an empty one, also at the end of a row."""
    rows = [HEADER, ["P01"], [None, 2, None], ["P03", None, "late"]]
    assert sound(workbook_of(path, rows)) == {
        "participant": ["P01", "", "P03"],
        "trial": ["", "2", ""],
        "cue": ["", "", "late"],
    }


def test_names_are_trimmed_and_composed(path: Path) -> None:
    """A name is compared as names in text files are."""
    assert list(sound(workbook_of(path, [[" a\u0308ge "], [1]]))) == ["äge"]


def test_table_without_rows_has_its_header(path: Path) -> None:
    """That a table is empty is for those to tell who need rows."""
    assert sound(workbook_of(path, [HEADER])) == {name: [] for name in HEADER}


def test_texts_may_be_kept_in_a_list(path: Path) -> None:
    """Spreadsheet programs save each text once, in a list that all sheets share."""
    rows = [HEADER, ["P01", 1, " early\nbird"], ["P01", 2, "&"]]
    inline = sound(workbook_of(path, rows))
    assert sound(share_texts(path)) == inline
    assert inline["cue"] == [" early\nbird", "&"]


def test_text_in_several_fonts_is_one_text(path: Path) -> None:
    """How a text is set, and how it is to be spoken, is no part of it."""
    share_texts(workbook_of(path, ROWS))
    runs = (
        '<si><r><rPr><b/></rPr><t>la</t></r><r><t>te</t></r><rPh sb="0" eb="1"><t>x</t></rPh></si>'
    )
    replace_in(path, "xl/sharedStrings.xml", "<si><t>late</t></si>", runs)
    assert sound(path)["cue"] == ["early", "late"]


def test_size_that_a_file_states_wrongly_loses_nothing(path: Path) -> None:
    """Some programs write a wrong dimension; all rows and columns are read nevertheless."""
    workbook_of(path, ROWS)
    replace_in(path, SHEET, '<dimension ref="A1:C3" />', '<dimension ref="A1" />')
    assert len(sound(path)["cue"]) == 2


def test_places_that_a_file_leaves_out_are_counted(path: Path) -> None:
    """References of rows and cells are optional in the format."""
    workbook_of(path, ROWS)
    for old in ('r="A2"', 'r="B2"', 'r="C2"', 'r="2"', 'r="3"'):
        replace_in(path, SHEET, old, "")
    assert sound(path)["cue"] == ["early", "late"]


def test_days_that_count_from_1904_are_the_days_shown(path: Path) -> None:
    """Some workbooks count days from 1904; what the lab sees is the same day."""
    book = Workbook()
    book.epoch = MAC_EPOCH
    book.worksheets[0].append(["day"])
    book.worksheets[0].append([date(2026, 5, 1)])
    book.save(path)
    assert sound(path) == {"day": ["2026-05-01"]}


def test_equal_names_are_told(path: Path) -> None:
    """Two columns of one name cannot be told apart."""
    assert refused(workbook_of(path, [["cue", "trial", "cue"], [1, 2, 3]])) == (
        'lists.xlsx:1: header: two columns have the same name; found "cue", expected a name of its '
        "own for each of columns A and C\n"
        "    fix: rename one of them in the file's header\n"
        "1 problem; nothing was written"
    )


def test_value_in_a_column_without_a_name_is_told(path: Path) -> None:
    """A remark beside the table is a value that belongs nowhere."""
    rows: list[list[object]] = [HEADER, ["P01", 1, "early", None, "tired"]]
    assert refused(workbook_of(path, rows)) == (
        'lists.xlsx:2: column E: a value stands in a column without a name; found "tired", expected'
        " a name for the column in row 1\n"
        "    fix: name the column, or move the remark to another sheet\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("error", ["#N/A", "#DIV/0!", "#REF!", "#NAME?", "#VALUE!"])
def test_error_value_is_told_with_its_cell(path: Path, error: str) -> None:
    """An error value is no value."""
    assert refused(workbook_of(path, [*ROWS, ["P03", 3, error]])) == (
        f'lists.xlsx:4: column "cue": the cell shows an error in place of a value; found "{error}",'
        " expected a value in cell C4\n"
        "    fix: correct the cell, or clear it where there is no value\n"
        "1 problem; nothing was written"
    )


def test_formula_without_a_result_is_told_with_its_cell(path: Path) -> None:
    """Nothing is calculated here: what a formula gives must lie in the file."""
    assert refused(workbook_of(path, [*ROWS, ["P03", "=B3+1", "late"]])) == (
        'lists.xlsx:4: column "trial": the result of the formula is not stored in the workbook; '
        "expected a value in cell B4\n"
        "    fix: open the workbook in the spreadsheet program and save it there: it then "
        "calculates the formulas and stores what they give\n"
        "1 problem; nothing was written"
    )


def test_formula_without_a_result_counts_in_a_header_and_in_a_row_of_its_own(path: Path) -> None:
    """A formula is something, wherever it stands."""
    text = refused(workbook_of(path, [["=A9", "trial"], ["P01", 1], ["=A2"]]))
    assert "lists.xlsx:1: column A: the result of the formula is not stored" in text
    assert "lists.xlsx:3: column A: the result of the formula is not stored" in text


@pytest.mark.parametrize(
    ("stored", "text"),
    [
        ('<c r="B4"><f>B3+1</f><v>3</v></c>', "3"),
        ('<c r="B4" t="str"><f>A1</f><v>three</v></c>', "three"),
        ('<c r="B4" t="str"><f>A1</f><v></v></c>', ""),
        ('<c r="B4" t="b"><f>A1</f><v>1</v></c>', "TRUE"),
    ],
    ids=["number", "text", "empty_text", "truth"],
)
def test_stored_result_of_a_formula_is_read(path: Path, stored: str, text: str) -> None:
    """What the spreadsheet program calculated is what the lab sees."""
    workbook_of(path, [*ROWS, ["P03", "=B3+1", "late"]])
    replace_in(path, SHEET, '<c r="B4"><f>B3+1</f><v /></c>', stored)
    assert sound(path)["trial"] == ["1", "2", text]


def test_merged_cells_are_told_with_their_range(path: Path) -> None:
    """One value over several rows: which of them it is for is never guessed."""
    merge: Change = lambda sheet: sheet.merge_cells("C2:C3")  # noqa: E731
    assert refused(workbook_of(path, ROWS, change=merge)) == (
        'lists.xlsx:2: column "cue": merged cells hold one value, and which of their rows and '
        'columns it is for cannot be told; found "early in C2:C3", expected a value in each cell\n'
        "    fix: unmerge the cells and fill each one in; begin a title above the header with #\n"
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize("cells", ["A1:C1", "A6:C6", "A5:C5"], ids=["remark", "blank", "below"])
def test_merged_cells_that_hold_nothing_of_the_table_do_no_harm(path: Path, cells: str) -> None:
    """A merged remark, and merged blank cells, say nothing about rows."""
    merge: Change = lambda sheet: sheet.merge_cells(cells)  # noqa: E731
    rows = [["# the list of May"], *ROWS, ["# checked"]]
    assert sound(workbook_of(path, rows, change=merge))["cue"] == ["early", "late"]


def hide(sheet: Worksheet) -> None:
    """Hide a row and a column."""
    sheet.row_dimensions[3].hidden = True
    sheet.column_dimensions["C"].hidden = True


def test_hidden_rows_and_columns_are_read_and_told(path: Path) -> None:
    """Hiding and filtering leave nothing out; the lab may think they do."""
    assert told(workbook_of(path, ROWS, change=hide)) == (
        'warning: lists.xlsx:3: a hidden row was read; found "row 3"\n'
        "    fix: show them and check; what is no part of the table must be deleted, since hiding "
        "and filtering leave nothing out\n"
        'warning: lists.xlsx:1: a hidden column was read; found "cue"\n'
        "    fix: show them and check"
    )
    cells, _ = read(path)
    assert cells is not None
    assert cells.texts("cue") == ["early", "late"]


def test_digits_that_are_not_shown_are_told(path: Path) -> None:
    """A number is read as it is shown, and it is said where it holds more."""
    rows = [["size"], [0.4567], [0.25], [1.999]]
    formats = {"A2": "0.00", "A3": "0.00", "A4": "0.00"}
    assert told(workbook_of(path, rows, formats)) == (
        'note: lists.xlsx:2: column "size": 2 cells show less than they hold, and were read as '
        'shown; found "0.4567 shown as 0.46"\n'
        "    fix: to have all of it read, give the column a number format that shows it"
    )


def test_number_format_that_is_not_understood_is_told(path: Path) -> None:
    """A fraction, say: its number is read, and that is said."""
    assert told(workbook_of(path, [["size"], [0.5]], {"A2": "# ?/?"})) == (
        'warning: lists.xlsx:2: column "size": a cell has a number format that is not understood, '
        'and was read without it; found "# ?/?, read as 0.5"\n'
        "    fix: give the column a plain number format, such as General or 0.00"
    )


def test_day_that_is_none_is_told(path: Path) -> None:
    """Zero in a column of dates shows as a day that never was."""
    workbook_of(path, [["day"], [date(2026, 5, 1)], [0]], {"A3": "yyyy-mm-dd"})
    assert 'found "00:00:00 on no day", expected a value in cell A3' in refused(path)


def test_number_too_large_for_a_date_is_told(path: Path) -> None:
    """A number that is no day of any calendar, with the library's own warning kept from users."""
    text = refused(workbook_of(path, [["day"], [1e9]], {"A2": "yyyy-mm-dd"}))
    assert 'found "#VALUE!", expected a value in cell A2' in text


def test_empty_sheet_is_told(path: Path) -> None:
    """A sheet of remarks alone holds no table."""
    assert "lists.xlsx: the sheet holds no table" in refused(workbook_of(path, [["# later"]]))


def of_several(path: Path) -> Path:
    """A workbook with a hidden sheet, a chart, a table and another table."""
    book = Workbook()
    first = book.worksheets[0]
    first.title = "Codes"
    first.sheet_state = "hidden"
    first.append(["code"])
    chart = book.create_chartsheet("Chart")
    assert isinstance(chart, Chartsheet)
    for name, cue in (("Trials", "early"), ("Trials (old)", "late"), ("Empty", None)):
        sheet = book.create_sheet(name)
        if cue is not None:
            sheet.append(["cue"])
            sheet.append([cue])
    book.active = 2
    book.save(path)
    return path


def test_first_sheet_that_is_shown_is_read_and_the_others_are_told(path: Path) -> None:
    """Where no sheet is named, it is said which one was read, if others hold something."""
    assert told(of_several(path)) == (
        'note: lists.xlsx: the first sheet, "Trials", was read; others hold something too; found '
        '"Codes, Trials (old)"\n'
        '    fix: to say which sheet is meant, write "lists.xlsx#Trials" in the study file'
    )
    cells, _ = read(path)
    assert cells is not None
    assert cells.texts("cue") == ["early"]


@pytest.mark.parametrize(("sheet", "cues"), [("Trials", ["early"]), ("Trials (old)", ["late"])])
def test_named_sheet_is_read(path: Path, sheet: str, cues: list[str]) -> None:
    """A sheet that is named is read, and nothing is said of the others."""
    assert sound(of_several(path), sheet) == {"cue": cues}


def test_hidden_sheet_is_read_where_it_is_named(path: Path) -> None:
    """Naming it says that it is meant."""
    assert sound(of_several(path), "Codes") == {"code": []}


@pytest.mark.parametrize(
    ("sheet", "fix"),
    [("trials", 'did you mean "Trials"? Correct'), ("June", "correct"), ("", "correct")],
    ids=["other_case", "unlike", "empty"],
)
def test_sheet_that_is_not_there_is_told_with_those_that_are(
    path: Path, sheet: str, fix: str
) -> None:
    """The message lists the sheets and names the nearest."""
    assert refused(of_several(path), sheet) == (
        f'lists.xlsx#{sheet}: the workbook has no sheet of this name; found "{sheet}", expected '
        'one of its sheets: "Codes", "Trials", "Trials (old)", "Empty"\n'
        f"    fix: {fix} the name after the hash in the study file\n"
        "1 problem; nothing was written"
    )


def test_chart_holds_no_table(path: Path) -> None:
    """A sheet that is a chart cannot be read."""
    assert "lists.xlsx#Chart: the sheet is a chart" in refused(of_several(path), "Chart")


def test_messages_name_file_sheet_and_row(path: Path) -> None:
    """A place in a workbook is file, sheet and row, then the column."""
    workbook_of(path, [*ROWS, ["P03", 3, "#N/A"]])
    assert refused(path, "Trials").startswith('lists.xlsx#Trials:4: column "cue": ')


@pytest.mark.parametrize(
    ("named", "file", "sheet"),
    [
        ("lists.xlsx", "lists.xlsx", None),
        ("lists.xlsx#June", "lists.xlsx", "June"),
        ("LISTS.XLSX#June 1#2", "LISTS.XLSX", "June 1#2"),
        ("list#2.csv", "list#2.csv", None),
        ("list#2.xlsx", "list#2.xlsx", None),
        ("list#2.xlsx#June", "list#2.xlsx", "June"),
        ("lists.xlsx.csv#June", "lists.xlsx.csv#June", None),
    ],
)
def test_hash_names_a_sheet_behind_a_workbook_only(
    named: str, file: str, sheet: str | None
) -> None:
    """A hash may stand in the name of any file; only behind .xlsx it is followed by a sheet."""
    assert file_and_sheet(Path("tables") / named) == (Path("tables") / file, sheet)


def test_ending_may_be_in_capitals(tmp_path: Path) -> None:
    """The ending of a name is understood in any case."""
    assert sound(workbook_of(tmp_path / "LISTS.XLSX", ROWS))["cue"] == ["early", "late"]


def test_header_can_be_read_alone(path: Path) -> None:
    """What a table could supply is known before it is read, whatever it lies in."""
    workbook_of(path, ROWS)
    text = path.with_name("lists.csv")
    text.write_text("participant,trial,cue\nP01,1,early\n", encoding="utf-8")
    assert header_of_table(path) == header_of_table(text) == tuple(HEADER)
    assert header_of_table(path.with_name("lists.xlsx#June")) == ()


def test_reading_twice_gives_the_same(path: Path) -> None:
    """Nothing depends on what was read before."""
    workbook_of(path, ROWS, {"B2": "0.0"})
    assert sound(path) == sound(path)


def test_warnings_of_the_library_stay_with_us(path: Path) -> None:
    """What the library says about extensions it drops is no matter of the lab's."""
    workbook_of(path, ROWS)
    extension = '<extLst><ext uri="{CCE6A557-97BC-4b89-ADB6-D9C93CAAB3DF}"/></extLst></worksheet>'
    replace_in(path, SHEET, "</worksheet>", extension)
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always")
        assert sound(path)["cue"] == ["early", "late"]
    assert caught == []


def test_file_can_be_removed_after_reading(path: Path) -> None:
    """No handle is kept: one operating system would refuse."""
    workbook_of(path, ROWS)
    findings = Findings()
    assert read_table(path, path.name, findings) is not None
    path.rename(path.with_name("moved.xlsx"))
    assert not path.exists()
