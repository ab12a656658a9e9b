"""What each setting decides: about a number, about its sign, about single cells."""

from __future__ import annotations

from math import prod

import numpy as np
from numpy.typing import NDArray

from etl.variants.facts import Crossing, Floats, Ints, SettingShare

#: About so many states are looked at in one go: little enough to stay near the processor.
_AT_ONCE = 2**18


def setting_shares(values: Floats, crossing: Crossing) -> tuple[SettingShare, ...]:
    """Which share of the variance over all variants each setting explains.

    Every combination of alternatives is there once, so nothing is sampled or estimated. The share
    that a setting explains alone is the variance of the means of its alternatives (first-order
    effect). Its share together with all interactions (total effect) is the mean variance that is
    left where all other settings are fixed. That is the mean square of differences of pairs that
    differ in this setting only, halved, where each alternative is paired with each, itself too.
    Both are divided by the variance over all variants.

    Parameters
    ----------
    values : (V,) float64 array
        A number for each variant, such as a difference in log-odds.
    crossing : Crossing
        The variants.

    Returns
    -------
    tuple of SettingShare
        By setting. Empty where a combination of alternatives is missing, a variant has no number,
        or all have the same one: then there are no shares.

    Raises
    ------
    ValueError
        If there is not one number for each variant.

    References
    ----------
    Sobol' (2001). Global sensitivity indices for nonlinear mathematical models and their Monte
    Carlo estimates. Mathematics and Computers in Simulation, 55, 271-280.
    doi:10.1016/S0378-4754(00)00270-6

    Jansen (1999). Analysis of variance designs for model output. Computer Physics Communications,
    117, 35-43. doi:10.1016/S0010-4655(98)00154-4
    """
    _one_each(len(values), crossing)
    if not crossing.full or not np.isfinite(values).all() or (values == values[0]).all():
        return ()
    ordered = values[_in_order(crossing)]
    # Shares do not hang on the unit; from 0 to 1, squares of small differences are not lost.
    scaled = (ordered - ordered.min()) / np.ptp(ordered)
    whole = scaled.var()
    flips = turning(values, crossing).tolist()
    shares = []
    for place, (before, number, after) in enumerate(_strides(crossing)):
        # Differences from the first alternative: exactly 0 throughout where a setting does nothing.
        along = scaled.reshape(before, number, after)
        apart = along - along[:, :1]
        alone = min(float(apart.mean(axis=(0, 2)).var() / whole), 1.0)
        together = min(float(apart.var(axis=1).mean() / whole), 1.0)
        means = ordered.reshape(before, number, after).mean(axis=(0, 2))
        # The one is never above the other but by rounding.
        shares.append(
            SettingShare(place, alone, max(alone, together), tuple(means.tolist()), flips[place])
        )
    return tuple(shares)


def turning(values: Floats, crossing: Crossing) -> Floats:
    """How often choosing a setting anew turns the sign of a number.

    Parameters
    ----------
    values : (V,) float64 array
        A number for each variant; NaN where there is none.
    crossing : Crossing
        The variants; not every combination need be among them.

    Returns
    -------
    (S,) float64 array
        For each setting, of all pairs of variants that differ in this setting only and have
        numbers, the share whose signs are not the same (0 has a sign of its own); 0 where there
        is no such pair.

    Raises
    ------
    ValueError
        If there is not one number for each variant.
    """
    _one_each(len(values), crossing)
    shares = np.zeros(len(crossing.settings))
    there = ~np.isnan(values)
    signs = [there & (values < 0), there & (values == 0), there & (values > 0)]
    for place in range(len(shares)):
        groups = _alike_but_for(place, crossing)
        below, zero, above = (np.bincount(groups, weights=own) for own in signs)
        differing = (below * zero + below * above + zero * above).sum()
        members = below + zero + above
        pairs = (members * (members - 1) / 2).sum()
        shares[place] = differing / pairs if pairs else 0.0
    return shares


def most_often(shares: Floats) -> tuple[list[int], bool]:
    """The settings with the greatest share.

    Parameters
    ----------
    shares : (S,) float64 array
        Such as from :func:`turning`.

    Returns
    -------
    list of int and bool
        Several where they are equal; and whether any other setting has a share at all.
    """
    most = np.flatnonzero(shares == shares.max()).tolist()
    return most, int(np.count_nonzero(shares)) > len(most)


def signs_with(values: Floats, crossing: Crossing, setting: int) -> list[tuple[int, int, int]]:
    """How many variants have a number below, at and above 0 with each alternative of a setting.

    Parameters
    ----------
    values : (V,) float64 array
        A number for each variant; NaN where there is none.
    crossing : Crossing
        The variants.
    setting : int
        Which setting.

    Returns
    -------
    list of (int, int, int)
        In the order of the alternatives.
    """
    found = []
    for place in range(len(crossing.settings[setting].alternatives)):
        own = values[crossing.choices[:, setting] == place]
        found.append((int((own < 0).sum()), int((own == 0).sum()), int((own > 0).sum())))
    return found


def changing_pairs(states: NDArray[np.generic], crossing: Crossing) -> tuple[Ints, Ints]:
    """How often choosing a setting anew changes a cell.

    Parameters
    ----------
    states : (cells, V) array of whole numbers or floats
        What each cell is in each variant, as codes or as values; NaN is a state like any other.
    crossing : Crossing
        The variants, with every combination of alternatives.

    Returns
    -------
    changes : (cells, S) int64 array
        For each cell and setting, how many of the pairs of variants that differ in this setting
        only have different states.
    pairs : (S,) int64 array
        How many such pairs there are.

    Raises
    ------
    ValueError
        If there is not one state for each variant, or a combination of alternatives is missing.
    """
    if not crossing.full:
        raise ValueError("a combination of alternatives is missing; expected each of them once")
    _one_each(states.shape[1], crossing)
    strides = _strides(crossing)
    pairs = np.array([b * n * (n - 1) // 2 * a for b, n, a in strides], dtype=np.int64)
    changes = np.zeros((len(states), len(strides)), dtype=np.int64)
    order = _in_order(crossing)
    step = max(1, _AT_ONCE // len(crossing))
    for start in range(0, len(states), step):
        block = _codes(states[start : start + step])
        changing = np.flatnonzero((block != block[:, :1]).any(axis=1))
        if not len(changing):
            continue
        # Variants first: then each comparison runs over neighbouring places in memory.
        by_variant = np.ascontiguousarray(block[changing][:, order].T)
        for place, (before, number, after) in enumerate(strides):
            along = by_variant.reshape(before, number, after, len(changing))
            count = np.zeros(len(changing), dtype=np.int64)
            for one in range(number):
                for other in range(one + 1, number):
                    differ = along[:, one] != along[:, other]
                    count += differ.reshape(-1, len(changing)).sum(axis=0)
            changes[start + changing, place] = count
    return changes, pairs


def _codes(states: NDArray[np.generic]) -> NDArray[np.generic]:
    """States that are equal exactly where they count as equal."""
    if not np.issubdtype(states.dtype, np.floating):
        return states
    # Bits instead of values, since NaN differs from itself; adding 0 makes -0.0 the same as 0.0.
    own = states.astype(np.float64) + 0.0
    own[np.isnan(own)] = np.nan
    return own.view(np.int64)


def _strides(crossing: Crossing) -> list[tuple[int, int, int]]:
    """For each setting: combinations of those before it, its alternatives, combinations after."""
    sizes = [len(own.alternatives) for own in crossing.settings]
    return [(prod(sizes[:i]), size, prod(sizes[i + 1 :])) for i, size in enumerate(sizes)]


def _ranks(crossing: Crossing) -> Ints:
    """The place of each variant where the last setting changes fastest; for full crossings."""
    ranks = np.zeros(len(crossing), dtype=np.int64)
    for chosen, (_, _, after) in zip(crossing.choices.T, _strides(crossing), strict=True):
        ranks += chosen * after
    return ranks


def _in_order(crossing: Crossing) -> Ints:
    """The variants in the order where the last setting changes fastest."""
    return np.argsort(_ranks(crossing))


def _alike_but_for(place: int, crossing: Crossing) -> Ints:
    """Numbers of groups of variants that differ in one setting only."""
    if crossing.full:
        return _ranks(crossing) - crossing.choices[:, place] * _strides(crossing)[place][2]
    others = crossing.choices.copy()
    others[:, place] = 0
    groups: Ints = np.unique(others, axis=0, return_inverse=True)[1].reshape(-1)
    return groups


def _one_each(found: int, crossing: Crossing) -> None:
    """Refuse numbers or states that are not one for each variant."""
    if found != len(crossing):
        raise ValueError(f"{len(crossing)} variants, but values or states of {found}")
