"""The sample studies lie in published ranges, measured by the built tables alone.

Rayner 1998 is doi:10.1037/0033-2909.124.3.372.
"""

from __future__ import annotations

from itertools import pairwise
from statistics import fmean

from tests.end_to_end.building import Sample, by_trial

CHARACTER_PX = 14


def saccades_px(sample: Sample) -> list[float]:
    """Signed lengths of the saccades within a line, so that return sweeps do not count."""
    return [
        after["x_px"] - before["x_px"]
        for _, rows in by_trial(row for row in sample.tables["fixations"] if row["kept"])
        for before, after in pairwise(rows)
        if before["line"] is not None and before["line"] == after["line"]
    ]


def values(sample: Sample, measure: str, regions: tuple[str, ...]) -> list[float]:
    """The values of a measure on some regions, the missing ones left out."""
    return [
        row["value"]
        for row in sample.tables["outcomes"]
        if row["measure"] == measure and row["region"] in regions and row["value"] is not None
    ]


def test_mean_fixation_lasts_200_to_250_ms(sample: Sample) -> None:
    """Fixations in silent reading last 200-250 ms on average (Rayner 1998)."""
    kept = [row["duration_ms"] for row in sample.tables["fixations"] if row["kept"]]
    assert 200 <= fmean(kept) <= 250


def test_mean_forward_saccade_spans_7_to_9_characters(sample: Sample) -> None:
    """The mean saccade in reading spans 7-9 letter spaces (Rayner 1998)."""
    forward = [length / CHARACTER_PX for length in saccades_px(sample) if length > 0]
    assert 7 <= fmean(forward) <= 9


def test_regressive_saccades_are_10_to_15_percent(sample: Sample) -> None:
    """About 10-15 % of saccades in skilled reading go back (Rayner 1998), within words too."""
    assert 0.10 <= fmean(length < 0 for length in saccades_px(sample)) <= 0.15


def test_durations_from_trials_agree_with_those_from_fixations(sample: Sample) -> None:
    """The mean fixation lies in the range also as reading time by fixations, both of ``trials``."""
    trials = sample.tables["trials"]
    total_ms = sum(row["reading_time"] for row in trials)
    assert 200 <= total_ms / sum(row["fixation_count"] for row in trials) <= 250


def test_about_three_zeros_to_each_one(orchard: Sample) -> None:
    """First-pass regressions out of the critical region and the next: three zeros to each one.

    That sparseness is common practice, no source. The share of ones is a quarter, give or take
    three binomial standard errors of some 1,400 rows: 3 * sqrt(0.25 * 0.75 / 1400) = 0.035.
    """
    ones = values(orchard, "first_pass_regression_out", ("verb", "spillover"))
    assert 1300 < len(ones) < 1500
    assert abs(fmean(ones) - 0.25) < 0.035


def test_share_of_regressions_is_that_which_was_simulated(orchard: Sample) -> None:
    """The built rate agrees with the mean of the true probabilities behind it.

    Each first pass is one draw, so the rate strays from the mean probability by less than the
    binomial standard error; three of them are 0.035 (as above).
    """
    true = [
        probability
        for trial in orchard.truth.trials
        if trial.recorded and not trial.disturbed
        for region, probability in trial.exit_probability.items()
        if region in ("verb", "spillover")
    ]
    built = values(orchard, "first_pass_regression_out", ("verb", "spillover"))
    assert abs(fmean(built) - fmean(true)) < 0.035
