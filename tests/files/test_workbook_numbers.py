"""Cells of a workbook as a sheet shows them: number formats, dates and times, truths, texts."""

from __future__ import annotations

import random
from datetime import date, datetime, time, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st
from openpyxl.styles.numbers import BUILTIN_FORMATS

from etl.files.numeric_cells import number_of
from etl.files.workbook_numbers import general, number_as_shown
from etl.files.workbook_values import cell_as_shown

#: The built-in formats for numbers, by their identifiers in ECMA-376-1:2016, section 18.8.30, with
#: 1234.5678 as spreadsheet programs show it (from memory), but without signs between thousands.
BUILT_IN = {
    0: "1234.5678",
    1: "1235",
    2: "1234.57",
    3: "1235",
    4: "1234.57",
    9: "123457%",
    10: "123456.78%",
    11: "1.23E+03",
    37: "1235",
    39: "1234.57",
    43: "1234.57",
    44: "$1234.57",
    49: "1234.5678",
}
#: Examples of format codes from ECMA-376-1:2016, section 18.8.31 (from memory), again without signs
#: between thousands.
STANDARD_EXAMPLES = [
    (1234.59, "####.#", "1234.6"),
    (8.9, "#.000", "8.900"),
    (0.631, "0.#", "0.6"),
    (12, "#.0#", "12.0"),
    (1234.568, "#.0#", "1234.57"),
    (12000, "#,###", "12000"),
]


@pytest.mark.parametrize(("identifier", "text"), BUILT_IN.items())
def test_built_in_number_formats(identifier: int, text: str) -> None:
    """Each built-in format shows a number as the standard says."""
    shown = number_as_shown(1234.5678, BUILTIN_FORMATS[identifier])
    assert (shown.text, shown.understood) == (text, True)


@pytest.mark.parametrize(("number", "code", "text"), STANDARD_EXAMPLES)
def test_examples_of_the_standard(number: float, code: str, text: str) -> None:
    """The standard's own examples of format codes come out as printed there."""
    assert number_as_shown(number, code).text == text


@pytest.mark.parametrize(
    "code",
    ["# ?/?", "# ??/??", "#,", "0.0,,", "##0.0E+0", "[>99]0;0.0", ";;;", "0;-0;;@", "yyy"],
    ids=[
        *("fraction", "fraction_of_two", "thousands", "millions", "steps_of_three", "condition"),
        *("hides_all", "hides_zero", "letters"),
    ],
)
def test_format_that_is_not_understood_leaves_the_number(code: str) -> None:
    """What a format would make of a number is not guessed: the number is given as it is held."""
    shown = number_as_shown(0 if code == "0;-0;;@" else 1.25, code)
    assert shown.understood is False
    assert shown.text == ("0" if code == "0;-0;;@" else "1.25")


@pytest.mark.parametrize(
    ("number", "code", "text"),
    [
        (7, "000", "007"),
        (7, '"P"00', "P07"),
        (7, "\\P00", "P07"),
        (123456789, "000-00-0000", "123-45-6789"),
        (5, '0.0" ms"', "5.0 ms"),
        (0.5, "#.00", ".50"),
        (1, "0.##", "1"),
        (7, "[Red]0", "7"),
        (7, "0_)", "7"),
        (7, "[$€-407] 0", "€ 7"),
        (7, "General", "7"),
        (7, '"no. "General', "no. 7"),
    ],
)
def test_digits_and_texts_of_a_format(number: float, code: str, text: str) -> None:
    """Leading zeros, and texts that stand around the digits, are part of what the lab sees."""
    assert number_as_shown(number, code).text == text


@pytest.mark.parametrize(
    "code",
    ["0.0", "0.0;-0.0", "0.0;(0.0)", "0.0_);[Red]\\(0.0\\)", "0.0;[Red]0.0", "0.0;-0.0;0.0"],
)
def test_number_below_zero_has_a_minus_sign(code: str) -> None:
    """Brackets and red ink are other ways of writing a minus sign; the number needs the sign."""
    assert number_as_shown(-1.5, code).text == "-1.5"


def test_dash_for_zero_is_a_zero() -> None:
    """Accounting formats show a dash for zero, which would pass for a missing value."""
    assert number_as_shown(0, '_(* #,##0.0_);_(* \\(#,##0.0\\);_(* "-"??_);_(@_)').text == "0.0"


@pytest.mark.parametrize(
    ("number", "text"), [(2.675, "2.68"), (1.005, "1.01"), (-2.5, "-2.50"), (-0.001, "0.00")]
)
def test_rounding_is_that_of_spreadsheets(number: float, text: str) -> None:
    """Halves go away from zero, by the decimal digits that are shown, not the binary ones.

    2.675 is held as 2.67499…; spreadsheet programs show 2.68 (common practice, no source).
    """
    assert number_as_shown(number, "0.00").text == text


@pytest.mark.parametrize(("number", "code"), [(0.4567, "0.00"), (0.4567, "0%"), (1234.5, "0.0E+0")])
def test_number_with_more_digits_than_shown_is_known(number: float, code: str) -> None:
    """That digits are not shown is reported, so that it can be told."""
    assert number_as_shown(number, code).exact is False
    assert cell_as_shown(number, code).held == general(number)


def test_noise_of_binary_numbers_is_not_shown() -> None:
    """0.1 + 0.2 is 0.3, as on the screen: 15 significant digits."""
    assert cell_as_shown(0.1 + 0.2, "General").text == "0.3"


@pytest.mark.parametrize("number", [1, 1.0], ids=["whole", "decimal"])
def test_whole_number_has_no_decimals(number: float) -> None:
    """A trial's number 1 must match the 1 of the logs."""
    assert cell_as_shown(number, "General").text == "1"


@given(st.floats(-1e14, 1e14).map(lambda number: float(format(number, ".14g"))))
def test_general_gives_back_the_number(number: float) -> None:
    """A number of at most 15 digits can be read back without loss."""
    assert number_of(general(number)) == number


@given(st.floats(-1e9, 1e9), st.integers(0, 6))
def test_fixed_decimals_are_within_half_a_step(number: float, places: int) -> None:
    """What is shown is never farther from the number than rounding may take it."""
    code = "0" + ("." + "0" * places if places else "")
    text = number_as_shown(number, code).text
    assert len(text.partition(".")[2]) == places
    shown = number_of(text)
    assert shown is not None
    # Half a step, and what 15 significant digits of a billion leave out.
    assert abs(shown - number) <= 0.5 * 10.0**-places + 1e-5


@given(
    st.floats(allow_nan=False, allow_infinity=False), st.text('0#?.,%E+-;"\\[]_*@ aG/', max_size=9)
)
def test_any_format_gives_a_text(number: float, code: str) -> None:
    """Whatever a format says, a number is shown by it or given as it is held."""
    shown = number_as_shown(number, code)
    assert shown.understood or shown.text == general(number)


@pytest.mark.parametrize(
    ("moment", "code", "text"),
    [
        (datetime.fromisoformat("2026-05-01"), "mm-dd-yy", "2026-05-01"),
        (datetime.fromisoformat("2026-05-01"), "d\\. mmmm yyyy", "2026-05-01"),
        (datetime.fromisoformat("2026-05-01"), "mmm", "2026-05-01"),
        (date(2026, 5, 1), "General", "2026-05-01"),
        (datetime.fromisoformat("2026-05-01T09:30"), "m/d/yy h:mm", "2026-05-01T09:30:00"),
        (datetime.fromisoformat("2026-05-01T09:30"), "General", "2026-05-01T09:30:00"),
        (
            datetime.fromisoformat("2026-05-01T09:30:01.250"),
            "d/m h:mm:ss",
            "2026-05-01T09:30:01.250",
        ),
        (time(9, 30), "h:mm", "09:30:00"),
        (time(21, 30), "h:mm AM/PM", "21:30:00"),
        (time(0, 1, 2, 500_000), "mm:ss.0", "00:01:02.500"),
        (timedelta(hours=26, minutes=5), "[h]:mm:ss", "26:05:00"),
        (timedelta(seconds=1.5), "[ss].0", "00:00:01.500"),
    ],
)
def test_moment_is_written_by_the_standard_of_dates(moment: object, code: str, text: str) -> None:
    """Dates and times are written by ISO 8601, whatever the order in which a lab shows them."""
    shown = cell_as_shown(moment, code)
    assert (shown.text, shown.held, shown.wrong) == (text, "", "")


@pytest.mark.parametrize(("code", "text"), [("d/m/yyyy", "2026-05-01"), ("h:mm", "09:30:00")])
def test_part_of_a_moment_that_is_not_shown_is_known(code: str, text: str) -> None:
    """A format that shows the day alone, or the time alone, is followed, and the rest reported."""
    shown = cell_as_shown(datetime.fromisoformat("2026-05-01T09:30"), code)
    assert (shown.text, shown.held) == (text, "2026-05-01T09:30:00")


@pytest.mark.parametrize(
    ("value", "code", "wrong"),
    [
        (time(0, 0), "d/m/yyyy", "00:00:00 on no day"),
        (datetime.fromisoformat("1899-12-29"), "d/m/yyyy", "1899-12-29, a day before 1900"),
        (timedelta(hours=-1), "[h]:mm", "a time below zero"),
        (float("inf"), "0", "a number too large to be held"),
        (10**400, "0", "a number too large to be held"),
    ],
)
def test_what_no_sheet_can_show_is_wrong(value: object, code: str, wrong: str) -> None:
    """Spreadsheet programs show hash signs for these: there is no value to take."""
    assert cell_as_shown(value, code).wrong == wrong


@pytest.mark.parametrize(
    ("held", "text"),
    [
        ("P01", "P01"),
        ("007", "007"),
        ("two\nlines", "two\nlines"),
        ("two_x000D_\nlines", "two\r\nlines"),
        ("_x005F_x000D_", "_x000D_"),
        ("_x0041_", "_x0041_"),
    ],
)
def test_text_is_as_it_is(held: str, text: str) -> None:
    """Text is not touched, but for control signs that the format of the file writes as codes."""
    assert cell_as_shown(held, "0.00").text == text


@pytest.mark.parametrize(("value", "text"), [(True, "TRUE"), (False, "FALSE")])
def test_truth_is_written_as_the_sheet_shows_it(value: bool, text: str) -> None:
    """A truth is no number, although 1 and TRUE compare as equal."""
    assert cell_as_shown(value, "0.00").text == text


def test_value_of_no_known_kind_is_refused() -> None:
    """Only what a cell can hold is written."""
    with pytest.raises(TypeError, match="a cell holds a list"):
        cell_as_shown([], "General")


def test_order_of_numbers_is_kept() -> None:
    """What is shown with as many decimals never changes which of two numbers is larger."""
    drawn = random.Random(4)
    numbers = sorted(drawn.uniform(-50, 50) for _ in range(200))
    shown = [float(number_as_shown(number, "#,##0.0").text) for number in numbers]
    assert shown == sorted(shown)
