"""How well the fitted models found the truth: coverage, bias, binned residuals."""

from __future__ import annotations

import math

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from tests.recovery.fitting import Fits, of_outcome
from tests.recovery.truth import Truth

Floats = NDArray[np.float64]


def covered(fits: Fits, truth: Truth, term: str, variant: str = "sound") -> int:
    """In how many studies the 95 % interval of a coefficient holds the true one."""
    table = of_outcome(fits.coefficients, truth.outcome, variant)
    own, true = table[table["term"] == term], truth.effects[term]
    return int(((own["low"] <= true) & (true <= own["high"])).sum())


def bias(fits: Fits, truth: Truth, term: str) -> tuple[float, float]:
    """Mean of estimate minus truth over the studies, and its Monte-Carlo standard error."""
    table = of_outcome(fits.coefficients, truth.outcome)
    off = table[table["term"] == term]["estimate"].to_numpy() - truth.effects[term]
    return float(off.mean()), float(off.std(ddof=1) / math.sqrt(len(off)))


def found_deviation(fits: Fits, truth: Truth, term: str) -> float:
    """The fitted standard deviation between readers over all studies.

    The square root of the mean variance: the mean of the standard deviations themselves falls short
    where some of them are 0, even if the variances are right on average.
    """
    table = of_outcome(fits.deviations, truth.outcome)
    own = table[(table["group"] == "participant") & (table["term"] == term)]
    return math.sqrt(float((own["deviation"] ** 2).mean()))


def binned(values: Floats, expected: Floats) -> tuple[int, int]:
    """How many binned residuals lie within two standard errors, and how many there are.

    Parameters
    ----------
    values : (n,) float64 array
        0 or 1.
    expected : (n,) float64 array
        The probability of a one that a model gives; trials are sorted by it into bins of equal
        counts, as many as a bin has trials.

    Returns
    -------
    (int, int)
        The residual of a bin is the mean of ``values - expected``; its standard error is
        ``sqrt(p * (1 - p) / n)``, p being the mean of ``expected`` in it.

    References
    ----------
    Gelman & Hill (2007). Data Analysis Using Regression and Multilevel/Hierarchical Models, section
    5.6: binned residuals; about 95 % are expected within two standard errors.

    Examples
    --------
    Two bins of two, each with limits of 2 * sqrt(0.1 * 0.9 / 2) = 0.424. First, residuals of -0.1
    and 0.1; then of 1 - 0.1 = 0.9 where ones were least expected, and 0.1.

    >>> expected = np.array([0.9, 0.1, 0.1, 0.9])
    >>> binned(np.array([1.0, 0.0, 0.0, 1.0]), expected)
    (2, 2)
    >>> binned(np.array([1.0, 1.0, 1.0, 1.0]), expected)
    (1, 2)
    """
    within = 0
    bins = np.array_split(np.argsort(expected, kind="stable"), math.isqrt(len(values)))
    for rows in bins:
        mean = float(expected[rows].mean())
        residual = float((values[rows] - expected[rows]).mean())
        within += abs(residual) <= 2.0 * math.sqrt(mean * (1.0 - mean) / len(rows))
    return within, len(bins)


def share_within(table: pd.DataFrame, value: str, expected: str) -> tuple[float, int]:
    """The share of binned residuals within two standard errors, and how many there are.

    Parameters
    ----------
    table : DataFrame
        Rows with ``study`` and the two columns; binned study by study.
    value, expected : str
        The columns of the outcomes and of the probabilities.

    Returns
    -------
    (float, int)
        Over all studies.
    """
    counts = [
        binned(own[value].to_numpy(float), own[expected].to_numpy(float))
        for _, own in table.groupby("study")
    ]
    total = sum(bins for _, bins in counts)
    return sum(within for within, _ in counts) / total, total
