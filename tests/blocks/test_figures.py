"""Middles and spans of a log in blocks are those of the log, to the last bit."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import pairwise

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.session.block_figures import Sketch, block_figures, joined_figures
from etl.session.log_figures import figures_of

Floats = NDArray[np.float64]


def made(rows: int, trials: int, seed: int) -> CanonicalLog:
    """Fixations of some trials, some without a position."""
    rng = np.random.default_rng(seed)
    trial = np.sort(rng.integers(0, trials, rows)).astype(np.int32)
    coarse = rng.choice([1.0, 40.0])
    absent = rng.random(rows) < rng.choice([0.0, 0.3, 1.0])
    x_px = np.where(absent, np.nan, np.round(rng.normal(800, 300, rows) / coarse) * coarse)
    nowhere = np.full(rows, np.nan)
    onset = np.cumsum(rng.integers(-20, 400, rows)).astype(np.float64)
    return CanonicalLog(
        {
            "participant": Coded.constant("P01", rows),
            "trial": Coded(trial, tuple(str(number) for number in range(trials))),
        },
        {},
        nowhere if rng.random() < 0.2 else onset,
        nowhere,
        rng.integers(1, 30, rows) * coarse,
        x_px,
        nowhere,
        None,
        np.arange(rows, dtype=np.int32) + 2,
        np.zeros(rows, dtype=bool),
        np.full(rows, -1, dtype=np.int32),
    )


@given(
    rows=st.integers(1, 300),
    trials=st.integers(1, 9),
    cuts=st.lists(st.integers(1, 299), max_size=6),
    points=st.integers(2, 40),
    seed=st.integers(0, 10**6),
)
def test_figures_of_blocks(
    rows: int, trials: int, cuts: Sequence[int], points: int, seed: int
) -> None:
    """Wherever a log is cut, and however rough the sketches are."""
    log = made(rows, trials, seed)
    bounds = sorted({0, rows, *(cut for cut in cuts if cut < rows)})
    blocks = [log.take(np.arange(a, b)) for a, b in pairwise(bounds)]
    measured = [block_figures(block, points) for block in blocks]

    def values(name: str) -> Iterator[Floats]:
        for block, (_, steps) in zip(blocks, measured, strict=True):
            yield steps if name == "steps" else getattr(block, name)

    joined = joined_figures([figures for figures, _ in measured], (1, trials), values)
    assert repr(joined) == repr(figures_of(log, 1, trials))


@given(
    values=st.lists(st.floats(-1e6, 1e6), max_size=200),
    limits=st.lists(st.floats(-1e6, 1e6), min_size=1, max_size=20),
)
def test_sketch_bounds_what_it_stands_for(values: list[float], limits: list[float]) -> None:
    """How many values lie up to a limit is between what a sketch says at least and at most."""
    own, at = np.array(values), np.sort(np.array(limits))
    sketch = Sketch.of(own)
    true = np.array([(own <= limit).sum() for limit in at])
    assert (sketch.fewest(at) <= true).all()
    assert (sketch.most(at) >= true).all()
