"""Rows of ``rates`` against a loop over variants, outcomes and conditions, in one batch or many."""

from __future__ import annotations

import csv
import math
from collections.abc import Mapping, Sequence
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.parquet as pq
import pytest

from etl.export import variant_rates
from etl.export.variant_rates import RateCounts, write_rates
from etl.readiness.intervals import Z_95, wilson_interval
from etl.variants.conditions import ConditionGroups, groups_of

#: Levels of the same names in two factors, and one that is called like a level of another.
SAME_NAMES = {"cue": ("no", "yes"), "fit": ("no", "yes"), "frame": ("yes", "odd", "no")}
OUTCOMES = (("went_back", "verb"), ("went_back", "noun"), ("passed_over", "verb"), ("any_skip", ""))


def counts_of(
    factors: Mapping[str, Sequence[str]], variants: int, seed: int
) -> tuple[ConditionGroups, RateCounts]:
    """Counts of a study in which two combinations of levels do not occur; many are 0."""
    source = np.random.default_rng(seed)
    every = [*product(*(range(len(levels)) for levels in factors.values()))]
    combinations = np.array([every[0], *every[3:]] if len(every) > 3 else every, dtype=np.int64)
    combinations = combinations.reshape(max(len(combinations), 1), len(factors))
    groups = groups_of(factors, combinations)
    shape = (variants, len(OUTCOMES), len(combinations))
    zeros, ones, missing, lost = (
        source.integers(0, 30, shape) * (source.random(shape) < 0.6) for _ in range(4)
    )
    read = (zeros + ones + missing + lost).max(axis=0)
    counts = groups.counted(np.stack([zeros, ones, zeros + ones + missing], axis=-1))
    return groups, RateCounts(OUTCOMES, counts, groups.counted(read[..., None])[..., 0])


def rows_of(folder: Path) -> list[dict[str, Any]]:
    """The rows as they were written."""
    return pq.read_table(folder / "rates.parquet").to_pylist()


def difference_of(table: np.ndarray) -> tuple[float, float, float, int] | None:
    """Level against reference: difference, interval, and whether 0.5 was added."""
    (a, b), (c, d) = table.tolist()
    # Where all values are the same nothing is known either.
    if not (a + b and c + d and a + c and b + d):
        return None
    added = 0.5 * (0 in (a, b, c, d))
    a, b, c, d = (own + added for own in (a, b, c, d))
    difference = math.log(d / c) - math.log(b / a)
    half = Z_95 * math.sqrt(1 / a + 1 / b + 1 / c + 1 / d)
    return difference, difference - half, difference + half, int(added > 0)


FACTORS: dict[str, Mapping[str, Sequence[str]]] = {
    "none": {},
    "one": {"cue": ("early", "late", "never")},
    "same names": SAME_NAMES,
}


@pytest.mark.parametrize("factors", FACTORS.values(), ids=FACTORS)
def test_rows_are_those_of_a_loop(
    factors: Mapping[str, Sequence[str]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Every outcome in every condition, variant by variant, also where many batches are made."""
    groups, counted = counts_of(factors, 7, seed=4)
    conditions = len(groups.labels)
    # Two variants at a time, and one left.
    monkeypatch.setattr(variant_rates, "_ROWS_AT_ONCE", 2 * len(OUTCOMES) * conditions + 1)
    written = write_rates(tmp_path, factors, groups, counted, ["parquet"])
    rows = rows_of(tmp_path)
    assert written == len(rows) == 7 * len(OUTCOMES) * conditions
    seen: set[str] = set()
    every = product(range(7), range(len(OUTCOMES)), range(conditions))
    for row, (variant, outcome, group) in zip(rows, every, strict=True):
        own = counted.counts[variant, outcome]
        zeros, ones, there = own[group].tolist()
        n = zeros + ones
        assert (row["variant"], row["measure"], row["region"]) == (
            *(variant + 1, OUTCOMES[outcome][0]),
            OUTCOMES[outcome][1] or None,
        )
        assert [row[name] for name in factors] == [own or None for own in groups.labels[group]]
        lost = int(counted.read[outcome, group]) - there
        assert [row[name] for name in ("rows", "rows_lost", "missing", "n", "ones")] == [
            *(there, lost, there - n, n, ones)
        ]
        rates = [row[name] for name in ("rate", "rate_low", "rate_high")]
        assert rates == ([ones / n, *wilson_interval(ones, n)] if n else [None] * 3)
        reference = int(groups.reference[group])
        compared = [
            row[name] for name in ("difference", "difference_low", "difference_high", "corrected")
        ]
        found = None if reference < 0 else difference_of(own[[reference, group], :2])
        against = ", ".join(own for own in groups.labels[reference] if own)
        assert row["against"] == (against if reference >= 0 else None)
        assert compared == ([None] * 4 if found is None else pytest.approx(found, abs=1e-12))
        both = own[[max(reference, 0), group], :2]
        seen.add(
            "nothing to compare with" * (reference < 0)
            or "no value" * (not both.sum(axis=1).all())
            or "all the same" * (found is None)
            or ("added" if found and found[3] else "plain")
        )
    assert len(seen) == (5 if factors else 1)


@pytest.mark.parametrize("at_once", [1, 100, 250])
def test_many_batches_make_the_same_table_as_one(
    at_once: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One variant at a time, or two or more, with one batch that is not full."""
    groups, counted = counts_of(SAME_NAMES, 11, seed=5)
    formats = ["parquet", "csv"]
    (tmp_path / "one").mkdir()
    (tmp_path / "many").mkdir()
    whole = write_rates(tmp_path / "one", SAME_NAMES, groups, counted, formats)
    monkeypatch.setattr(variant_rates, "_ROWS_AT_ONCE", at_once)
    assert write_rates(tmp_path / "many", SAME_NAMES, groups, counted, formats) == whole
    one, many = (rows_of(tmp_path / name) for name in ("one", "many"))
    assert one == many
    texts = [(tmp_path / name / "rates.csv").read_bytes() for name in ("one", "many")]
    assert texts[0] == texts[1]
    with (tmp_path / "one" / "rates.csv").open(encoding="utf-8", newline="") as file:
        read = [*csv.DictReader(file)]
    assert [row["against"] for row in read] == [row["against"] or "" for row in one]
    assert [int(row["variant"]) for row in read] == [row["variant"] for row in one]


def test_levels_of_the_same_name_stay_with_their_factors(tmp_path: Path) -> None:
    """What a row is of is told by its columns, and what it is compared with by the same columns."""
    groups, counted = counts_of(SAME_NAMES, 1, seed=6)
    write_rates(tmp_path, SAME_NAMES, groups, counted, ["parquet"])
    rows = [row for row in rows_of(tmp_path) if row["measure"] == "any_skip"]
    told = [(*(row[name] for name in SAME_NAMES), row["against"]) for row in rows]
    assert told[:8] == [
        (None, None, None, None),
        *(("no", None, None, None), ("yes", None, None, "no")),
        *((None, "no", None, None), (None, "yes", None, "no")),
        *((None, None, "yes", None), (None, None, "odd", "yes"), (None, None, "no", "yes")),
    ]
    assert told[8] == ("no", "no", "yes", None)
    assert {own[3] for own in told[9:]} == {"no, no, yes"}


def test_study_without_binary_outcomes_has_no_rows(tmp_path: Path) -> None:
    """The table is there, with its columns."""
    groups = groups_of(SAME_NAMES, np.zeros((1, 3), dtype=np.int64))
    width = len(groups.labels)
    counted = RateCounts(
        (), np.zeros((3, 0, width, 3), dtype=np.int64), np.zeros((0, width), dtype=np.int64)
    )
    assert write_rates(tmp_path, SAME_NAMES, groups, counted, ["parquet", "csv"]) == 0
    assert rows_of(tmp_path) == []
    assert pq.read_schema(tmp_path / "rates.parquet").names[:6] == [
        *("variant", "measure", "region", "cue", "fit", "frame")
    ]
    assert len((tmp_path / "rates.csv").read_text(encoding="utf-8").splitlines()) == 1
