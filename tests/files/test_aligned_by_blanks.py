"""Tables that are aligned by blanks: a run of them is one separator."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import RawText, cells_of
from tests.files.reading import cells_in, problems_in, rows_in

WORD = st.text(alphabet="ab1.\t", min_size=1, max_size=4).filter(lambda text: text.strip() == text)
RUN = st.integers(1, 4).map(lambda count: " " * count)


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_columns_aligned_by_blanks(quote: str) -> None:
    """However many blanks stand between cells and around them, the cells are the same."""
    cells = cells_in(f"  reader  trial   dur\n  P01         1   200  \nP02 2 {quote}210{quote}\n")
    assert cells.header == ("reader", "trial", "dur")
    assert cells.delimiter == " "
    assert rows_in(cells) == [("P01", "1", "200"), ("P02", "2", "210")]
    assert cells.lines.tolist() == [2, 3]


@given(st.lists(st.tuples(WORD, WORD, WORD, RUN, RUN, RUN), max_size=5), st.booleans())
def test_any_runs_of_blanks(rows: list[tuple[str, ...]], quoted: bool) -> None:
    """Runs of blanks of any length separate as one blank does."""
    last = ' "x" y z\n' if quoted else ""
    lines = [f"{a}{one}{b}{two}{c}{end}\n" for a, b, c, one, two, end in rows]
    cells = cells_in("reader trial dur\n" + "".join(lines) + last, " ")
    expected = [row[:3] for row in rows] + ([("x", "y", "z")] if quoted else [])
    assert rows_in(cells) == expected


def test_blanks_in_quotes_stay() -> None:
    """Inside quotes a blank is text, also at a cell's end and at a line's end."""
    cells = cells_in('reader  word\nP01   "a  pear "\nP02 "a \n b"  \nP03 ""\n', " ")
    assert rows_in(cells) == [("P01", "a  pear "), ("P02", "a \n b"), ("P03", "")]


def test_mark_not_doubled_between_blanks() -> None:
    """Quote marks are mended as with any separator."""
    cells = cells_in('reader word dur\nP01  """   200 \nP02 "a"b" 1\n', " ")
    assert rows_in(cells) == [("P01", '"', "200"), ("P02", 'a"b', "1")]


@pytest.mark.parametrize("quote", ["", '"'], ids=["plain", "quoted"])
def test_empty_cell_is_an_uneven_row(quote: str) -> None:
    """A cell left empty cannot be told from the blanks around it: the row is named."""
    said = problems_in(f"reader trial dur\nP01 1 {quote}200{quote}\nP01   200\n")
    assert said.startswith(
        'log.tsv:3: the row has too few fields; found "2 fields", expected 3 fields, as in the '
        "header\n"
    )


def test_remarks_in_aligned_tables() -> None:
    """A remark of as many words as the header has names is doubtful, as with any separator."""
    findings = Findings()
    text = RawText("log.txt", b"reader trial\nP01 1\n# lunch\n#  at  noon\n", "", "utf-8")
    cells = cells_of(text, findings)
    assert cells is not None
    assert (cells.comments, cells.comments_like_rows) == (2, 1)
