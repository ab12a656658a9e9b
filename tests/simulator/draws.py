"""Random draws that come out alike on every platform and with every version of numpy.

Only ``Generator.random`` is used: 53 bits of the bit stream divided by a power of two. How numpy
turns bits into normal numbers, ranges or permutations may change between versions (its policy on
random streams, NEP 19), and a committed sample must not change with it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from statistics import NormalDist
from typing import TypeVar

import numpy as np

Thing = TypeVar("Thing")
STANDARD_NORMAL = NormalDist()


def chance(rng: np.random.Generator, probability: float) -> bool:
    """Whether an event of this probability happens."""
    return bool(rng.random() < probability)


def uniform(rng: np.random.Generator, low: float, high: float) -> float:
    """A number from ``low`` up to, but without, ``high``."""
    return low + (high - low) * float(rng.random())


def normal(rng: np.random.Generator, mean: float, sd: float) -> float:
    """A normal number, by the inverse of the distribution function."""
    # Half a step up: 0 has no inverse.
    return mean + sd * STANDARD_NORMAL.inv_cdf(float(rng.random()) + 2.0**-54)


def clipped_normal(rng: np.random.Generator, sd: float, limit: float) -> float:
    """A normal number around 0, held within ``limit`` on either side."""
    return max(-limit, min(limit, normal(rng, 0.0, sd)))


def whole(rng: np.random.Generator, low: int, high: int) -> int:
    """A whole number from ``low`` to ``high``, both possible."""
    return low + int(float(rng.random()) * (high - low + 1))


def pick(rng: np.random.Generator, things: Sequence[Thing]) -> Thing:
    """One of several things, each as likely as the others."""
    return things[whole(rng, 0, len(things) - 1)]


def shuffled(rng: np.random.Generator, things: Sequence[Thing]) -> list[Thing]:
    """The things in a random order (Fisher-Yates)."""
    order = list(things)
    for last in range(len(order) - 1, 0, -1):
        other = whole(rng, 0, last)
        order[last], order[other] = order[other], order[last]
    return order


def probability(log_odds: float) -> float:
    """The probability that belongs to log-odds.

    Examples
    --------
    >>> probability(0.0)
    0.5
    >>> round(probability(-1.0986), 3)
    0.25
    """
    return 1.0 / (1.0 + math.exp(-log_odds))
