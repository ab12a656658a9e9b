"""Log odds ratios and rates against another implementation, published values and their laws."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from etl.readiness.intervals import wilson_interval
from etl.variants.differences import compare, compared, rates
from tests.variants.making import FIT, RATE

COUNTS = st.integers(0, 5) | st.integers(0, 100_000)
TABLES = st.tuples(COUNTS, COUNTS, COUNTS, COUNTS)


def has_difference(table: tuple[int, int, int, int]) -> bool:
    """Whether both conditions have any value, and there are zeros and ones."""
    a, b, c, d = table
    return a + b > 0 and c + d > 0 and a + c > 0 and b + d > 0


@given(st.lists(TABLES.filter(has_difference), min_size=1, max_size=20))
def test_difference_is_that_of_another_implementation(tables: list[tuple[int, ...]]) -> None:
    """Value and interval equal those of statsmodels, given 0.5 more where a count is 0."""
    theirs = pytest.importorskip("statsmodels.stats.contingency_tables")
    counts = np.array(tables, dtype=np.int64).reshape(-1, 2, 2)
    difference, low, high, corrected = compare(counts)
    for place, table in enumerate(counts):
        # Its own ``shift_zeros`` adds to all four counts by its description, but in some versions
        # to those of 0 only.
        own = theirs.Table2x2(table + 0.5 * (table == 0).any(), shift_zeros=False)
        assert difference[place] == pytest.approx(own.log_oddsratio, abs=1e-10)
        limits = own.log_oddsratio_confint(alpha=0.05)
        assert (low[place], high[place]) == pytest.approx(limits, abs=1e-10)
        assert corrected[place] == (table == 0).any()


def test_difference_has_published_values() -> None:
    """The physicians' aspirin trial: odds ratio 1.83 (1.44 to 2.33).

    189 heart attacks among 11,034 with placebo against 104 among 11,037 with aspirin (Agresti,
    Categorical Data Analysis, from memory).
    """
    own = np.exp(compare(np.array([[10_933, 104], [10_845, 189]]))[:3])
    assert [round(float(value), 2) for value in own] == [1.83, 1.44, 2.33]


def test_difference_is_the_one_worked_out_by_hand() -> None:
    """3 zeros and 1 one against 1 zero and 3 ones.

    Odds 1/3 and 3, so the difference is log 9 = 2.1972; the variance is 1/3 + 1 + 1 + 1/3 = 8/3,
    its root 1.63299, times 1.959964 = 3.20061. With a count of 0 in place of the first, 0.5 more
    in each: odds 1.5/0.5 = 3 and 3.5/1.5, log(7/9) = -0.2513.
    """
    difference, low, high, corrected = compare(np.array([[[3, 1], [1, 3]], [[0, 1], [1, 3]]]))
    assert difference == pytest.approx([2.19722, -0.25131], abs=1e-5)
    assert (low[0], high[0]) == pytest.approx((-1.00339, 5.39784), abs=1e-5)
    assert corrected.tolist() == [False, True]


@given(TABLES, st.integers(1, 50), st.integers(1, 50))
def test_equal_odds_have_no_sign(table: tuple[int, ...], first: int, second: int) -> None:
    """Multiples of the same counts differ by exactly 0, not by what rounding leaves."""
    zeros, ones = table[0] + 1, table[1] + 1
    counts = np.array([[first * zeros, first * ones], [second * zeros, second * ones]])
    assert compare(counts)[0] == 0.0


@given(TABLES.filter(has_difference))
def test_sign_is_that_of_the_odds(table: tuple[int, int, int, int]) -> None:
    """Which odds are larger is settled in whole numbers, so the sign must agree with that."""
    a, b, c, d = (2 * count + (0 in table) for count in table)
    assert np.sign(compare(np.reshape(table, (2, 2)))[0]) == np.sign(a * d - b * c)


@given(TABLES)
def test_turning_conditions_or_values_round_turns_the_sign(table: tuple[int, ...]) -> None:
    """Level for reference, or ones for zeros: the same difference the other way."""
    counts = np.reshape(table, (2, 2))
    difference, low, high, corrected = compare(counts)
    for turned in (counts[::-1], counts[:, ::-1]):
        other = compare(turned)
        expected = (-difference, -high, -low)
        assert other[:3] == pytest.approx(expected, abs=1e-12, nan_ok=True)
        assert other[3] == corrected


@pytest.mark.parametrize(
    "table",
    [
        *((0, 0, 3, 4), (3, 4, 0, 0), (0, 0, 0, 0)),
        *((3, 0, 40, 0), (40, 0, 3, 0), (7, 0, 7, 0), (0, 3, 0, 40), (0, 1, 0, 1)),
    ],
)
def test_where_nothing_is_known_there_is_no_difference(table: tuple[int, ...]) -> None:
    """Nothing is added where a condition has no value, or all values of both are the same.

    With 0.5 more in each count, 3 zeros against 40 would differ by log(3.5 x 0.5 / (0.5 x 40.5)) =
    -2.45: a sign that only tells which condition has more trials.
    """
    difference, low, high, corrected = compare(np.reshape(table, (2, 2)))
    assert np.isnan([difference, low, high]).all()
    assert not corrected


@given(TABLES)
def test_every_other_table_has_a_difference(table: tuple[int, int, int, int]) -> None:
    """A number and both ends of its interval, or none of the three."""
    own = compare(np.reshape(table, (2, 2)))
    expected = [has_difference(table)] * 3
    assert np.isfinite(own[:3]).tolist() == expected
    assert own[3] == (has_difference(table) and 0 in table)


@given(st.lists(TABLES, min_size=6, max_size=6))
def test_leading_axes_are_kept(tables: list[tuple[int, ...]]) -> None:
    """Many tables at once give what each gives alone, to the last bit."""
    counts = np.array(tables, dtype=np.int64).reshape(2, 3, 2, 2)
    together = compare(counts)
    for place in np.ndindex(2, 3):
        alone = compare(counts[place])
        for own, other in zip(together, alone, strict=True):
            assert own.shape == (2, 3)
            assert np.array_equal(own[place], other, equal_nan=True)


@given(st.lists(st.tuples(COUNTS, COUNTS), min_size=1, max_size=20))
@example([(0, 0), (0, 1), (1, 0)])
def test_rates_are_those_of_one_rate_at_a_time(pairs: list[tuple[int, int]]) -> None:
    """Exactly the interval that tables and pages have elsewhere."""
    for own, (zeros, ones) in zip(zip(*rates(np.array(pairs)), strict=True), pairs, strict=True):
        n = zeros + ones
        if n:
            assert own == (ones / n, *wilson_interval(ones, n))
        else:
            assert np.isnan(own).all()


@given(COUNTS, COUNTS)
def test_rates_are_those_of_another_implementation(zeros: int, ones: int) -> None:
    """Wilson's interval equals the one of statsmodels."""
    proportion = pytest.importorskip("statsmodels.stats.proportion")
    _, low, high = rates(np.array([zeros + 1, ones]))
    theirs = proportion.proportion_confint(ones, zeros + 1 + ones, alpha=0.05, method="wilson")
    assert (low, high) == pytest.approx(theirs, abs=1e-12)


def test_comparison_without_factor_is_a_rate() -> None:
    """Without levels to compare the rate itself is looked at, and nothing is added to counts."""
    counts = np.array([[[5, 5], [5, 5]], [[4, 0], [4, 0]], [[4, 0], [2, 2]]])
    own = compared(RATE, counts)
    assert own.difference.tolist() == [0.5, 0.0, 0.0]
    assert (own.low[0], own.high[0]) == wilson_interval(5, 10)
    assert own.corrected.tolist() == [False, False, False]
    both = compared(FIT, counts)
    # 4.5 zeros and 0.5 ones against 2.5 of each: log 9.
    expected = [0.0, np.nan, np.log(9)]
    assert both.difference == pytest.approx(expected, abs=1e-12, nan_ok=True)
    assert both.corrected.tolist() == [False, False, True]


def test_what_are_no_counts_is_refused() -> None:
    """A wrong shape, and counts below 0."""
    with pytest.raises(ValueError, match=r"shape \(2, 3\); expected \(\.\.\., 2, 2\)"):
        compare(np.zeros((2, 3), dtype=np.int64))
    with pytest.raises(ValueError, match=r"shape \(3,\); expected \(\.\.\., 2\)"):
        rates(np.zeros(3, dtype=np.int64))
    with pytest.raises(ValueError, match="counts go down to -1; expected 0 or more"):
        compare(np.array([[1, 1], [1, -1]]))
