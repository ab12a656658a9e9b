"""The explanation in plain words: whole sentences of cases worked out by hand."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from etl.report.trace_input import Cell, Removal, TracedTrial
from etl.report.trace_words import explain
from tests.trace.tracing import by_hand, measured, worked_example


def sentence(traced: TracedTrial, region: str, measure: str) -> str:
    """What is said of one outcome; of the trial where no region is named."""
    said = explain(traced).only([region] if region else [], [measure])
    statements = said.regions[0].statements if region else said.trial
    (statement,) = statements
    return statement.sentence


#: Regions 1 to 5 of the worked example are when, topic, auxiliary, verb and object.
WORKED = [
    (
        "auxiliary",
        "first_pass_skip",
        (
            "1, because fixation 4 went beyond `auxiliary`, to `verb`, before `auxiliary` was ever "
            "fixated; fixation 5 came to it only afterwards"
        ),
    ),
    (
        "verb",
        "first_pass_regression_out",
        (
            "1, because fixation 4 leaves `verb` in its first pass and lands on `auxiliary` "
            "(fixation 5)"
        ),
    ),
    (
        "topic",
        "first_pass_regression_out",
        "0, because fixation 3 leaves `topic` in its first pass and goes on to `verb` (fixation 4)",
    ),
    (
        "when",
        "regression_out",
        (
            "missing (no_earlier_region): `when` is the first region; there is none before it to "
            "go back to"
        ),
    ),
    (
        "object",
        "regression_in",
        (
            "missing (no_later_region): `object` is the last region; there is none after it to "
            "come back from"
        ),
    ),
    (
        "auxiliary",
        "regression_in_count",
        (
            "2: a saccade comes back from `verb` (fixation 4) to `auxiliary` (fixation 5) and "
            "`object` (fixation 8) to `auxiliary` (fixation 9)"
        ),
    ),
    (
        "verb",
        "go_past_time",
        (
            "880 ms = 250 (fixation 4) + 190 (5) + 210 (6) + 230 (7); fixation 8, on `object`, "
            "goes beyond"
        ),
    ),
    (
        "verb",
        "right_bounded_time",
        (
            "480 ms = 250 (fixation 4) + 230 (7), on `verb` itself; fixation 8, on `object`, "
            "goes beyond"
        ),
    ),
    (
        "object",
        "go_past_time",
        "690 ms = 300 (fixation 8) + 150 (9) + 240 (10); the eyes never go beyond `object`",
    ),
    (
        "topic",
        "single_fixation_duration",
        "missing (refixated): the first pass has 2 fixations (fixations 2 and 3)",
    ),
    (
        "auxiliary",
        "second_pass_time",
        "340 ms = 190 (fixation 5) + 150 (9), all that it has, for it has no first pass",
    ),
    (
        "",
        "any_first_pass_regression",
        "1, because first_pass_regression_out is 1 for `verb` and `object`",
    ),
    (
        "",
        "reading_time",
        (
            "2170 ms = 200 (`when`) + 610 (`topic`) + 340 (`auxiliary`) + 480 (`verb`) + 540 "
            "(`object`)"
        ),
    ),
    (
        "",
        "regions_reached",
        "5: fixation 8 is the first on `object`, region 5 of 5, the furthest fixated",
    ),
]


@pytest.mark.parametrize(
    ("region", "measure", "words"), WORKED, ids=[f"{r or 'trial'}-{m}" for r, m, _ in WORKED]
)
def test_worked_example_in_words(region: str, measure: str, words: str) -> None:
    """The worked example of the definitions, told with its fixations."""
    assert sentence(worked_example(), region, measure) == words


def test_skipped_region_is_told_with_the_fixation_that_went_beyond() -> None:
    """A region without a first pass names the fixation that passed it."""
    traced = by_hand([1, 3], [200, 200], 3)
    assert sentence(traced, "topic", "first_pass_time") == (
        "missing (skipped): fixation 2 went beyond `topic`, to `auxiliary`, before `topic` was "
        "ever fixated"
    )


def test_region_not_reached_is_told_with_how_far_the_eyes_got() -> None:
    """A region that was not reached names the furthest fixation."""
    traced = by_hand([1, 2, 1], [200, 200, 200], 4)
    assert sentence(traced, "verb", "total_time") == (
        "missing (not_reached): the eyes got no further than `topic` (fixation 2)"
    )


def test_other_convention_is_told_with_its_name() -> None:
    """A zero for want of opportunity is told as such, a skip of an unreached region as 1."""
    traced = by_hand([1, 2, 1], [200, 200, 200], 4, no_opportunity="zero")
    why = "the eyes got no further than `topic` (fixation 2)"
    assert (
        sentence(traced, "verb", "reread") == f'0 by no_opportunity = "zero" (not_reached): {why}'
    )
    assert sentence(traced, "verb", "first_pass_skip") == (
        f'1 by no_opportunity = "zero" (not_reached): {why}'
    )


def test_fixation_outside_that_ends_a_first_pass_is_named() -> None:
    """Where outside fixations interrupt, the one that ended the pass is the reason for the 0."""
    traced = by_hand([2, 0, 1], [200, 90, 200], 3, outside="interrupt")
    assert sentence(traced, "topic", "first_pass_regression_out") == (
        "0, because fixation 2, outside every region, ends the first pass on `topic` after "
        "fixation 1"
    )


def test_trial_that_ends_in_a_first_pass() -> None:
    """Where the trial is over, nothing is left to regress."""
    traced = by_hand([1, 2], [200, 200], 3)
    assert sentence(traced, "topic", "first_pass_regression_out") == (
        "0, because the trial ends in the first pass on `topic`, with fixation 2"
    )


def test_empty_trial() -> None:
    """A trial without a fixation says so."""
    traced = by_hand([], [], 2)
    assert sentence(traced, "", "any_regression") == (
        "missing (no_saccade): no kept fixation is inside a region"
    )


def test_value_set_missing_is_told_with_what_it_was() -> None:
    """A value that a rule on values removed keeps its explanation."""
    traced = by_hand([1, 2, 1], [200, 200.5, 1900], 2)
    cells = (Cell(math.nan, "outlier"), traced.outcomes["total_time"][1])
    removed = {("total_time", 1): Removal("outlier_sd", "3", "total_time 2100")}
    changed = replace(traced, outcomes={"total_time": cells}, values_set_missing=removed)
    assert sentence(changed, "when", "total_time") == (
        "missing (outlier): set missing by outlier_sd = 3; it was 2100 ms = 200 "
        "(fixation 1) + 1900 (3), all on `when`"
    )


def test_what_was_left_out_is_told_with_rule_limit_and_finding() -> None:
    """Each fixation left out has its sentence; many alike share one."""
    left_out = {
        2: Removal("under_ms", "80", "62", "last"),
        4: Removal("repeated"),
        5: Removal("repeated"),
    }
    traced = by_hand([1, 2, 0, 2, 2], [200, 62, 190, 180, 200], 3, left_out=left_out)
    assert explain(traced).left_out == (
        "fixation 2 (62 ms, on `topic`): left out by under_ms = 80 (found 62); also last",
        "fixations 4 and 5: left out by repeated",
        (
            "fixation 3 lies outside every region: passed over when visits and saccades are found "
            '(outside = "ignore")'
        ),
    )


def test_merged_fixation_names_the_one_it_went_into() -> None:
    """A merged fixation is told with both numbers."""
    limit = "under_ms = 80, within_px = 14"
    traced = by_hand([1, 1], [200, 62], 3, left_out={2: Removal("merge", limit, "62")})
    fixations = (traced.fixations[0], replace(traced.fixations[1], merged_into=1))
    assert explain(replace(traced, fixations=fixations)).left_out == (
        f"fixation 2 (62 ms, on `when`): merged into fixation 1 by merge = {limit}",
    )


def test_trial_left_out_as_a_whole() -> None:
    """Of a trial left out the rule is told once, not once a fixation; it has no outcomes."""
    removal = Removal("answer_wrong", "true", "no")
    traced = by_hand([1, 2], [200, 200], 3, left_out={1: removal, 2: removal})
    said = explain(replace(traced, outcomes={}, trial_outcomes={}, removal=removal))
    assert said.left_out == (
        "the whole trial: left out by answer_wrong = true (found no); fixations 1 and 2 with it",
    )
    assert said.trial == ()


def test_chosen_regions_and_measures_only() -> None:
    """An explanation can be cut down to the cells that one asks for."""
    said = explain(worked_example()).only(["verb"], ["go_past_time", "reread"])
    assert said.trial == ()
    assert [(r.name, [s.measure for s in r.statements]) for r in said.regions] == [
        ("verb", ["reread", "go_past_time"])
    ]


def test_fixations_left_out_play_no_part() -> None:
    """What was left out decides nothing: the first pass goes on over it."""
    traced = by_hand([2, 1, 2, 3], [200, 50, 180, 200], 3, left_out={2: Removal("under_ms")})
    assert sentence(measured(traced), "topic", "first_pass_time") == (
        "380 ms = 200 (fixation 1) + 180 (3), the first pass"
    )
