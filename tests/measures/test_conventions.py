"""Small trials worked by hand under each convention; the arithmetic stands in the docstrings."""

import numpy as np
import pytest

from etl.measures import compute
from tests.measures.building import one_trial, region_cells, trial_cells


def interrupted(text: str, regions: int):
    """The outcomes of one trial in which outside fixations interrupt."""
    return compute(one_trial(text, regions), outside="interrupt")


def test_outside_fixation_ends_a_first_pass_without_a_regression():
    """2:180, outside, 1:200: leaving 2 by way of the margin is no regression, so the value is 0."""
    outcomes = interrupted("1:210 2:180 0:90 1:200 3:250", 3)
    assert region_cells(outcomes, "first_pass_regression_out") == ["no_earlier_region", 0, 0]


def test_ignored_outside_fixation_leaves_the_regression():
    """The same trial without the outside fixation goes from 2 straight to 1: a regression."""
    outcomes = compute(one_trial("1:210 2:180 0:90 1:200 3:250", 3))
    assert region_cells(outcomes, "first_pass_regression_out") == ["no_earlier_region", 1, 0]
    assert outcomes.regressions.launch.tolist() == [1]
    assert outcomes.regressions.landing.tolist() == [3]


def test_step_across_an_outside_fixation_is_neither_regression_nor_progression():
    """Of 1 2 (0) 1 3, only 1 to 2 and 1 to 3 are saccades: no regression, two progressions."""
    outcomes = interrupted("1:210 2:180 0:90 1:200 3:250", 3)
    trial = trial_cells(outcomes)
    assert (trial["regression_count"], trial["progression_count"]) == (0, 2)
    assert region_cells(outcomes, "regression_in_count") == [0, 0, "no_later_region"]
    assert outcomes.regressions.launch.size == 0


def test_going_past_is_still_the_next_higher_region_across_an_outside_fixation():
    """2:180 (0:90) 1:200 3:250: past 2 takes 180 + 200 = 380; the 90 ms outside add nothing."""
    outcomes = interrupted("1:210 2:180 0:90 1:200 3:250", 3)
    assert region_cells(outcomes, "go_past_time") == [210, 380, 250]
    assert region_cells(outcomes, "right_bounded_time") == [210, 180, 250]


def test_coming_back_to_the_same_region_is_a_second_visit():
    """2:180 (0:90) 2:220: first pass 180 of one fixation, go-past 180 + 220 = 400, reread."""
    outcomes = interrupted("2:180 0:90 2:220 3:250", 3)
    column = {
        name: region_cells(outcomes, name)[1]
        for name in (
            "first_pass_time",
            "single_fixation_duration",
            "first_pass_refixation",
            "go_past_time",
            "right_bounded_time",
            "second_pass_time",
            "visit_count",
            "reread",
        )
    }
    assert column == {
        "first_pass_time": 180,
        "single_fixation_duration": 180,
        "first_pass_refixation": 0,
        "go_past_time": 400,
        "right_bounded_time": 400,
        "second_pass_time": 220,
        "visit_count": 2,
        "reread": 1,
    }
    assert outcomes.visit.tolist() == [1, 0, 2, 1]
    assert outcomes.first_pass.tolist() == [True, False, False, True]


def test_ignored_outside_fixation_does_not_split_a_visit():
    """2:180 (0:90) 2:220: one visit of two fixations, 180 + 220 = 400 in first pass."""
    outcomes = compute(one_trial("2:180 0:90 2:220 3:250", 3))
    assert region_cells(outcomes, "first_pass_time")[1] == 400
    assert region_cells(outcomes, "visit_count")[1] == 1
    assert outcomes.visit.tolist() == [1, 0, 1, 1]
    assert outcomes.first_pass.tolist() == [True, False, True, True]


def test_region_entered_across_an_outside_fixation_has_a_first_pass():
    """(0) 2 (0) 3: both are entered before anything beyond them; first pass asks for no saccade."""
    outcomes = interrupted("0:90 2:180 0:80 3:250 0:70", 3)
    assert region_cells(outcomes, "first_pass_time") == ["skipped", 180, 250]
    assert trial_cells(outcomes)["outside_fixation_count"] == 3


def test_regression_after_an_interrupted_return_ends_no_first_pass():
    """2 (0) 2 1: the saccade 2 to 1 is a regression, but the first pass on 2 was over before."""
    outcomes = interrupted("2:180 0:90 2:220 1:200", 3)
    assert region_cells(outcomes, "first_pass_regression_out")[1] == 0
    assert region_cells(outcomes, "regression_out")[1] == 1
    assert outcomes.regressions.ends_first_pass.tolist() == [False]
    assert trial_cells(outcomes)["any_first_pass_regression"] == 0


def test_two_fixations_torn_apart_are_still_two_fixations_inside():
    """2 (0) 1 has two fixations inside regions, so any_regression has a value: 0, not missing."""
    assert trial_cells(interrupted("2:180 0:90 1:200", 2))["any_regression"] == 0


STOPS_EARLY = "1:200 3:250 3:240"


def test_missing_is_what_had_no_chance():
    """1 3 3 of four regions: 2 was skipped and never seen, 3 not gone past, 4 not reached."""
    outcomes = compute(one_trial(STOPS_EARLY, 4))
    column = {name: region_cells(outcomes, name) for name in outcomes.regions}
    assert column["first_pass_skip"] == [0, 1, 0, "not_reached"]
    assert column["reread"] == [0, "skipped", 0, "not_reached"]
    assert column["regression_out"] == ["no_earlier_region", "never_fixated", 0, "not_reached"]
    assert column["regression_in"] == [0, 0, "not_passed", "no_later_region"]
    assert column["single_fixation_duration"] == [200, "skipped", "refixated", "not_reached"]
    assert column["total_time"] == [200, "never_fixated", 490, "not_reached"]
    assert column["fixation_count"] == [1, 0, 2, 0]


def test_zero_keeps_structural_reasons_and_durations_missing():
    """The same trial under "zero": only the first and last region keep their reasons."""
    outcomes = compute(one_trial(STOPS_EARLY, 4), no_opportunity="zero")
    column = {name: region_cells(outcomes, name) for name in outcomes.regions}
    assert column["first_pass_skip"] == [0, 1, 0, 1]
    assert column["reread"] == [0, 0, 0, 0]
    assert column["first_pass_fixation_count"] == [1, 0, 2, 0]
    assert column["first_pass_refixation"] == [0, 0, 1, 0]
    assert column["first_pass_regression_out"] == ["no_earlier_region", 0, 0, 0]
    assert column["regression_out"] == ["no_earlier_region", 0, 0, 0]
    assert column["regression_in"] == [0, 0, 0, "no_later_region"]
    assert column["single_fixation_duration"] == [200, "skipped", "refixated", "not_reached"]
    assert column["total_time"] == [200, "never_fixated", 490, "not_reached"]


def test_unreached_region_is_a_skip_only_under_zero():
    """1 2 of three regions skips nothing on the way, unless an unreached region counts."""
    text = "1:200 2:210"
    assert trial_cells(compute(one_trial(text, 3)))["any_skip"] == 0
    assert trial_cells(compute(one_trial(text, 3), no_opportunity="zero"))["any_skip"] == 1


@pytest.mark.parametrize("no_opportunity", ["missing", "zero"])
@pytest.mark.parametrize("text", ["", "0:100 0:90", "1:200", "0:80 2:200"])
def test_trial_with_less_than_two_fixations_inside_has_no_saccade(text, no_opportunity):
    """Whether there was a regression is missing, under either convention; counts are 0."""
    trial = trial_cells(compute(one_trial(text, 3), no_opportunity=no_opportunity))
    whether = (trial["any_regression"], trial["any_first_pass_regression"])
    assert whether == ("no_saccade", "no_saccade")
    assert trial["regression_count"] == trial["progression_count"] == 0


def test_text_of_one_region_has_nowhere_to_go_back_to():
    """R = 1: structural reasons stand on both sides, also before the missing saccade."""
    outcomes = compute(one_trial("1:200", 1))
    assert region_cells(outcomes, "regression_out") == ["no_earlier_region"]
    assert region_cells(outcomes, "regression_in") == ["no_later_region"]
    trial = trial_cells(outcomes)
    whether = (trial["any_regression"], trial["any_first_pass_regression"])
    assert whether == ("no_saccade", "no_earlier_region")


def test_structural_reason_stands_before_not_reached():
    """An empty trial: the first region has no earlier one, whether it was reached or not."""
    outcomes = compute(one_trial("", 2))
    assert region_cells(outcomes, "regression_out") == ["no_earlier_region", "not_reached"]
    assert region_cells(outcomes, "regression_in") == ["not_reached", "no_later_region"]
    assert region_cells(outcomes, "total_time") == ["not_reached", "not_reached"]


def test_no_trials_at_all_give_empty_tables():
    """A reader all of whose trials were left out is no special case."""
    nothing = one_trial("", 1)
    empty = type(nothing)(
        nothing.trial, nothing.region_order, nothing.duration_ms, np.zeros(0, np.int32)
    )
    outcomes = compute(empty)
    assert outcomes.cell_offsets.tolist() == [0]
    assert {measured.values.size for measured in outcomes.regions.values()} == {0}
    assert {measured.values.size for measured in outcomes.trials.values()} == {0}
