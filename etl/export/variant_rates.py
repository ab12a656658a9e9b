"""Rows of ``rates``: every binary outcome in every condition, variant by variant."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.export.arrays import array_of, coded_of, numbers_of
from etl.export.parts import TableParts
from etl.export.writers import TableWriter
from etl.tables import written_schema
from etl.tables.variants import RATES, rate_columns
from etl.variants.conditions import ConditionGroups
from etl.variants.differences import compare, rates

#: About so many rows are made at once.
_ROWS_AT_ONCE: Final = 200_000


@dataclass(frozen=True, slots=True, eq=False)
class RateCounts:
    """Counts of all binary outcomes. V variants, O outcomes, G conditions.

    Attributes
    ----------
    outcomes : tuple of (str, str), length O
        Measure and region; the region is empty for an outcome of trials.
    counts : (V, O, G, 3) int64 array
        Zeros, ones and rows.
    read : (O, G) int64 array
        Rows that there would be if nothing were left out.
    """

    outcomes: tuple[tuple[str, str], ...]
    counts: NDArray[np.int64]
    read: NDArray[np.int64]


def write_rates(
    folder: Path,
    factors: Mapping[str, Sequence[str]],
    groups: ConditionGroups,
    counted: RateCounts,
    formats: Sequence[str],
) -> int:
    """Write ``rates`` into a folder.

    Parameters
    ----------
    folder : Path
        Where it goes.
    factors : mapping of str to sequence of str
        The levels of each factor in order.
    groups : ConditionGroups
        The conditions.
    counted : RateCounts
        All counts.
    formats : sequence of str
        ``parquet``, ``csv``.

    Returns
    -------
    int
        How many rows it has.
    """
    columns = rate_columns(factors)
    parts = TableParts(columns, formats)
    writer = TableWriter(
        columns,
        folder / f"{RATES}.parquet" if "parquet" in formats else None,
        folder / f"{RATES}.csv" if "csv" in formats else None,
        parts.part(None),
    )
    try:
        schema = written_schema(columns)
        for arrays in _batches(factors, groups, counted):
            writer.add(parts.part(pa.RecordBatch.from_arrays(arrays, schema=schema)))
        writer.close()
    finally:
        writer.abandon()
    return writer.rows


def _batches(
    factors: Mapping[str, Sequence[str]], groups: ConditionGroups, counted: RateCounts
) -> Iterator[list[pa.Array]]:
    """The columns of some variants at a time."""
    variants, outcomes, conditions, _ = counted.counts.shape
    at_once = max(1, _ROWS_AT_ONCE // max(1, outcomes * conditions))
    measures = _Texts([measure for measure, _ in counted.outcomes])
    regions = _Texts([region for _, region in counted.outcomes])
    # What has no condition to be compared with has the text that is empty.
    labels = [_spelled(label) for label in groups.labels]
    against = _Texts([labels[place] if place >= 0 else "" for place in groups.reference.tolist()])
    for start in range(0, variants, at_once):
        counts = counted.counts[start : start + at_once]
        some = len(counts)
        shape = (some, outcomes, conditions)
        zeros, ones, rows = (counts[..., slot].ravel() for slot in range(3))
        n = zeros + ones
        rate, low, high = rates(np.stack([zeros, ones], axis=-1))
        reference = np.maximum(groups.reference, 0)
        pairs = np.stack([counts[:, :, reference, :2], counts[..., :2]], axis=-2)
        difference, lower, upper, corrected = compare(pairs)
        compared = np.broadcast_to(groups.reference >= 0, shape).ravel()
        outcome = np.broadcast_to(np.arange(outcomes)[:, None], shape).ravel()
        group = np.broadcast_to(np.arange(conditions), shape).ravel()
        variant = np.repeat(np.arange(start + 1, start + some + 1), outcomes * conditions)

        yield [
            array_of(variant),
            measures.taken(outcome),
            regions.taken(outcome),
            *(
                coded_of(codes[group], pa.array(list(levels), pa.string()))
                for codes, levels in _levels(factors, groups)
            ),
            array_of(rows.copy()),
            array_of(np.broadcast_to(counted.read, shape).ravel() - rows),
            array_of(rows - n),
            array_of(n),
            array_of(ones.copy()),
            *(numbers_of(values) for values in (rate, low, high)),
            against.taken(group),
            *(
                numbers_of(np.where(compared, values.ravel(), np.nan))
                for values in (difference, lower, upper)
            ),
            array_of(corrected.ravel().astype(np.int8), compared & ~np.isnan(difference.ravel())),
        ]


class _Texts:
    """Texts of which many are the same; an empty one is missing.

    Each stands in the list of values once: a file whose list has one twice is not always written in
    the same bytes.
    """

    def __init__(self, texts: Sequence[str]) -> None:
        values = list(dict.fromkeys(text for text in texts if text))
        places = {text: place for place, text in enumerate(values)}
        self._codes = np.array([places.get(text, -1) for text in texts], dtype=np.int32)
        self._values = pa.array(values, pa.string())

    def taken(self, places: NDArray[np.integer]) -> pa.Array:
        """The texts at some places."""
        return coded_of(self._codes[places], self._values)


def _levels(
    factors: Mapping[str, Sequence[str]], groups: ConditionGroups
) -> Iterator[tuple[NDArray[np.int32], Sequence[str]]]:
    """For each factor the code of the level of each condition, -1 where it holds all."""
    for place, levels in enumerate(factors.values()):
        code = {level: number for number, level in enumerate(levels)}
        yield (
            np.array([code.get(label[place], -1) for label in groups.labels], dtype=np.int32),
            levels,
        )


def _spelled(label: Sequence[str]) -> str:
    """A condition in words."""
    return ", ".join(level for level in label if level)
