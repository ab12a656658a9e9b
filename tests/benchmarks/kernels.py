"""How many fixations a second the measure kernels take, on one core.

Run from the checkout: ``python tests/benchmarks/kernels.py``. Texts of 6 regions, 20 fixations a
trial, all outcomes computed, under each convention for fixations outside. Measured twice: one call
per reader of 100 trials, as a build calls the kernels, and one call for everything. The best of
several repeats is given, since anything else on the machine can only slow a repeat down.
"""

import argparse
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from etl.measures import Outside, Sequences, compute

REGIONS = 6
FIXATIONS_PER_TRIAL = 20
TRIALS_PER_READER = 100
#: The goal of the project for the kernels alone.
GOAL_PER_SECOND = 2_000_000


def make_trials(trials: int, seed: int) -> Sequences:
    """Trials that read on with some refixations, regressions, skips and fixations outside."""
    generator = np.random.default_rng(seed)
    shape = (trials, FIXATIONS_PER_TRIAL)
    steps = generator.choice([-2, -1, 0, 1, 2], p=[0.06, 0.16, 0.4, 0.3, 0.08], size=shape)
    order = np.clip(np.cumsum(steps, axis=1) + 1, 1, REGIONS)
    order[generator.random(shape) < 0.04] = 0
    return Sequences(
        trial=np.repeat(np.arange(trials, dtype=np.int64), FIXATIONS_PER_TRIAL),
        region_order=order.astype(np.int32).ravel(),
        duration_ms=generator.gamma(9.0, 25.0, size=order.size),
        region_count=np.full(trials, REGIONS, np.int32),
    )


def best_rate(batches: list[Sequences], outside: Outside, repeats: int) -> float:
    """Fixations a second over all batches, in the best repeat."""
    fixations = sum(batch.trial.size for batch in batches)
    times_s = []
    for _ in range(repeats):
        start_s = time.perf_counter()
        for batch in batches:
            compute(batch, outside=outside)
        times_s.append(time.perf_counter() - start_s)
    return fixations / min(times_s)


def main() -> None:
    """Print the rates, and whether the goal is met."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--readers", type=int, default=500)
    parser.add_argument("--repeats", type=int, default=5)
    chosen = parser.parse_args()
    readers = [make_trials(TRIALS_PER_READER, seed) for seed in range(chosen.readers)]
    everything = [make_trials(TRIALS_PER_READER * chosen.readers, seed=1)]
    fixations = everything[0].trial.size
    print(f"{fixations:,} fixations, {chosen.readers} readers, best of {chosen.repeats}")
    for outside in ("ignore", "interrupt"):
        for name, batches in (("a call per reader", readers), ("one call", everything)):
            rate = best_rate(batches, outside, chosen.repeats)
            verdict = "met" if rate >= GOAL_PER_SECOND else "missed"
            print(
                f"{name:18} outside={outside:10} {rate / 1e6:6.2f} million fixations a second"
                f" (goal {GOAL_PER_SECOND / 1e6:.0f}: {verdict})"
            )


if __name__ == "__main__":
    main()
