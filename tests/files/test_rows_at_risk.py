"""Rows that a remark sign or an open quote mark would swallow; limits that are put back."""

from __future__ import annotations

import csv

import pytest

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of
from tests.files.reading import cells_in, rows_in

HEADER = "reader\ttrial\tword\n"


def read(content: str, *, wary: bool = False) -> tuple[Cells | None, Findings]:
    """The cells of a text, and all that was found."""
    findings = Findings()
    text = RawText("log.tsv", content.encode("utf-8"), "", "utf-8")
    return cells_of(text, findings, wary=wary), findings


@pytest.mark.parametrize("quoted", ["pear", '"pear"'], ids=["without quotes", "with quotes"])
def test_comment_with_as_many_fields_as_the_header_is_warned_of(quoted: str) -> None:
    """Such lines may be rows: they are counted, and the first is named."""
    rows = f"#P01\t1\tpear\nP02\t1\t{quoted}\n# noise outside\n# P03\t1\tplum\n"
    cells, findings = read(HEADER + rows)
    assert cells is not None
    assert (len(cells), cells.comments, cells.comments_like_rows) == (1, 3, 2)
    assert findings.lines() == [
        (
            "warning: log.tsv:2: 2 lines begin with # and have as many fields as the header; "
            "expected remarks, which are not read\n"
            "    fix: if this is a row, put its first cell in quotes"
        )
    ]


def test_single_comment_like_a_row_is_told_as_one() -> None:
    """One line is one line."""
    _, findings = read(HEADER + "P02\t1\tpear\n#P01\t1\tpear\n")
    (finding,) = findings
    assert finding.problem == "a line begins with # and has as many fields as the header"
    assert finding.line == 3


@pytest.mark.parametrize(
    "content",
    [
        "# a\tb\tc\n" + HEADER + "P01\t1\tpear\n",
        HEADER + "P01\t1\tpear\n# a remark\n#a\tb\n",
        "reader\nP01\n# a remark\n",
    ],
    ids=["above the header", "of other numbers of fields", "in a file of one column"],
)
def test_other_comments_are_not_warned_of(content: str) -> None:
    """Remarks above the header, or of another number of fields, are remarks."""
    assert read(content)[1].lines() == []


def test_first_cell_in_quotes_is_a_row() -> None:
    """What the message says is so: a quoted cell may begin with the sign of a remark."""
    assert rows_in(cells_in(HEADER + '"#P01"\t1\tpear\n')) == [("#P01", "1", "pear")]


def test_quote_that_swallows_rows_is_an_error() -> None:
    """An open quote mark in the last column is named where it opens."""
    rows = 'P01\t1\tThe\nP01\t1\t"pear\nP01\t2\tThe\nP01\t3\tplum"\nP01\t4\tThe\n'
    cells, findings = read(HEADER + rows, wary=True)
    assert cells is None
    assert findings.text() == (
        'log.tsv:3: a quoted cell holds whole rows; expected a second quote mark " before line 4, '
        "which has as many fields as a row\n"
        "    fix: close or double the quote mark in this line\n"
        "1 problem; nothing was written"
    )


def test_quote_that_opens_in_a_later_line_of_its_row_is_named_there() -> None:
    """A row may run over several lines before the quote mark that is too much."""
    rows = 'P01\t"1\na"\t"pear\nP01\t2\tplum"\n'
    _, findings = read(HEADER + rows, wary=True)
    assert [finding.line for finding in findings] == [3]


@pytest.mark.parametrize(
    "row",
    ['"P\n01"\t1\tpear\n', 'P01\t"1\na\tb"\tpear\n', 'P01\t1\t"pear\nplum\tfig"\n'],
    ids=["in the first cell", "in the middle", "in the last cell"],
)
def test_line_breaks_in_cells_stay_allowed(row: str) -> None:
    """A cell that runs over lines is no fault where its lines could be no rows."""
    cells, findings = read(HEADER + row + "P02\t1\tfig\n", wary=True)
    assert cells is not None, findings.text()
    assert cells.lines.tolist() == [2, 4]


def test_texts_of_several_lines_may_hold_the_separator() -> None:
    """In tables of texts, a line with a comma is a line of a text."""
    cells, findings = read('item,text\n1,"The pear,\nthe plum, "\n')
    assert cells is not None, findings.text()
    assert len(cells) == 1


def test_limit_of_the_standard_reader_is_put_back() -> None:
    """Reading a file leaves the process as it was, also where the file is broken."""
    before = csv.field_size_limit()
    read(HEADER + 'P01\t1\t"pear"\n')
    read(HEADER + 'P01\t1\t"pear\n')
    assert csv.field_size_limit() == before
