"""Shares of variance and changing cells against naive loops, another implementation, their laws."""

from __future__ import annotations

import time
from itertools import combinations
from random import Random

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from etl.variants.facts import Crossing, Floats
from etl.variants.shares import changing_pairs, setting_shares, turning
from tests.variants.making import chosen, crossed, full_crossings, valued


def pairs_of(setting: int, crossing: Crossing) -> list[tuple[int, int]]:
    """The pairs of variants that differ in one setting only, looked up one by one."""
    return [
        (one, other)
        for one, other in combinations(range(len(crossing)), 2)
        if [s for s in range(len(crossing.settings)) if differ(one, other, s, crossing)]
        == [setting]
    ]


def differ(one: int, other: int, setting: int, crossing: Crossing) -> bool:
    """Whether two variants take other alternatives of a setting."""
    return bool(crossing.choices[one, setting] != crossing.choices[other, setting])


def left_over(values: Floats, setting: int, crossing: Crossing) -> float:
    """The mean variance with all other settings fixed: E[Var(f | all others)]."""
    lines: dict[tuple[int, ...], list[float]] = {}
    for row, value in zip(crossing.choices.tolist(), values.tolist(), strict=True):
        lines.setdefault(tuple(row[:setting] + row[setting + 1 :]), []).append(value)
    return float(np.mean([np.var(line) for line in lines.values()]))


def test_shares_are_those_worked_out_by_hand() -> None:
    """Two settings of two alternatives: 1 and 3 with the first of a, 2 and -2 with the second.

    The mean is 1, deviations 0, 2, 1, -3: variance (0 + 4 + 1 + 9) / 4 = 3.5. Means of a are 2 and
    0: variance 1. Means of b are 1.5 and 0.5: variance 0.25. What is left is the interaction, 2.25.
    Within b fixed, a varies from 1 to 2 (variance 0.25) and from 3 to -2 (6.25): mean 3.25, which
    is 1 + 2.25. Within a fixed, b varies from 1 to 3 (1) and from 2 to -2 (4): mean 2.5. The sign
    turns in one pair of two for a (3 and -2), and in one of two for b (2 and -2).
    """
    a, b = setting_shares(np.array([1.0, 3.0, 2.0, -2.0]), crossed([2, 2]))
    assert (a.alone, a.together) == pytest.approx((1 / 3.5, 3.25 / 3.5))
    assert (b.alone, b.together) == pytest.approx((0.25 / 3.5, 2.5 / 3.5))
    assert (a.means, b.means) == ((2.0, 0.0), (1.5, 0.5))
    assert (a.setting, b.setting, a.flips, b.flips) == (0, 1, 0.5, 0.5)


@given(st.integers(0, 2**32 - 1), st.permutations(range(24)))
def test_first_order_shares_are_sums_of_squares(seed: int, order: list[int]) -> None:
    """A share alone is the sum of squares of an analysis of variance, of the total."""
    pandas = pytest.importorskip("pandas")
    anova = pytest.importorskip("statsmodels.stats.anova")
    api = pytest.importorskip("statsmodels.formula.api")
    crossing = crossed([2, 3, 4], order)
    values = np.random.default_rng(seed).normal(size=24)
    frame = pandas.DataFrame(crossing.choices, columns=["a", "b", "c"]).assign(value=values)
    fitted = api.ols("value ~ C(a) + C(b) + C(c)", frame).fit()
    squares = anova.anova_lm(fitted)["sum_sq"].to_numpy()
    shares = setting_shares(values, crossing)
    assert [own.alone for own in shares] == pytest.approx(squares[:3] / squares.sum())


@given(valued())
def test_total_shares_are_what_is_left_by_all_others(made: tuple[Crossing, Floats]) -> None:
    """A share together is E[Var(f | all others)] / Var(f); without variance there is none."""
    crossing, values = made
    shares = setting_shares(values, crossing)
    if (values == values[0]).all():
        assert shares == ()
        return
    # Where numbers differ in the last places only, the naive variances are rounding.
    assume(np.ptp(values) > 1e-6)
    assert [own.setting for own in shares] == list(range(len(crossing.settings)))
    for place, own in enumerate(shares):
        expected = left_over(values, place, crossing) / np.var(values)
        assert own.together == pytest.approx(expected, abs=1e-8)
        of = [values[crossing.choices[:, place] == a] for a in range(len(own.means))]
        assert own.means == pytest.approx([np.mean(each) for each in of], abs=1e-12)
        assert own.alone == pytest.approx(
            np.var([np.mean(e) for e in of]) / np.var(values), abs=1e-8
        )


@given(valued())
def test_shares_keep_their_laws(made: tuple[Crossing, Floats]) -> None:
    """Alone never above together, alone at most 1 in all, together at least 1 in all."""
    crossing, values = made
    shares = setting_shares(values, crossing)
    assume(shares)
    assert all(0 <= own.alone <= own.together <= 1 for own in shares)
    assert sum(own.alone for own in shares) <= 1 + 1e-9
    assert sum(own.together for own in shares) >= 1 - 1e-9


@given(st.integers(0, 2**32 - 1))
def test_settings_that_only_add_have_the_same_share_both_ways(seed: int) -> None:
    """Without interactions nothing comes to the share alone, and rounding takes nothing away."""
    source = np.random.default_rng(seed)
    effects = [source.normal(size=size) for size in (2, 3, 4)]
    crossing = crossed([2, 3, 4])
    values = sum(effect[own] for effect, own in zip(effects, crossing.choices.T, strict=True))
    shares = setting_shares(np.asarray(values), crossing)
    assert all(own.alone <= own.together == pytest.approx(own.alone) for own in shares)
    assert sum(own.alone for own in shares) == pytest.approx(1)


@given(valued(), st.randoms())
def test_shares_do_not_hang_on_names_and_orders(
    made: tuple[Crossing, Floats], source: Random
) -> None:
    """Variants in another order and alternatives under other numbers: the same shares."""
    crossing, values = made
    shares = setting_shares(values, crossing)
    sizes = [len(own.alternatives) for own in crossing.settings]
    order = list(range(len(crossing)))
    source.shuffle(order)
    new = [list(range(size)) for size in sizes]
    for numbers in new:
        source.shuffle(numbers)
    rows = [[new[s][a] for s, a in enumerate(crossing.choices[v].tolist())] for v in order]
    others = setting_shares(values[order], chosen(rows, sizes))
    assert len(others) == len(shares)
    for own, other in zip(shares, others, strict=True):
        assert (other.alone, other.together) == pytest.approx((own.alone, own.together), abs=1e-9)
        assert other.flips == own.flips
        means = [other.means[number] for number in new[own.setting]]
        assert means == pytest.approx(own.means, abs=1e-12)


@given(valued(), st.integers(1, 3), st.integers(0, 4))
def test_setting_that_does_nothing_has_no_share(
    made: tuple[Crossing, Floats], size: int, place: int
) -> None:
    """Exactly 0, not what rounding leaves; and the others keep theirs."""
    crossing, values = made
    sizes = [len(own.alternatives) for own in crossing.settings]
    place = min(place, len(sizes))
    rows = [
        [*row[:place], extra, *row[place:]]
        for row in crossing.choices.tolist()
        for extra in range(size)
    ]
    shares = setting_shares(
        np.repeat(values, size), chosen(rows, [*sizes[:place], size, *sizes[place:]])
    )
    before = setting_shares(values, crossing)
    assert len(shares) == (len(before) + 1 if before else 0)
    if shares:
        idle = shares[place]
        assert (idle.alone, idle.together, idle.flips) == (0.0, 0.0, 0.0)
        kept = [own.together for own in shares if own.setting != place]
        assert kept == pytest.approx([own.together for own in before], abs=1e-9)


@pytest.mark.parametrize("missing", [np.nan, np.inf])
def test_there_are_no_shares_without_all_numbers(missing: float) -> None:
    """A variant without a number, or a combination without a variant."""
    values = np.array([1.0, 2.0, 3.0, missing])
    assert setting_shares(values, crossed([2, 2])) == ()
    assert setting_shares(values[:3], chosen([(0, 0), (0, 1), (1, 0)], [2, 2])) == ()


def test_numbers_must_be_one_a_variant() -> None:
    """Another length is refused."""
    for of in (setting_shares, turning):
        with pytest.raises(ValueError, match="4 variants, but values or states of 3"):
            of(np.zeros(3), crossed([2, 2]))
    with pytest.raises(ValueError, match="4 variants, but values or states of 3"):
        changing_pairs(np.zeros((5, 3), dtype=np.int64), crossed([2, 2]))
    with pytest.raises(ValueError, match="a combination of alternatives is missing"):
        changing_pairs(np.zeros((5, 2), dtype=np.int64), chosen([(0, 0), (1, 1)], [2, 2]))


@st.composite
def parts_of_crossings(draw: st.DrawFn) -> tuple[Crossing, Floats]:
    """Some variants of a crossing, with numbers or without."""
    crossing = draw(full_crossings())
    rows = crossing.choices[: draw(st.integers(1, len(crossing)))].tolist()
    numbers = st.sampled_from([-2.0, -1.0, 0.0, 1.0, np.nan])
    values = draw(st.lists(numbers, min_size=len(rows), max_size=len(rows)))
    return chosen(rows, [len(own.alternatives) for own in crossing.settings]), np.array(values)


@given(parts_of_crossings())
def test_signs_turn_as_a_loop_over_pairs_finds(made: tuple[Crossing, Floats]) -> None:
    """Also where combinations or numbers are missing."""
    crossing, values = made
    turned = turning(values, crossing)
    for setting in range(len(crossing.settings)):
        signs = [
            np.sign(values[list(pair)])
            for pair in pairs_of(setting, crossing)
            if not np.isnan(values[list(pair)]).any()
        ]
        expected = np.mean([one != other for one, other in signs]) if signs else 0.0
        assert turned[setting] == pytest.approx(expected)


STATES = {
    "codes": st.integers(0, 2),
    "floats": st.sampled_from([0.0, -0.0, 1.0, np.nan, -np.nan]),
}


@pytest.mark.parametrize("kind", STATES)
@given(crossing=full_crossings(), data=st.data())
def test_changes_are_those_a_loop_over_pairs_finds(
    kind: str, crossing: Crossing, data: st.DataObject
) -> None:
    """Cell by cell and pair by pair; two missing values are no change."""
    cells = data.draw(st.integers(0, 6))
    dtype = np.dtype(np.int8 if kind == "codes" else np.float64)
    size = cells * len(crossing)
    drawn = data.draw(st.lists(STATES[kind], min_size=size, max_size=size))
    states = np.array(drawn, dtype=dtype).reshape(cells, len(crossing))
    changes, pairs = changing_pairs(states, crossing)
    assert changes.shape == (cells, len(crossing.settings))
    for setting in range(len(crossing.settings)):
        own = pairs_of(setting, crossing)
        assert pairs[setting] == len(own)
        for cell in range(cells):
            row = states[cell]
            differing = sum(
                not (row[one] == row[other] or (np.isnan(row[one]) and np.isnan(row[other])))
                for one, other in own
            )
            assert changes[cell, setting] == differing


def test_many_cells_are_counted_as_few_are() -> None:
    """Cells fall into several slices; each has what it has alone, in little time and memory."""
    source = np.random.default_rng(7)
    crossing = crossed([2, 5, 5, 2], source.permutation(100).tolist())
    states = np.zeros((100_000, 100), dtype=np.int8)
    changing = source.choice(100_000, 20_000, replace=False)
    states[changing] = source.integers(0, 3, (20_000, 100))
    begun = time.process_time()
    changes, pairs = changing_pairs(states, crossing)
    # It takes some 0.03 s; a loop over cells would take minutes.
    assert time.process_time() - begun < 3
    assert pairs.tolist() == [50, 200, 200, 50]
    assert (changes.sum(axis=1) > 0).sum() == 20_000
    for cell in [0, 1, *changing[:20].tolist(), 99_999]:
        assert changes[cell].tolist() == changing_pairs(states[[cell]], crossing)[0][0].tolist()
    # Two of three equally likely states differs in 2 of 3 cases.
    assert changes[changing].mean(axis=0) / pairs == pytest.approx([2 / 3] * 4, abs=0.01)
