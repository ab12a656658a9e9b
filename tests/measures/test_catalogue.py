"""The catalogue explains every outcome, under every convention."""

import pytest

from etl.errors import FaultError
from etl.measures import MEASURES, REASON_MEANINGS, REASONS, SELECTABLE, TRIAL_MEASURES, select

ALL = [*MEASURES.values(), *TRIAL_MEASURES.values()]
IDS = [f"{measure.level}-{measure.name}" for measure in ALL]


@pytest.mark.parametrize("measure", ALL, ids=IDS)
def test_every_measure_is_explained(measure):
    """Each has a sentence of definition, a source, a unit, and reasons that have a meaning."""
    assert measure.definition.endswith(".")
    assert measure.source
    assert measure.unit == {"binary": "0 or 1", "count": "count", "duration": "ms"}[measure.kind]
    assert set(measure.reasons) <= set(REASON_MEANINGS)


def test_every_reason_has_a_meaning():
    """All reasons but the empty one are explained, in the order of their codes."""
    assert list(REASON_MEANINGS) == [reason for reason in REASONS if reason]


@pytest.mark.parametrize("measure", ALL, ids=IDS)
def test_definition_without_options_is_the_plain_one(measure):
    """Under the conventions that hold when none is named, nothing is added."""
    assert measure.definition_under("ignore", "missing") == measure.definition


def test_definition_says_what_interrupting_changes():
    """An interrupted first pass ends without a regression, and the definition says so."""
    text = MEASURES["first_pass_regression_out"].definition_under("interrupt", "missing")
    assert text.endswith(
        "A fixation outside every region ends the first pass without a regression."
    )


def test_definition_says_where_zero_stands_for_no_opportunity():
    """Under "zero" the reasons that became 0 are named; structural ones are not."""
    text = MEASURES["regression_in"].definition_under("ignore", "zero")
    assert text.endswith("Also 0 where there was no opportunity (not_reached, not_passed).")


@pytest.mark.parametrize(
    "measure", [MEASURES["first_pass_skip"], TRIAL_MEASURES["any_skip"]], ids=lambda m: m.name
)
def test_definition_of_skipping_says_that_zero_makes_unreached_regions_skipped(measure):
    """The one outcome that becomes 1 for want of opportunity, and what follows for the trial."""
    text = measure.definition_under("ignore", "zero")
    assert "A region that was never reached counts as skipped" in text
    assert "Also 0" not in text


def test_duration_keeps_its_reasons_under_zero():
    """A duration of nothing is never written as 0 ms."""
    measure = MEASURES["first_pass_time"]
    assert measure.reasons_under("zero") == measure.reasons == ("not_reached", "skipped")


def test_groups_select_their_kind_in_catalogue_order():
    """Naming all groups, in any order, selects everything once."""
    assert select(["duration", "count", "binary"]) == tuple(MEASURES)


def test_group_and_names_may_overlap():
    """A name that its group already covers is selected once."""
    chosen = select(["total_time", "count", "visit_count"])
    assert chosen == (
        "fixation_count",
        "first_pass_fixation_count",
        "visit_count",
        "regression_out_count",
        "regression_in_count",
        "total_time",
    )


def test_outcome_of_a_trial_adds_no_outcome_of_a_region():
    """The outcomes of trials are always written, so naming one selects nothing more."""
    assert select(["any_regression"]) == ()


def test_name_of_both_levels_selects_the_outcome_of_the_region():
    """``fixation_count`` exists for regions and for trials."""
    assert select(["fixation_count"]) == ("fixation_count",)


def test_unknown_outcome_is_refused_with_the_nearest_name():
    """A misspelt outcome never silently selects nothing."""
    with pytest.raises(
        FaultError,
        match=r"^there is no outcome or group 'first_pass_tme'; the nearest is 'first_pass_time'$",
    ):
        select(["first_pass_tme"])


def test_everything_selectable_is_named_once():
    """Groups, outcomes of regions and outcomes of trials, without repeats."""
    assert len(SELECTABLE) == len(set(SELECTABLE)) == 3 + len({*MEASURES, *TRIAL_MEASURES})
