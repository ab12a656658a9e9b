"""Rows of made-up studies: as counts, and as finished tables."""

from __future__ import annotations

import random
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pytest

from etl.coding import Coding, coding_of
from etl.export import parts
from etl.export.writers import TableWriters
from etl.readiness import Conditions, OutcomeCounts, UnitCells, outcome_readiness
from etl.readiness.facts import OutcomeReadiness
from etl.tables import IdColumn, MeasureColumn, TableDesign, written_schema

#: A reader, an item (or None), the level of each factor, and 0, 1 or None.
Row = tuple[str, str | None, tuple[str, ...], int | None]


def counts_of(
    factors: dict[str, Sequence[str]],
    rows: Iterable[Row],
    *,
    outcome: str = "regression_out",
    region: str = "verb",
    items: bool = True,
) -> OutcomeCounts:
    """Counts of one outcome, one row after the other."""
    rows = list(rows)
    conditions = list(product(*factors.values()))
    cells = np.zeros((len(conditions), 3), dtype=np.int64)
    for _, _, levels, value in rows:
        cells[conditions.index(levels), 2 if value is None else value] += 1
    units = []
    for unit, place in (("participant", 0), ("item", 1)) if items else (("participant", 0),):
        names = sorted({str(row[place]) for row in rows if row[place] is not None})
        pairs: dict[tuple[int, int], list[int]] = {}
        for row in rows:
            if row[3] is not None and row[place] is not None:
                key = (names.index(str(row[place])), conditions.index(row[2]))
                pairs.setdefault(key, [0, 0])[row[3]] += 1
        keys = sorted(pairs)
        units.append(
            UnitCells(
                unit,
                np.array([key[0] for key in keys], dtype=np.int64),
                np.array([key[1] for key in keys], dtype=np.int64),
                np.array([pairs[key] for key in keys], dtype=np.int64).reshape(-1, 2),
            )
        )
    levels = tuple(tuple(own) for own in factors.values())
    codes = [[own.index(level) for own, level in zip(levels, c, strict=True)] for c in conditions]
    array = np.array(codes, dtype=np.int64).reshape(len(conditions), len(levels))
    return OutcomeCounts(
        outcome, region, Conditions(tuple(factors), levels, array), cells, tuple(units)
    )


def judged(
    factors: dict[str, Sequence[str]],
    rows: Iterable[Row],
    codings: dict[str, Coding] | None = None,
    **told: Any,
) -> OutcomeReadiness:
    """The facts of one outcome; factors are treatment-coded unless told otherwise."""
    own = {name: coding_of(name, levels) for name, levels in factors.items()}
    return outcome_readiness(counts_of(factors, rows, **told), {**own, **(codings or {})})


def crossed(
    factors: dict[str, Sequence[str]],
    readers: int,
    items: int,
    *,
    seed: int = 1,
    share: float = 0.3,
) -> list[Row]:
    """Every reader reads every item once; conditions rotate over both, so all are within both."""
    source = random.Random(seed)
    conditions = list(product(*factors.values()))
    return [
        (f"P{reader}", f"i{item}", conditions[(reader + item) % len(conditions)], value)
        for reader in range(readers)
        for item in range(items)
        for value in [int(source.random() < share)]
    ]


@dataclass
class MadeStudy:
    """Rows of two tables, from which naive counts can be made."""

    design: TableDesign
    wide: list[dict[str, Any]] = field(default_factory=list)
    trials: list[dict[str, Any]] = field(default_factory=list)


def design_of(
    ids: dict[str, Sequence[str]],
    factors: dict[str, Sequence[str]],
    regions: Sequence[str],
    outcomes: Sequence[str] = ("first_pass_skip", "regression_out"),
    trial_outcomes: Sequence[str] = ("any_skip",),
) -> TableDesign:
    """The tables of a study with binary outcomes, and a count that nobody is to count here."""
    binary = [MeasureColumn(name, "binary", "0 or 1", "1 if …") for name in outcomes]
    of_trials = [MeasureColumn(name, "binary", "0 or 1", "1 if …") for name in trial_outcomes]
    number = MeasureColumn("fixation_count", "count", "count", "Number of …")
    return TableDesign(
        {name: IdColumn.of(values) for name, values in ids.items()},
        {name: tuple(levels) for name, levels in factors.items()},
        {},
        tuple(regions),
        (*binary, number),
        (*of_trials, number),
        ("", "not_reached"),
        (),
        (),
    )


def random_study(seed: int, *, regions: int = 3) -> MadeStudy:
    """Few readers and items, some factors, holes and constant units, in any design."""
    source = random.Random(seed)
    numbered = source.random() < 0.3
    readers = [str(n) if numbered else f"P{n}" for n in range(1, source.randint(1, 7) + 1)]
    items = [f"s{n}" for n in range(source.randint(1, 6))] if source.random() < 0.8 else []
    factors = {
        f"f{n}": [f"l{k}" for k in range(source.randint(1, 3))] for n in range(source.randint(0, 3))
    }
    names = [f"r{n}" for n in range(regions)]
    source.shuffle(names)
    ids = {"participant": readers, "trial": [str(n) for n in range(1, 20)]}
    study = MadeStudy(design_of({**ids, **({"item": items} if items else {})}, factors, names))
    rates = {reader: source.choice([0.0, 0.2, 0.5, 1.0]) for reader in readers}
    between = [name for name in factors if source.random() < 0.3]
    own = {(reader, f): source.choice(factors[f]) for reader in readers for f in between}
    for reader in readers:
        for trial in range(1, source.randint(1, 12)):
            key: dict[str, Any] = {"participant": int(reader) if numbered else reader}
            key["trial"] = trial
            if items:
                key["item"] = source.choice([*items, None])
            for name, levels in factors.items():
                key[name] = own.get((reader, name)) or source.choice(levels)
            count = {"fixation_count": source.randint(0, 9)}
            row = {"any_skip": _value(source, rates[reader]), "missing": None}
            study.trials.append({**key, **row, **count})
            for order, region in enumerate(names, start=1):
                skip, out = (_value(source, rates[reader]) for _ in range(2))
                values = {"first_pass_skip": skip, "regression_out": None if order == 1 else out}
                place = {"region": region, "region_order": order}
                study.wide.append({**key, **place, **values, **count})
    return study


def _value(source: random.Random, rate: float) -> int | None:
    """0, 1 or missing."""
    return None if source.random() < 0.2 else int(source.random() < rate)


def write_study(study: MadeStudy, folder: Path, patch: pytest.MonkeyPatch | None = None) -> None:
    """Write both tables as a build does, a batch for each reader; small row groups if patched."""
    if patch is not None:
        patch.setattr(parts, "CELLS_A_GROUP", 60)
    formats = {"outcomes_wide": ("parquet",), "trials": ("parquet",)}
    maker = parts.PartMaker(study.design, formats)
    with TableWriters(folder, study.design, formats) as out:
        readers = dict.fromkeys(row["participant"] for row in study.trials)
        for reader in readers:
            batches = {}
            for name, rows in (("outcomes_wide", study.wide), ("trials", study.trials)):
                schema = written_schema(study.design.columns(name))
                own = [row for row in rows if row["participant"] == reader]
                batches[name] = pa.RecordBatch.from_pylist(own, schema=schema)
            out.add(maker.parts(batches))
