"""The maximal formula, the steps below it, and where to begin."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.coding import coding_of
from etl.readiness.facts import Step
from etl.readiness.ladder import Grouping, Ladder, Model, ladder_of
from etl.readiness.terms import MOST_COEFFICIENTS, quoted
from tests.readiness.making import crossed, judged

CUE = {"cue": ["early", "late"]}
CUE_FIT = {**CUE, "fit": ["fitting", "odd"]}


def ladder(rarer: int, *groupings: Grouping, values: int = 10_000, coefficients: int = 4) -> Ladder:
    """The ladder of a model of two factors with so many ones."""
    columns = {"cue": ("cue_late",), "fit": ("fit_odd",)}
    model = Model("reread", "cue * fit", coefficients, values, rarer, "ones", columns)
    return ladder_of(model, groupings)


READERS = Grouping("participant", 24, 10_000, {("cue",): 4.0, ("fit",): 5.0, ("cue", "fit"): 2.0})
ITEMS = Grouping("item", 32, 10_000, {("cue",): 3.0})
PLAIN_READERS = Grouping("participant", 24, 10_000, {})
PLAIN_ITEMS = Grouping("item", 32, 10_000, {})


def test_steps_go_from_maximal_to_readers_alone() -> None:
    """Correlations go first, then the thinnest slopes, an interaction before its parts; items."""
    steps = ladder(20, READERS, ITEMS).steps
    fixed = "reread ~ cue * fit + "
    assert [(step.formula.removeprefix(fixed), step.change) for step in steps] == [
        ("(1 + cue * fit | participant) + (1 + cue | item)", ""),
        (
            "(1 + cue_late * fit_odd || participant) + (1 + cue_late || item)",
            "without correlations",
        ),
        (
            "(1 + cue_late + fit_odd || participant) + (1 + cue_late || item)",
            "without the by-reader slope for cue × fit",
        ),
        (
            "(1 + cue_late + fit_odd || participant) + (1 | item)",
            "without the by-item slope for cue",
        ),
        ("(1 + fit_odd || participant) + (1 | item)", "without the by-reader slope for cue"),
        (
            "(1 | participant) + (1 | item)",
            "without the by-reader slope for fit: intercepts only",
        ),
        ("(1 | participant)", "without items"),
    ]


def test_parameters_are_coefficients_variances_and_correlations() -> None:
    """By hand: 4 x 5 / 2 + 2 x 3 / 2 = 13 with correlations; 4 + 2 without; 2; 1."""
    steps = ladder(130, READERS, ITEMS).steps
    assert [step.random_parameters for step in steps] == [13, 6, 5, 4, 3, 2, 1]
    assert {step.fixed_parameters for step in steps} == {4}
    # The readers have most: 24 x 4 coefficients, then 24 x 3; then items have 32 x 1 at most.
    assert [step.random_effects for step in steps] == [96, 96, 72, 72, 48, 32, 24]
    assert steps[0].ones_per_parameter == pytest.approx(130 / 17)


def test_first_step_with_enough_of_the_rarer_value_is_the_start() -> None:
    """Ten a parameter: 4 + 4 parameters need 80 ones."""
    found = ladder(80, READERS, ITEMS)
    assert (found.start, found.free) == (4, True)
    assert [bool(step.expectation) for step in found.steps] == [True] * 3 + [False] * 3 + [True]


def test_without_enough_ones_the_start_keeps_readers_and_items() -> None:
    """Leaving items out mends no want of ones: it makes effects look surer than they are."""
    found = ladder(5, READERS, ITEMS)
    assert (found.start, found.free, len(found.steps)) == (6, False, 7)
    assert "effects look surer than they are" in found.steps[-1].expectation


def test_too_few_items_leave_the_last_step() -> None:
    """A variance over three items is none; then nothing speaks against leaving them out."""
    few = Grouping("item", 3, 10_000, {})
    found = ladder(500, PLAIN_READERS, few)
    assert (found.start, found.free) == (2, True)
    assert found.steps[0].expectation == "3 items are too few to estimate how much items differ."


def test_more_random_effects_than_values_are_refused() -> None:
    """24 readers with 4 coefficients each are 96 random effects: one more than there are values."""
    readers = Grouping("participant", 24, 95, READERS.slopes)
    step = ladder(90, readers, values=95).steps[0]
    assert step.expectation == "lme4 refuses it: 96 random effects by reader, but 95 values."


def test_as_many_random_effects_as_values_are_doubtful() -> None:
    """At equality it is accepted, and cannot be estimated."""
    readers = Grouping("participant", 24, 96, READERS.slopes)
    step = ladder(90, readers, values=96).steps[0]
    assert step.expectation.startswith(
        "96 random effects by reader cannot be told apart by 96 values; with 6.4 ones a parameter"
    )


def test_many_slopes_go_by_order() -> None:
    """Three factors within both: ten and more slopes do not go one at a time."""
    factors = {name: ["x", "y"] for name in "abc"}
    one = judged(factors, crossed(factors, 24, 40))
    assert [step.change for step in one.ladder][:5] == [
        "",
        "without correlations",
        "without slopes for interactions of 3 factors",
        "without slopes for interactions of 2 factors",
        "without the by-item slope for c",
    ]


def test_factor_between_readers_has_no_slope_by_reader() -> None:
    """Readers of one group: by-reader slopes for cue alone, by-item ones for all."""
    rows = [
        (reader, item, (levels[0], "x" if int(reader[1:]) % 2 else "y"), value)
        for reader, item, levels, value in crossed(CUE, 12, 12)
    ]
    one = judged({**CUE, "group": ["x", "y"]}, rows)
    assert one.ladder[0].formula == (
        "regression_out ~ cue * group + (1 + cue | participant) + (1 + cue + group | item)"
    )
    assert (
        "The design allows by-reader slopes for cue; none for group: group does not vary within "
        "readers."
    ) in one.sentences


def test_factor_once_a_level_in_each_reader_has_no_slope() -> None:
    """Two values in two levels tell no slope from the scatter of single values."""
    rows = [
        (f"P{reader}", f"i{place}", (level,), (reader + place) % 2)
        for reader in range(20)
        for place, level in enumerate(CUE["cue"])
    ]
    one = judged(CUE, rows)
    assert one.variations[0].kind == "within"
    assert not one.variations[0].repeated
    assert one.ladder[0].formula == "regression_out ~ cue + (1 | participant) + (1 | item)"


def test_factor_with_one_level_is_left_out() -> None:
    """Where only one level has values there is no effect to estimate, and that is said."""
    rows = [
        (r, i, (*levels, "only"), value) for r, i, levels, value in crossed(CUE, 10, 10, seed=3)
    ]
    one = judged({**CUE, "group": ["only", "never"]}, rows)
    assert one.ladder[0].formula.startswith("regression_out ~ cue + (1 + cue | participant)")
    assert "group has the level only only, so it is left out of the formulas." in one.sentences


def test_study_without_factors_has_intercepts() -> None:
    """A fixed intercept, readers and items."""
    one = judged({}, crossed({}, 20, 20))
    assert [step.formula for step in one.ladder] == [
        "regression_out ~ 1 + (1 | participant) + (1 | item)",
        "regression_out ~ 1 + (1 | participant)",
    ]
    assert one.separations == ()


LAST = "A singular fit with the variance 0 is here the same as a logistic regression without random"


def test_last_step_with_random_effects_says_what_a_singular_fit_means() -> None:
    """There, and nowhere else: variances of other steps can be 0 one by one."""
    steps = ladder(20, READERS, ITEMS).steps
    assert [LAST in step.expectation for step in steps] == [False] * 6 + [True]
    assert LAST in ladder(20, READERS).steps[-1].expectation


def test_one_value_an_item_leaves_a_logistic_regression() -> None:
    """One reader with 40 items of one row each: no random effect differs from chance."""
    rows = crossed(CUE, 1, 40)
    one = judged(CUE, rows)
    assert [(step.formula, step.change) for step in one.ladder] == [
        ("regression_out ~ cue + (1 | item)", ""),
        ("regression_out ~ cue", "without random effects"),
    ]
    assert (one.ladder[1].random_parameters, one.ladder[1].random_effects) == (0, 0)
    assert one.ladder[1].expectation.endswith(
        "; no random effect can be told from the scatter of single values: a logistic regression "
        "(glm), not a mixed one."
    )
    assert (one.start, one.verdict) == (2, "sparse")


def test_one_value_a_reader_and_an_item_leaves_a_logistic_regression() -> None:
    """As many readers as items as values."""
    rows = [(f"P{n}", f"i{n}", (CUE["cue"][n % 2],), int(n % 3 == 0)) for n in range(60)]
    one = judged(CUE, rows)
    assert [step.formula for step in one.ladder] == [
        "regression_out ~ cue + (1 | participant) + (1 | item)",
        "regression_out ~ cue + (1 | participant)",
        "regression_out ~ cue",
    ]
    assert one.start == 3


def test_readers_with_one_value_go_before_items_with_several() -> None:
    """Of two groupings the one stays that can be told from chance."""
    rows = [(f"P{n}", f"i{n % 8}", (CUE["cue"][n // 8 % 2],), int(n % 3 == 0)) for n in range(240)]
    one = judged(CUE, rows)
    last = one.ladder[-1]
    assert (last.formula, last.change) == ("regression_out ~ cue + (1 | item)", "without readers")
    assert "surer than they are" not in last.expectation
    assert one.start == last.number


def test_random_effects_stay_where_any_unit_has_two_values() -> None:
    """One item with a second row is enough for a variance to be there."""
    rows = [*crossed(CUE, 1, 40), ("P0", "i0", ("late",), 1)]
    assert [step.formula for step in judged(CUE, rows).ladder] == [
        "regression_out ~ cue + (1 | item)"
    ]


def test_one_reader_is_no_grouping() -> None:
    """One reader has items alone; without items nothing is left to group by."""
    rows = crossed(CUE, 1, 40)
    assert judged(CUE, rows).ladder[0].formula == "regression_out ~ cue + (1 | item)"
    plain = judged(CUE, rows, items=False).ladder
    assert [step.formula for step in plain] == ["regression_out ~ cue"]
    assert "a logistic regression (glm), not a mixed one" in plain[0].expectation


def test_names_that_are_no_names_in_r_are_quoted() -> None:
    """Blanks, leading digits and words of R's own get backquotes; numeric columns need none."""
    factors = {"cue type": ["early", "late"], "2nd": ["a", "b"]}
    steps = judged(factors, crossed(factors, 20, 40)).ladder
    assert steps[0].formula == (
        "regression_out ~ `cue type` * `2nd` + (1 + `cue type` * `2nd` | participant) + "
        "(1 + `cue type` * `2nd` | item)"
    )
    assert "(1 + cue_type_late * f_2nd_b || participant)" in steps[1].formula
    assert [quoted(name) for name in ("a.b", ".2", "_a", "größe", "in", "a`b")] == [
        "a.b",
        "`.2`",
        "`_a`",
        "`größe`",
        "`in`",
        r"`a\`b`",
    ]


def test_stated_contrasts_give_the_columns_of_uncorrelated_steps() -> None:
    """Columns are those of the tables; one for a level that never occurs is left out."""
    factors = {"cue": ["early", "late", "never"]}
    rows = crossed({"cue": ["early", "late"]}, 20, 20)
    coding = coding_of("cue", factors["cue"], "sum")
    steps = judged(factors, rows, {"cue": coding}).ladder
    assert steps[1].formula == (
        "regression_out ~ cue + (1 + cue_early || participant) + (1 + cue_early || item)"
    )


def test_interactions_beyond_number_are_left_out() -> None:
    """Seven factors of two levels have 128 coefficients; their pairs have 29."""
    factors = {name: ["x", "y"] for name in "abcdefg"}
    one = judged(factors, crossed(factors, 64, 66))
    assert 2 ** len(factors) > MOST_COEFFICIENTS
    assert one.ladder[0].formula.startswith("regression_out ~ (a + b + c + d + e + f + g)^2 + ")
    assert one.ladder[0].fixed_parameters == 29


def width(step: Step) -> int:
    """Parameters of a step."""
    return step.fixed_parameters + step.random_parameters


@given(
    rarer=st.integers(1, 5_000),
    units=st.lists(st.integers(2, 60), min_size=1, max_size=2),
    values=st.integers(60, 3_000),
)
def test_every_step_is_simpler_than_the_one_before(
    rarer: int, units: list[int], values: int
) -> None:
    """Fewer parameters, never more random effects, more ones for each parameter."""
    slopes = (READERS.slopes, {("cue",): 1.0, ("fit",): 1.0})
    groupings = [
        Grouping(unit, levels, values, own)
        for unit, levels, own in zip(("participant", "item"), units, slopes, strict=False)
    ]
    found = ladder(min(rarer, values), *groupings, values=values)
    for before, after in pairwise(found.steps):
        assert width(after) < width(before)
        assert after.random_effects <= before.random_effects
        assert after.ones_per_parameter > before.ones_per_parameter
    assert [step.number for step in found.steps] == list(range(1, len(found.steps) + 1))
    assert found.free == (found.steps[found.start - 1].expectation == "")


def test_interaction_goes_before_the_effects_within_it() -> None:
    """Even where more stands behind it than behind them, so that no step has it without them."""
    slopes = {("cue",): 1.0, ("fit",): 2.0, ("cue", "fit"): 9.0}
    changes = [s.change for s in ladder(20, Grouping("participant", 24, 10_000, slopes)).steps]
    assert changes[2:] == [
        "without the by-reader slope for cue × fit",
        "without the by-reader slope for cue",
        "without the by-reader slope for fit: intercepts only",
    ]
