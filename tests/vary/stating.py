"""States of cells that are made up, and what loops over them find."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations
from math import prod

import numpy as np
from hypothesis import strategies as st
from numpy.typing import NDArray

from etl.export.changed_cells import LEFT_OUT, NO_VALUE
from etl.session.outcome_work import Cells
from etl.session.variant_states import StateTable, Universe
from etl.tables import MeasureColumn
from etl.variants.facts import Crossing
from tests.variants.making import chosen, crossed

MEASURES = (
    MeasureColumn("went_back", "binary", "", ""),
    MeasureColumn("looks", "count", "", ""),
    MeasureColumn("passed_over", "binary", "", ""),
    MeasureColumn("time_spent", "duration", "ms", ""),
)
BINARY = ("went_back", "passed_over")
COMBINATIONS = 3


@dataclass(frozen=True)
class Readers:
    """As much of a group of readers as is asked for."""

    participants: tuple[str, ...]
    trial_starts: NDArray[np.int64]
    trials: range

    @property
    def reader_of_trial(self) -> NDArray[np.int64]:
        """The reader of each trial."""
        return np.repeat(np.arange(len(self.participants)), np.diff(self.trial_starts))


@dataclass(frozen=True)
class Made:
    """Variants, readers, and a table that is filled."""

    crossing: Crossing
    readers: Readers
    table: StateTable
    #: By measure, variant by variant, what each cell is.
    states: dict[str, list[list[float]]]


def pairs_apart(crossing: Crossing, setting: int) -> list[tuple[int, int]]:
    """Pairs of variants that differ in one setting only."""
    rows = crossing.choices.tolist()
    return [
        (one, other)
        for one, other in combinations(range(len(rows)), 2)
        if [at for at, (a, b) in enumerate(zip(rows[one], rows[other], strict=True)) if a != b]
        == [setting]
    ]


def cases(*, most_trials: int = 6, together: bool | None = None) -> st.SearchStrategy[Made]:
    """Random states of a few trials, with regions counted together or not."""
    return st.builds(
        made,
        st.integers(0, 2**32 - 1),
        st.integers(0, most_trials),
        st.booleans() if together is None else st.just(together),
        st.booleans(),
        st.sampled_from([0.0, 0.1, 0.5, 1.0]),
    )


def made(seed: int, trials: int, together: bool, full: bool, restless: float) -> Made:
    """Variants in any order, trials of several readers, some of no text, and their states.

    Parameters
    ----------
    seed : int
        Of all chances.
    trials : int
        How many there are.
    together : bool
        Whether regions are counted together.
    full : bool
        Whether every combination of alternatives is there.
    restless : float
        The chance that a cell is not the same in all variants.
    """
    source = np.random.default_rng(seed)
    sizes = source.integers(2, 4, source.integers(1, 4)).tolist()
    order = source.permutation(prod(sizes)).tolist()
    crossing = crossed(sizes, order)
    if not full:
        crossing = chosen(crossing.choices[: source.integers(1, len(crossing))].tolist(), sizes)
    base = int(source.integers(len(crossing)))
    crossing = Crossing(crossing.settings, crossing.names, crossing.choices, base)
    readers = int(source.integers(1, 4))
    starts = np.sort([0, trials, *source.integers(0, trials + 1, readers - 1)]).astype(np.int64)
    group = Readers(tuple(f"R{n + 1}" for n in range(readers)), starts, range(trials))
    universe = universe_of(trials, source, together=together)
    table = StateTable(universe, len(crossing), MEASURES)
    states: dict[str, list[list[float]]] = {own.name: [] for own in MEASURES}
    steady = {own.name: values_of(own.kind, len(universe), source) for own in MEASURES}
    moves = {own.name: source.random(len(universe)) < restless for own in MEASURES}
    for variant in range(len(crossing)):
        kept = source.random(trials) > 0.3 * restless
        kept_cells = kept[universe.cells.trial]
        values = {}
        for measure in MEASURES:
            other = values_of(measure.kind, len(universe), source)
            own = np.where(moves[measure.name], other, steady[measure.name])
            values[measure.name] = own[kept_cells]
            states[measure.name].append(
                np.where(kept_cells, np.where(np.isnan(own), NO_VALUE, own), LEFT_OUT).tolist()
            )
        table.fill(variant, kept, values)
    return Made(crossing, group, table, states)


def universe_of(trials: int, source: np.random.Generator, *, together: bool) -> Universe:
    """Trials of up to four regions each, whose names stand in any order."""
    in_study = np.flatnonzero(source.random(trials) < 0.8).astype(np.int64)
    names = [source.permutation(4)[: source.integers(0, 5)] for _ in in_study]
    counts = np.array([len(own) for own in names], dtype=np.int64)
    code = np.concatenate([np.zeros(0, dtype=np.int32), *names]).astype(np.int32)
    order = np.concatenate([np.zeros(0, dtype=np.int32), *(np.arange(n) + 1 for n in counts)])
    cells = Cells(counts, np.repeat(in_study, counts), order.astype(np.int32), code)
    slot = np.zeros(len(code), dtype=np.int64) if together else code.astype(np.int64)
    condition = source.integers(0, COMBINATIONS, trials)
    return Universe(in_study, cells, slot, condition, (1 if together else 4, COMBINATIONS))


def values_of(kind: str, size: int, source: np.random.Generator) -> NDArray[np.float64]:
    """Values of a measure, some of them missing; counts and durations that only wide types hold."""
    drawn = source.integers(0, 2, size).astype(np.float64)
    if kind == "count":
        drawn += source.choice([0, 300, 70_000], size)
    if kind == "duration":
        drawn += source.choice([0.25, 0.5, 1_000.125], size)
    drawn[source.random(size) < 0.2] = np.nan
    return drawn
