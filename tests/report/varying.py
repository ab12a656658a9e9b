"""Made-up variants for the page about them: counts with planted effects of some decisions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations, product

import numpy as np

from etl.report.variants_input import FILES, Hanging, VariantLoss, VariantsInput
from etl.variants.facts import (
    Change,
    Compared,
    Comparison,
    Crossing,
    Setting,
    SettingShare,
    Summary,
)

#: Decisions that are made up of, the first of which matters most.
SETTINGS = (
    Setting("screening.fixations.under_ms", ("80", "60", "100", "120", "140"), 0),
    Setting("screening.fixations.over_ms", ("800", "600", "1000", "false", "500"), 0),
    Setting("measures.outside", ('"ignore"', '"interrupt"'), 0),
    Setting(
        "screening.fixations.merge",
        ("{ under_ms = 80, within_characters = 1 }", "false", "{ under_ms = 40 }"),
        0,
    ),
    Setting("regions.tolerance_px", ("0", "10", "20", "30", "40"), 0),
    Setting("screening.trials.outside_share_over", ("0.3", "false", "0.5", "0.2"), 0),
    Setting("screening.trials.fewest_fixations", ("3", "5"), 0),
    Setting("lines.method", ('"attach"', '"chain"'), 0),
)
TABLES = tuple((file, f"what {file} has") for file in FILES.values())


@dataclass(frozen=True)
class Names:
    """What things are called."""

    title: str = "Notes about a community orchard"
    outcome: str = "first_pass_regression_out"
    region: str = "verb"
    factor: str = "fit"
    level: str = "odd"
    reference: str = "fitting"
    reader: str = "P07"
    notice: str = "an alternative leaves out every trial of a reader"


def crossing_of(alternatives: Sequence[int], settings: Sequence[Setting] = SETTINGS) -> Crossing:
    """All combinations of the first so many alternatives of each setting."""
    own = tuple(
        Setting(one.key, one.alternatives[:most], one.base)
        for one, most in zip(settings, alternatives, strict=False)
    )
    choices = np.array(list(product(*(range(len(one.alternatives)) for one in own))), np.int64)
    return Crossing(own, ("",) * len(choices), choices, 0)


def named_crossing() -> Crossing:
    """Four named variants that are not all combinations."""
    settings = tuple(Setting(one.key, one.alternatives[:3], 0) for one in SETTINGS[:3])
    choices = np.array([[0, 0, 0], [1, 0, 0], [2, 1, 1], [0, 2, 0]], np.int64)
    names = ("the study", "as the other lab does", "strict", "loose")
    return Crossing(settings, names, choices, 0)


def difference_of(counts: np.ndarray) -> tuple[np.ndarray, ...]:
    """Log-odds of the level less those of the reference, with Woolf's interval."""
    corrected = (counts == 0).any(axis=(1, 2))
    cells = counts + 0.5 * corrected[:, None, None]
    (z0, o0), (z1, o1) = cells[:, 0].T, cells[:, 1].T
    difference = np.log(o1 / z1) - np.log(o0 / z0)
    half = 1.959964 * np.sqrt((1 / cells).sum(axis=(1, 2)))
    missing = (counts.sum(axis=2) == 0).any(axis=1)
    for values in (difference, half):
        values[missing] = np.nan
    return difference, difference - half, difference + half, corrected & ~missing


def rate_of(counts: np.ndarray) -> tuple[np.ndarray, ...]:
    """Rates with a plain interval: that of the program is tried elsewhere."""
    zeros, ones = counts[:, 0].T
    n = zeros + ones
    rate = np.where(n > 0, ones / np.maximum(n, 1), np.nan)
    half = 1.96 * np.sqrt(rate * (1 - rate) / np.maximum(n, 1))
    return rate, np.maximum(rate - half, 0), np.minimum(rate + half, 1), np.zeros(len(n), bool)


def shares_of(values: np.ndarray, crossing: Crossing) -> tuple[SettingShare, ...]:
    """Shares by their definition, from a full crossing in the order of the product."""
    whole = values.var()
    if not crossing.full or not np.isfinite(values).all() or not whole:
        return ()
    cube = values.reshape([len(one.alternatives) for one in crossing.settings])
    out = []
    for setting in range(cube.ndim):
        moved = np.moveaxis(cube, setting, 0)
        means = moved.reshape(len(moved), -1).mean(axis=1)
        signs = np.sign(moved.reshape(len(moved), -1))
        pairs = [signs[i] != signs[j] for i in range(len(signs)) for j in range(i + 1, len(signs))]
        together = moved.reshape(len(moved), -1).var(axis=0).mean() / whole
        out.append(
            SettingShare(
                setting,
                float(means.var() / whole),
                float(together),
                tuple(map(float, means)),
                float(np.mean(pairs)),
            )
        )
    return tuple(out)


def summary_of(comparison: Comparison, counts: np.ndarray, crossing: Crossing) -> Summary:
    """What is to be said of made-up counts."""
    rate = not comparison.factor
    difference, low, high, corrected = (rate_of if rate else difference_of)(counts)
    order = np.lexsort((np.arange(len(difference)), difference)).astype(np.int64)
    shares = shares_of(difference, crossing)
    compared = Compared(comparison, counts, difference, low, high, corrected)
    without = int(np.isnan(difference).sum())
    matters = max(shares, key=lambda one: one.together).setting if shares else None
    if rate:
        whole = len(difference)
        return Summary(compared, order, 0, 0, 0, without, whole, 0, shares, matters, None)
    sign = np.sign(difference)
    own = sign[crossing.base]
    same = (sign == own) & np.isfinite(sign) & (own != 0)
    clear = int((same & ((low > 0) | (high < 0))).sum())
    most = max(shares, key=lambda one: one.flips, default=None)
    turns = most.setting if most and most.flips else None
    signs = [int((sign == one).sum()) for one in (1, -1, 0)]
    same_sign = int(same.sum())
    side = np.where(np.isnan(difference), np.nan, (low > 0) * 1.0 - (high < 0) * 1.0)
    cleared = [changes_of_pairs(side, crossing, at) for at in range(len(crossing.settings))]
    clears = int(np.argmax(cleared)) if any(cleared) else None
    return Summary(
        compared, order, *signs, without, same_sign, clear, shares, matters, turns, clears
    )


def changes_of_pairs(values: np.ndarray, crossing: Crossing, setting: int) -> float:
    """Of the pairs of variants that differ in one setting only, the share that is not the same."""
    weights = 10 ** np.arange(len(crossing.settings), dtype=np.int64)
    weights[setting] = 0
    groups: dict[int, list[float]] = {}
    for alike, own in zip((crossing.choices @ weights).tolist(), values.tolist(), strict=True):
        if own == own:
            groups.setdefault(alike, []).append(own)
    pairs = [one != other for own in groups.values() for one, other in combinations(own, 2)]
    return sum(pairs) / len(pairs) if pairs else 0.0


def counts_of(crossing: Crossing, seed: int, base: float, weights: Sequence[float]) -> np.ndarray:
    """Counts whose difference hangs on the decisions by some weights, and a little on chance."""
    random = np.random.default_rng(seed)
    reach = np.array([max(len(one.alternatives) - 1, 1) for one in crossing.settings])
    weight = np.array([*weights, *[0.05] * len(reach)])[: len(reach)]
    taken = crossing.choices / reach
    wanted = (
        base
        + taken @ weight
        + 0.2 * taken[:, 0] * taken[:, -1]
        + random.normal(0, 0.04, len(taken))
    )
    n = 380 - np.round(taken[:, 0] * 40).astype(int)
    reference = np.round(n / (1 + np.exp(1.2))).astype(int)
    level = np.round(n / (1 + np.exp(1.2 - wanted))).astype(int)
    return np.stack(
        [np.stack([n - reference, reference], axis=1), np.stack([n - level, level], axis=1)], axis=1
    ).astype(np.int64)


def facts_of(
    crossing: Crossing,
    *,
    names: Names | None = None,
    rates: bool = False,
    without: int = 0,
    regions: int = 4,
) -> VariantsInput:
    """The input of the page."""
    own = names or Names()
    factor = ("", "", "") if rates else (own.factor, own.level, own.reference)
    plans = [
        (own.outcome, own.region, 0.35, (-0.9, 0.15, 0.05)),
        (own.outcome, f"{own.region} 2", 0.7, (0.05, 0.1, 0.4)),
        *(
            (f"fixated_{i}", "" if i == 3 else own.region, 0.4 - 0.12 * i, (0.2,))
            for i in range(18)
        ),
    ]
    summaries = []
    for seed, (outcome, region, base, weights) in enumerate(plans):
        counts = counts_of(crossing, seed, base, weights)
        if without and seed == 0:
            counts[-without:, 1] = 0
        if rates:
            counts[:, 0] = counts[:, 1]
        summaries.append(summary_of(Comparison(outcome, region, *factor), counts, crossing))
    return VariantsInput(
        own.title,
        "How others would have cleaned it",
        "study.toml",
        "variants.toml",
        crossing,
        tuple(summaries),
        (0, 1),
        False,
        "Shown first are comparisons whose sign does not hold, then those with the widest range.",
        tuple(f"Passage {i} about {own.region}: from −0.10 to 0.32." for i in (1, 2)),
        tuple(one.key.rpartition(".")[2] for one in crossing.settings),
        losses_of(crossing),
        changes_of(crossing, own, regions),
        (hanging(crossing, own, ""),),
        tuple(hanging(crossing, own, str(trial)) for trial in range(1, 4)),
        (own.notice,),
        TABLES,
    )


def losses_of(crossing: Crossing) -> tuple[VariantLoss, ...]:
    """Losses that grow with the places of the alternatives."""
    out = []
    for row in crossing.choices:
        lost, cells = 9 + 7 * int(row[0]), 40 * int(row.sum())
        by_rule = {"notes": 4, "outside_share_over": lost - 4, "answer_wrong": 0}
        fixations = {"blink": 234, "under_ms": 41 * (1 + int(row[0]))}
        out.append(
            VariantLoss(
                24 - int(row[-1] > 1),
                int(row[-1] > 1),
                767,
                767 - lost,
                by_rule,
                10_744,
                10_744 - sum(fixations.values()),
                fixations,
                3,
                cells,
                cells // 5,
            )
        )
    return tuple(out)


def changes_of(crossing: Crossing, names: Names, regions: int) -> tuple[Change, ...]:
    """Cells of a binary, a count and a duration measure, and of one that never changes."""
    settings = len(crossing.settings)
    hangs = np.linspace(0.09, 0, settings) if crossing.full else np.full(settings, np.nan)
    none = np.zeros(len(crossing), np.int64)
    out = []
    for measure, kind, share in (
        (names.outcome, "binary", 0.1),
        ("first_pass_fixations", "count", 0.2),
        ("gaze_duration", "duration", 0.3),
        ("fixated", "binary", 0.0),
    ):
        for region in range(regions):
            changed = round(share * 700) + region * bool(share)
            out.append(
                Change(
                    measure,
                    kind,
                    f"{names.region} {region}",
                    700,
                    changed,
                    changed // 2,
                    none,
                    none,
                    hangs * (1 + region / 10) * share * 10,
                )
            )
    return tuple(out)


def hanging(crossing: Crossing, names: Names, trial: str) -> Hanging:
    """A reader, or one of the reader's trials."""
    settings = len(crossing.settings)
    hangs = tuple(np.linspace(0.2, 0, settings)) if crossing.full else (np.nan,) * settings
    return Hanging(
        names.reader,
        "",
        trial,
        f"i{trial}" if trial else "",
        hangs,
        6,
        48,
        0,
        (("as in the study", "traces/7.html"), ("as in variant 5", "traces/7 v5.html")),
        (f"{names.outcome} at {names.region}: 0, with under_ms = 100 it is 1",),
    )
