"""The worked example of the definitions, cell by cell, typed in from them."""

import math

import numpy as np
import pytest

from etl.measures import MEASURES, REASONS, TRIAL_MEASURES, compute
from tests.measures.building import one_trial, region_cells, trial_cells

SEQUENCE = "1:200 2:180 2:220 4:250 3:190 2:210 4:230 5:300 3:150 5:240"
FIRST, LAST, SKIPPED = "no_earlier_region", "no_later_region", "skipped"

REGION_TABLE = {
    "first_pass_skip": [0, 0, 1, 0, 0],
    "fixated": [1, 1, 1, 1, 1],
    "first_pass_refixation": [0, 1, SKIPPED, 0, 0],
    "first_pass_regression_out": [FIRST, 0, SKIPPED, 1, 1],
    "regression_out": [FIRST, 0, 1, 1, 1],
    "regression_in": [0, 1, 1, 0, LAST],
    "reread": [0, 1, SKIPPED, 1, 1],
    "fixation_count": [1, 3, 2, 2, 2],
    "first_pass_fixation_count": [1, 2, SKIPPED, 1, 1],
    "visit_count": [1, 2, 2, 2, 2],
    "regression_out_count": [FIRST, 0, 1, 1, 1],
    "regression_in_count": [0, 1, 2, 0, LAST],
    "first_fixation_duration": [200, 180, SKIPPED, 250, 300],
    "single_fixation_duration": [200, "refixated", SKIPPED, 250, 300],
    "first_pass_time": [200, 400, SKIPPED, 250, 300],
    "go_past_time": [200, 400, SKIPPED, 880, 690],
    "right_bounded_time": [200, 400, SKIPPED, 480, 540],
    "second_pass_time": [0, 210, 340, 230, 240],
    "total_time": [200, 610, 340, 480, 540],
}
TRIAL_TABLE = {
    "any_regression": 1,
    "any_first_pass_regression": 1,
    "any_skip": 1,
    "fixation_count": 10,
    "outside_fixation_count": 0,
    "regression_count": 3,
    "progression_count": 5,
    "regions_reached": 5,
    "reading_time": 2170,
}


@pytest.fixture(scope="module")
def outcomes():
    """The outcomes of the example under the conventions that hold when none is named."""
    return compute(one_trial(SEQUENCE, 5))


@pytest.mark.parametrize("name", REGION_TABLE)
def test_region_outcome_is_as_worked_by_hand(outcomes, name):
    """Each row of the worked example comes out, reasons included."""
    assert region_cells(outcomes, name) == REGION_TABLE[name]


def test_trial_outcomes_are_as_worked_by_hand(outcomes):
    """The values per trial of the worked example come out."""
    assert trial_cells(outcomes) == TRIAL_TABLE


def test_tables_and_catalogue_name_the_same_measures_in_the_same_order(outcomes):
    """Nothing is computed that the catalogue does not explain, nor the other way round."""
    assert list(outcomes.regions) == list(MEASURES) == list(REGION_TABLE)
    assert list(outcomes.trials) == list(TRIAL_MEASURES) == list(TRIAL_TABLE)


def test_visits_are_numbered_within_their_region(outcomes):
    """Region 2 is visited in fixations 2-3 and again in 6; regions 3, 4 and 5 twice each."""
    assert outcomes.visit.tolist() == [1, 1, 1, 1, 1, 2, 2, 1, 2, 2]


def test_first_pass_marks_the_fixations_of_first_passes(outcomes):
    """Region 3 is entered from the right first, so none of its fixations is first pass."""
    marked = [True, True, True, True, False, False, False, True, False, False]
    assert outcomes.first_pass.tolist() == marked


def test_regressive_saccades_are_listed_in_time_order(outcomes):
    """4 to 3 and 5 to 3 end first passes; 3 to 2 leaves a region without one."""
    rows = outcomes.regressions
    assert rows.launch.tolist() == [3, 4, 7]
    assert rows.landing.tolist() == [4, 5, 8]
    assert rows.ends_first_pass.tolist() == [True, False, True]


def test_missing_values_are_nan_and_only_those(outcomes):
    """A value is NaN exactly where a reason stands beside it."""
    for measured in (*outcomes.regions.values(), *outcomes.trials.values()):
        missing = [math.isnan(value) for value in measured.values.tolist()]
        assert missing == [bool(REASONS[code]) for code in measured.reasons.tolist()]


def test_arrays_have_the_promised_types(outcomes):
    """Values are float64, reasons uint8, visits int32; all of it read-only."""
    for measured in outcomes.regions.values():
        assert measured.values.dtype == np.float64
        assert measured.reasons.dtype == np.uint8
        assert not measured.values.flags.writeable
        assert not measured.reasons.flags.writeable
    assert outcomes.visit.dtype == np.int32
    assert outcomes.first_pass.dtype == np.bool_
    assert outcomes.cell_offsets.tolist() == [0, 5]
