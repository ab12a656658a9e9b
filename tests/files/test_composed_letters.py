"""Letters with accents are equal however they are composed (Unicode NFC and NFD)."""

from __future__ import annotations

import unicodedata

import numpy as np
import pyarrow as pa
import pytest

from etl.errors import Findings
from etl.files import NumberReading, number_of, numbers_in, truth_of
from tests.files.reading import cells_in

MILL = "m\u00fchle"
APART = unicodedata.normalize("NFD", MILL)


def test_cells_are_trimmed_and_composed() -> None:
    """A cell's text is in the form in which others are compared with it."""
    assert cells_in(f"item,text\n {APART} ,x\n").texts("item") == [MILL]


def test_column_names_are_composed() -> None:
    """A header is found by its name whatever its form."""
    assert cells_in(f"{APART},text\n1,x\n").header == (MILL, "text")


@pytest.mark.parametrize("form", ["NFC", "NFD"])
def test_missing_marks_of_numbers_may_have_accents(form: str) -> None:
    """A mark with an accent stands for no value in either form."""
    cells = pa.array(["1.5", unicodedata.normalize(form, MILL)])
    reading = NumberReading("log.tsv", np.array([2, 3], dtype=np.int32), {MILL}, ".")
    findings = Findings()
    values = numbers_in(cells, "x", reading, findings, expected="a number")
    assert values is not None, findings.text()
    assert np.isnan(values[1])


@pytest.mark.parametrize(
    "text", ["1_0", "nan", "inf", "1e999", "１２", "0x1", " 1", "1 ", "", "3,5"]
)
def test_words_are_no_numbers(text: str) -> None:
    """What a column of numbers refuses is no number elsewhere either."""
    assert number_of(text) is None


def test_digits_with_an_underscore_say_neither_yes_nor_no() -> None:
    """``0_1`` is no 1."""
    assert truth_of("0_1") is None
