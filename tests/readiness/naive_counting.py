"""Counts of a made-up study by loops over its rows, straight from what is to be counted."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

Rows = Sequence[dict[str, Any]]


def tally(rows: Rows, outcome: str) -> tuple[int, int, int]:
    """Zeros, ones, missing."""
    values = [row[outcome] for row in rows]
    return values.count(0), values.count(1), values.count(None)


def constant(rows: Rows, outcome: str, unit: str) -> tuple[int, int, int]:
    """Units with any value, with zeros only, with ones only."""
    own: dict[Any, set[int]] = {}
    for row in rows:
        if row.get(unit) is not None and row[outcome] is not None:
            own.setdefault(row[unit], set()).add(row[outcome])
    values = list(own.values())
    return len(values), values.count({0}), values.count({1})


def varies(rows: Rows, outcome: str, unit: str, factor: str) -> tuple[int, int]:
    """In how many of the units with a value a factor has two levels or more."""
    own: dict[Any, list[str]] = {}
    for row in rows:
        if row.get(unit) is not None and row[outcome] is not None:
            own.setdefault(row[unit], []).append(row[factor])
    return sum(len(set(levels)) > 1 for levels in own.values()), len(own)


def both_vary(rows: Rows, outcome: str, unit: str, factors: tuple[str, str]) -> tuple[int, int]:
    """The same for an interaction of two factors, by going round in squares.

    An interaction can be told from main effects where combinations of levels form a closed way
    that turns at each: as a graph of first levels and second levels, with an edge for each
    combination, it has a cycle.
    """
    own: dict[Any, list[tuple[str, str]]] = {}
    for row in rows:
        if row.get(unit) is not None and row[outcome] is not None:
            own.setdefault(row[unit], []).append((row[factors[0]], row[factors[1]]))
    return sum(_cycle(set(pairs)) for pairs in own.values()), len(own)


def _cycle(edges: set[tuple[str, str]]) -> bool:
    """Whether edges between two kinds of points have a cycle: take away loose ends till none is."""
    edges = set(edges)
    while True:
        loose = {
            edge
            for edge in edges
            if sum(edge[0] == other[0] for other in edges) == 1
            or sum(edge[1] == other[1] for other in edges) == 1
        }
        if not loose:
            return bool(edges)
        edges -= loose
