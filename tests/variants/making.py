"""Crossings and comparisons made up for tests."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import product
from math import prod

import numpy as np
from hypothesis import strategies as st

from etl.variants.differences import compared
from etl.variants.facts import Comparison, Crossing, Floats, Setting, Summary
from etl.variants.summaries import summarise

FIT = Comparison("first_pass_regression_out", "verb", "fit", "odd", "fitting")
RATE = Comparison("first_pass_regression_out", "verb", "", "", "")


def crossed(sizes: Sequence[int], order: Sequence[int] | None = None) -> Crossing:
    """All combinations of so many alternatives, the last setting changing fastest, or shuffled."""
    rows = list(product(*map(range, sizes)))
    return chosen([rows[i] for i in order] if order is not None else rows, sizes)


def chosen(
    rows: Sequence[Sequence[int]],
    sizes: Sequence[int],
    *,
    keys: Sequence[str] = (),
    named: bool = False,
) -> Crossing:
    """Variants by the alternatives that they take."""
    settings = tuple(
        Setting(keys[s] if keys else f"setting_{s}", tuple(str(a) for a in range(size)), 0)
        for s, size in enumerate(sizes)
    )
    names = tuple(f"variant {v}" if named else "" for v in range(len(rows)))
    return Crossing(settings, names, np.array(rows, dtype=np.int64), 0)


@st.composite
def full_crossings(draw: st.DrawFn) -> Crossing:
    """Small crossings of all sorts, with variants in any order."""
    sizes = draw(st.lists(st.integers(1, 4), min_size=1, max_size=4))
    return crossed(sizes, draw(st.permutations(range(prod(sizes)))))


@st.composite
def valued(draw: st.DrawFn) -> tuple[Crossing, Floats]:
    """A crossing with a number for each variant, often the same one."""
    crossing = draw(full_crossings())
    numbers = st.sampled_from([-1.0, 0.0, 0.5, 2.0]) | st.floats(-10, 10)
    values = draw(st.lists(numbers, min_size=len(crossing), max_size=len(crossing)))
    return crossing, np.array(values)


def summary_of(
    tables: Sequence[Sequence[int]], crossing: Crossing, comparison: Comparison = FIT
) -> Summary:
    """A summary of four counts a variant: zeros and ones of the reference, then of the level."""
    counts = np.array(tables, dtype=np.int64).reshape(-1, 2, 2)
    return summarise(compared(comparison, counts), crossing)
