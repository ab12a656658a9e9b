"""Small helpers of the measure tests: trials in a few characters, outcomes as plain cells."""

import numpy as np

from etl.measures import REASONS, Measured, Outcomes, Sequences

CONVENTIONS = [
    (outside, no_opportunity)
    for outside in ("ignore", "interrupt")
    for no_opportunity in ("missing", "zero")
]


def sequences(*trials: tuple[list[int], list[float], int]) -> Sequences:
    """Sequences from one (orders, durations in ms, number of regions) a trial."""
    sizes = [len(orders) for orders, _, _ in trials]
    return Sequences(
        trial=np.repeat(np.arange(len(trials), dtype=np.int64), sizes),
        region_order=np.array([o for orders, _, _ in trials for o in orders], np.int32),
        duration_ms=np.array([d for _, durations, _ in trials for d in durations], np.float64),
        region_count=np.array([regions for _, _, regions in trials], np.int32),
    )


def one_trial(text: str, regions: int) -> Sequences:
    """A trial written as ``order:duration`` items, ``0`` being outside."""
    pairs = [item.split(":") for item in text.split()]
    return sequences(([int(order) for order, _ in pairs], [float(ms) for _, ms in pairs], regions))


def cells(measured: Measured, start: int = 0, stop: int | None = None) -> list[float | str]:
    """The values of a measure, each missing one replaced by its reason."""
    return [
        REASONS[reason] if reason else value
        for value, reason in zip(
            measured.values[start:stop].tolist(), measured.reasons[start:stop].tolist(), strict=True
        )
    ]


def region_cells(outcomes: Outcomes, name: str) -> list[float | str]:
    """The cells of one measure of the regions."""
    return cells(outcomes.regions[name])


def trial_cells(outcomes: Outcomes) -> dict[str, float | str]:
    """All trial outcomes of a single trial."""
    return {name: cells(measured)[0] for name, measured in outcomes.trials.items()}
