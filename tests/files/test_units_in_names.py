"""Units that stand in the names of columns."""

import pytest

from etl.errors import Findings
from etl.files import RawText, cells_of
from etl.files.units import bare_name, own_names, unit_in


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
