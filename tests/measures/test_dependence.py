"""What outcomes say of one another, held against every outcome of many random trials."""

from __future__ import annotations

import random

import pytest

from etl.measures import MEASURES, TRIAL_MEASURES
from etl.measures.dependence import IMPLICATIONS, Implication, of_trial, shared_fixations
from tests.measures.building import CONVENTIONS
from tests.measures.naive import Naive, measure
from tests.measures.test_against_naive import random_trial

TRIALS = 1_500


@pytest.fixture(scope="module")
def outcomes() -> list[Naive]:
    """Outcomes of random trials under every convention, from the definitions."""
    source = random.Random(20_251_101)
    trials = [random_trial(source) for _ in range(TRIALS)]
    return [measure(trial, *options) for options in CONVENTIONS for trial in trials]


def pairs(one: Implication, naive: Naive) -> list[tuple[float | None, float | None]]:
    """The values of both outcomes, in every region or in the trial."""
    if one.level == "trial":
        return [(naive.trial[one.first][0], naive.trial[one.second][0])]
    firsts = [cell[0] for cell in naive.regions[one.first]]
    if one.level == "both":
        return [(value, naive.trial[one.second][0]) for value in firsts]
    return list(zip(firsts, (cell[0] for cell in naive.regions[one.second]), strict=True))


WHEN = {
    "= 0": lambda value: value == 0,
    "= 1": lambda value: value == 1,
    "> 0": lambda value: value is not None and value > 0,
    "has a value": lambda value: value is not None,
}
# Sums of the same durations in another order differ in the last places.
THEN = {
    "= 0": lambda _, value: value == 0,
    "= 1": lambda _, value: value == 1,
    ">= 1": lambda _, value: value is not None and value >= 1,
    ">= 2": lambda _, value: value is not None and value >= 2,
    "> 0": lambda _, value: value is not None and value > 0,
    "missing": lambda _, value: value is None,
    "not 1": lambda _, value: value != 1,
    "not > 0": lambda _, value: value is None or value <= 0,
    ">= it": lambda it, value: value is not None and value >= it - 1e-6,
    "= it": lambda it, value: value == pytest.approx(it),
}


@pytest.mark.parametrize("one", IMPLICATIONS, ids=lambda one: one.words)
def test_implication_holds_in_every_trial(one: Implication, outcomes: list[Naive]) -> None:
    """Under every convention, and not for want of a case."""
    cases = [pair for naive in outcomes for pair in pairs(one, naive) if WHEN[one.when](pair[0])]
    assert len(cases) > 50
    assert [case for case in cases if not THEN[one.then](*case)] == []


def test_regression_counts_at_both_of_its_ends(outcomes: list[Naive]) -> None:
    """Some region has a regression out exactly where another of the trial has one in."""
    both = 0
    for naive in outcomes:
        out = any(cell[0] == 1 for cell in naive.regions["regression_out"])
        into = any(cell[0] == 1 for cell in naive.regions["regression_in"])
        assert out == into
        both += out
    assert both > 500


ALL = shared_fixations(list(MEASURES), list(TRIAL_MEASURES))


def test_every_implication_is_told_of_its_pair() -> None:
    """Whatever says something of another is in the list of pairs, each pair once."""
    told = {frozenset(pair[:2]) for pair in ALL}
    assert len(told) == len(ALL)
    for one in IMPLICATIONS:
        first = one.first if one.level != "trial" else of_trial(one.first)
        second = one.second if one.level == "region" else of_trial(one.second)
        assert frozenset((first, second)) in told


def test_outcomes_of_other_fixations_are_not_paired() -> None:
    """Coming back into a region says nothing by design of how often its first pass refixated."""
    told = {frozenset(pair[:2]) for pair in ALL}
    assert frozenset(("regression_in", "first_pass_refixation")) not in told
    assert frozenset(("regression_in", "first_pass_time")) not in told


def test_only_outcomes_that_are_asked_for_are_paired() -> None:
    """In the order of the catalogue, with what the one says of the other."""
    assert shared_fixations(["first_pass_regression_out", "regression_out"], ["any_skip"]) == (
        (
            "first_pass_regression_out",
            "regression_out",
            "first_pass_regression_out = 1 means that regression_out = 1",
        ),
    )
