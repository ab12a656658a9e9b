"""The limits by which logs are compared, against plain loops, and over random logs."""

from __future__ import annotations

from dataclasses import replace
from statistics import median, median_low

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.files import FileAccount
from etl.parsers.canonical import LogNote
from etl.session.compared_logs import ComparedLog
from etl.session.differing_logs import cut_short, differences
from etl.session.far_off import far_off, medians_of_others, off_by_factor
from etl.session.log_figures import LogFigures, Spread

NUMBERS = st.lists(st.floats(0.001, 1e9), min_size=2, max_size=30)
SPREAD = Spread(200.0, 500.0, 900.0)
FIGURES = LogFigures(1, 24, 240, 240, 210.0, 1.2, SPREAD, Spread(500.0, 530.0, 560.0))


def log(name: str, figures: LogFigures = FIGURES, **note: object) -> ComparedLog:
    """A log that was read."""
    account = FileAccount(241)
    account.line("header", 1, 1)
    account.line("fixations", 240, 2)
    plain = LogNote(name, "", "utf-8", "\t", ".", ("a", "b", "c"), account=account)
    return ComparedLog(replace(plain, **note), figures)


@given(NUMBERS)
def test_median_of_others_leaves_a_value_itself_out(values: list[float]) -> None:
    """For each value the median of the list without it."""
    expected = [median(values[:place] + values[place + 1 :]) for place in range(len(values))]
    # A median of an even number of values is the mean of two, rounded once here and there.
    assert medians_of_others(values).tolist() == pytest.approx(expected, rel=1e-15)


@given(NUMBERS)
def test_number_is_far_off_beyond_five_deviations_and_a_third(values: list[float]) -> None:
    """Both limits must be passed, and two numbers are never far off one another."""
    middle = median(values)
    deviation = median(abs(value - middle) for value in values)
    expected = [
        len(values) > 2 and abs(value - middle) > 5 * deviation and abs(value - middle) > middle / 3
        for value in values
    ]
    assert (far_off(values)[1] != 0).tolist() == expected


@given(NUMBERS, st.floats(1.5, 1000))
def test_value_is_off_by_a_factor_of_the_lower_median(values: list[float], factor: float) -> None:
    """The usual value is one that occurs and never off itself; what is not there is not off."""
    usual, off = off_by_factor([*values, float("nan")], factor)
    assert usual == median_low(values)
    several = len(values) > 2
    expected = [several and (v > factor * usual or v < usual / factor) for v in values]
    assert off.tolist() == [*expected, False]


@given(st.integers(1, 40), st.floats(1, 1e5), st.integers(0, 500), st.booleans())
def test_nothing_is_told_of_logs_that_are_the_same(
    count: int, median_ms: float, fixations: int, ends_open: bool
) -> None:
    """However many logs there are and whatever they are like, if they are alike."""
    figures = replace(FIGURES, median_ms=median_ms, fixations=fixations + 1, placed=fixations)
    logs = [log(f"{place}.tsv", figures, ends_open=ends_open) for place in range(count)]
    assert differences(logs) == []
    assert cut_short(logs) == []


@given(st.permutations(range(9)))
def test_order_of_logs_changes_only_the_order_of_names(order: list[int]) -> None:
    """The same logs are named for the same differences, whichever comes first."""
    logs = [log(f"{place}.tsv") for place in range(9)]
    logs[2] = log("2.tsv", encoding="utf-16")
    logs[4] = log("4.tsv", replace(FIGURES, trials=3), decimal=",")
    logs[7] = log("7.tsv", replace(FIGURES, x=replace(SPREAD, middle_px=2000.0)))
    told = {(about.alone, about.logs) for about in differences([logs[place] for place in order])}
    assert told == {(about.alone, about.logs) for about in differences(logs)}
    assert {name for _, names in told for name in names} == {"2.tsv", "4.tsv", "7.tsv"}


def test_columns_are_told_apart_by_what_is_missing_and_besides() -> None:
    """Names that differ in letter case only are one column; long lists are cut and counted."""
    usual = ("reader", "trial", "onset", *(f"spare {n}" for n in range(9)))
    logs = [log(f"{place}.tsv", columns=usual) for place in range(4)]
    logs.append(log("odd.tsv", columns=("trial", "Reader", "onset", "remark")))
    (told,) = differences(logs)
    spare = ", ".join(f'"spare {n}"' for n in range(6))
    assert told.alone == (
        f"the columns are not those of the rest, 4 of 5 logs: without {spare} and 3 more, "
        'with "remark" besides, "Reader" for "reader", in another order'
    )


def test_lines_that_most_logs_have_are_missed_in_the_others() -> None:
    """A log without the rows of the other eye, where all others have some, is told."""
    logs = [log(f"{place}.tsv") for place in range(4)]
    for one in logs[:3]:
        one.note.account.line("rows of the other eye", 9, 3)
    (told,) = differences(logs)
    assert told.finding().text() == (
        "note: 3.tsv: the log lacks lines of a kind that 3 of 4 logs have: rows of the other eye"
    )


def test_spread_leaves_positions_that_are_not_there_aside() -> None:
    """A log without any position has none in the middle either."""
    assert np.isnan(Spread.of(np.full(3, np.nan)).middle_px)
    assert Spread.of(np.array([np.nan, 7.0, np.nan])) == Spread(7.0, 7.0, 7.0)
