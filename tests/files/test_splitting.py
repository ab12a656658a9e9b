"""Text into cells: separators, quotes, comments, blank lines, and the true line of each row."""

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.files.reading import cells_in, problems_in, rows_in

#: Cells as a table may hold them: no zero byte, and line feeds for line ends, as read_text gives.
CELL = st.text(st.characters(exclude_categories=("Cs",), exclude_characters="\x00\r"), max_size=12)
#: Cells that need no quotes: the writer below puts none, so pyarrow's reader is used.
PLAIN_CELL = st.text(
    st.characters(exclude_categories=("Cs",), exclude_characters='\x00\r\n"#\t;,| \ufeff'),
    max_size=12,
)
SEPARATOR = st.sampled_from(["\t", ";", ",", "|"])


def written(rows: list[list[str]], separator: str, between: list[str]) -> tuple[str, list[int]]:
    """A table by the standard library's writer, with lines between its rows; each row's line."""
    out = io.StringIO(newline="")
    writer = csv.writer(out, delimiter=separator, lineterminator="\n")
    lines = []
    for row, extra in zip(rows, between, strict=True):
        out.write(extra)
        lines.append(out.getvalue().count("\n") + 1)
        writer.writerow(row)
    return out.getvalue(), lines[1:]


@st.composite
def tables(draw: st.DrawFn, cell: st.SearchStrategy[str]) -> tuple[list[list[str]], list[str]]:
    """Rows of three cells below a header, and what stands between the rows."""
    body = draw(st.lists(st.tuples(cell, cell, cell).map(list), max_size=6))
    # A row that begins with the comment sign is a comment, as documented.
    body = [["x" + row[0], *row[1:]] for row in body]
    rows = [["reader", "trial", "item"], *body]
    extra = st.sampled_from(["", "", "\n", "# a remark\n", "   \n", " # a remark\n\n"])
    return rows, draw(st.lists(extra, min_size=len(rows), max_size=len(rows)))


@given(tables(CELL), SEPARATOR)
def test_any_table_is_read_back(table: tuple[list[list[str]], list[str]], separator: str) -> None:
    """What RFC 4180 lets a writer write is read back cell by cell, each row with its line."""
    rows, between = table
    text, lines = written(rows, separator, between)
    cells = cells_in(text, separator)
    assert rows_in(cells) == [tuple(row) for row in rows[1:]]
    assert cells.lines.tolist() == lines


@given(tables(PLAIN_CELL), SEPARATOR, st.booleans())
def test_both_readers_give_the_same(
    table: tuple[list[list[str]], list[str]], separator: str, end: bool
) -> None:
    """Text without quotes gives the same cells and lines when one quoted row is added."""
    rows, between = table
    text, lines = written(rows, separator, between)
    plain = cells_in(text if end else text.removesuffix("\n"), separator)
    quoted = cells_in(text + separator.join(['"P"', '"1"', '"x"']), separator)
    assert plain.lines.tolist() == lines
    assert quoted.lines.tolist()[:-1] == lines
    assert rows_in(quoted)[:-1] == rows_in(plain)
    assert plain.comments == quoted.comments


def test_line_numbers_after_all_that_takes_lines() -> None:
    """Comments, blank lines and line breaks in cells all count."""
    cells = cells_in(
        "# recorded in May\n\nreader,note\n"
        'P01,"two\nlines"\n'  # lines 4 and 5
        "\n# lunch\n"
        'P02,"a ""word"""\n'  # line 8
        "P03,\n"
    )
    assert cells.header_line == 3
    assert rows_in(cells) == [("P01", "two\nlines"), ("P02", 'a "word"'), ("P03", "")]
    assert cells.lines.tolist() == [4, 8, 9]
    assert cells.comments == 1


def test_header_over_two_lines() -> None:
    """A quoted name with a line break moves the rows down by a line."""
    cells = cells_in('"reader","duration\n(ms)"\nP01,200\n')
    assert cells.header == ("reader", "duration\n(ms)")
    assert cells.lines.tolist() == [3]


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_blank_lines_of_tabs_are_blank(quote: str) -> None:
    """A line of tabs is blank unless tabs separate the fields."""
    cells = cells_in(f"a,b\n{quote}1{quote},2\n\t\n \t \n3,4\n")
    assert (rows_in(cells), cells.lines.tolist()) == ([("1", "2"), ("3", "4")], [2, 5])


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_row_of_empty_cells_is_a_row(quote: str) -> None:
    """Where tabs separate the fields, a line of tabs is a row without values."""
    cells = cells_in(f"a\tb\n{quote}1{quote}\t2\n\t\n")
    assert (rows_in(cells), cells.lines.tolist()) == ([("1", "2"), ("", "")], [2, 3])


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_column_without_a_name_is_left_out(quote: str) -> None:
    """A column of row numbers, as some programs write one without a name, does no harm."""
    cells = cells_in(f",reader,dur\n1,{quote}P01{quote},200\n")
    assert cells.table.column_names == ["reader", "dur"]
    assert cells.column("dur").to_pylist() == ["200"]


def test_quote_inside_a_plain_cell_stays() -> None:
    """A quote mark that does not begin a cell is a character like any other."""
    assert rows_in(cells_in('size,of\n24",screen\n')) == [('24"', "screen")]


def test_blanks_in_cells_stay() -> None:
    """Cells are handed on as they are; only names are trimmed."""
    cells = cells_in(" reader ;dur\n P01 ; 200\n")
    assert cells.header == ("reader", "dur")
    assert rows_in(cells) == [(" P01 ", " 200")]


@pytest.mark.parametrize(
    ("text", "separator"),
    [
        ("reader\ttrial\nP01\t1\n", "\t"),
        ("reader;dur\nP01;200,5\n", ";"),
        ("reader,dur\nP01,200.5\n", ","),
        ("reader|dur\nP01|200\n", "|"),
        ("reader dur\nP01 200\n", " "),
        ("reader id\tthe dur\nP 01\t200\n", "\t"),
        ("x, left;y\n1,5;2,5\n", ";"),
        ('item,text\npear,"one; two; three"\n', ","),
        ("reader\nP01\n", "\t"),
    ],
    ids=[
        "tabs",
        "semicolons with decimal commas",
        "commas",
        "bars",
        "blanks",
        "tabs with blanks in names",
        "semicolons with a comma in a name",
        "commas with semicolons in quotes",
        "one column",
    ],
)
def test_separator_is_found_out(text: str, separator: str) -> None:
    """The separator is the sign that splits header and rows into as many fields."""
    assert cells_in(text).delimiter == separator


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_every_uneven_row_is_named(quote: str) -> None:
    """Rows with too few and too many fields are all named, by both readers alike."""
    said = problems_in(f"a,b\n{quote}1{quote},2\n# remark\n1\n1,2,3\n")
    fix = (
        "    fix: complete the row, or remove what is too much; a cell that holds the separator "
        "must stand in quotes\n"
    )
    assert said == (
        'log.tsv:4: the row has too few fields; found "1 field", expected 2 fields, as in the '
        f"header\n{fix}"
        'log.tsv:5: the row has too many fields; found "3 fields", expected 2 fields, as in the '
        f"header\n{fix}"
        "2 problems; nothing was written"
    )


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_header_that_lacks_a_name_is_named(quote: str) -> None:
    """Where all rows have one field more than the header, the header is wrong, not the rows."""
    assert problems_in(f"a,b\n{quote}1{quote},2,3\n4,5,6\n") == (
        'log.tsv:1: the header has another number of fields than every row; found "2 in the '
        'header, 3 in each row", expected as many names, separated by commas, as fields in a row\n'
        "    fix: complete the header, or remove the name that is too much\n"
        "1 problem; nothing was written"
    )
