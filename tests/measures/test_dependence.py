"""What outcomes say of one another, held against every outcome of many random trials."""

from __future__ import annotations

import random
from collections import Counter
from itertools import chain, combinations, product

import pytest

from etl.measures import MEASURES, TRIAL_MEASURES
from etl.measures.dependence import (
    IMPLICATIONS,
    Conventions,
    Implication,
    of_trial,
    shared_fixations,
)
from tests.measures.building import CONVENTIONS
from tests.measures.naive import Naive, measure
from tests.measures.test_against_naive import random_trial

TRIALS = 1_500


Judged = dict[tuple[str, str], list[Naive]]
BINARY = [name for name, own in MEASURES.items() if own.kind == "binary"]
BINARY_OF_TRIALS = [name for name, own in TRIAL_MEASURES.items() if own.kind == "binary"]


@pytest.fixture(scope="module")
def outcomes() -> Judged:
    """Outcomes of random trials under every convention, from the definitions."""
    source = random.Random(20_251_101)
    trials = [random_trial(source) for _ in range(TRIALS)]
    return {options: [measure(trial, *options) for trial in trials] for options in CONVENTIONS}


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
    "not 0": lambda _, value: value != 0,
    "not 1": lambda _, value: value != 1,
    "not > 0": lambda _, value: value is None or value <= 0,
    ">= it": lambda it, value: value is not None and value >= it - 1e-6,
    "= it": lambda it, value: value == pytest.approx(it),
}


@pytest.mark.parametrize("one", IMPLICATIONS, ids=lambda one: one.words)
def test_implication_holds_in_every_trial(one: Implication, outcomes: Judged) -> None:
    """Under every convention under which it is told, not for want of a case, and under no other."""
    for options, judged in outcomes.items():
        cases = [p for naive in judged for p in pairs(one, naive) if WHEN[one.when](p[0])]
        assert len(cases) > 50
        against = [case for case in cases if not THEN[one.then](*case)]
        assert (against == []) == one.holds(options)


@pytest.mark.parametrize("options", CONVENTIONS, ids=" ".join)
def test_no_certainty_among_binary_outcomes_is_left_out(
    options: tuple[str, str], outcomes: Judged
) -> None:
    """Whatever a value of one says of another in all random trials stands in the list.

    A certainty is that one value of the first leaves one value (or none) of the second out, though
    both occur. Either direction says it; "= 0" of the one says "not 1", and missing says neither.
    """
    names = [*BINARY, *(f"{name} " for name in BINARY_OF_TRIALS)]  # those of trials end in a blank
    seen: Counter[tuple[str, float, str, float]] = Counter()
    occur: Counter[tuple[str, float]] = Counter()
    for naive in outcomes[options]:
        for place in range(len(naive.regions["fixated"])):
            row = {name: naive.regions[name][place][0] for name in BINARY}
            row |= {f"{name} ": naive.trial[name][0] for name in BINARY_OF_TRIALS}
            there = {name: value for name, value in row.items() if value is not None}
            occur.update(there.items())
            seen.update((a, there[a], b, there[b]) for a in there for b in there if a < b)
    told = set()
    for one in IMPLICATIONS:
        first = f"{one.first} " if one.level == "trial" else one.first
        second = one.second if one.level == "region" else f"{one.second} "
        if one.holds(options):
            told.add(frozenset((first, second)))
    lacking = [
        (a, value, b, other)
        for a, b in combinations(sorted(names), 2)
        for value, other in product((0, 1), repeat=2)
        if not seen[a, value, b, other] and min(occur[a, value], occur[b, other]) > 50
        if frozenset((a, b)) not in told
    ]
    assert lacking == []


def test_regression_counts_at_both_of_its_ends(outcomes: Judged) -> None:
    """Some region has a regression out exactly where another of the trial has one in."""
    both = 0
    for naive in chain.from_iterable(outcomes.values()):
        out = any(cell[0] == 1 for cell in naive.regions["regression_out"])
        into = any(cell[0] == 1 for cell in naive.regions["regression_in"])
        assert out == into
        both += out
    assert both > 500


ALL = shared_fixations(list(MEASURES), list(TRIAL_MEASURES))


@pytest.mark.parametrize("options", [None, *CONVENTIONS], ids=str)
def test_every_implication_is_told_of_its_pair(options: Conventions | None) -> None:
    """Whatever says something of another is in the list of pairs, each pair once."""
    pairs_told = shared_fixations(list(MEASURES), list(TRIAL_MEASURES), options)
    told = {frozenset(pair[:2]) for pair in pairs_told}
    assert len(told) == len(pairs_told)
    for one in IMPLICATIONS:
        first = one.first if one.level != "trial" else of_trial(one.first)
        second = one.second if one.level == "region" else of_trial(one.second)
        assert frozenset((first, second)) in told or not one.holds(options)


def test_regressions_of_trials_are_one_outcome_where_outside_is_ignored() -> None:
    """The study's own options decide what is told of a pair."""
    both = ["any_regression", "any_first_pass_regression"]
    told = {
        outside: shared_fixations([], both, (outside, "missing"))[0][2]
        for outside in ("ignore", "interrupt")
    }
    assert told == {
        "ignore": "any_regression is the same wherever any_first_pass_regression has a value under "
        "the study's options: the first regression of a trial always ends a first pass, so both "
        "are the same outcome",
        "interrupt": "any_regression = 0 means that any_first_pass_regression is not 1",
    }
    assert shared_fixations([], both)[0][2] == told["interrupt"]


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
