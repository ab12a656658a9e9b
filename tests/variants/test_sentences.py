"""What is said of comparisons, whole texts."""

from __future__ import annotations

import re
from itertools import product

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.variants.facts import Comparison, Crossing, Setting, Summary
from etl.variants.in_short import in_short
from etl.variants.passages import for_paper
from etl.variants.sentences import (
    alternative_words,
    comparison_words,
    setting_words,
    short_keys,
    variant_words,
)
from etl.variants.words import number, percent
from tests.variants.making import RATE, chosen, summary_of
from tests.variants.test_summaries import summarised

KEYS = ["screening.fixations.over_ms", "screening.fixations.merge", "measures.outside"]
BEGINS = (
    "The rates of first_pass_regression_out at verb with fit odd and with fitting were compared in "
)
BEGINS_RATE = "The rate of first_pass_regression_out at verb was computed in "
SOURCE = "(a multiverse analysis; Steegen, Tuerlinckx, Gelman, & Vanpaemel, 2016)"
#: The study as it stands: 60 of 100 ones against 50 of 100.
OWN = (
    "In the study as it stands 60 of 100 values (60.0%) are 1 with fit odd and 50 of 100 values "
    "(50.0%) with fitting: a difference of 0.41 in log-odds (95% interval −0.15 to 0.97). "
)
INDEPENDENT = " (Woolf, 1955) take trials as independent, though they share readers and items."


def by_keys(*sizes: int) -> Crossing:
    """All combinations of so many alternatives of the settings above."""
    return chosen([*product(*map(range, sizes))], sizes, keys=KEYS)


def told(summary: Summary, crossing: Crossing) -> tuple[str, str]:
    """The passage and the lines for the console, without the names of what is compared."""
    passage, lines = for_paper(summary, crossing), in_short(summary, crossing)
    name = comparison_words(summary.compared.comparison) + ": "
    begins = BEGINS if summary.compared.comparison.factor else BEGINS_RATE
    assert passage.startswith(begins)
    assert lines.startswith(name)
    return passage.removeprefix(begins), lines.removeprefix(name)


def first(lines: str) -> str:
    """The first of two lines, or the only one."""
    return lines.split("\n", maxsplit=1)[0]


def last(lines: str) -> str:
    """The last of two lines, or the only one."""
    return lines.rsplit("\n", maxsplit=1)[-1]


def test_sign_that_turns_is_told_with_what_turns_it() -> None:
    """over_ms turns it, and merge shifts it a little."""
    crossing = by_keys(3, 2)
    tables = [(50, 50, 40 + 20 * (a == 2) + 2 * b, 60) for a, b in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert passage == (
        f"6 variants of the data {SOURCE}, all combinations of over_ms (0, 1, 2) and merge (0, 1). "
        f"{OWN}Over the variants the difference in log-odds ranges from −0.03 to 0.41. It is above "
        "0, as in the study, in 4 of 6 variants (the interval leaves out 0 in none of these). It "
        "is below 0 in 1 (its interval includes 0) and exactly 0 in 1. The sign hangs most on "
        "over_ms: it is above 0 in 2 of 2 with 0, in 2 of 2 with 1 and in 0 of 2 with 2. The "
        "decision that explains the largest share of the variance between variants is over_ms "
        "(99%). Intervals" + INDEPENDENT
    )
    assert lines == (
        "0.41 (−0.15 to 0.97) in the study, −0.03 to 0.41 over 6 variants; above 0 in 4 of 6 "
        "variants (the interval leaves out 0 in none of these)\n"
        "the sign turns most often with screening.fixations.over_ms: above 0 in 2 of 2 "
        "variants with 0, in 2 of 2 with 1, in 0 of 2 with 2"
    )


def test_sign_that_holds_is_told_with_what_matters() -> None:
    """Some intervals leave out 0; one setting works with another only."""
    crossing = by_keys(2, 2, 2)
    tables = [(50, 50, 40 - 15 * a * (1 + b), 60) for a, b, _ in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert passage == (
        f"8 variants of the data {SOURCE}, all combinations of over_ms (0, 1), merge (0, 1) and "
        f"outside (0, 1). {OWN}Over the variants the difference in log-odds ranges from 0.41 to "
        "1.79. It is above 0 in all 8 variants (the interval leaves out 0 in 4 of these). Whether "
        "the interval leaves out 0 hangs on over_ms: it does in 0 of 4 with 0 and in 4 of 4 with "
        "1. The decision that explains the largest share of the variance between variants is "
        "over_ms (84% with its interactions, 67% by itself). Intervals" + INDEPENDENT
    )
    assert lines == (
        "0.41 (−0.15 to 0.97) in the study, 0.41 to 1.79 over 8 variants; above 0 in all 8 "
        "variants (the interval leaves out 0 in 4 of these)\n"
        "whether the interval leaves out 0 hangs on screening.fixations.over_ms: it does in 0 of 4 "
        "variants with 0, it does in 4 of 4 with 1"
    )


def test_what_matters_is_told_where_neither_sign_nor_interval_hangs_on_it() -> None:
    """Much the same from few trials: every interval includes 0."""
    crossing = by_keys(2, 2, 2)
    tables = [(10, 10, 8 - 2 * a * (1 + b), 12) for a, b, _ in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert last(lines) == (
        "screening.fixations.over_ms matters most (87% of the variance between variants)"
    )
    assert (
        "It is above 0 in all 8 variants (the interval leaves out 0 in none of these). The decision"
    ) in passage
    assert "hangs" not in passage


def test_settings_that_matter_equally_are_told_as_equal() -> None:
    """Only their combination turns the sign: neither is put before the other."""
    crossing = by_keys(2, 2)
    one, other = (60, 40, 40, 60), (40, 60, 60, 40)
    passage, lines = told(summary_of([one, other, other, one], crossing), crossing)
    assert (
        "It is above 0, as in the study, in 2 of 4 variants (the interval leaves out 0 in both of "
        "these). It is below 0 in 2 (the interval leaves out 0 in both of these). The sign hangs "
        "equally on over_ms and merge. On which side of 0 the interval lies hangs "
        "equally on over_ms and merge. Both decisions explain equally "
        "much of the variance between variants (100% each, with interactions)."
    ) in passage
    assert last(lines) == (
        "the sign turns equally often with screening.fixations.over_ms and "
        "screening.fixations.merge"
    )


def test_two_of_three_that_matter_equally() -> None:
    """The third does nothing; the sign holds."""
    crossing = by_keys(2, 2, 2)
    tables = [(50, 50, 40 - 9 * (a != b), 60) for a, b, _ in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert (
        "Whether the interval leaves out 0 hangs equally on over_ms and merge. The decisions that "
        "explain the largest shares of the variance between variants are over_ms and merge, "
        "equally much (100% each, with interactions)."
    ) in passage
    assert last(lines) == (
        "whether the interval leaves out 0 hangs equally on screening.fixations.over_ms and "
        "screening.fixations.merge"
    )
    unsure = [(10, 10, 8 - 2 * (a != b), 12) for a, b, _ in crossing.choices.tolist()]
    assert last(in_short(summary_of(unsure, crossing), crossing)) == (
        "screening.fixations.over_ms and screening.fixations.merge matter most, and equally (100% "
        "of the variance between variants each)"
    )
    turned = [
        t if a == b else (60, 40, 80, 20)
        for t, (a, b, _) in zip(tables, crossing.choices, strict=True)
    ]
    assert last(in_short(summary_of(turned, crossing), crossing)) == (
        "the sign turns equally often with screening.fixations.over_ms and "
        "screening.fixations.merge"
    )


def test_three_that_matter_equally() -> None:
    """None is left out."""
    crossing = by_keys(2, 2, 2)
    tables = [(50, 50, 40 - 9 * (sum(row) % 2), 60) for row in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert (
        "Whether the interval leaves out 0 hangs equally on over_ms, merge and outside. All 3 "
        "decisions explain equally much of the variance between variants (100% each, with "
        "interactions)."
    ) in passage
    assert last(lines) == (
        "whether the interval leaves out 0 hangs equally on screening.fixations.over_ms, "
        "screening.fixations.merge and measures.outside"
    )
    unsure = [(10, 10, 8 - 2 * (sum(row) % 2), 12) for row in crossing.choices.tolist()]
    assert last(in_short(summary_of(unsure, crossing), crossing)) == (
        "all 3 settings matter equally (100% of the variance between variants each)"
    )


def test_rates_are_told_without_a_sign() -> None:
    """Wilson's interval, a range, and what matters."""
    crossing = by_keys(2, 2)
    tables = [(60 - 20 * a, 40 + 20 * a) * 2 for a, _ in crossing.choices.tolist()]
    summary = summary_of(tables, crossing, RATE)
    assert for_paper(summary, crossing) == (
        f"The rate of first_pass_regression_out at verb was computed in 4 variants of the data "
        f"{SOURCE}, all combinations of over_ms (0, 1) and merge (0, 1). In the study as it stands "
        "40 of 100 values (40.0%) are 1: a rate of 0.40 (95% interval 0.31 to 0.50). Over the "
        "variants the rate ranges from 0.40 to 0.60. The decision that explains the largest share "
        "of the variance between variants is over_ms (100%). Intervals (Wilson, 1927) take trials "
        "as independent, though they share readers and items."
    )
    assert in_short(summary, crossing) == (
        "first_pass_regression_out at verb: rate 0.40 (0.31 to 0.50) in the study, 0.40 to 0.60 "
        "over 4 variants\n"
        "screening.fixations.over_ms matters most (100% of the variance between variants)"
    )


def test_missing_values_and_counts_of_0_are_told() -> None:
    """One variant without a difference, so no shares; one with 0.5 added."""
    crossing = by_keys(2, 2)
    tables = [(50, 50, 70, 30), (50, 50, 75, 25), (0, 0, 70, 30), (5, 5, 10, 0)]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert passage == (
        f"4 variants of the data {SOURCE}, all combinations of over_ms (0, 1) and merge (0, 1). "
        "The difference in log-odds has no value in 1 of 4 variants, since at least one of the two "
        "conditions has none. In the study as it stands 30 of 100 values (30.0%) are 1 with fit "
        "odd and 50 of 100 values (50.0%) with fitting: a difference of −0.85 in log-odds (95% "
        "interval −1.43 to −0.27). Over the variants the difference in log-odds ranges from −3.04 "
        "to −0.85. It is below 0, as in the study, in 3 of 4 variants (the interval leaves out 0 "
        "in 2 of these). Whether the interval leaves out 0 hangs on over_ms: it does in 2 of 2 "
        "with 0 and in 0 of 1 with 1. Where one of the four counts is 0 (in 1 of 4 variants), 0.5 "
        "was added to each (Haldane, 1956; Anscombe, 1956). Intervals" + INDEPENDENT
    )
    assert lines == (
        "−0.85 (−1.43 to −0.27) in the study, −3.04 to −0.85 over 4 variants; below 0 in 3 of 4 "
        "variants (the interval leaves out 0 in 2 of these); no value in 1\n"
        "whether the interval leaves out 0 hangs on screening.fixations.over_ms: it does in 2 of 2 "
        "variants with 0, it does in 0 of 1 with 1"
    )


@pytest.mark.parametrize(
    ("lacking", "why"),
    [
        ([(0, 0, 3, 4), (3, 4, 0, 0)], "at least one of the two conditions has none"),
        ([(9, 0, 99, 0), (0, 7, 0, 8)], "all values of both conditions are the same"),
        (
            [(0, 0, 3, 4), (9, 0, 99, 0)],
            "at least one of the two conditions has none, or all values of both are the same",
        ),
    ],
)
def test_passage_says_why_there_is_no_value(lacking: list[tuple[int, ...]], why: str) -> None:
    """Of those variants that have none; the others may have no ones in one condition."""
    crossing = by_keys(3)
    summary = summary_of([(50, 0, 40, 60), *lacking], crossing)
    passage = for_paper(summary, crossing)
    assert f"The difference in log-odds has no value in 2 of 3 variants, since {why}. In" in passage
    nowhere = for_paper(summary_of(lacking, by_keys(2)), by_keys(2))
    assert nowhere.endswith(
        f"The difference in log-odds has no value in either variant, since {why}."
    )


SURE, TURNED, UNSURE = (60, 40, 40, 60), (40, 60, 60, 40), (10, 10, 9, 11)


@pytest.mark.parametrize(
    ("sizes", "tables", "sentence"),
    [
        (
            [2, 2],
            [SURE, SURE, TURNED, TURNED],
            (
                "On which side of 0 the interval lies hangs on over_ms: it lies above 0 in 2 of 2 "
                "with 0 and in 0 of 2 with 1."
            ),
        ),
        (
            [2, 2],
            [SURE, SURE, TURNED, UNSURE],
            (
                "Whether the interval leaves out 0, and on which side it lies, hangs most on "
                "over_ms: it lies above 0 in 2 and below 0 in 0 of 2 with 0; above 0 in 0 and "
                "below 0 in 1 of 2 with 1."
            ),
        ),
        (
            [2, 3],
            [SURE, SURE, UNSURE, TURNED, TURNED, UNSURE],
            (
                "Whether the interval leaves out 0, and on which side it lies, hangs equally on "
                "over_ms and merge."
            ),
        ),
        (
            [2, 3],
            [SURE, SURE, UNSURE, UNSURE, UNSURE, UNSURE],
            (
                "Whether the interval leaves out 0 hangs most on over_ms: it does in 2 of 3 with 0 "
                "and in 0 of 3 with 1."
            ),
        ),
        (
            [3],
            [SURE, (0, 0, 1, 1), UNSURE],
            (
                "Whether the interval leaves out 0 hangs on over_ms: it does in 1 of 1 with 0 and "
                "in 0 of 1 with 2."
            ),
        ),
        ([2, 2], [SURE, SURE, SURE, (60, 40, 39, 61)], ""),
    ],
)
def test_passage_says_on_what_it_hangs_where_the_interval_lies(
    sizes: list[int], tables: list[tuple[int, ...]], sentence: str
) -> None:
    """Where all leave out 0 it is only told on what the side hangs."""
    crossing = by_keys(*sizes)
    passage = for_paper(summary_of(tables, crossing), crossing)
    found = re.findall(r"(?:Whether|On which)[^.]*\.", passage)
    assert found == ([sentence] if sentence else [])


def test_alternative_without_any_value_is_told_where_the_sign_turns() -> None:
    """Nothing is said of the sign there."""
    crossing = by_keys(3)
    tables = [(50, 50, 40, 60), (50, 50, 60, 40), (0, 0, 1, 1)]
    assert last(in_short(summary_of(tables, crossing), crossing)) == (
        "the sign turns with screening.fixations.over_ms: above 0 in 1 of 1 variant with 0, "
        "in 0 of 1 with 1, no value with 2"
    )


@pytest.mark.parametrize(
    ("own", "value", "short", "why"),
    [
        (
            (10, 10, 10, 10),
            (
                "10 of 20 values (50.0%) are 1 with fit odd and 10 of 20 values (50.0%) with "
                "fitting: a difference of 0.00 in log-odds (95% interval −1.24 to 1.24)"
            ),
            "0.00 (−1.24 to 1.24)",
            1,
        ),
        ((0, 0, 10, 10), "it has no value", "no value", 0),
        ((10, 0, 99, 0), "it has no value", "no value", 0),
    ],
)
def test_study_without_a_sign_is_told_so(
    own: tuple[int, ...], value: str, short: str, why: int
) -> None:
    """Then there is nothing that could hold, and all signs are counted."""
    crossing = by_keys(3)
    tables = [own, (50, 50, 30, 70), (50, 50, 51, 49)]
    passage, lines = told(summary_of(tables, crossing), crossing)
    zero = ", exactly 0 in 1" if why else ""
    assert (
        f"In the study as it stands {value}. Over the variants the difference in log-odds ranges "
        "from −0.04 to 0.85. So there is no sign that could hold; the value is below 0 in 1 (its "
        f"interval includes 0){zero} and above 0 in 1 (its interval leaves out 0). The sign"
    ) in passage
    assert first(lines) == (
        f"{short} in the study, −0.04 to 0.85 over 3 variants; below 0 in 1{zero} and above 0 in 1"
        + ("" if why else "; no value in 1")
    )


def test_no_value_anywhere_is_told_at_once() -> None:
    """No range, no interval."""
    nothing = (0, 0, 3, 4)
    passage, lines = told(summary_of([nothing] * 3, by_keys(3)), by_keys(3))
    assert passage == (
        f"3 variants of the data {SOURCE}, by over_ms (0, 1, 2). The difference in log-odds has no "
        "value in any of the 3 variants, since at least one of the two conditions has none."
    )
    assert lines == ("no value in any of the 3 variants")
    passage, lines = told(summary_of([nothing] * 2, by_keys(2), RATE), by_keys(2))
    assert passage == (
        f"2 variants of the data {SOURCE}, by over_ms (0, 1). The rate has no value in either "
        "variant, since there are no data."
    )
    assert lines == ("no value in either variant")
    passage, lines = told(summary_of([nothing], by_keys(1)), by_keys(1))
    assert passage == (
        "one variant only, the study as it stands. The difference in log-odds has no value, since "
        "at least one of the two conditions has none."
    )
    assert lines == ("no value")


def test_one_variant_is_told_as_one() -> None:
    """No range, nothing that varies."""
    passage, lines = told(summary_of([(50, 0, 40, 60)], by_keys(1)), by_keys(1))
    assert passage == (
        "one variant only, the study as it stands. Here 60 of 100 values (60.0%) are 1 with fit "
        "odd and 0 of 50 values (0.0%) with fitting: a difference of 5.02 in log-odds (95% "
        "interval 2.20 to 7.83). Its interval leaves out 0. Where one of the four counts is 0 "
        "(here), 0.5 was added to each (Haldane, 1956; Anscombe, 1956). Intervals" + INDEPENDENT
    )
    assert lines == ("5.02 (2.20 to 7.83) in the study")
    unsure = for_paper(summary_of([(10, 10, 8, 12)], by_keys(1)), by_keys(1))
    assert "(95% interval −0.85 to 1.66). Its interval includes 0. Intervals" in unsure
    equal = for_paper(summary_of([(5, 5, 5, 5)], by_keys(1)), by_keys(1))
    assert "(95% interval −1.75 to 1.75). Intervals" in equal


def test_values_that_are_all_alike_are_told_once() -> None:
    """The same value, or one that two decimals do not tell from it."""
    crossing = by_keys(2)
    same = [(50, 50, 40, 60)] * 2
    passage, lines = told(summary_of(same, crossing), crossing)
    assert passage == (
        f"2 variants of the data {SOURCE}, by over_ms (0, 1). {OWN}The difference in log-odds is "
        "0.41 in both variants. It is above 0 in both variants (the interval leaves out 0 in "
        "neither of these). Intervals" + INDEPENDENT
    )
    assert lines == (
        "0.41 (−0.15 to 0.97) in the study, 0.41 over 2 variants; above 0 in both variants (the "
        "interval leaves out 0 in neither of these)"
    )
    passage, lines = told(summary_of([(1_000, 3_000) * 2] * 2, by_keys(2), RATE), by_keys(2))
    assert passage == (
        f"2 variants of the data {SOURCE}, by over_ms (0, 1). In the study as it stands 3,000 of "
        "4,000 values (75.0%) are 1: a rate of 0.75 (95% interval 0.74 to 0.76). The rate is 0.75 "
        "in both variants. Intervals (Wilson, 1927) take trials as independent, though they share "
        "readers and items."
    )
    assert lines == "rate 0.75 (0.74 to 0.76) in the study, 0.75 over 2 variants"
    near = [(5000, 5000, 4000, 6000), (5000, 5000, 4001, 6000)]
    assert "The difference in log-odds is 0.41 (to two decimals) in both variants." in for_paper(
        summary_of(near, crossing), crossing
    )
    lacking = by_keys(3)
    assert "The difference in log-odds is 0.41 in the other 2." in for_paper(
        summary_of([*same, (0, 0, 1, 1)], lacking), lacking
    )
    assert "The difference in log-odds is 0.41 in the other one." in for_paper(
        summary_of([same[0], (0, 0, 1, 1), (0, 0, 1, 1)], lacking), lacking
    )


def test_named_variants_are_told_as_such() -> None:
    """Where no two differ in one setting only, nothing can be said to turn the sign."""
    tables = [(50, 50, 40, 60), (50, 50, 60, 40)]
    apart = chosen([(0, 0), (1, 1)], [2, 2], keys=KEYS, named=True)
    passage, lines = told(summary_of(tables, apart), apart)
    assert passage == (
        f"2 named variants of the data, the study as it stands among them {SOURCE}. {OWN}Over the "
        "variants the difference in log-odds ranges from −0.41 to 0.41. It is above 0, as in the "
        "study, in 1 of 2 variants (its interval includes 0). It is below 0 in 1 (its interval "
        "includes 0). Intervals" + INDEPENDENT
    )
    assert last(lines) == "the sign turns, but not between variants that differ in one setting only"
    beside = chosen([(0, 0), (1, 0)], [2, 2], keys=KEYS, named=True)
    assert last(in_short(summary_of(tables, beside), beside)).startswith(
        "the sign turns with screening.fixations.over_ms: above 0 in 1 of 1 variant with 0"
    )


def test_combinations_that_are_not_all_are_not_called_so() -> None:
    """And a rule that is off is called so."""
    settings = (
        Setting("screening.fixations.under_ms", ("80", "false"), 0),
        Setting("measures.outside", ('"ignore"', '"interrupt"'), 0),
    )
    crossing = Crossing(settings, ("",) * 3, chosen([(0, 0), (1, 0), (1, 1)], [2, 2]).choices, 0)
    passage, _ = told(summary_of([(50, 50, 40, 60)] * 3, crossing), crossing)
    assert passage.startswith(
        f'3 variants of the data {SOURCE}, combinations of under_ms (80, off) and outside ("ignore"'
        ', "interrupt"). In'
    )


def test_outcome_of_trials_has_no_region() -> None:
    """Neither in a comparison nor as a rate."""
    crossing = by_keys(2)
    tables = [(50, 50, 40, 60)] * 2
    answer = Comparison("answer", "", "fit", "odd", "fitting")
    assert for_paper(summary_of(tables, crossing, answer), crossing).startswith(
        "The rates of answer with fit odd and with fitting were compared in 2 variants of"
    )
    alone = Comparison("answer", "", "", "", "")
    assert for_paper(summary_of(tables, crossing, alone), crossing).startswith(
        "The rate of answer was computed in 2 variants of"
    )


def test_variants_are_told_by_how_they_differ() -> None:
    """Only what is not as in the study; with their names, where they have any."""
    settings = (
        Setting("screening.fixations.under_ms", ("80", "false"), 0),
        Setting("measures.outside", ('"ignore"', '"interrupt"'), 0),
    )
    choices = by_keys(2, 2).choices
    own = Crossing(settings, ("",) * 4, choices, 0)
    assert [variant_words(own, variant) for variant in range(4)] == [
        *("the study as it stands", 'outside = "interrupt"', "under_ms off"),
        'under_ms off, outside = "interrupt"',
    ]
    named = Crossing(settings, ("the study", "strict", "", "loose"), choices, 0)
    assert variant_words(named, 3) == 'loose (under_ms off, outside = "interrupt")'
    assert variant_words(named, 2) == "under_ms off"
    assert variant_words(named, 0) == "the study as it stands"
    other = Crossing(settings, ("",) * 4, choices, 3)
    assert variant_words(other, 1) == "under_ms = 80"


@given(summarised())
def test_there_are_words_for_everything(made: tuple[Crossing, Summary]) -> None:
    """Whatever the counts: whole sentences, at most two lines, and no leavings of numbers."""
    crossing, summary = made
    passage, lines = for_paper(summary, crossing), in_short(summary, crossing).split("\n")
    assert passage.endswith(".")
    assert len(lines) <= 2
    for text in (passage, *lines):
        assert not re.findall(r"nan\b|\binf|-\d|  |\.\.|\(\)", text)
        assert "−0.00" not in text
    if summary.without < len(crossing) > 1:
        assert ("no sign that could hold" in passage) == (summary.same_sign == 0)


def test_comparison_is_named_by_what_there_is() -> None:
    """Names are taken as they are; outcomes of trials have no region."""
    assert comparison_words(Comparison("answer", "", "", "", "")) == "answer"
    assert comparison_words(Comparison("answer", "", "a b", "-1", "été")) == (
        "answer, a b -1 against été"
    )
    assert comparison_words(RATE) == "first_pass_regression_out at verb"


@given(st.lists(st.sampled_from(["a", "b", "a.b", "b.b", "a.a.b", "b.a.b", "c.b"]), unique=True))
def test_short_keys_are_told_apart(keys: list[str]) -> None:
    """Each is an end of its key, and no two are the same."""
    short = short_keys([Setting(key, ("1",), 0) for key in keys])
    assert len({*short}) == len(keys)
    for own, key in zip(short, keys, strict=True):
        assert f".{key}".endswith(f".{own}")
        # One part less would do for another one as well.
        if "." in own:
            less = own.partition(".")[2]
            assert sum(f".{other}".endswith(f".{less}") for other in keys) > 1


def test_settings_are_named_with_their_alternatives() -> None:
    """As in the study file, but off in place of false."""
    assert setting_words("outside", '"interrupt"') == 'outside = "interrupt"'
    assert setting_words("fixations.under_ms", "false") == "fixations.under_ms off"
    assert [alternative_words(own) for own in ("80", "false", "true")] == ["80", "off", "true"]


@pytest.mark.parametrize(
    ("share", "text"),
    [
        *((0.0, "0%"), (1e-20, "0%"), (0.004, "less than 1%"), (0.006, "1%"), (0.614, "61%")),
        *((0.994, "99%"), (0.996, "more than 99%"), (1 - 1e-15, "100%"), (1.0, "100%")),
    ],
)
def test_share_that_is_not_quite_all_or_nothing_is_not_called_so(share: float, text: str) -> None:
    """Whole percents, but for both ends."""
    assert percent(share) == text


def test_numbers_have_two_decimals_and_a_true_minus() -> None:
    """A third one where 0 would be left of what is not 0; no sign where nothing else is."""
    values = (-0.004, 0.0, -0.0001, -0.006, 0.125001, -1234.5)
    expected = ["−0.004", "0.00", "0.00", "−0.01", "0.13", "−1,234.50"]
    assert [number(value) for value in values] == expected
