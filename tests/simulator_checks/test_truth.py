"""What the simulator says is true is true of the coordinates it writes."""

from __future__ import annotations

import doctest
from types import ModuleType

import numpy as np
import pytest

from tests.simulator import (
    Effects,
    Grid,
    Mess,
    PlannedTrial,
    SimulatedFixation,
    SimulatedStudy,
    SimulatedTrial,
    draws,
    lay_out,
    layout,
    orchard_spec,
    orchard_texts,
    simulate_study,
    study,
    true_orders,
    writing,
)
from tests.simulator.reading import Look
from tests.simulator.study import timed

GRID = Grid(left_px=200, top_px=500, character_width_px=10, line_height_px=60)


def generator(seed: int) -> np.random.Generator:
    """A generator with a fixed bit stream."""
    return np.random.Generator(np.random.PCG64(seed))


def first_pass_exits(orders: tuple[int | None, ...], region: int) -> bool | None:
    """Whether the first pass on a region ended with a regression; none without a first pass.

    Written from the definition: outside fixations are ignored.
    """
    inside = [order for order in orders if order is not None]
    for start, order in enumerate(inside):
        if order == region and max(inside[:start], default=0) < region:
            rest = [other for other in inside[start:] if other != region]
            return bool(rest) and rest[0] < region
    return None


def test_worked_example_by_hand() -> None:
    """Places worked out by hand on a character grid have the orders worked out by hand.

    "Old trees bend low": "Old" is characters 0-2 (200 to 230 px), " trees" is 3-8 (230 to 290),
    " bend" 9-13 (290 to 340), " low" 14-17 (340 to 380). Regions: a = Old trees, b = bend.
    """
    layout = lay_out("{a: Old trees} {b: bend} low", GRID)
    places = [205.0, 229.9, 230.0, 289.9, 290.0, 250.0, 339.9, 340.0, 300.0]
    looks = [Look(layout.word_at(x, 530.0), x, 530.0, 200, 30) for x in places]
    plan = PlannedTrial("P01", 1, "i01", "text")
    trial = SimulatedTrial(plan, True, 0, 9999, True, {}, tuple(timed(looks, 1000)))
    assert true_orders(trial) == (1, 1, 1, 1, 2, 1, 2, None, 2)


def test_clock_of_a_trial_by_hand() -> None:
    """Each fixation starts when the one before has ended and the eyes have flown."""
    looks = [Look(None, 0.0, 0.0, 200, 30), Look(None, 0.0, 0.0, 150, 25), Look(None, 0, 0, 90, 0)]
    assert [fixation.onset_ms for fixation in timed(looks, 1000)] == [1000, 1230, 1405]


@pytest.mark.parametrize("module", [draws, layout, orchard_texts, study, writing])
def test_examples_in_docstrings_hold(module: ModuleType) -> None:
    """What the simulator's own documentation shows is what happens."""
    result = doctest.testmod(module)
    assert result.attempted > 0
    assert result.failed == 0


def test_words_on_later_lines_have_later_numbers() -> None:
    """With every word a region, order runs on across the lines of a text."""
    layout = lay_out("one two\nthree", GRID, every_word=True)
    found = [(word.region, word.region_order, word.line, word.left_px) for word in layout.words]
    assert found == [("w1", 1, 1, 200), ("w2", 2, 1, 230), ("w3", 3, 2, 200)]


def test_doubled_brace_is_a_brace() -> None:
    """Two opening braces stand for one on the screen, also outside every region."""
    layout = lay_out("{a: x} {{y", GRID)
    assert [word.text for word in layout.words] == ["x", "{y"]


def test_word_in_two_regions_is_refused() -> None:
    """A word cut by a region's edge would make the truth about it ambiguous."""
    with pytest.raises(ValueError, match="the word 'ab' lies in two regions"):
        lay_out("{a: a}{b: b}", GRID)


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_recorded_place_lies_in_the_intended_word(
    name: str, request: pytest.FixtureRequest
) -> None:
    """Unless a trial is disturbed, the word at the written place is the word that was looked at."""
    study: SimulatedStudy = request.getfixturevalue(name)
    wrong = []
    for trial in study.trials:
        if trial.disturbed:
            continue
        layout = study.spec.layouts[trial.plan.text]
        for fixation in trial.fixations:
            word = layout.word_at(fixation.x_px, fixation.y_px)
            found = (None, None) if word is None else (word.number, word.region_order)
            if found != (fixation.word, fixation.region_order):
                wrong.append((trial.plan, fixation))
    assert wrong == []


def test_places_have_one_decimal(orchard: SimulatedStudy) -> None:
    """What is written with one decimal is what the truth was taken from."""
    places = [f.x_px for t in orchard.trials for f in t.fixations]
    places += [f.y_px for t in orchard.trials for f in t.fixations]
    assert [place for place in places if float(f"{place:.1f}") != place] == []


def exits(study: SimulatedStudy, region: str, **facts: str) -> tuple[list[bool], list[float]]:
    """Outcomes and true probabilities of first-pass regressions out of a region."""
    outcomes, truths = [], []
    for trial in study.trials:
        if region not in trial.exit_probability or facts.items() - trial.plan.facts.items():
            continue
        order = study.spec.layouts[trial.plan.text].regions.index(region) + 1
        outcome = first_pass_exits(true_orders(trial), order)
        if outcome is not None:
            outcomes.append(outcome)
            truths.append(trial.exit_probability[region])
    return outcomes, truths


@pytest.mark.parametrize("region", ["verb", "spillover"])
@pytest.mark.parametrize("fit", ["fitting", "odd"])
def test_first_pass_regressions_follow_the_given_log_odds(region: str, fit: str) -> None:
    """Without random effects, the share of ones is the probability that belongs to the log-odds.

    Within 4 standard errors of a binomial share, so that a right simulator fails about once in
    16,000 seeds; the seed is fixed.
    """
    effects = Effects(intercepts={"verb": -1.0, "spillover": -1.5}, levels={"fit=odd": 1.0})
    rng = generator(7)
    spec = orchard_spec(rng, readers=40, with_fillers=False, effects=effects, mess=Mess())
    outcomes, truths = exits(simulate_study(spec, rng), region, fit=fit)
    log_odds = {"verb": -1.0, "spillover": -1.5}[region] + (1.0 if fit == "odd" else 0.0)
    expected = 1 / (1 + np.exp(-log_odds))
    assert np.allclose(truths, expected)
    error = np.sqrt(expected * (1 - expected) / len(outcomes))
    assert abs(np.mean(outcomes) - expected) < 4 * error


@pytest.mark.parametrize(("readers", "items"), [(160, 4), (4, 160)], ids=["readers", "items"])
def test_random_effects_have_the_given_spread(readers: int, items: int) -> None:
    """Reader and item intercepts scatter with the standard deviation asked for.

    The standard error of a standard deviation from n draws is sd / sqrt(2 n), here 0.028; 4 of
    them are allowed.
    """
    effects = Effects(intercepts={"verb": -1.0}, reader_sd=0.5, item_sd=0.5)
    rng = generator(3)
    spec = orchard_spec(rng, readers=readers, items=items, with_fillers=False, effects=effects)
    study = simulate_study(spec, rng)
    of_readers = [reader.intercept for reader in study.readers]
    drawn = of_readers if readers > items else list(study.item_intercepts.values())
    assert abs(np.std(drawn) - 0.5) < 4 * 0.028


def test_more_readers_do_not_change_the_first_ones() -> None:
    """Each reader has a stream of numbers of their own."""

    def first_reader(readers: int) -> list[SimulatedFixation]:
        spec = orchard_spec(generator(5), readers=8, items=8)
        kept = {reader.participant for reader in spec.readers[:readers]}
        trials = tuple(trial for trial in spec.trials if trial.participant in kept)
        part = type(spec)(spec.readers[:readers], trials, spec.layouts, spec.effects)
        return [f for t in simulate_study(part, generator(6)).trials[:20] for f in t.fixations]

    assert first_reader(1) == first_reader(8)
