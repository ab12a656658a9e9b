"""Units that stand in the names of columns."""

import pytest

from etl.errors import Findings
from etl.files import RawText, cells_of
from etl.files.units import bare_name, own_names, unit_in, units_in_row


@pytest.mark.parametrize(
    ("name", "unit"),
    [
        ("dur [ms]", "ms"),
        ("dur[ms]", "ms"),
        ("dur (MSEC)", "ms"),
        ("t/s", "s"),
        ("t / s", "s"),
        ("onset [seconds]", "s"),
        ("onset [µs]", "us"),
        ("onset [μs]", "us"),
        ("x (px)", "px"),
        ("x [°]", "deg"),
        ("x [mm]", "mm"),
        ("gaze (left) [px]", "px"),
        ("dur_ms", None),
        ("dur ms", None),
        ("[ms]", None),
        ("words/line", None),
        ("eye (left)", None),
        ("dur [ms", None),
        ("dur", None),
    ],
)
def test_unit_of_a_name(name: str, unit: str | None) -> None:
    """A known unit in brackets or after a slash is a unit; the two signs for micro are one."""
    assert unit_in(name) == unit


def test_bare_name_keeps_what_is_no_unit() -> None:
    """Only a known unit in brackets is left out."""
    assert [bare_name(name) for name in ("x (px)", "x (left)", "t/s")] == ["x", "x (left)", "t/s"]


@pytest.mark.parametrize(
    ("header", "own"),
    [
        (["dur [ms]"], {"dur": "dur [ms]"}),
        (["dur [ms]", "dur"], {"dur": "dur"}),
        (["dur [ms]", "dur (s)"], {}),
        (["dur [fast]"], {}),
        (["dur/ms"], {}),
        (["Dur [ms]"], {}),
    ],
    ids=["one", "itself", "two", "no unit", "a slash", "another case"],
)
def test_name_without_its_unit(header: list[str], own: dict[str, str]) -> None:
    """A name is found without its unit only where it cannot be another column."""
    assert own_names(["dur"], header) == own


def test_column_is_read_without_its_unit() -> None:
    """The cells come under the name that the file has."""
    findings = Findings()
    text = RawText("log.csv", b"of May\nreader,dur [ms]\nP01,200\n", "", "utf-8")
    cells = cells_of(text, findings, needed=["reader", "dur"], wary=True)
    assert cells is not None, findings.text()
    assert cells.table.column_names == ["reader", "dur [ms]"]
    assert cells.column("dur [ms]").to_pylist() == ["200"]


NUMERIC = ("start", "number", "gx")


@pytest.mark.parametrize(
    ("cells", "units"),
    [
        (("ms", "", "px"), {"start": "ms", "gx": "px"}),
        (("[ms]", "-", "(Pixels)"), {"start": "ms", "gx": "px"}),
        (("[ µs ]", "[]", "[-]"), {"start": "us"}),
        ((" sec ", "NA", "°"), {"start": "s", "gx": "deg"}),
        (("", "", "mm"), {"gx": "mm"}),
        (("ms", "1", "px"), {}),
        (("ms", "first", "px"), {}),
        (("ms", "", "furlong"), {}),
        (("ms", "", "1,5"), {}),
        (("[ms", "", "px"), {}),
        (("", "", ""), {}),
        (("NA", "-", ""), {}),
    ],
    ids=[
        "plain",
        "in brackets",
        "microseconds",
        "missing",
        "one only",
        "a number",
        "another word",
        "no known unit",
        "a comma",
        "half a bracket",
        "empty",
        "nothing",
    ],
)
def test_row_of_units(cells: tuple[str, str, str], units: dict[str, str]) -> None:
    """Every column of numbers has a unit or nothing, and one at least has a unit."""
    row = dict(zip(NUMERIC, cells, strict=True))
    assert units_in_row({"reader": "text", **row}, NUMERIC, {"", "NA"}) == units


@pytest.mark.parametrize(("cell", "is_row"), [("7", False), ("P07", True), ("-9", True)])
def test_number_anywhere_makes_it_no_row_of_units(cell: str, is_row: bool) -> None:
    """A trial with a number is one whose fixation is damaged, if its numbers are none."""
    row = {"trial": cell, "start": "ms"}
    assert bool(units_in_row(row, ["start"], {"", "-9"})) is is_row


def test_units_of_columns_without_numbers_are_words() -> None:
    """A column of words may hold the word for a unit."""
    assert units_in_row({"word": "s", "start": ""}, ["start"]) == {}
