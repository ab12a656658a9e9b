"""Intervals of rates."""

from __future__ import annotations

import math

#: The 0.975 quantile of the normal distribution, for intervals of 95 %.
Z_95 = 1.959963984540054


def wilson_interval(ones: int, n: int, z: float = Z_95) -> tuple[float, float]:
    """The score interval of a proportion.

    With p = ones / n: (p + z²/2n ± z √(p(1−p)/n + z²/4n²)) / (1 + z²/n).

    Parameters
    ----------
    ones : int
        How many of the values are 1.
    n : int
        How many values there are, at least 1.
    z : float
        Quantile of the normal distribution; the default gives 95 %.

    Returns
    -------
    tuple of float
        Lower and upper limit, between 0 and 1.

    Raises
    ------
    ValueError
        If there are no values.

    References
    ----------
    Wilson (1927). Probable inference, the law of succession, and statistical inference. Journal
    of the American Statistical Association, 22, 209-212. doi:10.1080/01621459.1927.10502953

    Examples
    --------
    With z = 2 and 5 of 10: (0.5 + 0.2 ± 2 √(0.025 + 0.01)) / 1.4 = 0.5 ± 0.2673.

    >>> [round(limit, 4) for limit in wilson_interval(5, 10, z=2)]
    [0.2327, 0.7673]
    """
    if n < 1:
        raise ValueError("an interval needs at least one value")
    p = ones / n
    middle = p + z * z / (2 * n)
    half = z * math.sqrt(p * (1 - p) / n + z * z / (4 * n * n))
    scale = 1 + z * z / n
    # At 0 and n of n the formula gives exactly 0 and 1, but for rounding.
    low = 0.0 if ones == 0 else (middle - half) / scale
    high = 1.0 if ones == n else (middle + half) / scale
    return low, high
