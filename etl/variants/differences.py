"""How two conditions differ in the odds of ones, in one variant or in all at once."""

from __future__ import annotations

import numpy as np

from etl.readiness.intervals import Z_95
from etl.variants.facts import Compared, Comparison, Flags, Floats, Ints

#: What is added to each of four counts where one of them is 0.
ADDED = 0.5


def compare(counts: Ints) -> tuple[Floats, Floats, Floats, Flags]:
    """Log odds ratios with intervals of 95 %.

    With zeros a and ones b of the reference, zeros c and ones d of the level: log(ad / bc), which
    is the log-odds of the level less those of the reference, ± z √(1/a + 1/b + 1/c + 1/d).

    Parameters
    ----------
    counts : (..., 2, 2) int64 array
        Zeros and ones (last axis) of the reference and of the level (the axis before).

    Returns
    -------
    difference, low, high : (...) float64 arrays
        In log-odds; NaN where one of the two conditions has no value, or all values of both are the
        same: then nothing is known of a ratio of odds, and 0.5 added to each count would give it a
        sign that only tells which condition has more values.
    corrected : (...) bool array
        Where one of the counts is 0, though both conditions have values: there 0.5 was added to
        all four.

    Raises
    ------
    ValueError
        If the last two axes are not 2 long, or a count is below 0.

    References
    ----------
    Woolf (1955). On estimating the relation between blood group and disease. Annals of Human
    Genetics, 19, 251-253. doi:10.1111/j.1469-1809.1955.tb01348.x

    Haldane (1956). The estimation and significance of the logarithm of a ratio of frequencies.
    Annals of Human Genetics, 20, 309-311. doi:10.1111/j.1469-1809.1955.tb01285.x

    Anscombe (1956). On estimating binomial response relations. Biometrika, 43, 461-464.
    doi:10.1093/biomet/43.3-4.461

    Examples
    --------
    10 ones of 20 against 15 of 20: log 3, and 1/10 + 1/10 + 1/5 + 1/15 = 0.4667.

    >>> difference, low, high, _ = compare(np.array([[10, 10], [5, 15]]))
    >>> print(f"{difference:.4f}: {low:.4f} to {high:.4f}")
    1.0986: -0.2403 to 2.4375
    """
    whole = _sound(counts, 2)
    there = (whole.sum(axis=-1) > 0).all(axis=-1) & (whole.sum(axis=-2) > 0).all(axis=-1)
    corrected: Flags = there & (whole == 0).any(axis=(-2, -1))
    own = whole + ADDED * corrected[..., np.newaxis, np.newaxis]
    # Any counts will do where there is no difference: what comes out is not looked at.
    own = np.where(there[..., np.newaxis, np.newaxis], own, 1.0)
    # One quotient of two products: equal ratios are the same number to the last bit, whatever
    # counts they come from, and equal odds are exactly 0, so that signs can be trusted.
    ratio = own[..., 0, 0] * own[..., 1, 1] / (own[..., 0, 1] * own[..., 1, 0])
    difference = np.where(there, np.log(ratio), np.nan)
    half = Z_95 * np.sqrt((1 / own).sum(axis=(-2, -1)))
    return difference, difference - half, difference + half, corrected


def rates(counts: Ints) -> tuple[Floats, Floats, Floats]:
    """Shares of ones with Wilson's intervals of 95 %.

    The same as :func:`etl.readiness.intervals.wilson_interval` gives for one rate, to the last bit.

    Parameters
    ----------
    counts : (..., 2) int64 array
        Zeros and ones.

    Returns
    -------
    rate, low, high : (...) float64 arrays
        From 0 to 1; NaN where there is no value.

    Raises
    ------
    ValueError
        If the last axis is not 2 long, or a count is below 0.

    References
    ----------
    Wilson (1927). Probable inference, the law of succession, and statistical inference. Journal
    of the American Statistical Association, 22, 209-212. doi:10.1080/01621459.1927.10502953

    Examples
    --------
    >>> rate, low, high = rates(np.array([5, 5]))
    >>> print(f"{rate:.2f}: {low:.4f} to {high:.4f}")
    0.50: 0.2366 to 0.7634
    """
    whole = _sound(counts, 1)
    zeros, ones = whole[..., 0], whole[..., 1]
    there = zeros + ones > 0
    n = np.where(there, zeros + ones, 1)
    p = ones / n
    # Step by step as there, since another order would round otherwise.
    z = Z_95
    middle = p + z * z / (2 * n)
    half = z * np.sqrt(p * (1 - p) / n + z * z / (4 * n * n))
    scale = 1 + z * z / n
    low = np.where(ones == 0, 0.0, (middle - half) / scale)
    high = np.where(zeros == 0, 1.0, (middle + half) / scale)
    rate, low, high = (np.where(there, own, np.nan) for own in (p, low, high))
    return rate, low, high


def compared(comparison: Comparison, counts: Ints) -> Compared:
    """A comparison over all variants.

    Parameters
    ----------
    comparison : Comparison
        What is compared; without a factor the rate itself is looked at.
    counts : (V, 2, 2) int64 array
        By variant, zeros and ones (last axis) of the reference and of the level (middle axis).

    Returns
    -------
    Compared
        With differences in log-odds, or with rates.

    Raises
    ------
    ValueError
        If the last two axes are not 2 long, or a count is below 0.
    """
    whole = _sound(counts, 2)
    if comparison.factor:
        return Compared(comparison, whole, *compare(whole))
    return Compared(comparison, whole, *rates(whole[:, 0]), np.zeros(len(whole), dtype=np.bool_))


def _sound(counts: Ints, axes: int) -> Ints:
    """Counts as 64-bit whole numbers, if they are counts by so many pairs."""
    own = np.asarray(counts, dtype=np.int64)
    if own.shape[-axes:] != (2,) * axes:
        expected = ", ".join(["...", *["2"] * axes])
        raise ValueError(f"counts have the shape {own.shape}; expected ({expected})")
    if (own < 0).any():
        raise ValueError(f"counts go down to {own.min()}; expected 0 or more")
    return own
