"""Variants of a study, and what is known of them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import prod
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Standing = Literal["decided", "around 0", "held", "none"]


@dataclass(frozen=True, slots=True)
class Setting:
    """One decision that is varied.

    Attributes
    ----------
    key : str
        As in the study file, in full: ``screening.fixations.under_ms``.
    alternatives : tuple of str
        Its values as TOML writes them, in the order of the variants file; ``false`` is off.
    base : int
        The place of the study's own value among them.
    """

    key: str
    alternatives: tuple[str, ...]
    base: int


@dataclass(frozen=True, eq=False)
class Crossing:
    """The variants of a study: which alternative of each setting each of them takes.

    Attributes
    ----------
    settings : tuple of Setting, length S
        The decisions.
    names : tuple of str, length V
        What each variant is called; empty where it has no name.
    choices : (V, S) int64 array
        The place of the alternative that each variant takes. No two rows are the same.
    base : int
        Which variant is the study as it stands.
    """

    settings: tuple[Setting, ...]
    names: tuple[str, ...]
    choices: Ints
    base: int

    def __len__(self) -> int:
        return len(self.choices)

    @cached_property
    def full(self) -> bool:
        """Whether every combination of the alternatives is among the variants."""
        return len(self) == prod(len(own.alternatives) for own in self.settings)


@dataclass(frozen=True, slots=True)
class Comparison:
    """Two conditions that are compared in one outcome.

    Attributes
    ----------
    outcome, region : str
        Names; the region is empty for an outcome of trials, and ``(all regions)`` where they are
        counted together.
    factor, level, reference : str
        The level that is compared with the reference level. All three are empty in a study without
        factors: then the rate itself is looked at.
    """

    outcome: str
    region: str
    factor: str
    level: str
    reference: str


@dataclass(frozen=True, eq=False)
class Compared:
    """A comparison over all variants.

    Attributes
    ----------
    comparison : Comparison
        What is compared.
    counts : (V, 2, 2) int64 array
        Zeros and ones (last axis) of the reference and of the level (middle axis). Without factors
        both of the middle axis are the same.
    difference, low, high : (V,) float64 arrays
        Log-odds of the level less those of the reference, with a 95 % interval; NaN where one of
        the two has no value, or all values of both are the same. Without factors the rate, from 0
        to 1, with its interval; NaN where there is no value.
    corrected : (V,) bool array
        Where 0.5 was added to each of the four counts, since one was 0.
    """

    comparison: Comparison
    counts: Ints
    difference: Floats
    low: Floats
    high: Floats
    corrected: Flags


@dataclass(frozen=True, slots=True)
class SettingShare:
    """How much one setting decides about a number.

    Attributes
    ----------
    setting : int
        Which.
    alone : float
        Share of the variance over all variants that the setting explains by itself, from 0 to 1.
    together : float
        The same with all its interactions with other settings: what is left of the variance where
        all other settings are fixed.
    means : tuple of float
        The mean over the variants with each of its alternatives.
    flips : float
        Of all pairs of variants that differ in this setting only, the share whose differences have
        opposite signs, or one of them none.
    """

    setting: int
    alone: float
    together: float
    means: tuple[float, ...]
    flips: float


@dataclass(frozen=True, eq=False)
class Summary:
    """What is to be said of a comparison over all variants.

    Attributes
    ----------
    compared : Compared
        The comparison.
    order : (V,) int64 array
        The variants from the lowest difference to the highest, equal ones as numbered; those
        without one at the end.
    positive, negative, zero, without : int
        How many variants have a difference above 0, below 0, of exactly 0, and none.
    same_sign : int
        How many have the sign of the study as it stands; 0 where that has none.
    clear : int
        How many of these have an interval that leaves out 0.
    shares : tuple of SettingShare
        By setting; empty where not every combination is there, a variant has no difference, or
        all are the same.
    matters : int or None
        The setting that decides most about the difference (by ``together``); None without shares.
    turns : int or None
        The setting whose choice turns the sign most often; None where no pair differs in sign.
    clears : int or None
        The setting whose choice most often decides whether the interval leaves out 0, or on which
        side it lies; None where no pair differs in that.
    """

    compared: Compared
    order: Ints
    positive: int
    negative: int
    zero: int
    without: int
    same_sign: int
    clear: int
    shares: tuple[SettingShare, ...]
    matters: int | None
    turns: int | None
    clears: int | None = None

    @property
    def holds(self) -> bool:
        """Whether all variants have the sign of the study as it stands."""
        return self.same_sign == len(self.order)

    @cached_property
    def side(self) -> Floats:
        """(V,) float64 array: 1 and -1 where the interval lies above or below 0, 0 around it.

        NaN where there is no difference.
        """
        own = self.compared
        side: Floats = np.where(own.low > 0, 1.0, 0.0) - np.where(own.high < 0, 1.0, 0.0)
        return np.where(np.isnan(own.difference), np.nan, side)

    @cached_property
    def apart(self) -> int:
        """How many variants have an interval that leaves out 0, on whichever side."""
        return int((np.abs(self.side) > 0).sum())

    @property
    def standing(self) -> Standing:
        """What the decisions do to the comparison.

        Looked at are the variants that have a difference. ``decided``: whether the interval leaves
        out 0 hangs on them, or on which side it lies. ``around 0``: no interval leaves out 0, and
        the sign is not the same in all. ``none``: no variant has a difference. ``held``: everything
        else, and all rates.
        """
        there = len(self.order) - self.without
        if not there:
            return "none"
        if not self.compared.comparison.factor:
            return "held"
        one_sign = there in (self.positive, self.negative, self.zero)
        if 0 < self.apart < there or (self.apart and not one_sign):
            return "decided"
        return "held" if one_sign else "around 0"


@dataclass(frozen=True, eq=False)
class Change:
    """Cells of ``outcomes`` that are not the same in all variants: one measure in one region.

    A cell is a reader's trial, a region and a measure. It has a value, or none for a reason, or is
    not there because the trial or reader is left out; it changes where any of this does.

    Attributes
    ----------
    measure, kind, region : str
        Names, and ``binary``, ``count`` or ``duration``.
    cells : int
        Cells that are there in any variant.
    changed : int
        Those that are not the same in all variants.
    trials : int
        Trials that these are of.
    changed_by : (V,) int64 array
        For each variant how many cells are not as in the study as it stands.
    trials_by : (V,) int64 array
        Trials that these are of.
    hangs : (S,) float64 array
        For each setting: the chance that a cell changes when only this setting is chosen anew; over
        all cells, and all pairs of variants that differ in nothing else. Without values (NaN) where
        not every combination is there.
    """

    measure: str
    kind: str
    region: str
    cells: int
    changed: int
    trials: int
    changed_by: Ints
    trials_by: Ints
    hangs: Floats
