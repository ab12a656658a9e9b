"""Quote marks inside quoted cells that are not doubled: mended where that is plain, or refused."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import Cells, RawText, cells_of

NAMES = ("reader", "trial", "word", "dur")
HEADER = "\t".join(NAMES) + "\n"
REPAIR = "quote marks that were not doubled"
#: Cells without line breaks, separators and blanks included.
CELL = st.text(alphabet='ab"\t; 1', max_size=8)


def read(
    content: str, *, wary: bool = True, delimiter: str = "\t"
) -> tuple[Cells | None, Findings]:
    """The cells of a log, and all that was found."""
    findings = Findings()
    text = RawText("log.tsv", content.encode("utf-8"), "", "utf-8")
    return cells_of(text, findings, delimiter=delimiter, wary=wary), findings


def words_in(content: str, *, wary: bool = True) -> tuple[list[str], int]:
    """The words of a log, and how many rows were mended."""
    cells, findings = read(content, wary=wary)
    assert cells is not None, findings.text()
    repair = cells.account.repairs.get(REPAIR)
    return cells.column("word").to_pylist(), 0 if repair is None else repair.count


@pytest.mark.parametrize("wary", [True, False], ids=["log", "table"])
@pytest.mark.parametrize(
    ("written", "word"),
    [
        ('"""', '"'),
        ('"he said "no" to it"', 'he said "no" to it'),
        ('"a "word""', 'a "word"'),
        ('"5" wide"', '5" wide'),
        ('"he said ""no"" and "yes" to it"', 'he said "no" and "yes" to it'),
        ('"a;"b"', 'a;"b'),
    ],
    ids=["a mark alone", "a word", "the last word", "inches", "both ways", "with a semicolon"],
)
def test_marks_that_are_not_doubled(written: str, word: str, wary: bool) -> None:
    """A mark closes a cell only before a separator or the line's end."""
    rows = f'P01\t1\tpear\t200\nP01\t1\t{written}\t210\nP01\t1\t"a ""fig"""\t220\n'
    assert words_in(HEADER + rows, wary=wary) == (["pear", word, 'a "fig"'], 1)


def test_mark_in_the_last_cell() -> None:
    """The line's end closes a cell as a separator does."""
    cells, findings = read('reader\tword\nP01\t"""\nP01\t"a "b" c"\n')
    assert cells is not None, findings.text()
    assert cells.column("word").to_pylist() == ['"', 'a "b" c']


@pytest.mark.parametrize("count", [1, 2, 3, 4], ids=["once", "twice", "three times", "four times"])
def test_marks_alone_never_swallow_rows(count: int) -> None:
    """By the standard, two such cells would be one that holds the rows between them."""
    rows = [
        f'P01\t{n}\t"""\t{n}00' if n <= count else f"P01\t{n}\tpear\t{n}00" for n in range(1, 7)
    ]
    words, mended = words_in(HEADER + "\n".join(rows) + "\n")
    assert words == ['"'] * count + ["pear"] * (6 - count)
    assert mended == count


def test_two_marks_alone_in_one_row() -> None:
    """They would make one cell of what stands between them."""
    cells, findings = read('a\tb\tc\td\n"""\t1\t"""\t2\n')
    assert cells is not None, findings.text()
    assert [cells.column(name)[0].as_py() for name in "abcd"] == ['"', "1", '"', "2"]


def test_repair_is_counted_with_its_first_line() -> None:
    """The account names the repair; the log needs no warning."""
    cells, findings = read(HEADER + 'P01\t1\tpear\t200\n\nP01\t1\t"""\t210\nP01\t1\t"""\t220\n')
    assert cells is not None, findings.text()
    repair = cells.account.repairs[REPAIR]
    assert (repair.count, repair.first_line) == (2, 4)
    assert cells.lines.tolist() == [2, 4, 5]
    assert findings.lines() == []


def test_repair_in_a_table_of_facts_is_warned_of() -> None:
    """There is no account of tables, so the repair is said at once."""
    cells, findings = read('item,text\n1,"the "pear" fell"\n', wary=False, delimiter=",")
    assert cells is not None, findings.text()
    assert findings.lines() == [
        (
            "warning: log.tsv:2: quote marks inside a cell are not doubled; they were taken as "
            "they stand\n"
            "    fix: check the cells, and double the quote marks inside them"
        )
    ]


@pytest.mark.parametrize(
    "row",
    [
        'P01\t1\t"pear\t200',
        'P01\t1\t"he said "no"\t no"\t200',
        'P01\t1\t"pe"ar\t200',
        'P01\t1\t"a" \t200',
        'P01\t1\t"pear"x"\t"200',
        'P01\t1\t"a"b"\t200\t9',
        'P01\t1\t"a"b"',
    ],
    ids=[
        "never closed",
        "a separator after a mark inside",
        "closed too early",
        "a blank behind the mark",
        "two cells in one",
        "too many fields",
        "too few fields",
    ],
)
def test_what_cannot_be_told_is_refused(row: str) -> None:
    """Where a line has not as many fields as the header, nothing is guessed."""
    cells, findings = read(f"{HEADER}{row}\nP01\t1\tpear\t210\n")
    assert cells is None
    assert findings.items[0].line == 2


def test_row_behind_a_lost_line_end_is_not_mended_into_a_cell() -> None:
    """In a log, a cell that holds as many separators as a row shows that a line end is lost."""
    row = 'P01\t1\t{0}00\t"pear"'
    lines = ["reader\ttrial\tdur\tword", row.format(1) + "'" + row.format(2), row.format(3), ""]
    cells, findings = read("\n".join(lines))
    assert cells is None
    assert findings.items[0].line == 2


def test_row_too_wide_is_not_mended_into_one_cell() -> None:
    """Two well-formed cells are two, also where one would make the row even."""
    cells, findings = read('a,b\n1,"x","y"\n2,z\n', delimiter=",")
    assert cells is None
    assert findings.items[0].problem == "the row has too many fields"


def test_line_breaks_in_cells_beside_marks_not_doubled_are_refused() -> None:
    """Once the standard does not hold, a mark that stays open may be a fault."""
    cells, findings = read(HEADER + 'P01\t1\t"pear\nplum"\t200\nP01\t1\t"a "b" c"\t210\n')
    assert cells is None
    assert findings.items[0].problem == "a quoted cell is broken"


def test_mark_within_a_plain_cell_is_text() -> None:
    """A mark that does not begin a cell means nothing; RFC 4180 aside, so the standard library."""
    assert words_in(HEADER + 'P01\t1\t5" wide\t200\nP01\t1\tx"\t210\n') == (['5" wide', 'x"'], 0)


def test_paths_with_backslashes_are_text() -> None:
    """A backslash is a sign like any other, also before a mark."""
    rows = 'P01\t1\tC:\\new\\table\t200\nP01\t1\t"D:\\logs\\"\t210\n'
    assert words_in(HEADER + rows) == (["C:\\new\\table", "D:\\logs\\"], 0)


@given(st.lists(st.tuples(CELL, CELL, CELL, CELL), min_size=1, max_size=5))
def test_well_formed_files_are_read_by_the_standard(rows: list[tuple[str, ...]]) -> None:
    """What the standard library writes, it reads, and so is it read here; nothing is mended."""
    rows = [("x" + row[0], *row[1:]) for row in rows]
    out = io.StringIO(newline="")
    csv.writer(out, delimiter="\t", lineterminator="\n").writerows([NAMES, *rows])
    cells, findings = read(out.getvalue())
    assert cells is not None, findings.text()
    assert list(zip(*(cells.column(name).to_pylist() for name in NAMES), strict=True)) == rows
    assert cells.account.repairs == {}


@given(st.lists(st.tuples(CELL, CELL, CELL, CELL), min_size=1, max_size=5))
def test_marks_that_are_not_doubled_are_read_back_or_refused(rows: list[tuple[str, ...]]) -> None:
    """Cells quoted without doubling are never read as other cells, unless they are well-formed.

    Cells in which a mark stands before a separator are left out: those no reader can tell, and so
    are doubled marks, which stand for one; nor can anybody tell where a cell ends with a mark and
    the next one begins with a separator.
    """
    rows = [
        tuple(cell.replace('"\t', "").replace('""', '"').replace('"\t', "") for cell in row)
        for row in rows
    ]
    rows = [row for row in rows if not any('""' in cell or '"\t' in cell for cell in row)]
    rows = [row for row in rows if '"\t\t' not in "\t".join(row)]
    text = HEADER + "".join("\t".join(f'"{cell}"' for cell in row) + "\n" for row in rows)
    cells, _ = read(text)
    standard = list(csv.reader(io.StringIO(text), delimiter="\t"))[1:]
    if cells is not None:
        got = list(zip(*(cells.column(name).to_pylist() for name in NAMES), strict=True))
        if cells.account.repairs:
            assert got == rows
        else:
            assert [list(row) for row in got] == standard
