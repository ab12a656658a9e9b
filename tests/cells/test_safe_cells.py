"""Texts that spreadsheet programs would run as formulas, made safe and taken back."""

from __future__ import annotations

import re

import pyarrow as pa
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from etl.cells import MARKED, SIGNS, plain, plain_array, safe, safe_array

#: Texts of the signs that matter, besides any others.
TEXTS = st.one_of(
    st.text(),
    st.text(alphabet="=+-@'＝＋－＠\t\r\n0159.eE ax", max_size=8),
)


@pytest.mark.parametrize(
    ("text", "written"),
    [
        pytest.param("=1+2", "'=1+2", id="formula"),
        pytest.param("+49 30", "'+49 30", id="telephone number"),
        pytest.param("-a", "'-a", id="dash before a word"),
        pytest.param("@home", "'@home", id="at"),
        pytest.param("＝1", "'＝1", id="wide equals"),
        pytest.param("＋1", "'＋1", id="wide plus"),
        pytest.param("－1", "'－1", id="wide minus"),
        pytest.param("＠a", "'＠a", id="wide at"),
        pytest.param("\t=1", "'\t=1", id="tab"),
        pytest.param("\r=1", "'\r=1", id="carriage return"),
        pytest.param("\n=1", "'\n=1", id="line feed"),
        pytest.param("'=x", "''=x", id="apostrophe before a formula"),
        pytest.param("''=x", "'''=x", id="two apostrophes before a formula"),
        pytest.param("-5-3", "'-5-3", id="difference"),
        pytest.param("-5\n", "'-5\n", id="number and an end of line"),
        pytest.param("-1,5", "'-1,5", id="number with a comma"),
        pytest.param("--5", "'--5", id="two signs"),
        pytest.param("+", "+", id="a sign by itself"),
        pytest.param("-", "-", id="a dash by itself"),
        pytest.param("'-", "'-", id="apostrophe and a dash"),
        pytest.param("-5", "-5", id="number"),
        pytest.param("+5", "+5", id="number with a plus"),
        pytest.param("-.5", "-.5", id="number without a zero"),
        pytest.param("-5.", "-5.", id="number with a point at the end"),
        pytest.param("-1.5e-05", "-1.5e-05", id="number with an exponent"),
        pytest.param("'-5", "'-5", id="apostrophe and a number"),
        pytest.param("'tis", "'tis", id="apostrophe and a word"),
        pytest.param("a=1", "a=1", id="sign further on"),
        pytest.param(" =1", " =1", id="blank before a sign"),
        pytest.param("", "", id="nothing"),
    ],
)
def test_text_as_it_is_written(text: str, written: str) -> None:
    """Signs as in OWASP's "CSV Injection" (from memory); numbers and single signs stay."""
    assert (safe(text), plain(written)) == (written, text)


@given(TEXTS)
def test_what_was_made_safe_comes_back(text: str) -> None:
    """Taking the mark off gives the very text, whatever it is."""
    assert plain(safe(text)) == text


@given(TEXTS)
def test_safe_text_begins_with_no_sign(text: str) -> None:
    """A cell of two characters or more that begins with a sign is a number as Python reads it."""
    written = safe(text)
    if len(written) > 1 and written[0] in SIGNS:
        assert re.fullmatch(r"[-+0-9.eE]+", written)
        assert isinstance(float(written), float)


@given(TEXTS)
@example("''=x")
def test_at_most_one_apostrophe_is_added(text: str) -> None:
    """The text stays what it is, or has one apostrophe more in front."""
    assert safe(text) in (text, "'" + text)


@given(st.integers() | st.floats(allow_nan=False, allow_infinity=False))
def test_numbers_stay(number: float) -> None:
    """However Python spells a number, its text is no formula."""
    assert safe(repr(number)) == repr(number)


@given(TEXTS)
def test_texts_without_marks_are_read_as_they_are(text: str) -> None:
    """A table that no program made safe, such as one by hand, loses nothing but such marks."""
    assert plain(text) == text or text.startswith("'")


@given(st.lists(st.none() | TEXTS))
def test_column_is_made_safe_text_by_text(texts: list[str | None]) -> None:
    """Plain columns and coded ones give what their texts give; missing cells stay missing."""
    expected = [None if text is None else safe(text) for text in texts]
    column = pa.array(texts, pa.string())
    coded = column.dictionary_encode()
    for given_, made in ((column, safe_array(column)), (coded, safe_array(coded))):
        assert made.type == given_.type
        assert made.to_pylist() == expected
        assert plain_array(made).to_pylist() == texts


def test_column_with_nothing_to_do_is_the_same_object() -> None:
    """Nothing is copied where no text is to be changed."""
    column = pa.array(["early", "-", None]).dictionary_encode()
    assert safe_array(column) is column


def test_pattern_knows_no_sign_of_one_language_only() -> None:
    """R knows neither spelled letters nor the sign for the end of a text that Python knows."""
    assert r"\u" not in MARKED
    assert r"\Z" not in MARKED
