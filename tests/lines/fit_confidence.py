"""The weights of ``etl/lines/consensus_confidence.py``, fitted on simulated trials.

``python -m tests.lines.fit_confidence`` prints all weights, then how well they do on trials of
other seeds; the tests use yet others. Run it when the model, the signs or the simulated readers
change, and put in what it prints. A third of the trials have one phenomenon of Carr et al. (2022),
a sixth all of them, half everything that real trials are known for and other layouts.
"""

from __future__ import annotations

import argparse
from collections.abc import Iterator
from itertools import chain, pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize

from etl.lines.consensus import SURE, lines_of, pool, signs_of
from etl.lines.consensus_confidence import (
    FIXATION_SIGNS,
    LOG_ODDS_SAID,
    RIGHT_SHARE,
    TRIAL_SIGNS,
    Signs,
    chance_of,
    contested_share,
    fixation_signs,
    trial_signs,
    weighted,
)
from etl.lines.settings import MethodSettings
from tests.lines.simulated import (
    PUBLISHED,
    Trial,
    combined_trials,
    mixed_trials,
    published_trials,
)

Floats = NDArray[np.float64]

#: Weights are drawn towards 0 by this, in standard deviations of their signs: signs tell alike.
RIDGE = 0.002


def trials_for(seed: int, count: int) -> Iterator[tuple[str, Trial]]:
    """The trials to fit on, with the name of their kind."""
    each = max(count // 15, 1)
    singles = ((name, published_trials(seed, name, each)) for name in PUBLISHED)
    combined = ("combined", combined_trials(seed, count // 6))
    mixed = ("mixed", mixed_trials(seed, count // 2))
    for kind, trials in chain(singles, [combined, mixed]):
        for trial in trials:
            yield kind, trial


def signs_and_truth(trial: Trial) -> tuple[Signs, Floats]:
    """The signs of a trial, and which of its fixations are right."""
    pooled = pool(trial.x_px, trial.y_px, trial.duration_ms, trial.passage, MethodSettings())
    line, _ = lines_of(pooled)
    return signs_of(pooled, line), (line == trial.line).astype(np.float64)


def fitted(signs: Floats, right: Floats) -> Floats:
    """Constant and weights of the logistic function that makes what is seen likeliest."""
    mean, deviation = signs.mean(0), signs.std(0)
    scaled = np.column_stack([np.ones(len(signs)), (signs - mean) / deviation])

    def loss(weights: Floats) -> tuple[float, Floats]:
        total = scaled @ weights
        value = np.mean(np.logaddexp(0, total) - right * total) + RIDGE * (weights[1:] ** 2).sum()
        slope = scaled.T @ (chance_of(total) - right) / len(right)
        slope[1:] += 2 * RIDGE * weights[1:]
        return float(value), slope

    best = minimize(loss, np.zeros(scaled.shape[1]), jac=True, method="BFGS").x
    weights = best[1:] / deviation
    return np.append(best[0] - (weights * mean).sum(), weights)


def odds_seen(said: Floats, right: Floats) -> Floats:
    """The log odds at ``LOG_ODDS_SAID``, straight between, that make what is seen likeliest."""
    knots = np.array(LOG_ODDS_SAID)
    near = np.column_stack([np.interp(said, knots, row) for row in np.eye(len(knots))])

    def loss(values: Floats) -> tuple[float, Floats]:
        total = near @ values
        off = values - knots
        value = np.mean(np.logaddexp(0, total) - right * total) + 1e-6 * (off @ off)
        return float(value), near.T @ (chance_of(total) - right) / len(right) + 2e-6 * off

    # More said is more seen, whatever the draw of a few trials at the lower end.
    return np.maximum.accumulate(minimize(loss, knots, jac=True, method="BFGS", tol=1e-7).x)


def tell_calibration(title: str, chances: Floats, right: Floats) -> None:
    """Print what was said against what was so."""
    print(title)
    ends = [0, 0.2, 0.4, 0.6, 0.8, 0.9, SURE, 0.98, 0.99, 1.0001]
    for low, high in pairwise(ends):
        within = (chances >= low) & (chances < high)
        if within.any():
            said, so = chances[within].mean(), right[within].mean()
            print(
                f"  {low:.2f} to {min(high, 1):.2f}  n {within.sum():6d}"
                f"  said {said:.3f}  so {so:.3f}"
            )


def tell_sure(kinds: list[str], sure: NDArray[np.bool_], shares: Floats) -> None:
    """Print for each kind of trial how many are sure, and how right those are."""
    for kind in dict.fromkeys(kinds):
        own = np.array([one == kind for one in kinds])
        right = shares[own & sure] >= RIGHT_SHARE
        print(
            f"  {kind:10s} right {np.mean(shares[own] >= RIGHT_SHARE):.3f}"
            f"  sure {sure[own].mean():.3f}"
            f"  of the sure right {right.mean() if right.size else float('nan'):.3f}"
        )


def main() -> None:
    """Fit, print, and try on other seeds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--trials", type=int, default=3600)
    parser.add_argument("--seed", type=int, default=1001)
    given = parser.parse_args()
    seen = [(kind, *signs_and_truth(t)) for kind, t in trials_for(given.seed, given.trials)]
    rows = np.array([trial_signs(signs) for _, signs, _ in seen])
    right = np.array([truth.mean() >= RIGHT_SHARE for _, _, truth in seen], dtype=np.float64)
    weights = fitted(rows, right)
    print("TRIAL_WEIGHTS:", ", ".join(f"{weight:.4g}" for weight in weights))
    for name, weight in zip(TRIAL_SIGNS, weights[1:] * rows.std(0), strict=True):
        print(f"  {name:16s} {weight:+.2f} a standard deviation")
    said = chance_of(weighted(rows, weights))
    every = [fixation_signs(one, p) for (_, one, _), p in zip(seen, said, strict=True)]
    signs, truth = np.concatenate(every), np.concatenate([truth for _, _, truth in seen])
    of_fixations = fitted(signs, truth)
    print("FIXATION_WEIGHTS:", ", ".join(f"{weight:.4g}" for weight in of_fixations))
    assert len(of_fixations) == len(FIXATION_SIGNS) + 1
    seen_at = odds_seen(weighted(signs, of_fixations), truth)
    print("LOG_ODDS_SEEN:", ", ".join(f"{value:.4g}" for value in seen_at))
    tell_on_others(given.seed + 1, given.trials // 2, (weights, of_fixations, seen_at))


def tell_on_others(seed: int, count: int, fits: tuple[Floats, Floats, Floats]) -> None:
    """Print calibration, and how right sure trials are, on other seeds."""
    weights, of_fixations, seen_at = fits
    seen = [(kind, *signs_and_truth(trial)) for kind, trial in trials_for(seed, count)]
    said = chance_of(weighted(np.array([trial_signs(signs) for _, signs, _ in seen]), weights))
    shares = np.array([truth.mean() for _, _, truth in seen])
    tell_calibration("trials", said, (shares >= RIGHT_SHARE).astype(np.float64))
    every = [fixation_signs(one, p) for (_, one, _), p in zip(seen, said, strict=True)]
    total = weighted(np.concatenate(every), of_fixations)
    truth = np.concatenate([truth for _, _, truth in seen])
    tell_calibration("fixations", chance_of(np.interp(total, LOG_ODDS_SAID, seen_at)), truth)
    contested = np.array([contested_share(signs) for _, signs, _ in seen]) >= 1 - RIGHT_SHARE
    tell_sure([kind for kind, _, _ in seen], (said >= SURE) & ~contested, shares)


if __name__ == "__main__":
    main()
