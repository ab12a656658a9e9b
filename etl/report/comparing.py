"""Whether readers and conditions differ: robust outliers, loss of trials by condition."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

#: Makes the median absolute deviation of normal values estimate their standard deviation.
MAD_SCALE = 1.4826
#: A reader farther than this many scaled median absolute deviations from the median stands out
#: (the "very conservative" limit of Leys et al. 2013, from memory).
FENCE = 3.0
#: With fewer values than this nobody is called an outlier (common practice, no source).
FEWEST_TO_COMPARE = 5
#: Random tables drawn for Fisher's test on more than two levels, and the seed they are drawn from,
#: so that the same study gives the same page.
RANDOM_TABLES = 9_999
SEED = 1922


def robust_fence(values: Sequence[float]) -> tuple[float, float] | None:
    """The median and the scaled median absolute deviation of values.

    Parameters
    ----------
    values : sequence of float
        One value a reader.

    Returns
    -------
    tuple of float or None
        Median and deviation; None where there are too few values to compare, or so many are alike
        that the deviation is 0.

    References
    ----------
    Leys, Ley, Klein, Bernard & Licata (2013). Detecting outliers: do not use standard deviation
    around the mean, use absolute deviation around the median. Journal of Experimental Social
    Psychology, 49, 764-766. doi:10.1016/j.jesp.2013.03.013

    Examples
    --------
    The median is 3; the distances from it are 2, 1, 0, 1, 97, and their median is 1.

    >>> robust_fence([1, 2, 3, 4, 100])
    (3.0, 1.4826)
    """
    if len(values) < FEWEST_TO_COMPARE:
        return None
    median = float(np.median(values))
    deviation = MAD_SCALE * float(np.median(np.abs(np.asarray(values) - median)))
    return (median, deviation) if deviation > 0 else None


def loss_p_value(lost: Sequence[int], kept: Sequence[int]) -> float | None:
    """Whether trials were lost alike at all levels of a factor, by Fisher's exact test.

    Parameters
    ----------
    lost, kept : sequence of int
        Trials lost and kept at each level.

    Returns
    -------
    float or None
        Two-sided p. With more than two levels it rests on random tables with the same margins,
        drawn from a fixed seed. None where nothing can be compared: nothing or all was lost, or
        fewer than two levels have trials.

    References
    ----------
    Fisher (1922). On the interpretation of χ² from contingency tables, and the calculation of P.
    Journal of the Royal Statistical Society, 85, 87-94. doi:10.2307/2340521 (from memory)

    Examples
    --------
    Of 8 trials 4 were lost, all at the first level: one of 70 tables with these margins is as
    extreme, and so is its mirror image; 2 / 70.

    >>> round(loss_p_value([4, 0], [0, 4]), 4)
    0.0286
    """
    table = np.array([lost, kept], dtype=np.int64)
    table = table[:, table.sum(axis=0) > 0]
    if table.shape[1] < 2 or (table.sum(axis=1) == 0).any():
        return None
    # Importing the tests of scipy takes longer than a small build, so only where one is needed.
    from scipy.stats import MonteCarloMethod, fisher_exact  # noqa: PLC0415

    if table.shape[1] == 2:
        return float(fisher_exact(table).pvalue)
    method = MonteCarloMethod(n_resamples=RANDOM_TABLES, rng=np.random.default_rng(SEED))
    return float(fisher_exact(table, method=method).pvalue)
