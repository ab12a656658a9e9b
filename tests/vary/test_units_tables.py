"""Tables on variants against one another, and against builds where nothing else tells of them."""

from __future__ import annotations

import math
import tomllib
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

import etl
from etl.screening.rules import READER_RULES
from etl.session.varied import Varied
from tests.vary.otherwise import (
    Alternatives,
    Built,
    Choice,
    as_toml,
    changed,
    few_readers,
    variants_file,
)
from tests.vary.test_against_builds import assert_as_built

#: Decisions at all levels; the study's own value stands second where it can. The limits are such
#: that readers are lost, and that values are far from others.
SOME: Alternatives = {
    "screening.fixations.under_ms": [False, 80],
    "regions.tolerance_px": [0, 25],
    "screening.participants.correct_share_under": [0.75, 0.93],
    "screening.values.outlier_sd": [False, 1.5],
}
KEYS = ["measure", "region", "factor", "level", "reference"]


@pytest.fixture(scope="module")
def orchard(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Five readers of the orchard study."""
    return few_readers("orchard", tmp_path_factory.mktemp("tables"), ["logs/P0[1-5]*"])


@pytest.fixture(scope="module")
def varied(orchard: Path) -> Varied:
    """Sixteen variants of them."""
    return etl.vary(
        etl.load_study(orchard), variants_file(orchard.with_name("variants.toml"), SOME)
    )


def plain(table: pd.DataFrame) -> list[dict[str, Any]]:
    """Rows with None for what is empty."""
    rows: list[dict[str, Any]] = table.astype(object).where(table.notna(), None).to_dict("records")
    return rows


def rates_of(varied: Varied) -> dict[tuple[Any, ...], dict[str, Any]]:
    """Rows of ``rates`` by variant, measure, region, factor and level; of single factors only."""
    found = {}
    factors = ("cue", "fit", "group")
    for row in plain(varied.table("rates")):
        levels = [(name, row[name]) for name in factors if row[name]]
        if len(levels) < 2:
            own = levels[0] if levels else ("", "")
            found[(row["variant"], row["measure"], row["region"], *own)] = row
    return found


def close(value: float | None) -> Any:
    """The same number but for its last place, which is read from CSV files now so, now so."""
    return None if value is None else pytest.approx(value, abs=1e-12)


def apart(low: float | None, high: float | None) -> int | None:
    """On which side of 0 an interval lies; 0 around it, None where there is none."""
    if low is None or high is None:
        return None
    return int(low > 0) - int(high < 0)


def most_often(values: list[Any], varied: Varied) -> str | None:
    """The setting whose choice changes these most often, of pairs that have them both."""
    choices = varied.crossing.choices.tolist()
    shares = []
    for at in range(len(varied.crossing.settings)):
        pairs = [
            values[one] != values[other]
            for one, other in combinations(range(len(choices)), 2)
            if [n for n in range(len(choices[0])) if choices[one][n] != choices[other][n]] == [at]
            and None not in (values[one], values[other])
        ]
        shares.append(sum(pairs) / max(len(pairs), 1))
    most = shares.index(max(shares))
    return varied.crossing.settings[most].key if shares[most] > 0 else None


def test_comparisons_are_those_of_rates(varied: Varied) -> None:
    """Ends with their variants, signs, intervals apart from 0, and what hangs on what."""
    rates = rates_of(varied)
    variants = range(1, len(varied.crossing) + 1)
    told: dict[str, set[Any]] = {"turns_with": set(), "clears_with": set(), "without": set()}
    for row in plain(varied.table("comparisons")):
        own = [
            rates[v, row["measure"], row["region"], row["factor"], row["level"]] for v in variants
        ]
        values = [one["difference"] for one in own]
        assert row["in_study"] == close(values[0])
        assert (row["in_study_low"], row["in_study_high"]) == (
            *map(close, (own[0]["difference_low"], own[0]["difference_high"])),
        )
        known = [value for value in values if value is not None]
        assert row["without"] == len(values) - len(known)
        assert (row["positive"], row["negative"], row["zero"]) == (
            *(sum(v > 0 for v in known), sum(v < 0 for v in known), known.count(0)),
        )
        if known:
            assert (row["lowest"], row["highest"]) == (close(min(known)), close(max(known)))
            assert row["lowest_variant"] == values.index(min(known)) + 1
            assert values[int(row["highest_variant"]) - 1] == max(known)
        else:
            assert row["lowest"] is row["lowest_variant"] is row["highest_variant"] is None
        sides = [apart(one["difference_low"], one["difference_high"]) for one in own]
        same = [v is not None and v * (values[0] or 0) > 0 for v in values]
        assert row["same_sign"] == sum(same)
        assert row["clear"] == sum(
            bool(s) for s, is_same in zip(sides, same, strict=True) if is_same
        )
        assert row["clears_with"] == most_often(sides, varied)
        assert row["turns_with"] == most_often(
            [None if v is None else np.sign(v) for v in values], varied
        )
        for name, values_of in told.items():
            values_of.add(row[name])
    # There are comparisons of every sort, so that nothing above goes without saying.
    assert all(len(values) > 1 for values in told.values())
    assert any(
        row["turns_with"] != row["clears_with"] for row in plain(varied.table("comparisons"))
    )


def test_decisions_are_those_of_rates(varied: Varied) -> None:
    """The mean with each alternative, which is the study's own, and the share that decides most."""
    rates = rates_of(varied)
    decided = {
        tuple(row[key] for key in KEYS): (row["decides_most"], row["decides_share"])
        for row in plain(varied.table("comparisons"))
    }
    rows = plain(varied.table("decisions"))
    settings = varied.crossing.settings
    most: dict[tuple[Any, ...], list[tuple[float, str]]] = {}
    for row in rows:
        at = [own.key for own in settings].index(row["setting"])
        place = settings[at].alternatives.index(str(row["alternative"]))
        assert row["in_study"] == (place == settings[at].base)
        chosen = [
            rates[v + 1, row["measure"], row["region"], row["factor"], row["level"]]["difference"]
            for v in np.flatnonzero(varied.crossing.choices[:, at] == place).tolist()
        ]
        assert row["mean"] == pytest.approx(np.mean(chosen), abs=1e-12)
        most.setdefault(tuple(row[key] for key in KEYS), []).append(
            (row["together"], row["setting"])
        )
    assert {own.base for own in settings} == {0, 1}
    for key, shares in most.items():
        largest = max(share for share, _ in shares)
        assert decided[key] == next((name, share) for share, name in shares if share == largest)
    assert all((decided[key][0] is not None) == (key in most) for key in decided)


def test_what_screening_leaves_out_and_what_is_there_are_all_there_is(varied: Varied) -> None:
    """Rows and rows lost add up to the same in every variant; some are lost."""
    rates = varied.table("rates")
    rates["all"] = rates.rows + rates.rows_lost
    names = ["measure", "region", "cue", "fit", "group"]
    whole = rates.groupby(names, dropna=False)["all"].nunique()
    assert (whole == 1).all()
    assert rates.rows_lost.min() == 0
    assert rates.rows_lost.max() > 0
    assert rates["all"].min() >= 0


def test_readers_are_those_of_changed_cells(varied: Varied) -> None:
    """Cells of binary outcomes, how many change, and how often with each setting."""
    kinds = varied.table("changes").drop_duplicates("measure").set_index("measure").kind
    cells = varied.table("changed_cells")
    binary = cells[cells.measure.map(kinds) == "binary"]
    readers = plain(varied.table("readers"))
    settings = [own.key for own in varied.crossing.settings]
    assert [row["setting"] for row in readers] == settings * (len(readers) // len(settings))
    # Also cells of trials that no variant keeps.
    rates = varied.table("rates")
    rates = rates[(rates.variant == 1) & rates.region.notna()]
    whole = rates[rates[["cue", "fit", "group"]].isna().all(axis=1)]
    every = int((whole.rows + whole.rows_lost).sum())
    assert sum(row["cells"] for row in readers) == every * len(settings)
    columns = [name for name in cells.columns if name.startswith("hangs_on_")]
    seen = set()
    for row in readers:
        own = binary[binary.participant == row["participant"]]
        assert row["cells_changed"] == len(own) <= row["cells"]
        column = columns[settings.index(row["setting"])]
        assert row["chance"] == pytest.approx(own[column].sum() / row["cells"], abs=1e-12)
        seen.add(row["chance"])
    assert len(seen) > len(settings)


@pytest.mark.parametrize("number", [0, 6, 15])
def test_variant_is_as_built_to_its_readers_and_far_values(
    number: int, orchard: Path, varied: Varied, tmp_path: Path
) -> None:
    """Readers of whom a trial is kept, those whom rules leave out, and values set missing."""
    choice: Choice = {
        own.key: tomllib.loads(f"value = {own.alternatives[place]}")["value"]
        for own, place in zip(
            varied.crossing.settings, varied.crossing.choices[number].tolist(), strict=True
        )
    }
    other = orchard.with_name("other.toml")
    data = tomllib.loads(orchard.read_text(encoding="utf-8"))
    other.write_text(as_toml(changed(data, choice)), encoding="utf-8", newline="\n")
    result = etl.build(etl.load_study(other), into=tmp_path / "out", keep=False)
    accounts = pd.read_csv(tmp_path / "out" / "accounts.csv")
    factors = ("cue", "fit", "group")
    built = Built(result.outcomes, result.trials, accounts, factors)
    assert_as_built(varied, number + 1, built)
    trials = accounts[(accounts.unit == "trials") & (accounts.participant != "(all)")]
    rules = [rule for rule in READER_RULES if rule in trials]
    row = varied.table("variants").iloc[number]
    assert row.readers_kept == (trials.kept > 0).sum()
    assert row.readers_lost == (trials[rules].sum(axis=1) > 0).sum()
    assert row.values_set_missing == (result.outcomes.missing == "outlier").sum()
    every = varied.table("variants")
    assert len({*every.readers_lost}) > 1
    assert len({*every.values_set_missing}) > 2
    assert math.isclose(every.study.sum(), 1)
    assert every.study.iloc[0] == 1
