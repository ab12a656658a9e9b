"""Cells into numbers: decimal signs, missing marks, and what is no number."""

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.errors import Findings
from etl.files import NumberReading, find_decimal, numbers_in

ORDINARY = st.floats(allow_nan=False, allow_infinity=False)


def reading(rows: int, decimal: str = ".", missing: tuple[str, ...] = ("",)) -> NumberReading:
    """A log whose first row stands in line 2."""
    return NumberReading("log.tsv", np.arange(2, rows + 2, dtype=np.int32), missing, decimal)


def numbers(
    *cells: str, decimal: str = ".", missing: tuple[str, ...] = ("", "NA")
) -> list[float | None]:
    """Cells as numbers, None for missing ones; nothing must be wrong."""
    findings = Findings()
    found = numbers_in(
        pa.array(cells, pa.string()),
        "dur",
        reading(len(cells), decimal, missing),
        findings,
        expected="a number",
    )
    assert found is not None, findings.text()
    return [None if np.isnan(value) else value for value in found.tolist()]


def decimal_of(*cells: str) -> tuple[str | None, str]:
    """The decimal sign that is found out, and what is said."""
    findings = Findings()
    column = pa.array(cells, pa.string())
    return find_decimal({"dur": column}, "log.tsv", lambda row: row + 2, findings), findings.text()


@given(st.lists(ORDINARY, min_size=1), st.sampled_from([".", ","]))
def test_any_number_is_read_exactly(values: list[float], decimal: str) -> None:
    """A number that Python wrote is read back to the last bit, with either decimal sign."""
    cells = [repr(value).replace(".", decimal) for value in values]
    assert numbers(*cells, decimal=decimal) == values


@given(st.lists(ORDINARY, min_size=1))
def test_missing_cells_change_no_number(values: list[float]) -> None:
    """The way in which a column with missing cells is read gives the same numbers."""
    assert numbers(*map(repr, values), "NA") == [*numbers(*map(repr, values)), None]


@pytest.mark.parametrize(
    ("cell", "value"),
    [
        ("5", 5.0),
        (" 5 ", 5.0),
        ("+5", 5.0),
        ("-5", -5.0),
        ("5.", 5.0),
        (".5", 0.5),
        ("1e3", 1000.0),
        ("1E-3", 0.001),
        ("007", 7.0),
        ("5\u00a0", 5.0),
    ],
)
def test_spelling(cell: str, value: float) -> None:
    """The usual spellings of a number are read, alone and in a column with missing cells."""
    assert numbers(cell) == [value]
    assert numbers(cell, "NA") == [value, None]


@pytest.mark.parametrize(
    "cell",
    [
        "abc",
        "nan",
        "NaN",
        "inf",
        "-inf",
        "Infinity",
        "1e999",
        "1_000",
        "0x10",
        "1 000",
        "1,5",
        "٣",
        "5ms",
        "--5",
        "1e",
        "e5",
        ".",
    ],
)
def test_what_is_no_number(cell: str) -> None:
    """A cell that is no finite decimal number is refused, alone and beside a missing one."""
    for cells in ([cell], [cell, "NA"]):
        findings = Findings()
        column = pa.array(cells, pa.string())
        how = reading(len(cells), missing=("", "NA"))
        assert numbers_in(column, "dur", how, findings, expected="a number in ms") is None
        (finding,) = findings.items
        assert (finding.line, finding.where, finding.found) == (2, 'column "dur"', cell)


@pytest.mark.parametrize("mark", ["-", "n/a", "-9999", "nan", "inf"])
def test_missing_mark_may_look_like_a_number(mark: str) -> None:
    """A mark stands for no value even where it could be read as one."""
    assert numbers("5", mark, f" {mark} ", missing=("", mark)) == [5.0, None, None]


@pytest.mark.parametrize(
    ("cells", "decimal"),
    [
        (["1", "2"], "."),
        (["1.5", "2"], "."),
        (["1,5", "2"], ","),
        (["0,123"], ","),
        (["1234,567"], ","),
        (["12,345", "1,5"], ","),
        ([], "."),
    ],
    ids=["whole", "point", "comma", "leading zero", "four digits before", "one is clear", "none"],
)
def test_decimal_sign_is_found_out(cells: list[str], decimal: str) -> None:
    """The decimal sign is told from the cells where they can be read in one way only."""
    assert decimal_of(*cells) == (decimal, "")


def test_comma_that_may_mark_thousands_is_refused() -> None:
    """Where every comma stands before three digits, nobody can tell what it is."""
    decimal, said = decimal_of("12,345", "1,234,567")
    assert decimal is None
    assert said == (
        'log.tsv:2: column "dur": the comma could be a decimal sign or a thousands sign; found '
        '"12,345", expected numbers that can be read in one way only\n'
        '    fix: state decimal = "," in [logs] if it is the decimal sign; otherwise write the '
        "numbers without thousands signs\n"
        "1 problem; nothing was written"
    )


def test_commas_and_points_are_refused() -> None:
    """A file with both signs is not guessed at."""
    decimal, said = decimal_of("1.234", "5,5")
    assert decimal is None
    assert said == (
        'log.tsv:3: column "dur": the numbers have commas and points, so the decimal sign cannot '
        'be told (a point in column "dur", line 2); found "5,5", expected one decimal sign in the '
        "whole file\n"
        '    fix: state decimal = "." or "," in [logs], and write numbers without thousands signs\n'
        "1 problem; nothing was written"
    )


@pytest.mark.parametrize(
    ("cell", "decimal"),
    [
        ("1,5", "."),
        ("1.5", ","),
        ("1.234,5", ","),
        ("1,234.5", "."),
        ("1'000", "."),
        ("1 000", "."),
    ],
)
def test_other_sign_in_a_number_is_explained(cell: str, decimal: str) -> None:
    """A number with another sign than the stated one says how the log is read."""
    findings = Findings()
    column = pa.array([cell], pa.string())
    assert numbers_in(column, "dur", reading(1, decimal), findings, expected="a number") is None
    assert findings.items[0].fix == (
        f'the log is read with "{decimal}" as decimal sign and without thousands signs: correct '
        "the cell, or [logs] decimal in the study file"
    )
