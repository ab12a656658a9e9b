"""Conditions that are counted and compared: all trials, each level of a factor, combinations."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from etl.variants.facts import Flags, Ints


@dataclass(frozen=True, eq=False)
class ConditionGroups:
    """Sets of combinations of levels.

    Attributes
    ----------
    labels : tuple of tuple of str, length G
        For each, the level of every factor; empty where it holds all levels.
    members : (G, combinations) bool array
        The combinations that belong to each.
    reference : (G,) int64 array
        What each is compared with: a level with the first level of its factor, a combination with
        that of all first levels; -1 for nothing.
    """

    labels: tuple[tuple[str, ...], ...]
    members: Flags
    reference: Ints

    def counted(self, counts: Ints) -> Ints:
        """Counts by combination as counts by group.

        Parameters
        ----------
        counts : (..., combinations, k) int64 array

        Returns
        -------
        (..., G, k) int64 array
        """
        counted: Ints = np.einsum("gc,...ck->...gk", self.members.astype(np.int64), counts)
        return counted


def groups_of(factors: Mapping[str, Sequence[str]], combinations: Ints) -> ConditionGroups:
    """The conditions of a study.

    Parameters
    ----------
    factors : mapping of str to sequence of str
        The levels of each factor, the reference level first.
    combinations : (combinations, factors) int64 array
        The combinations of levels that occur, ascending.

    Returns
    -------
    ConditionGroups
        All together; each level of each factor; with two factors or more each combination.

    Examples
    --------
    >>> groups = groups_of({"cue": ["early", "late"]}, np.array([[0], [1]]))
    >>> groups.labels, groups.reference.tolist()
    ((('',), ('early',), ('late',)), [-1, -1, 1])
    """
    names = list(factors)
    labels = [("",) * len(names)]
    members = [np.ones(len(combinations), dtype=bool)]
    reference = [-1]
    for place, name in enumerate(names):
        first = len(labels)
        for code, level in enumerate(factors[name]):
            labels.append(tuple(level if own == place else "" for own in range(len(names))))
            members.append(combinations[:, place] == code)
            reference.append(first if code else -1)
    if len(names) > 1:
        first = len(labels)
        there = len(combinations) > 0 and not combinations[0].any()
        for row, codes in enumerate(combinations.tolist()):
            labels.append(
                tuple(factors[name][code] for name, code in zip(names, codes, strict=True))
            )
            members.append(np.arange(len(combinations)) == row)
            reference.append(first if there and row else -1)
    return ConditionGroups(tuple(labels), np.array(members), np.array(reference, dtype=np.int64))


def comparisons_of(factors: Mapping[str, Sequence[str]]) -> list[tuple[str, int, int]]:
    """Every level that is compared with the reference level of its factor.

    Parameters
    ----------
    factors : mapping of str to sequence of str
        The levels of each factor, the reference level first.

    Returns
    -------
    list of (str, int, int)
        Factor, and by the groups of :func:`groups_of` those of the level and of the reference
        level. In a study without factors one entry without a name, for all trials.

    Examples
    --------
    >>> comparisons_of({"cue": ["early", "late"]})
    [('cue', 2, 1)]
    """
    if not factors:
        return [("", 0, 0)]
    found = []
    at = 1
    for name, levels in factors.items():
        found += [(name, at + code, at) for code in range(1, len(levels))]
        at += len(levels)
    return found
