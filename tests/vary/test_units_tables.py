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
from tests.vary.labelled import BY_HAND, STUDY, labelled_study
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


def changing(values: list[Any], at: int, varied: Varied) -> float:
    """How often choosing a setting anew changes these, of pairs that have them both."""
    choices = varied.crossing.choices.tolist()
    pairs = [
        values[one] != values[other]
        for one, other in combinations(range(len(choices)), 2)
        if [n for n in range(len(choices[0])) if choices[one][n] != choices[other][n]] == [at]
        and None not in (values[one], values[other])
    ]
    return sum(pairs) / max(len(pairs), 1)


def most_often(values: list[Any], varied: Varied) -> str | None:
    """The setting whose choice changes these most often."""
    settings = varied.crossing.settings
    shares = [changing(values, at, varied) for at in range(len(settings))]
    most = shares.index(max(shares))
    return settings[most].key if shares[most] > 0 else None


def test_comparisons_are_those_of_rates(varied: Varied) -> None:
    """Ends with their variants, signs, intervals apart from 0, and what hangs on what."""
    rates = rates_of(varied)
    variants = range(1, len(varied.crossing) + 1)
    told: dict[str, set[Any]] = {
        name: set() for name in ("turns_with", "clears_with", "without", "leaves_out_0")
    }
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
        assert row["leaves_out_0"] == sum(map(bool, sides))
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
    """A row for each comparison, setting and alternative, also where there are no shares."""
    rates = rates_of(varied)
    comparisons = plain(varied.table("comparisons"))
    rows = plain(varied.table("decisions"))
    settings, choices = varied.crossing.settings, varied.crossing.choices
    expected = [
        (*(own[key] for key in KEYS), setting.key, alternative)
        for own in comparisons
        for setting in settings
        for alternative in setting.alternatives
    ]
    assert expected == [
        (*(row[key] for key in KEYS), row["setting"], str(row["alternative"])) for row in rows
    ]
    assert {own.base for own in settings} == {0, 1}
    decided = {tuple(own[key] for key in KEYS): own for own in comparisons}
    seen: dict[str, set[Any]] = {"without": set(), "leaves_out_0": set(), "clears": set()}
    for row in rows:
        at = [own.key for own in settings].index(row["setting"])
        place = settings[at].alternatives.index(str(row["alternative"]))
        assert row["in_study"] == (place == settings[at].base)
        own = [
            rates[v, row["measure"], row["region"], row["factor"], row["level"]]
            for v in range(1, len(varied.crossing) + 1)
        ]
        values = [one["difference"] for one in own]
        sides = [apart(one["difference_low"], one["difference_high"]) for one in own]
        chosen = np.flatnonzero(choices[:, at] == place).tolist()
        known = [values[v] for v in chosen if values[v] is not None]
        assert row["variants"] == len(chosen) == len(choices) // 2
        assert row["without"] == len(chosen) - len(known)
        assert row["mean"] == (pytest.approx(np.mean(known), abs=1e-12) if known else None)
        assert row["leaves_out_0"] == sum(bool(sides[v]) for v in chosen)
        signs = [None if value is None else np.sign(value) for value in values]
        assert row["turns"] == pytest.approx(changing(signs, at, varied), abs=1e-12)
        assert row["clears"] == pytest.approx(changing(sides, at, varied), abs=1e-12)
        shares = (None, None) if None in values else shares_of(np.array(values), at, choices)
        assert (row["alone"], row["together"]) == (*map(close, shares),)
        whole = decided[tuple(row[key] for key in KEYS)]
        if whole["decides_most"] == row["setting"]:
            assert row["together"] == close(whole["decides_share"])
        for name, values_of in seen.items():
            values_of.add(row[name])
    # There are rows of every sort, so that nothing above goes without saying.
    assert all(len(values) > 1 for values in seen.values())
    assert {row["together"] is None for row in rows} == {True, False}


def test_setting_named_is_the_one_with_the_largest_share(varied: Varied) -> None:
    """The first of equal ones; none where there are no shares."""
    rows = plain(varied.table("decisions"))
    for own in plain(varied.table("comparisons")):
        shares = {
            row["setting"]: row["together"]
            for row in rows
            if all(row[key] == own[key] for key in KEYS)
        }
        assert len(shares) == len(varied.crossing.settings)
        if None in shares.values():
            assert {*shares.values()} == {None}
            assert own["decides_most"] is own["decides_share"] is None
        else:
            assert own["decides_most"] == max(shares, key=lambda key: shares[key])


def shares_of(
    values: np.ndarray, at: int, choices: np.ndarray
) -> tuple[float, float] | tuple[None, None]:
    """What a setting of two alternatives explains alone, and together with all others."""
    if (values == values[0]).all():
        return None, None
    alone = np.var([values[choices[:, at] == place].mean() for place in range(2)])
    others = np.delete(choices, at, axis=1)
    left = [values[(others == row).all(axis=1)].var() for row in np.unique(others, axis=0)]
    return float(alone / values.var()), float(np.mean(left) / values.var())


def test_rates_have_no_signs(tmp_path: Path) -> None:
    """In a study without factors the columns on signs are empty, and the others are of the rate."""
    study = STUDY.replace('factors = ["cue"]\nlevels = { cue = ["early", "late"] }\n', "")
    text = "[screening.fixations]\nunder_ms = [80, false]\n"
    study_file, variants = labelled_study(tmp_path, BY_HAND, text, study)
    varied = etl.vary(etl.load_study(study_file), variants)
    rates = {
        (row["variant"], row["measure"], row["region"]): row["rate"]
        for row in plain(varied.table("rates"))
    }
    signs = ("positive", "negative", "zero", "same_sign", "clear", "leaves_out_0")
    comparisons = plain(varied.table("comparisons"))
    for row in comparisons:
        own = [rates[v, row["measure"], row["region"]] for v in (1, 2)]
        known = [rate for rate in own if rate is not None]
        assert {row[name] for name in signs} == {None}
        assert row["turns_with"] is row["clears_with"] is None
        assert row["without"] == own.count(None)
        assert row["in_study"] == close(own[0])
        ends = (min(known), max(known)) if known else (None, None)
        assert (row["lowest"], row["highest"]) == (*map(close, ends),)
    decisions = plain(varied.table("decisions"))
    assert len(decisions) == 2 * len(comparisons)
    for number, row in enumerate(decisions):
        assert row["turns"] is row["leaves_out_0"] is row["clears"] is None
        variant = number % 2 + 1
        assert row["mean"] == close(rates[variant, row["measure"], row["region"]])
        assert (row["variants"], row["without"]) == (1, int(row["mean"] is None))
    # 3 of 7 values without the short glances, 5 of 8 with them.
    (own,) = (
        row
        for row in comparisons
        if (row["measure"], row["region"]) == ("first_pass_regression_out", "middle")
    )
    assert (own["lowest"], own["highest"]) == (close(3 / 7), close(5 / 8))
    assert (own["decides_most"], own["decides_share"]) == ("screening.fixations.under_ms", 1)


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


def cells_kept(orchard: Path, varied: Varied, folder: Path, measures: set[str]) -> int:
    """Binary cells that are among the rows of the loosest variant, built by itself."""
    loose = {key: values[0] for key, values in SOME.items()}
    built = Built.of(orchard, loose, folder / "loose")
    outcomes = built.outcomes[built.outcomes.measure.isin(measures)]
    kept = varied.table("variants").trials_kept.max()
    assert len(outcomes.drop_duplicates(["participant", "trial"])) == kept
    return len(outcomes)


def test_readers_are_those_of_changed_cells(orchard: Path, varied: Varied, tmp_path: Path) -> None:
    """Cells of binary outcomes, how many change, and how often with each setting."""
    kinds = varied.table("changes").drop_duplicates("measure").set_index("measure").kind
    cells = varied.table("changed_cells")
    binary = cells[cells.measure.map(kinds) == "binary"]
    readers = plain(varied.table("readers"))
    settings = [own.key for own in varied.crossing.settings]
    assert [row["setting"] for row in readers] == settings * (len(readers) // len(settings))
    # Cells of trials that a variant keeps; some trials are left out in every variant.
    rates = varied.table("rates")
    rates = rates[rates.region.notna() & rates[["cue", "fit", "group"]].isna().all(axis=1)]
    in_study = rates[rates.variant == 1]
    told = sum(row["cells"] for row in readers) // len(settings)
    assert told == cells_kept(orchard, varied, tmp_path, {*in_study.measure})
    assert told < int((in_study.rows + in_study.rows_lost).sum())
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
