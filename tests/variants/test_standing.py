"""What decisions do to a comparison, case by case and against loops over variants."""

from __future__ import annotations

import math
import re
from itertools import product

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from etl.variants.facts import Compared, Comparison, Crossing, Standing, Summary
from etl.variants.in_short import in_short
from etl.variants.summaries import leading, summarise
from tests.variants.making import FIT, RATE, chosen, crossed
from tests.variants.test_shares import pairs_of

NAN = math.nan
#: An interval above 0, one below, three around it (the sign above, below, none), and no value; the
#: ends of two are 0 itself, which they do not leave out.
KINDS = {
    "above": (0.5, 0.2, 0.8),
    "below": (-0.5, -0.8, -0.2),
    "up": (0.2, -0.1, 0.5),
    "up to the edge": (0.2, 0.0, 0.4),
    "down": (-0.2, -0.5, 0.1),
    "down to the edge": (-0.2, -0.4, 0.0),
    "zero": (0.0, -0.3, 0.3),
    "nothing": (NAN, NAN, NAN),
}
SIDES = {"above": 1.0, "below": -1.0, "nothing": NAN}


def summary_of(kinds: list[str], crossing: Crossing, comparison: Comparison = FIT) -> Summary:
    """A summary of variants of these kinds."""
    difference, low, high = np.array([KINDS[kind] for kind in kinds]).T
    counts = np.ones((len(kinds), 2, 2), dtype=np.int64)
    none = np.zeros(len(kinds), dtype=np.bool_)
    return summarise(Compared(comparison, counts, difference, low, high, none), crossing)


@st.composite
def of_kinds(draw: st.DrawFn) -> tuple[Crossing, list[str]]:
    """Some variants of a small crossing, of any kinds; the study stands anywhere among them."""
    sizes = draw(st.lists(st.integers(1, 3), min_size=1, max_size=3))
    rows = draw(st.permutations([*product(*map(range, sizes))]))
    rows = rows[: draw(st.integers(1, len(rows)))]
    some = draw(st.lists(st.sampled_from([*KINDS]), min_size=1, max_size=3))
    kinds = draw(st.lists(st.sampled_from(some), min_size=len(rows), max_size=len(rows)))
    made = chosen(rows, sizes)
    base = draw(st.integers(0, len(rows) - 1))
    return Crossing(made.settings, made.names, made.choices, base), kinds


@given(of_kinds())
@example((crossed([2]), ["above", "below"]))
@example((crossed([2]), ["above", "nothing"]))
@example((crossed([1]), ["up"]))
def test_sides_are_those_of_a_loop(made: tuple[Crossing, list[str]]) -> None:
    """Side, how many lie apart from 0, and what the decisions do, variant by variant."""
    crossing, kinds = made
    own = summary_of(kinds, crossing)
    for kind, side in zip(kinds, own.side.tolist(), strict=True):
        expected = SIDES.get(kind, 0.0)
        assert side == expected or (math.isnan(side) and math.isnan(expected))
    above, below = kinds.count("above"), kinds.count("below")
    assert own.apart == above + below
    there = [kind for kind in kinds if kind != "nothing"]
    signs = {float(np.sign(KINDS[kind][0])) for kind in there}
    expected_standing: Standing
    if not there:
        expected_standing = "none"
    elif (above and below) or 0 < above + below < len(there):
        expected_standing = "decided"
    elif above or below or len(signs) == 1:
        expected_standing = "held"
    else:
        expected_standing = "around 0"
    assert own.standing == expected_standing
    # What the words on these say.
    if own.standing == "around 0":
        assert not own.holds
        assert own.apart == 0
    if own.standing == "held":
        assert own.apart in (0, len(there))
        assert len(signs) == 1
        steady = len(there) == len(crossing) and signs != {0.0}
        assert own.holds == steady


@given(of_kinds())
def test_setting_that_clears_is_found_by_a_loop_over_pairs(
    made: tuple[Crossing, list[str]],
) -> None:
    """Of the pairs that differ in one setting only and have intervals, how many change sides."""
    crossing, kinds = made
    own = summary_of(kinds, crossing)
    shares = []
    for setting in range(len(crossing.settings)):
        pairs = [
            (SIDES.get(kinds[one], 0.0), SIDES.get(kinds[other], 0.0))
            for one, other in pairs_of(setting, crossing)
            if "nothing" not in (kinds[one], kinds[other])
        ]
        shares.append(sum(one != other for one, other in pairs) / max(len(pairs), 1))
    expected = shares.index(max(shares)) if max(shares) > 0 else None
    assert own.clears == expected
    if own.clears is not None:
        assert own.standing == "decided"


@pytest.mark.parametrize(
    ("kinds", "standing"),
    [
        (["above", "up"], "decided"),
        (["above", "up to the edge"], "decided"),
        (["below", "down to the edge"], "decided"),
        (["up", "below"], "decided"),
        (["above", "below"], "decided"),
        (["zero", "above"], "decided"),
        (["above", "above"], "held"),
        (["below", "below"], "held"),
        (["up", "up to the edge"], "held"),
        (["up", "down"], "around 0"),
        (["up", "zero"], "around 0"),
        (["zero", "zero"], "held"),
        (["zero", "nothing"], "held"),
        (["up", "nothing"], "held"),
        (["nothing", "up"], "held"),
        (["nothing", "above"], "held"),
        (["above", "nothing"], "held"),
        (["nothing", "nothing"], "none"),
        (["nothing"], "none"),
        (["above"], "held"),
        (["down"], "held"),
        (["zero"], "held"),
        (["up", "nothing", "down"], "around 0"),
        (["nothing", "zero", "up"], "around 0"),
        (["nothing", "above", "up"], "decided"),
        (["nothing", "above", "below"], "decided"),
        (["above", "nothing", "above"], "held"),
    ],
)
def test_standing_of_a_few_variants(kinds: list[str], standing: Standing) -> None:
    """As it is documented; what has no difference is not looked at."""
    own = summary_of(kinds, crossed([len(kinds)]))
    assert own.standing == standing
    assert (own.clears is not None) == (standing == "decided")


def test_rates_stand_as_held() -> None:
    """They have no 0 to leave out, however their intervals lie; without any value there is none."""
    for kinds in (["above", "up"], ["above", "below"], ["nothing", "up"], ["up", "down"]):
        own = summary_of(kinds, crossed([2]), RATE)
        assert (own.standing, own.clears) == ("held", None)
    assert summary_of(["nothing", "nothing"], crossed([2]), RATE).standing == "none"


@given(st.lists(of_kinds(), max_size=8), st.integers(-1, 9))
def test_leading_ones_are_sorted_by_the_rule(
    made: list[tuple[Crossing, list[str]]], most: int
) -> None:
    """Complete ones before those that lack values, decided before others, each once."""
    summaries = [summary_of(kinds, crossing) for crossing, kinds in made]
    places = leading(summaries, most)
    assert len(places) == len({*places}) == min(max(most, 0), len(summaries))
    ranks = [(one.without > 0, one.standing != "decided") for one in summaries]
    assert [ranks[place] for place in places] == sorted(ranks)[: max(most, 0)]
    equal = [summary_of(["above", "up"], crossed([2]))] * 4
    assert leading(equal, 3) == (0, 1, 2)


#: Three settings, whose keys are those of a study file.
KEYS = ("screening.fixations.over_ms", "screening.fixations.merge", "measures.outside")


def line_of(kinds: list[str], sizes: list[int]) -> str:
    """The second line for all combinations, whose keys are as in a study file."""
    crossing = chosen([*product(*map(range, sizes))], sizes, keys=KEYS)
    return in_short(summary_of(kinds, crossing), crossing).partition("\n")[2]


@pytest.mark.parametrize(
    ("sizes", "kinds", "line"),
    [
        (
            [3],
            ["above", "up", "above"],
            (
                "hangs on screening.fixations.over_ms: it does in 1 of 1 variant with 0, it does "
                "in 0 of 1 with 1, it does in 1 of 1 with 2"
            ),
        ),
        (
            [2, 2],
            ["below", "below", "down", "down"],
            (
                "hangs on screening.fixations.over_ms: it does in 2 of 2 variants with 0, it does "
                "in 0 of 2 with 1"
            ),
        ),
        (
            [2, 3],
            ["above", "above", "up", "up", "up", "up"],
            (
                "hangs most on screening.fixations.over_ms: it does in 2 of 3 variants with 0, it "
                "does in 0 of 3 with 1"
            ),
        ),
        (
            [2, 2],
            ["above", "up", "up", "up"],
            "hangs equally on screening.fixations.over_ms and screening.fixations.merge",
        ),
        (
            [2, 2, 2],
            ["above", "above", "up", "up", "up", "up", "up", "up"],
            "hangs equally on screening.fixations.over_ms and screening.fixations.merge",
        ),
        (
            [2, 2, 2],
            ["up", "above", "up", "up", "up", "up", "up", "up"],
            (
                "hangs equally on screening.fixations.over_ms, screening.fixations.merge and "
                "measures.outside"
            ),
        ),
    ],
)
def test_line_says_on_what_the_interval_hangs(
    sizes: list[int], kinds: list[str], line: str
) -> None:
    """Where the sign holds: with how many variants of each alternative it leaves out 0."""
    assert line_of(kinds, sizes) == f"whether the interval leaves out 0 {line}"


def test_line_on_the_sign_comes_before_that_on_the_interval() -> None:
    """Where the sign turns, that is said; where nothing hangs on a decision, nothing is."""
    assert line_of(["above", "down"], [2]).startswith("the sign turns with ")
    assert line_of(["above", "below"], [2]).startswith("the sign turns with ")
    assert line_of(["above", "above"], [2]) == ""
    assert line_of(["up", "up"], [2]) == ""
    assert line_of(["above", "nothing"], [2]) == ""


def test_alternatives_are_told_by_the_variants_that_have_an_interval() -> None:
    """What has no value includes no 0, so it is not among those that are counted."""
    assert line_of(["above", "up", "nothing"], [3]) == (
        "whether the interval leaves out 0 hangs on screening.fixations.over_ms: it does in 1 of 1 "
        "variant with 0, it does in 0 of 1 with 1, no value with 2"
    )
    assert line_of(["above", "above", "up", "nothing"], [2, 2]) == (
        "whether the interval leaves out 0 hangs on screening.fixations.over_ms: it does in 2 of 2 "
        "variants with 0, it does in 0 of 1 with 1"
    )


def test_pairs_that_differ_in_more_than_one_setting_tell_of_none() -> None:
    """Two named variants: the interval hangs on both decisions together, so nothing is named."""
    apart = chosen([(0, 0), (1, 1)], [2, 2], keys=KEYS, named=True)
    own = summary_of(["above", "up"], apart)
    assert (own.standing, own.clears) == ("decided", None)
    assert "\n" not in in_short(own, apart)


@given(of_kinds())
def test_numbers_in_the_line_are_counted(made: tuple[Crossing, list[str]]) -> None:
    """Those of each alternative that has a value, and together those whose interval is apart."""
    crossing, kinds = made
    own = summary_of(kinds, crossing)
    line = in_short(own, crossing).partition("\n")[2]
    told = [(int(some), int(of)) for some, of in re.findall(r"it does in (\d+) of (\d+)", line)]
    if not told:
        return
    assert own.clears is not None
    taken = crossing.choices[:, own.clears].tolist()
    expected = []
    for place in range(len(crossing.settings[own.clears].alternatives)):
        with_it = [
            kind
            for kind, choice in zip(kinds, taken, strict=True)
            if choice == place and kind != "nothing"
        ]
        if with_it:
            expected.append((sum(kind in ("above", "below") for kind in with_it), len(with_it)))
    assert told == expected
