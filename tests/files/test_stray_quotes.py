"""Quote marks in cells without quotes: counted where other cells of the file have quotes."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of
from etl.files.tally import Tally

HEADER = "reader,trial,word,spare\n"
NEEDED = ("reader", "trial", "word")
REPAIR = "quote marks in cells without quotes"
SOUND = 'P01,1,"a ""ripe"" fig","x"\n'


def read(content: str, delimiter: str = ",", *, wary: bool = True) -> tuple[Cells, Findings]:
    """The cells of a log, and all that was found."""
    findings = Findings()
    text = RawText("log.csv", content.encode("utf-8"), "", "utf-8")
    cells = cells_of(text, findings, delimiter=delimiter, needed=NEEDED, wary=wary)
    assert cells is not None, findings.text()
    return cells, findings


@pytest.mark.parametrize(
    "row",
    [
        'P01,1,the ""sour"" one","x"',
        'P01,1,fig","x"',
        'P01,1,5" wide,"x"',
        'P01,1,fig,x"',
        'P01"s,1,fig,x',
        'P01,1,say ""no"",x',
        'P01,1, "fig",x',
    ],
    ids=[
        "doubled marks inside",
        "a word",
        "inches",
        "in a column not asked for",
        "in the first cell",
        "both marks lost",
        "a blank before the mark",
    ],
)
@pytest.mark.parametrize("between", ["", "\n", "# a remark\n", '# a,"\n'], ids=repr)
def test_lost_opening_mark_is_counted(row: str, between: str) -> None:
    """The cell is taken as it stands, and the account says so."""
    cells, findings = read(f"{HEADER}{SOUND}{between}{row}\n{between}{SOUND}{row}\n")
    line = 3 + bool(between)
    assert cells.account.repairs == {REPAIR: Tally(2, line)}
    assert cells.column("word")[1].as_py() == row.split(",")[2]
    assert findings.of("error") == []
    assert cells.account.balances()


@pytest.mark.parametrize("wary", [True, False], ids=["log", "table"])
def test_table_of_facts_is_warned_of(wary: bool) -> None:
    """There is no account of tables, so it is said at once."""
    _, findings = read(f'{HEADER}{SOUND}P01,1,fig",x\n', wary=wary)
    warning = (
        "warning: log.csv:3: a cell without quotes holds quote marks; they were taken as they "
        'stand; expected a quote mark " on both sides of a cell, as others have, or in none\n'
        "    fix: check the cell: a quote mark may be lost"
    )
    assert findings.lines() == ([] if wary else [warning])


def test_marks_of_a_file_without_quoted_cells_are_text() -> None:
    """Where no cell has quotes, a mark is a sign like any other."""
    cells, _ = read(f'{HEADER}P01,1,5" wide,x\nP01,1,fig",x\n')
    assert cells.account.repairs == {}


def test_marks_beside_marks_that_were_not_doubled() -> None:
    """Both repairs are counted, each for its own lines."""
    cells, _ = read(f'{HEADER}P01,1,fig",x\nP01,1,"a "ripe" fig",x\nP01,1,5" wide,x\n')
    assert cells.account.repairs == {
        REPAIR: Tally(2, 2),
        "quote marks that were not doubled": Tally(1, 3),
    }


def test_row_over_several_lines_is_looked_at_whole() -> None:
    """In a table a quoted cell may hold line ends; only the row with the stray mark is counted."""
    content = f'{HEADER}P01,1,"a\n\n""fig""","x"\n\nP01,1,"b\nc",x"\nP01,1,"d\ne",x\n'
    cells, findings = read(content, wary=False)
    assert cells.account.repairs == {REPAIR: Tally(1, 6)}
    assert [finding.line for finding in findings] == [6]


def test_stray_mark_in_a_table_aligned_by_blanks() -> None:
    """Runs of blanks around quoted cells are no part of them."""
    content = 'reader  trial  word\n  P01  1  "a fig"  \n  P01  1  fig"  \n'
    cells, _ = read(content, " ")
    assert cells.account.repairs == {REPAIR: Tally(1, 3)}
    assert cells.column("word").to_pylist() == ["a fig", 'fig"']


#: What a cell may look like in the file: with quotes, without, and spoiled.
WRITTEN = st.one_of(
    st.text('a",;', max_size=5).map(lambda text: '"' + text.replace('"', '""') + '"'),
    st.text("a1;", min_size=1, max_size=3),
    st.sampled_from(['a"', 'a""', '5" a', 'a""b"', 'a"b"']),
)


@given(st.lists(st.tuples(WRITTEN, WRITTEN, WRITTEN, WRITTEN), min_size=1, max_size=6))
def test_every_row_with_a_stray_mark_is_counted(rows: list[tuple[str, ...]]) -> None:
    """The count is that of rows with such a cell, told from how each cell was written."""
    rows = [(f"P{row[0]}" if row[0][0] != '"' else row[0], *row[1:]) for row in rows]
    content = HEADER + "".join(",".join(row) + "\n" for row in rows)
    cells, _ = read(content)
    standard = list(csv.reader(io.StringIO(content)))[1:]
    assert cells.column("word").to_pylist() == [row[2] for row in standard]
    stray = [
        line
        for line, row in enumerate(rows, start=2)
        if any('"' in cell and cell[0] != '"' for cell in row)
    ]
    quoted = any(cell[0] == '"' for row in rows for cell in row)
    expected = {REPAIR: Tally(len(stray), stray[0])} if stray and quoted else {}
    assert cells.account.repairs == expected
