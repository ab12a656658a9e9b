"""Who stands out, and whether loss differs between conditions."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from etl.report.comparing import loss_p_value, robust_fence

VALUES = st.lists(st.floats(-1e6, 1e6), min_size=5, max_size=60)
TWO = st.lists(st.integers(0, 60), min_size=2, max_size=2)


@given(VALUES)
def test_deviation_is_that_of_another_implementation(values: list[float]) -> None:
    """It is scipy's scaled median absolute deviation, with Leys and others' rounded factor."""
    fence = robust_fence(values)
    theirs = float(stats.median_abs_deviation(values, scale="normal"))
    if fence is None:
        assert theirs == 0
    else:
        # 1.4826 is 1 / 0.674490 rounded to four places.
        assert fence[1] == pytest.approx(theirs, rel=3e-5)


def test_few_readers_are_not_judged() -> None:
    """With four values nobody is called an outlier."""
    assert robust_fence([1.0, 2.0, 3.0, 100.0]) is None


def test_readers_alike_are_not_judged() -> None:
    """Where more than half have the same value the deviation is 0, and nobody is judged."""
    assert robust_fence([5.0, 5.0, 5.0, 5.0, 9.0]) is None


def exact(lost: list[int], kept: list[int]) -> float:
    """Fisher's two-sided p of two levels, summed over all tables with these margins."""
    a, n = lost[0] + kept[0], lost[1] + kept[1]
    k = sum(lost)

    def weight(x: int) -> int:
        return math.comb(a, x) * math.comb(n, k - x)

    tables = [weight(x) for x in range(max(0, k - n), min(a, k) + 1)]
    # Whole numbers: no table is missed for a rounding error.
    return sum(w for w in tables if w <= weight(lost[0])) / math.comb(a + n, k)


@given(TWO, TWO)
def test_two_levels_have_the_exact_p(lost: list[int], kept: list[int]) -> None:
    """Of two levels, p is the share of all tables with the same margins that are as rare."""
    p = loss_p_value(lost, kept)
    margins = [sum(lost), sum(kept), lost[0] + kept[0], lost[1] + kept[1]]
    if p is None:
        assert 0 in margins
    else:
        assert p == pytest.approx(exact(lost, kept), abs=1e-9)


def test_three_levels_come_near_the_exact_p() -> None:
    """Of three levels, p is within what 9,999 random tables allow of the exact value.

    Lost 6, 1, 1 of 8 each; all 45 tables that lose 8 of 24 are counted here. Four standard errors
    of a share of 9,999 draws are 0.02.
    """
    weights = [
        math.comb(8, a) * math.comb(8, b) * math.comb(8, 8 - a - b)
        for a in range(9)
        for b in range(9 - a)
    ]
    own = math.comb(8, 6) * 8 * 8
    p = loss_p_value([6, 1, 1], [2, 7, 7])
    assert p == pytest.approx(sum(w for w in weights if w <= own) / math.comb(24, 8), abs=0.02)


def test_random_tables_give_the_same_p_again() -> None:
    """The draws have a fixed seed."""
    assert loss_p_value([6, 1, 1], [2, 7, 7]) == loss_p_value([6, 1, 1], [2, 7, 7])


@pytest.mark.parametrize(
    ("lost", "kept"),
    [([0, 0], [5, 5]), ([5, 5], [0, 0]), ([3], [4]), ([3, 0], [4, 0]), ([], [])],
    ids=["nothing lost", "all lost", "one level", "one level with trials", "no level"],
)
def test_nothing_to_compare_has_no_p(lost: list[int], kept: list[int]) -> None:
    """Where no difference could show there is no p."""
    assert loss_p_value(lost, kept) is None
