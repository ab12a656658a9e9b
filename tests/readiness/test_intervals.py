"""Wilson's interval against its formula, another implementation and its own laws."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.readiness.intervals import wilson_interval


@st.composite
def counts(draw: st.DrawFn) -> tuple[int, int]:
    """Ones among values."""
    n = draw(st.integers(1, 100_000))
    return draw(st.integers(0, n)), n


@given(counts())
def test_interval_is_that_of_another_implementation(of: tuple[int, int]) -> None:
    """It equals the one that statsmodels computes, but for rounding in the last places."""
    proportion = pytest.importorskip("statsmodels.stats.proportion")
    theirs = proportion.proportion_confint(*of, alpha=0.05, method="wilson")
    assert wilson_interval(*of) == pytest.approx(theirs, abs=1e-12)


def test_interval_has_published_values() -> None:
    """81 of 263 give 0.2553 to 0.3662 (Newcombe 1998, Statistics in Medicine, 17, from memory)."""
    assert wilson_interval(81, 263) == pytest.approx((0.2553, 0.3662), abs=5e-5)


@given(counts())
def test_interval_holds_the_rate(of: tuple[int, int]) -> None:
    """The rate lies within, and the limits between 0 and 1."""
    low, high = wilson_interval(*of)
    assert 0 <= low <= of[0] / of[1] <= high <= 1


@given(counts())
def test_interval_mirrors(of: tuple[int, int]) -> None:
    """Zeros instead of ones turn the interval round."""
    ones, n = of
    low, high = wilson_interval(ones, n)
    assert wilson_interval(n - ones, n) == pytest.approx((1 - high, 1 - low), abs=1e-12)


def test_interval_of_nothing_is_refused() -> None:
    """Without values there is no interval."""
    with pytest.raises(ValueError, match="an interval needs at least one value"):
        wilson_interval(0, 0)
