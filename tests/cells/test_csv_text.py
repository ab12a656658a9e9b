"""CSV as the small tables are written, read by others."""

from __future__ import annotations

import csv
import io
import math
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.cells import csv_text, plain, write_csv

TEXT = st.text(st.characters(exclude_categories=("Cs",)), max_size=6)
TEXTS = TEXT | st.text(alphabet=",;\"'\r\n\t= a", max_size=6)


def read(text: str, delimiter: str = ",") -> list[list[str]]:
    """Rows by Python's reader, marks taken off."""
    rows = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    return [[plain(cell) for cell in row] for row in rows]


@given(
    st.integers(1, 4).flatmap(lambda n: st.lists(st.lists(TEXTS, min_size=n, max_size=n))),
    st.sampled_from([",", "\t", ";"]),
)
def test_any_texts_come_back(rows: list[list[str]], delimiter: str) -> None:
    """Delimiters, quotes and ends of lines within cells are no ends of cells."""
    assert read(csv_text(rows, delimiter), delimiter) == rows


@given(st.floats(allow_nan=False))
def test_numbers_come_back_with_every_digit(number: float) -> None:
    """A number is spelled so that reading gives the very same one."""
    [[cell]] = read(csv_text([[number]]))
    assert float(cell) == number


@pytest.mark.parametrize(
    ("cell", "written"),
    [
        pytest.param(None, "", id="nothing"),
        pytest.param(math.nan, "", id="not a number"),
        pytest.param(np.float64(0.1), "0.1", id="number of numpy"),
        pytest.param(np.int64(-3), "-3", id="whole number of numpy"),
        pytest.param(-0.5, "-0.5", id="negative number"),
        pytest.param("a,b", '"a,b"', id="comma"),
        pytest.param('6"', '"6"""', id="quote"),
        pytest.param("a\rb", '"a\rb"', id="carriage return"),
        pytest.param("=a,b", '"\'=a,b"', id="formula with a comma"),
    ],
)
def test_cell_as_it_is_spelled(cell: str | float | None, written: str) -> None:
    """Quotes only where a reader needs them (RFC 4180); missing values as empty cells."""
    assert csv_text([["x", cell]]) == f"x,{written}\n"


def test_line_of_one_empty_cell_is_no_empty_line(tmp_path: Path) -> None:
    """Readers skip empty lines: a row must not get lost so."""
    write_csv(tmp_path / "a.csv", ["x"], [["1"], [None], ["2"]])
    assert (tmp_path / "a.csv").read_bytes() == b'x\n1\n""\n2\n'
    assert len(pd.read_csv(tmp_path / "a.csv")) == 3


def test_file_is_utf8_with_plain_line_ends(tmp_path: Path) -> None:
    """The same bytes on every system; headers are made safe as cells are."""
    write_csv(tmp_path / "a.csv", ["=pear", "Größe"], [["=plum", 1.5], ["late", None]])
    assert (tmp_path / "a.csv").read_bytes() == "'=pear,Größe\n'=plum,1.5\nlate,\n".encode()
