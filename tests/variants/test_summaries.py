"""Summaries counted one by one, and which comparisons come first."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.variants.facts import Crossing, Summary
from etl.variants.shares import setting_shares, turning
from etl.variants.summaries import leading
from tests.variants.making import RATE, chosen, crossed, full_crossings, summary_of

COUNTS = st.sampled_from([0, 1, 2, 10, 200])
TABLES = st.tuples(COUNTS, COUNTS, COUNTS, COUNTS)


@st.composite
def summarised(draw: st.DrawFn) -> tuple[Crossing, Summary]:
    """Counts of any kind over a crossing, or over some of its variants."""
    crossing = draw(full_crossings())
    rows = crossing.choices[: draw(st.integers(1, len(crossing)))].tolist()
    crossing = chosen(rows, [len(own.alternatives) for own in crossing.settings])
    tables = draw(st.lists(TABLES, min_size=len(rows), max_size=len(rows)))
    return crossing, summary_of(tables, crossing)


@given(summarised())
def test_summary_is_that_of_a_loop(made: tuple[Crossing, Summary]) -> None:
    """Signs, clear intervals and order, variant by variant."""
    crossing, own = made
    compared = own.compared
    rows = list(zip(compared.difference, compared.low, compared.high, strict=True))
    base = rows[crossing.base][0]
    same = [row for row in rows if row[0] * base > 0]
    assert own.positive == sum(row[0] > 0 for row in rows)
    assert own.negative == sum(row[0] < 0 for row in rows)
    assert own.zero == sum(row[0] == 0 for row in rows)
    assert own.without == sum(row[0] != row[0] for row in rows)
    assert own.positive + own.negative + own.zero + own.without == len(crossing)
    assert own.same_sign == len(same)
    assert own.clear == sum(not row[1] <= 0 <= row[2] for row in same)
    assert own.holds == (len(same) == len(rows))
    numbered = [(row[0] != row[0], row[0], v) for v, row in enumerate(rows)]
    with_value = sorted(each for each in numbered if not each[0])
    assert own.order.tolist() == [
        each[2] for each in [*with_value, *filter(lambda e: e[0], numbered)]
    ]


@given(summarised())
def test_settings_named_are_those_with_the_most(made: tuple[Crossing, Summary]) -> None:
    """What matters has the largest share, what turns the sign does so most often."""
    crossing, own = made
    assert own.shares == setting_shares(own.compared.difference, crossing)
    if own.shares:
        assert own.matters is not None
        together = [each.together for each in own.shares]
        assert own.matters == together.index(max(together))
    else:
        assert own.matters is None
    turned = turning(own.compared.difference, crossing).tolist()
    assert own.turns == (turned.index(max(turned)) if max(turned) > 0 else None)
    if own.shares:
        assert [each.flips for each in own.shares] == turned
        assert (own.turns is None) == (len({*np.sign(own.compared.difference).tolist()}) == 1)


def test_study_without_a_sign_has_none_that_holds() -> None:
    """Equal odds in the study: nothing has the same sign."""
    own = summary_of([(5, 5, 5, 5), (5, 5, 4, 6)], crossed([2]))
    assert (own.same_sign, own.clear, own.zero, own.positive, own.holds) == (0, 0, 1, 1, False)
    assert own.turns == 0


def test_study_whose_values_are_all_the_same_has_no_sign() -> None:
    """No one in either condition, though in one of them many more trials."""
    own = summary_of([(50, 0, 3, 0), (50, 1, 3, 1), (50, 2, 3, 1)], crossed([3]))
    assert (own.without, own.same_sign, own.clear, own.positive, own.holds) == (1, 0, 0, 2, False)
    assert (own.shares, own.matters, own.turns) == ((), None, None)
    assert own.order.tolist()[-1] == 0


def test_rates_have_no_sign() -> None:
    """Shares are there, but nothing is said of signs, not even where a rate is 0."""
    tables = [(5, 5, 5, 5), (9, 1, 9, 1), (4, 6, 4, 6), (10, 0, 10, 0)]
    own = summary_of(tables, crossed([2, 2]), RATE)
    assert (own.positive, own.negative, own.zero, own.clear, own.turns) == (0, 0, 0, 0, None)
    assert (own.same_sign, own.holds, own.matters, own.without) == (4, True, 1, 0)
    assert [each.flips for each in own.shares] == [0.0, 0.0]
    assert own.order.tolist() == [3, 1, 0, 2]
    lacking = summary_of([(0, 0, 0, 0), *tables[1:]], crossed([2, 2]), RATE)
    assert (lacking.without, lacking.holds, lacking.shares) == (1, True, ())


WAYS = {
    "steady": [(50, 50, 40, 60), (50, 50, 39, 61)],
    "wide": [(50, 50, 40, 60), (50, 50, 10, 90)],
    "wide, unsure": [(5, 5, 4, 6), (5, 5, 1, 9)],
    "narrow, but over the edge": [(500, 500, 440, 560), (500, 500, 460, 540)],
    "turns around 0": [(50, 50, 49, 51), (50, 50, 51, 49)],
    "lacking": [(50, 50, 40, 60), (0, 0, 40, 60)],
    "lacking, decided": [(50, 50, 10, 90), (50, 50, 49, 51), (0, 0, 40, 60)],
    "lacking, sure": [(50, 50, 10, 90), (0, 0, 40, 60)],
    "all the same": [(50, 50, 40, 60), (50, 0, 20, 0)],
    "lacking throughout": [(0, 0, 40, 60), (0, 0, 40, 60)],
}


@pytest.mark.parametrize("backwards", [False, True])
def test_decided_comparisons_come_first_and_those_that_lack_values_last(backwards: bool) -> None:
    """By the rule that users are told, whatever the order in which they come.

    The differences of "wide" and "wide, unsure" go over much the same range, but the interval of
    the latter is some three times as wide, since it has a tenth of the trials, and includes 0 in
    both variants. That of "narrow, but over the edge" is 0.24 ± 0.18, then 0.16 ± 0.18. The sign of
    "turns around 0" turns, but from -0.04 to 0.04 only, with intervals of ± 0.55. One variant with
    a difference decides nothing, whether its interval leaves out 0 or not.
    """
    names = sorted(WAYS, reverse=backwards)
    summaries = [summary_of(WAYS[name], crossed([len(WAYS[name])])) for name in names]
    chosen_first = [names[place] for place in leading(summaries, 5)]
    assert chosen_first == [
        *("wide", "narrow, but over the edge"),
        *("wide, unsure", "turns around 0", "steady"),
    ]
    everything = [names[place] for place in leading(summaries, 99)]
    assert everything[:5] == chosen_first
    assert everything[5] == "lacking, decided"
    rest = ("lacking", "lacking, sure", "all the same", "lacking throughout")
    assert everything[6:] == [name for name in names if name in rest]
    assert leading(summaries, 0) == leading(summaries, -1) == leading([], 3) == ()


def test_equal_comparisons_stay_in_their_order() -> None:
    """The first ones are taken."""
    same = [summary_of(WAYS["wide"], crossed([2])) for _ in range(5)]
    assert leading(same, 3) == (0, 1, 2)


def test_width_is_that_of_the_study_as_it_stands() -> None:
    """Its own interval is the measure, wherever the study stands among the variants."""
    # Differences of 0.04 and 0.41 around which all intervals include 0: from 100 trials and 10, or
    # the other way round.
    first = summary_of([(50, 50, 49, 51), (5, 5, 4, 6)], crossed([2]))
    second = summary_of([(5, 5, 4, 6), (50, 50, 49, 51)], crossed([2]))
    assert leading([second, first], 1) == (1,)
    assert leading([second, first], 1, base=1) == (0,)
