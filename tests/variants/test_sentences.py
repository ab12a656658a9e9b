"""What is said of comparisons, whole texts."""

from __future__ import annotations

import re
from itertools import product

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.variants.facts import Comparison, Crossing, Setting, Summary
from etl.variants.in_short import in_short
from etl.variants.sentences import (
    comparison_words,
    for_paper,
    setting_words,
    short_keys,
)
from etl.variants.words import number, percent
from tests.variants.making import RATE, chosen, summary_of
from tests.variants.test_summaries import summarised

KEYS = ["screening.fixations.over_ms", "screening.fixations.merge", "measures.outside"]
INDEPENDENT = " (Woolf, 1955) take trials as independent, though they share readers and items."


def by_keys(*sizes: int) -> Crossing:
    """All combinations of so many alternatives of the settings above."""
    return chosen([*product(*map(range, sizes))], sizes, keys=KEYS)


def told(summary: Summary, crossing: Crossing) -> tuple[str, str]:
    """The passage and the lines for the console, without the names of what is compared."""
    passage, lines = for_paper(summary, crossing), in_short(summary, crossing)
    name = comparison_words(summary.compared.comparison) + ": "
    assert passage.startswith(name)
    assert lines.startswith(name)
    return passage.removeprefix(name), lines.removeprefix(name)


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
        "the difference in log-odds was computed in 6 variants of the data, all combinations of 2 "
        "decisions (over_ms and merge). It ranges from −0.03 to 0.41. In the study as it stands it "
        "is 0.41 (95% interval −0.15 to 0.97). It is above 0, as in the study, in 4 of 6 variants "
        "(the interval leaves out 0 in none of these). It is below 0 in 1 (its interval includes "
        "0) and exactly 0 in 1. The decision that explains the largest share of the variance "
        "between variants is over_ms (99%). Intervals" + INDEPENDENT
    )
    assert lines == (
        "0.41 (−0.15 to 0.97) in the study, −0.03 to 0.41 over 6 variants; above 0 in 4 of 6 "
        "variants (the interval leaves out 0 in none of these)\n"
        "the sign turns most often with screening.fixations.over_ms: above 0 with 0 (2 of 2 "
        "variants), above 0 with 1 (2 of 2), below 0 or exactly 0 with 2 (1 of 2 each)"
    )


def test_sign_that_holds_is_told_with_what_matters() -> None:
    """Some intervals leave out 0; one setting works with another only."""
    crossing = by_keys(2, 2, 2)
    tables = [(50, 50, 40 - 15 * a * (1 + b), 60) for a, b, _ in crossing.choices.tolist()]
    passage, lines = told(summary_of(tables, crossing), crossing)
    assert passage == (
        "the difference in log-odds was computed in 8 variants of the data, all combinations of 3 "
        "decisions (over_ms, merge and outside). It ranges from 0.41 to 1.79. In the study as it "
        "stands it is 0.41 (95% interval −0.15 to 0.97). It is above 0 in all 8 variants (the "
        "interval leaves out 0 in 4 of these). The decision that explains the largest share of the "
        "variance between variants is over_ms (84% with its interactions, 67% by itself)."
        " Intervals" + INDEPENDENT
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
    assert last(in_short(summary_of(tables, crossing), crossing)) == (
        "screening.fixations.over_ms matters most (87% of the variance between variants)"
    )


def test_settings_that_matter_equally_are_told_as_equal() -> None:
    """Only their combination turns the sign: neither is put before the other."""
    crossing = by_keys(2, 2)
    one, other = (60, 40, 40, 60), (40, 60, 60, 40)
    passage, lines = told(summary_of([one, other, other, one], crossing), crossing)
    assert (
        "It is above 0, as in the study, in 2 of 4 variants (the interval leaves out 0 in both of "
        "these). It is below 0 in 2 (the interval leaves out 0 in both of these). Both decisions "
        "explain equally much of the variance between variants (100% each, with interactions)."
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
        "The decisions that explain the largest shares of the variance between variants are "
        "over_ms and merge, equally much (100% each, with interactions)."
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
        "All 3 decisions explain equally much of the variance between variants (100% e" in passage
    )
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
        "first_pass_regression_out at verb: the rate was computed in 4 variants of the data, all "
        "combinations of 2 decisions (over_ms and merge). It ranges from 0.40 to 0.60. In the "
        "study as it stands it is 0.40 (95% interval 0.31 to 0.50). The decision that explains the "
        "largest share of the variance between variants is over_ms (100%). Intervals (Wilson, "
        "1927) take trials as independent, though they share readers and items."
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
        "the difference in log-odds was computed in 4 variants of the data, all combinations of 2 "
        "decisions (over_ms and merge). It has no value in 1 of 4 variants, since one of the two "
        "conditions has none. It ranges from −3.04 to −0.85. In the study as it stands it is −0.85 "
        "(95% interval −1.43 to −0.27). It is below 0, as in the study, in 3 of 4 variants (the "
        "interval leaves out 0 in 2 of these). Where one of the four counts is 0 (in 1 of 4 "
        "variants), 0.5 was added to each (Haldane, 1956; Anscombe, 1956). Intervals" + INDEPENDENT
    )
    assert lines == (
        "−0.85 (−1.43 to −0.27) in the study, −3.04 to −0.85 over 4 variants; below 0 in 3 of 4 "
        "variants (the interval leaves out 0 in 2 of these); no value in 1\n"
        "whether the interval leaves out 0 hangs on screening.fixations.over_ms: it does in 2 of 2 "
        "variants with 0, it does in 0 of 1 with 1"
    )


def test_alternative_without_any_value_is_told_where_the_sign_turns() -> None:
    """Nothing is said of the sign there."""
    crossing = by_keys(3)
    tables = [(50, 50, 40, 60), (50, 50, 60, 40), (0, 0, 1, 1)]
    assert last(in_short(summary_of(tables, crossing), crossing)) == (
        "the sign turns with screening.fixations.over_ms: above 0 with 0 (1 of 1 variant), below 0 "
        "with 1 (1 of 1), no value with 2"
    )


@pytest.mark.parametrize(
    ("own", "value", "short", "why"),
    [
        ((10, 10, 10, 10), "it is 0.00 (95% interval −1.24 to 1.24)", "0.00 (−1.24 to 1.24)", 1),
        ((0, 0, 10, 10), "it has no value", "no value", 0),
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
        f"In the study as it stands {value}. So there is no sign that could hold; the value is "
        f"below 0 in 1 (its interval includes 0){zero} and above 0 in 1 (its interval leaves out "
        "0). Intervals"
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
        "the difference in log-odds was computed in 3 variants of the data, by one decision "
        "(over_ms). It has no value in any of the 3 variants, since one of the two conditions has "
        "none."
    )
    assert lines == ("no value in any of the 3 variants")
    passage, lines = told(summary_of([nothing] * 2, by_keys(2), RATE), by_keys(2))
    assert passage.endswith("It has no value in either variant, since there are no data.")
    assert lines == ("no value in either variant")
    passage, lines = told(summary_of([nothing], by_keys(1)), by_keys(1))
    assert passage.endswith("It has no value, since one of the two conditions has none.")
    assert lines == ("no value")


def test_one_variant_is_told_as_one() -> None:
    """No range, nothing that varies."""
    passage, lines = told(summary_of([(50, 0, 40, 60)], by_keys(1)), by_keys(1))
    assert passage == (
        "the difference in log-odds was computed in one variant only, the study as it stands. It "
        "is 5.02 (95% interval 2.20 to 7.83). Its interval leaves out 0. Where one of the four "
        "counts is 0 (here), 0.5 was added to each (Haldane, 1956; Anscombe, 1956). Intervals"
        + INDEPENDENT
    )
    assert lines == ("5.02 (2.20 to 7.83) in the study")


def test_values_that_are_all_alike_are_told_once() -> None:
    """The same value, or one that two decimals do not tell from it."""
    crossing = by_keys(2)
    same = [(50, 50, 40, 60)] * 2
    passage, lines = told(summary_of(same, crossing), crossing)
    assert "by one decision (over_ms). It is 0.41 in both variants. In the study" in passage
    assert "It is above 0 in both variants (the interval leaves out 0 in neither of th" in passage
    assert lines == (
        "0.41 (−0.15 to 0.97) in the study, 0.41 over 2 variants; above 0 in both variants (the "
        "interval leaves out 0 in neither of these)"
    )
    near = [(5000, 5000, 4000, 6000), (5000, 5000, 4001, 6000)]
    assert "It is 0.41 (to two decimals) in both variants." in for_paper(
        summary_of(near, crossing), crossing
    )
    lacking = by_keys(3)
    assert "It is 0.41 in the other 2." in for_paper(
        summary_of([*same, (0, 0, 1, 1)], lacking), lacking
    )
    assert "It is 0.41 in the other one." in for_paper(
        summary_of([same[0], (0, 0, 1, 1), (0, 0, 1, 1)], lacking), lacking
    )


def test_named_variants_are_told_as_such() -> None:
    """Where no two differ in one setting only, nothing can be said to turn the sign."""
    tables = [(50, 50, 40, 60), (50, 50, 60, 40)]
    apart = chosen([(0, 0), (1, 1)], [2, 2], keys=KEYS, named=True)
    passage, lines = told(summary_of(tables, apart), apart)
    assert passage == (
        "the difference in log-odds was computed in 2 named variants of the data, the study as it "
        "stands among them. It ranges from −0.41 to 0.41. In the study as it stands it is 0.41 "
        "(95% interval −0.15 to 0.97). It is above 0, as in the study, in 1 of 2 variants (its "
        "interval includes 0). It is below 0 in 1 (its interval includes 0). Intervals"
        + INDEPENDENT
    )
    assert last(lines) == "the sign turns, but not between variants that differ in one setting only"
    beside = chosen([(0, 0), (1, 0)], [2, 2], keys=KEYS, named=True)
    assert last(in_short(summary_of(tables, beside), beside)).startswith(
        "the sign turns with screening.fixations.over_ms: above 0 with 0 (1 of 1 variant)"
    )


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
    """And no sign where nothing but 0 is left."""
    values = (-0.004, 0.0, -0.006, 0.125001, -1234.5)
    assert [number(value) for value in values] == ["0.00", "0.00", "−0.01", "0.13", "−1,234.50"]
