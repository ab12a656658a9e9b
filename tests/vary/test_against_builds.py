"""Every variant says what a build says whose study file was changed by hand."""

from __future__ import annotations

import itertools
import math
import random
from collections.abc import Iterator
from pathlib import Path

import pandas as pd
import pytest

import etl
from etl.session.varied import Varied
from tests.vary.otherwise import (
    Alternatives,
    Built,
    Choice,
    choices,
    few_readers,
    named_variants_file,
    variants_file,
)

#: Two of everything, so that rules at all levels, places and conventions meet.
ORCHARD: Alternatives = {
    "screening.fixations.outside_text_time": [True, False],
    "screening.fixations.blink": ["drop", False],
    "screening.fixations.merge": [
        {"under_ms": 80, "within_characters": 1},
        {"under_ms": 120, "within_characters": 3},
    ],
    "screening.fixations.under_ms": [80, 150],
    "screening.trials.notes": ["notes.csv", False],
    "screening.trials.answer_wrong": [False, True],
    "screening.trials.outside_share_over": [0.3, 0.1],
    "screening.participants.correct_share_under": [0.75, 0.93],
    "screening.values.outlier_sd": [False, 2],
    "regions.tolerance_px": [0, 25],
    "measures.outside": ["ignore", "interrupt"],
    "measures.no_opportunity": ["missing", "zero"],
}
#: A passage read by three readers, by the methods that take no time.
PASSAGES: Alternatives = {
    "screening.fixations.under_ms": [False, 120],
    "regions.tolerance_px": [0, 12],
    "lines.method": ["nearest", "slice", "attach"],
}


@pytest.fixture(scope="module")
def orchard(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Five readers of the orchard study."""
    return few_readers("orchard", tmp_path_factory.mktemp("orchard"), ["logs/P0[1-5]*"])


def assert_as_built(varied: Varied, number: int, built: Built) -> None:
    """One variant of ``rates``, ``variants`` and ``variant_accounts`` is as a build has it."""
    rates = varied.table("rates")
    own = rates[rates.variant == number]
    expected = built.counts()
    seen = set()
    for row in own.astype(object).where(own.notna(), None).to_dict("records"):
        key = (
            row["measure"],
            row["region"] or "",
            *(row[name] or "" for name in built.factors),
        )
        rows, n, ones = expected.get(key, [0, 0, 0])
        assert (row["rows"], row["n"], row["ones"], row["missing"]) == (rows, n, ones, rows - n)
        seen.add(key)
    assert expected.keys() <= seen
    accounts = varied.table("variant_accounts")
    for row in accounts[accounts.variant == number].to_dict("records"):
        whole = built.accounts[
            (built.accounts.participant == "(all)") & (built.accounts.unit == row["unit"])
        ].to_dict("records")[0]
        assert row["kept"] == whole["kept"]
        assert row["read"] == whole["read"] - whole.get("skip", 0) - whole.get("repeated", 0)
        rules = set(row) - {"variant", "unit", "read", "kept"}
        for rule in rules | (set(whole) - {"participant", "unit", "read", "kept"}):
            if rule not in ("skip", "repeated"):
                assert row.get(rule, 0) == whole.get(rule, 0), rule
        assert row["read"] == row["kept"] + sum(row[rule] for rule in rules)


def test_named_variants_are_as_built(orchard: Path, tmp_path: Path) -> None:
    """Variants drawn at random from all combinations of twelve decisions, and the study itself."""
    drawn = random.Random(8)
    named: dict[str, Choice] = {}
    for number in range(9):
        own = {key: drawn.choice(values) for key, values in ORCHARD.items()}
        named[f"laboratory {number}"] = own
    path = named_variants_file(orchard.with_name("named.toml"), named)
    varied = etl.vary(etl.load_study(orchard), path, into=tmp_path / "named")
    assert varied.crossing.names == ("the study", *named)
    assert_as_built(varied, 1, Built.of(orchard, {}, tmp_path / "base"))
    for number, choice in enumerate(named.values(), start=2):
        built = Built.of(orchard, choice, tmp_path / f"built {number}")
        assert_as_built(varied, number, built)


def pairs_apart(all_: list[Choice], key: str) -> Iterator[tuple[int, int]]:
    """Every two choices that differ in one key only."""
    for a, b in itertools.combinations(range(len(all_)), 2):
        if {k for k in all_[a] if all_[a][k] != all_[b][k]} == {key}:
            yield a, b


@pytest.mark.parametrize(
    ("name", "logs", "some"),
    [
        (
            "orchard",
            ["logs/P0[1-3]*"],
            {
                "screening.fixations.under_ms": [80, False, 150],
                "screening.trials.outside_share_over": [0.3, 0.1],
                "measures.no_opportunity": ["missing", "zero"],
            },
        ),
        ("passages", ["logs/P3[1-2]*"], PASSAGES),
    ],
)
def test_crossing_is_as_built(
    name: str, logs: list[str], some: Alternatives, tmp_path: Path
) -> None:
    """All combinations built one by one: rates, accounts, and what became of every cell."""
    study_file = few_readers(name, tmp_path / "lab", logs)
    if name == "passages":
        text = study_file.read_text(encoding="utf-8") + 'lines = { method = "nearest" }\n'
        study_file.write_text(text, encoding="utf-8", newline="\n")
    path = variants_file(study_file.with_name("variants.toml"), some)
    varied = etl.vary(etl.load_study(study_file), path, into=tmp_path / "varied")
    listed = varied.table("variants")
    every = choices(some)
    # The product may count in another order than this test does.
    keys = [setting.key for setting in varied.crossing.settings]
    places = {
        tuple(setting.alternatives[c] for setting, c in zip(varied.crossing.settings, row))  # noqa: B905
        for row in varied.crossing.choices.tolist()
    }
    assert len(places) == len(listed) == len(every)
    order = [
        next(
            choice
            for choice in every
            if all(
                choice[key] == some[key][_place(setting, c, some[key])]
                for key, setting, c in zip(keys, varied.crossing.settings, row, strict=True)
            )
        )
        for row in varied.crossing.choices.tolist()
    ]
    built = [
        Built.of(study_file, choice, tmp_path / f"built {number}")
        for number, choice in enumerate(order)
    ]
    cells = [own.cells() for own in built]
    for number, own in enumerate(built, start=1):
        assert_as_built(varied, number, own)
    ids = [key for key in ("participant", "session", "trial") if key in built[0].outcomes]
    table = varied.table("changed_cells")
    told = {
        tuple(row[key] for key in (*ids, "region", "measure")): row
        for row in table.to_dict("records")
    }
    assert len(told) == len(table)
    changing = {
        cell for cell in set().union(*cells) if len({own.get(cell, "gone") for own in cells}) > 1
    }
    assert set(told) == changing
    short = dict(zip(keys, (c for c in table.columns if c.startswith("hangs_on_")), strict=True))
    pairs = {key: list(pairs_apart(order, key)) for key in keys}
    for cell, row in told.items():
        states = [own.get(cell, "gone") for own in cells]
        base = states[0]
        expected = {"gone": "left out", "missing": "missing"}.get(str(base), "value")
        assert row["in_study"] == expected
        assert expected != "value" or row["value"] == base
        assert row["variants_same"] == states.count(base)
        others = [state for state in states if state != base]
        assert row["variants_left_out"] == others.count("gone")
        assert row["variants_missing"] == others.count("missing")
        assert row["variants_other_value"] == sum(isinstance(state, float) for state in others)
        for key in keys:
            differing = sum(states[a] != states[b] for a, b in pairs[key])
            assert math.isclose(row[short[key]], differing / len(pairs[key]))
    by_variant = varied.table("changes_by_variant")
    region = ids.__len__()
    for row in by_variant.to_dict("records"):
        own = cells[row["variant"] - 1]
        differing_cells = {
            cell
            for cell in changing
            if cell[region + 1] == row["measure"]
            and row["region"] in (cell[region], "(all regions)")
            and own.get(cell, "gone") != cells[0].get(cell, "gone")
        }
        assert row["cells_changed"] == len(differing_cells)
        assert row["trials_changed"] == len({cell[:region] for cell in differing_cells})
    changes = varied.table("changes")
    for (measure, where), own_rows in changes.groupby(["measure", "region"]):
        of = [
            cell
            for cell in set().union(*cells)
            if cell[region + 1] == measure and where in (cell[region], "(all regions)")
        ]
        assert set(own_rows.cells) == {len(of)}
        assert set(own_rows.cells_changed) == {len(changing & set(of))}
        for row in own_rows.to_dict("records"):
            differing = sum(
                cells[a].get(cell, "gone") != cells[b].get(cell, "gone")
                for a, b in pairs[row["setting"]]
                for cell in changing.intersection(of)
            )
            chance = differing / (len(of) * len(pairs[row["setting"]]))
            assert math.isclose(row["chance"], chance, abs_tol=1e-12)
        assert pd.isna(own_rows.share).all() or math.isclose(own_rows.share.sum(), 1)


def _place(setting: object, code: int, values: list[object]) -> int:
    """Where an alternative stands in the test's own list."""
    spelled = setting.alternatives[code]  # type: ignore[attr-defined]
    import tomllib  # noqa: PLC0415

    value = tomllib.loads(f"value = {spelled}")["value"]
    return values.index(value)
