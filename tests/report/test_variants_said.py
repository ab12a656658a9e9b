"""Sentences that sum a comparison up, and the table of its decisions, against counts by hand."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest

from etl.report.variants_decisions import collect_decisions, sides_with
from etl.report.variants_input import VariantsInput
from etl.report.variants_page import variants_page
from etl.report.variants_said import headline, odds_words, sign_words, spread_words
from etl.variants.facts import Compared, Comparison, Crossing, Setting
from etl.variants.summaries import LEADING_RULE, summarise
from tests.report.reading import Node, read
from tests.report.test_variants_page import by_class
from tests.report.varying import crossing_of, facts_of, named_crossing

NAN = math.nan
NOTHING = (NAN, NAN, NAN)
FIT = ("fit", "odd", "fitting")


def facts_with(
    values: Sequence[tuple[float, float, float]],
    crossing: Crossing | None = None,
    levels: tuple[str, str, str] = FIT,
) -> VariantsInput:
    """The input of a page about one comparison with these differences and intervals."""
    crossing = crossing or crossing_of([2, 3])
    difference, low, high = np.array(values).T
    counts = np.ones((len(values), 2, 2), dtype=np.int64)
    none = np.zeros(len(values), dtype=bool)
    own = Comparison("went_back", "verb", *levels)
    summary = summarise(Compared(own, counts, difference, low, high, none), crossing)
    made = facts_of(crossing)
    return replace(made, summaries=(summary,), leading=(0,), passages=("A passage.",))


def around(value: float, half: float) -> tuple[float, float, float]:
    """A difference with an interval of so much on either side."""
    return value, value - half, value + half


def said(facts: VariantsInput) -> str:
    """The headline as text."""
    return headline(facts.summaries[0], facts).striptags()


def spread(values: Sequence[tuple[float, float, float]], **more: tuple[str, str, str]) -> str:
    """What is said of the spread of these."""
    sizes = {1: [1], 2: [2], 3: [3]}[len(values)]
    return spread_words(facts_with(values, crossing_of(sizes), **more).summaries[0], 0)


@pytest.mark.parametrize(
    ("values", "text"),
    [
        (
            [around(0.88, 0.37), around(0.77, 0.4)],
            (
                "The difference in log-odds goes from +0.77 to +0.88 over the variants: a range of "
                "0.11, 15% of the width of the study’s interval (0.74). In the study it is +0.88 "
                "(odds 2.4 times as high)."
            ),
        ),
        (
            [around(-0.5, 0.1), around(0.5, 0.1)],
            (
                "The difference in log-odds goes from −0.50 to +0.50 over the variants: a range of "
                "1.00, 5.0 times the width of the study’s interval (0.20). In the study it is "
                "−0.50 (odds 0.61 times as high)."
            ),
        ),
        (
            # Neither is there a range that is nothing, nor a share that is.
            [around(0.2049, 0.5), around(0.2051, 0.5)],
            (
                "The difference in log-odds goes from +0.20 to +0.21 over the variants: a range of "
                "less than 0.01, less than 1% of the width of the study’s interval (1.00). In the "
                "study it is +0.20 (odds 1.2 times as high)."
            ),
        ),
        (
            [around(0.88, 0.37), around(0.88, 0.4)],
            "The difference in log-odds is +0.88 (odds 2.4 times as high) in both variants.",
        ),
        (
            [around(0.88, 0.37)],
            "The difference in log-odds is +0.88 (odds 2.4 times as high) in the one variant.",
        ),
        (
            [NOTHING, around(0.3, 0.4), around(0.4, 0.4)],
            (
                "The difference in log-odds goes from +0.30 to +0.40 over the variants: a range of "
                "0.10. 1 variant has no difference: the study as it stands."
            ),
        ),
        (
            [around(0.3, 0.4), NOTHING, NOTHING],
            (
                "The difference in log-odds is +0.30 (odds 1.3 times as high) in the one variant "
                "that has a value. 2 variants have no difference."
            ),
        ),
        ([NOTHING, NOTHING], "No variant has a difference."),
    ],
)
def test_spread_is_held_against_the_interval(
    values: list[tuple[float, float, float]], text: str
) -> None:
    """Whole texts."""
    assert spread(values) == text


def test_spread_of_rates_is_in_percentage_points() -> None:
    """A rate has no odds, and its range is no percentage of it."""
    text = spread([(0.125, 0.10, 0.15), (0.135, 0.11, 0.16)], levels=("", "", ""))
    assert text == (
        "The rate goes from 12.5% to 13.5% over the variants: a range of 1.0 percentage points, "
        "20% of the width of the study’s interval (5.0 percentage points). In the study it is "
        "12.5%."
    )


@pytest.mark.parametrize("difference", [-6.0, -2.0, -0.3, -0.04, 0.03, 0.06, 0.4, 2.25, 2.31, 6.0])
def test_odds_are_the_exponential_to_two_figures(difference: float) -> None:
    """The number read back is within half of its last figure."""
    number = float(odds_words(difference).split()[1])
    assert number == pytest.approx(math.exp(difference), rel=0.05)
    assert (number > 1) == (difference > 0)


@pytest.mark.parametrize(
    ("values", "text"),
    [
        (
            [(1, 0.5, 2)] * 6,
            "The sign holds in all 6 variants, and the interval leaves out 0 in all of these.",
        ),
        (
            [(1, -1, 2)] * 6,
            "The sign holds in all 6 variants, and the interval leaves out 0 in none of these.",
        ),
        (
            [(1, 0.5, 2)] * 2 + [(1, -1, 2)] * 3 + [NOTHING],
            (
                "The sign holds in all 5 variants that have a value, and the interval leaves out 0 "
                "in 2 of these."
            ),
        ),
        (
            [(1, 0.5, 2)] * 2 + [(1, -1, 2), (-1, -2, 1), (-1, -2, -0.5), (0, -1, 1)],
            (
                "The sign holds in 3 of 6 variants, and the interval leaves out 0 in 2 of these 3; "
                "over all, 3 are above 0, 2 are below 0 and 1 is exactly 0. In 1 of the others the "
                "interval leaves out 0 too, on the other side."
            ),
        ),
        (
            [(1, 0.5, 2)] * 2 + [(-1, -2, 1)] * 4,
            (
                "The sign holds in 2 of 6 variants, and the interval leaves out 0 in both of "
                "these; over all, 2 are above 0 and 4 are below 0."
            ),
        ),
        (
            [(-1, -2, 1), (1, -1, 2), (1, -1, 2), NOTHING, NOTHING, NOTHING],
            (
                "The sign holds in 1 of 3 variants that have a difference, and its interval "
                "includes 0; over all, 2 are above 0 and 1 is below 0."
            ),
        ),
        (
            [(0, -1, 1), (1, 0.5, 2), (1, 0.5, 2), (-1, -2, 1), (-1, -2, 1), (-1, -2, 1)],
            (
                "The study as it stands has no sign, its difference is exactly 0; over the "
                "variants 2 are above 0, 3 are below 0 and 1 is exactly 0. The interval leaves out "
                "0 in 2 of these 6."
            ),
        ),
        (
            [NOTHING, (1, 0.5, 2), NOTHING, NOTHING, NOTHING, NOTHING],
            (
                "The study as it stands has no sign; over the variants 1 is above 0. Its interval "
                "leaves out 0."
            ),
        ),
        ([NOTHING] * 6, ""),
    ],
)
def test_sign_is_told_with_the_intervals_of_those_that_have_it(
    values: list[tuple[float, float, float]], text: str
) -> None:
    """Whole texts: intervals of the study's sign and of the other are told apart."""
    assert sign_words(facts_with(values).summaries[0], 0) == text


def test_two_winners_are_told_apart() -> None:
    """One decision moves the difference, another puts the end of the interval on either side."""
    # By hand: over_ms moves the difference by 0.4; under_ms moves it by 0.02, and its interval ends
    # above 0 in 1 of 3 variants with 80, and in all 3 with 60.
    values = [
        (0.50, 0.10, 0.90), (0.70, -0.10, 1.5), (0.90, -0.10, 1.9),
        (0.52, 0.12, 0.92), (0.72, 0.10, 1.3), (0.92, 0.10, 1.7),
    ]  # fmt: skip
    text = said(facts_with(values))
    assert (
        "Whether the interval leaves out 0 hangs most on under_ms: it does in 1 of 3 variants with "
        "80, in 3 of 3 with 60. The difference itself moves most with over_ms: more than 99% of "
        "the variance between variants." in text
    )
    # The spread is told before any share.
    assert text.startswith("The difference in log-odds goes from +0.50 to +0.92")


def test_sides_are_told_where_intervals_lie_on_both() -> None:
    """The same number of intervals leaves out 0 with both alternatives, on other sides of it."""
    up, down = (0.5, 0.1, 0.9), (-0.5, -0.9, -0.1)
    facts = facts_with([up] * 3 + [down] * 3)
    assert (
        "Whether the interval leaves out 0, and on which side, hangs on under_ms: it does in 3 of "
        "3 variants with 80 (3 above, 0 below), in 3 of 3 with 60 (0 above, 3 below). The sign "
        "changes with under_ms: it is not the same in 100% of all pairs of variants that differ in "
        "this decision only." in said(facts)
    )


def test_of_many_alternatives_the_farthest_are_named() -> None:
    """With five of them a sentence would be a table."""
    setting = Setting("screening.fixations.under_ms", ("1", "2", "3", "4", "5"), 0)
    choices = np.array([[one, two] for one in range(5) for two in range(2)], np.int64)
    other = Setting("screening.fixations.over_ms", ("8", "9"), 0)
    crossing = Crossing((setting, other), ("",) * 10, choices, 0)
    values = [around(0.5, 0.6 if place in (2, 3, 9) else 0.4) for place in range(10)]
    text = said(facts_with(values, crossing))
    # 2 of 2 with 1, 0 of 2 with 2, 2 of 2 with 3 and 4, 1 of 2 with 5: the first of equal ones.
    assert "it does in 0 of 2 variants with 2, in 2 of 2 with 4." in text


def test_decisions_that_matter_equally_are_all_named() -> None:
    """None is put before the others for coming first."""
    crossing = crossing_of([2, 2])
    values = [around(one, 0.25) for one in (0.1, 0.3, 0.3, 0.5)]
    text = said(facts_with(values, crossing))
    assert "hangs equally on under_ms and over_ms." in text
    assert (
        "The difference itself moves most, and equally, with under_ms and over_ms: 50% of the "
        "variance between variants each." in text
    )


def test_one_decision_explains_all_without_saying_so() -> None:
    """With one decision there is nothing that it could explain more than."""
    assert "variance" not in said(facts_with([around(0.1, 1), around(0.2, 1)], crossing_of([2])))


def test_variants_far_from_each_other_have_no_decision_to_name() -> None:
    """No two of them differ in one decision only."""
    settings = crossing_of([2, 2]).settings
    crossing = Crossing(settings, ("", ""), np.array([[0, 0], [1, 1]], np.int64), 0)
    facts = facts_with([(0.5, 0.1, 0.9), (0.4, -0.1, 0.9)], crossing)
    assert "cannot be told: no two variants that differ in one decision only" in said(facts)
    # The table counts all the same, and has dashes instead of shares of pairs.
    found = collect_decisions(facts, facts.summaries[0])
    assert (found.shares, found.clears) == (False, True)
    assert [(row.flips, row.clears) for row in found.rows] == [("–", "–")] * 2
    assert [[one.apart for one in row.alternatives] for row in found.rows] == [
        ["1 of 1", "0 of 1"]
    ] * 2


def table_of(facts: VariantsInput) -> Node:
    """The table of decisions, read back from the page."""
    (table,) = by_class(read(variants_page(facts)), "weights")
    return table


def test_table_has_intervals_by_alternative_beside_their_means() -> None:
    """Each number against the variants, counted anew."""
    crossing = crossing_of([2, 3, 2])
    random = np.random.default_rng(5)
    values = [around(x, 0.3) for x in 0.3 + random.normal(0, 0.05, 12)]
    facts = facts_with(values, crossing)
    (summary,) = facts.summaries
    assert 0 < summary.apart < 12
    table = table_of(facts)
    low = summary.compared.low
    heads = [n.text for n in table.one("thead").all("th")]
    assert heads == [
        "Decision", "Alone", "With others", "Changes the sign", "Changes the interval",
        "Alternative", "Mean difference", "Interval leaves out 0 in",
    ]  # fmt: skip
    rows = [row for body in table.all("tbody") for row in body.all("tr")]
    last = min(summary.shares, key=lambda one: one.together).setting
    own = rows[-len(crossing.settings[last].alternatives) :]
    found = {row.cells()[-3].split()[-1]: row.cells()[-2:] for row in own}
    for place, text in enumerate(crossing.settings[last].alternatives):
        chosen = crossing.choices[:, last] == place
        mean = f"{summary.compared.difference[chosen].mean():+.2f}"
        assert found[text.split()[-1]] == [mean, f"{(low[chosen] > 0).sum()} of {chosen.sum()}"]
    assert len(rows) == 2 + 3 + 2


def test_column_of_intervals_is_there_only_where_they_differ() -> None:
    """Otherwise the sentence has said it."""
    same = table_of(facts_with([around(one, 0.2) for one in (0.5, 0.6, 0.7, 0.8, 0.9, 1.0)]))
    heads = [n.text for n in same.one("thead").all("th")]
    assert "Changes the sign" in heads
    assert not {"Changes the interval", "Interval leaves out 0 in"} & {*heads}
    rates = [(x, x - 0.05, x + 0.05) for x in (0.03, 0.06, 0.2, 0.3, 0.3, 0.4)]
    bare = table_of(facts_with(rates, levels=("", "", "")))
    assert [n.text for n in bare.one("thead").all("th")] == [
        "Decision", "Alone", "With others", "Alternative", "Mean rate",
    ]  # fmt: skip


def test_pair_of_signs_that_are_not_the_same_need_not_be_opposite() -> None:
    """A difference of exactly 0 against one above 0 counts, and the page says so."""
    facts = facts_with([around(0.2, 1)] * 3 + [around(0.0, 1)] * 3)
    table = table_of(facts)
    assert (
        "the share in which the sign is not the same; exactly 0 has a sign of its own" in table.text
    )
    assert "opposite" not in table.text
    first = next(iter(table.all("tbody")))
    assert next(iter(first.all("tr"))).cells()[3] == "100%"


def test_variants_without_a_difference_count_for_no_alternative() -> None:
    """And an alternative with none that has one has a dash."""
    values = [(0.5, 0.1, 0.9), (0.4, -0.1, 0.9), NOTHING, (0.5, 0.1, 0.9), NOTHING, NOTHING]
    facts = facts_with(values)
    sides = sides_with(facts.summaries[0], facts.crossing, 0)
    assert [(own.apart, own.of) for _, own in sides] == [(1, 2), (1, 1)]
    rows = {row.key.striptags(): row for row in collect_decisions(facts, facts.summaries[0]).rows}
    over = rows["screening.fixations.over_ms"]
    assert [own.apart for own in over.alternatives] == ["2 of 2", "0 of 1", "–"]
    assert (
        "hangs on over_ms: it does in 2 of 2 variants with 800, in 0 of 1 with 600; with 1000 no "
        "variant has a difference." in said(facts)
    )


def test_odds_are_explained_with_the_first_curve_that_has_a_difference() -> None:
    """Under "How it was done", and not at all where rates are looked at."""
    facts = facts_with([around(0.88, 0.37)] * 6)
    method = read(variants_page(facts)).one("section", id="method").text
    assert (
        "The study’s difference of +0.88 for went_back at verb, fit odd against fitting" in method
    )
    assert "means odds 2.4 times as high." in method
    none = read(variants_page(facts_with([NOTHING] * 6))).one("section", id="method").text
    assert "The study’s difference of" not in none


def test_rule_is_told_only_where_it_chose() -> None:
    """Not of rates, which it does not fit, and not where the user named what leads."""
    facts = replace(facts_with([around(0.5, 0.6)] * 6), rule=LEADING_RULE)
    rates = replace(facts_of(crossing_of([2, 2]), rates=True), rule=LEADING_RULE)
    for one, told, text in (
        (facts, True, LEADING_RULE),
        (replace(facts, named=True), False, "The variants file names these comparisons."),
        (rates, False, "Rates over all variants"),
        (replace(rates, named=True), False, "The variants file names these rates."),
    ):
        page = read(variants_page(one))
        assert (" ".join(LEADING_RULE.split()) in page.text) is told
        assert text in page.one("section", id="curves").text


def test_named_variants_are_called_so() -> None:
    """Also where they happen to be all combinations."""
    own = crossing_of([2])
    two = Crossing(own.settings, ("the study", "strict"), own.choices, 0)
    lead = [by_class(read(variants_page(facts_of(one))), "lead")[0].text for one in (two, own)]
    assert lead[0].startswith("2 named variants that differ in 1 decision. Each")
    assert lead[1].startswith("2 variants: all combinations of 1 decision. Each")
    four = by_class(read(variants_page(facts_of(named_crossing()))), "lead")[0].text
    assert four.startswith("4 named variants that differ in 3 decisions, out of 18 combinations.")
