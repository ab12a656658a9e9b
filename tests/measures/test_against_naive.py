"""The kernels against a loop over one trial that is written from the definitions."""

import random

import numpy as np
import pytest

from etl.measures import MEASURES, REASONS, TRIAL_MEASURES, Outcomes, compute
from tests.measures.building import CONVENTIONS, cells, sequences
from tests.measures.naive import Naive, Trial, measure

TRIALS = 10_000


def random_trial(source: random.Random) -> Trial:
    """A trial of one of many shapes; durations of whole or tenths of milliseconds."""
    shape = source.choice(
        ["empty", "single", "outside", "jumpy", "reading", "reading", "reading", "dwelling", "long"]
    )
    regions = source.choice([1, 2, 3, 4, 5, 6, 6, 6, 9, 14])
    size = {"empty": 0, "single": 1, "long": source.randint(20, 60)}.get(
        shape, source.randint(1, 18)
    )
    outside_share = 1.0 if shape == "outside" else source.choice([0.0, 0.0, 0.1, 0.4])
    orders, place = [], source.choice([1, 1, source.randint(1, regions)])
    for _ in range(size):
        orders.append(0 if source.random() < outside_share else place)
        if shape == "jumpy":
            place = source.randint(1, regions)
        elif shape == "dwelling":
            place += source.choice([0, 0, 0, 1, -1])
        else:
            place += source.choice([0, 0, 1, 1, 1, 2, -1, -2])
        place = min(max(place, 1), regions)
    fraction = source.choice([1.0, 0.1])
    durations_ms = [
        source.randint(400, 9000) // 10 * 1.0 + fraction * source.randint(0, 9) for _ in orders
    ]
    return Trial(orders, durations_ms, regions)


@pytest.fixture(scope="module")
def trials() -> list[Trial]:
    """The same random trials for every convention."""
    source = random.Random(20_240_611)
    return [random_trial(source) for _ in range(TRIALS)]


def as_naive(outcomes: Outcomes, trial: int, first: int, size: int) -> Naive:
    """What the kernels say about one trial, in the shape of the naive loop."""
    start, stop = outcomes.cell_offsets[trial : trial + 2].tolist()
    rows = outcomes.regressions
    among = slice(*np.searchsorted(rows.launch, [first, first + size]).tolist())
    launch, landing = rows.launch[among] - first, rows.landing[among] - first
    return Naive(
        {name: _pairs(measured, start, stop) for name, measured in outcomes.regions.items()},
        {name: _pairs(measured, trial, trial + 1)[0] for name, measured in outcomes.trials.items()},
        outcomes.visit[first : first + size].tolist(),
        outcomes.first_pass[first : first + size].tolist(),
        list(
            zip(
                launch.tolist(), landing.tolist(), rows.ends_first_pass[among].tolist(), strict=True
            )
        ),
    )


def _pairs(measured, start, stop):
    """Cells as (value, "") or (None, reason)."""
    return [
        (None, cell) if isinstance(cell, str) else (cell, "")
        for cell in cells(measured, start, stop)
    ]


@pytest.fixture(scope="module", params=CONVENTIONS, ids="-".join)
def compared(request, trials):
    """Naive loop and kernels, trial by trial, under one of the four conventions."""
    outside, no_opportunity = request.param
    together = compute(
        sequences(*((t.orders, t.durations_ms, t.regions) for t in trials)),
        outside=outside,
        no_opportunity=no_opportunity,
    )
    pairs, first = [], 0
    for number, trial in enumerate(trials):
        kernels = as_naive(together, number, first, len(trial.orders))
        pairs.append((trial, measure(trial, outside, no_opportunity), kernels))
        first += len(trial.orders)
    return no_opportunity, pairs


def first_difference(pairs, part: str) -> str:
    """The first trial on which the two disagree about one part, or nothing."""
    for trial, naive, kernels in pairs:
        expected, found = getattr(naive, part), getattr(kernels, part)
        if expected != found:
            return f"{trial}:\n  by the definitions {expected}\n  by the kernels     {found}"
    return ""


@pytest.mark.parametrize("part", ["regions", "trial", "visit", "first_pass", "regressions"])
def test_kernels_equal_the_naive_loop(compared, part):
    """10,000 random trials agree cell by cell, to the last bit, reasons included."""
    _, pairs = compared
    assert first_difference(pairs, part) == ""


def test_reasons_that_occur_are_those_of_the_catalogue(compared):
    """Each measure is missing for each of its listed reasons somewhere, and for no other."""
    no_opportunity, pairs = compared
    seen = {name: set() for name in MEASURES} | {f"trial {name}": set() for name in TRIAL_MEASURES}
    for _, _, kernels in pairs:
        for name, column in kernels.regions.items():
            seen[name].update(reason for _, reason in column)
        for name, (_, reason) in kernels.trial.items():
            seen[f"trial {name}"].add(reason)
    listed = {name: set(m.reasons_under(no_opportunity)) for name, m in MEASURES.items()} | {
        f"trial {name}": set(m.reasons_under(no_opportunity)) for name, m in TRIAL_MEASURES.items()
    }
    assert {name: reasons - {""} for name, reasons in seen.items()} == listed
    assert set().union(*listed.values()) <= set(REASONS)


def test_random_trials_have_the_awkward_shapes(trials):
    """The comparison covers what it promises: R = 1, empty, all outside, single, between, long."""

    def has(rule) -> bool:
        return sum(bool(rule(trial)) for trial in trials) >= 100

    assert has(lambda t: t.regions == 1)
    assert has(lambda t: not t.orders)
    assert has(lambda t: t.orders and not any(t.orders))
    assert has(lambda t: len(t.orders) == 1)
    assert has(lambda t: 0 in t.orders[1:-1] and t.orders[0] and t.orders[-1])
    assert has(lambda t: len(t.orders) > 40)
    assert has(lambda t: max(t.orders, default=0) == t.regions)
