"""From counts over all readers to comparisons, changes and losses of all variants."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.export.variant_rates import RateCounts
from etl.readiness.facts import ALL_REGIONS
from etl.report.variants_input import VariantLoss
from etl.screening import LEFT_OUT_BY
from etl.screening.rules import BEFORE
from etl.session.variant_counts import VariantCounts
from etl.tables import TableDesign
from etl.variants.conditions import ConditionGroups, comparisons_of, groups_of
from etl.variants.differences import compared
from etl.variants.facts import Change, Comparison, Crossing, Summary
from etl.variants.summaries import summarise


@dataclass(frozen=True, slots=True, eq=False)
class VariantResults:
    """What is known of all variants.

    Attributes
    ----------
    crossing : Crossing
        The variants.
    groups : ConditionGroups
        The conditions.
    rates : RateCounts
        Counts of all binary outcomes.
    summaries : tuple of Summary
        Every comparison.
    changes : tuple of Change
        One a measure and region.
    losses : tuple of VariantLoss
        One a variant.
    """

    crossing: Crossing
    groups: ConditionGroups
    rates: RateCounts
    summaries: tuple[Summary, ...]
    changes: tuple[Change, ...]
    losses: tuple[VariantLoss, ...]


def results_of(
    counts: VariantCounts,
    crossing: Crossing,
    design: TableDesign,
    conditions: NDArray[np.int64],
    pairs: Sequence[int],
) -> VariantResults:
    """Compare conditions, and say what each variant changes and loses.

    Parameters
    ----------
    counts : VariantCounts
        Over all readers.
    crossing : Crossing
        The variants.
    design : TableDesign
        The tables of the study.
    conditions : (combinations, factors) int64 array
        The combinations of levels that occur.
    pairs : sequence of int
        By setting, how many pairs of variants differ in it only.

    Returns
    -------
    VariantResults
    """
    regions = (ALL_REGIONS,) if len(counts.read_rows) == 1 < len(design.regions) else design.regions
    groups = groups_of(design.factors, conditions)
    rates = _rates(counts, design, regions, groups)
    summaries = tuple(
        summarise(compared(comparison, rates.counts[:, outcome][:, [low, high], :2]), crossing)
        for outcome, (measure, region) in enumerate(rates.outcomes)
        for comparison, high, low in _comparisons(measure, region, design, groups)
    )
    return VariantResults(
        crossing,
        groups,
        rates,
        summaries,
        _changes(counts, design, regions, pairs if crossing.full else None),
        _losses(counts),
    )


def _rates(
    counts: VariantCounts,
    design: TableDesign,
    regions: Sequence[str],
    groups: ConditionGroups,
) -> RateCounts:
    """All binary outcomes by condition: those of regions that any trial has, then of trials."""
    variants = len(counts.far)
    there = np.flatnonzero(counts.read_rows.sum(axis=1) > 0).tolist()
    outcomes, counted, read = [], [], []
    for place, name in enumerate(m.name for m in design.measures if m.kind == "binary"):
        for slot in there:
            outcomes.append((name, regions[slot] if slot < len(regions) else ""))
            counted.append(groups.counted(counts.regions[place, :, slot]))
            read.append(groups.counted(counts.read_rows[slot][:, None])[:, 0])
    for place, name in enumerate(m.name for m in design.trial_measures if m.kind == "binary"):
        outcomes.append((name, ""))
        counted.append(groups.counted(counts.of_trials[place]))
        read.append(groups.counted(counts.read_trials[:, None])[:, 0])
    width = len(groups.labels)
    return RateCounts(
        tuple(outcomes),
        np.stack(counted, axis=1) if counted else np.zeros((variants, 0, width, 3), dtype=np.int64),
        np.stack(read) if read else np.zeros((0, width), dtype=np.int64),
    )


def _comparisons(
    measure: str, region: str, design: TableDesign, groups: ConditionGroups
) -> list[tuple[Comparison, int, int]]:
    """Each comparison in one outcome, with the groups of level and reference."""
    names = list(design.factors)
    found = []
    for factor, high, low in comparisons_of(design.factors):
        levels = ("", "")
        if factor:
            place = names.index(factor)
            levels = groups.labels[high][place], groups.labels[low][place]
        found.append((Comparison(measure, region, factor, *levels), high, low))
    return found


def _changes(
    counts: VariantCounts,
    design: TableDesign,
    regions: Sequence[str],
    pairs: Sequence[int] | None,
) -> tuple[Change, ...]:
    """How many cells change, by measure and region."""
    found = []
    for measure, own in zip(design.measures, counts.changes, strict=True):
        for slot in np.flatnonzero(own.cells).tolist():
            cells = int(own.cells[slot])
            hangs = np.full(len(own.pairs), np.nan)
            if pairs is not None:
                hangs = own.pairs[:, slot] / (cells * np.array(pairs, dtype=np.float64))
            found.append(
                Change(
                    measure.name,
                    measure.kind,
                    regions[slot],
                    cells,
                    int(own.changed[slot]),
                    int(own.trials[slot]),
                    own.changed_by[:, slot],
                    own.trials_by[:, slot],
                    hangs,
                )
            )
    return tuple(found)


def _losses(counts: VariantCounts) -> tuple[VariantLoss, ...]:
    """What each variant keeps and leaves out, of the trials of the study."""
    found = []
    for variant in range(len(counts.far)):
        trials, fixations = (
            _fates(own[variant].tolist()) for own in (counts.trials, counts.fixations)
        )
        readers, readers_lost = counts.readers[variant].tolist()
        cells, trials_changed = counts.changed[variant].tolist()
        far = int(counts.far[variant])
        found.append(
            VariantLoss(readers, readers_lost, *trials, *fixations, far, cells, trials_changed)
        )
    return tuple(found)


def _fates(counted: list[int]) -> tuple[int, int, dict[str, int]]:
    """Read, kept and left out by rule; what is no part of the study is not among them."""
    kept, *left_out = counted
    by_rule = {
        rule: own
        for rule, own in zip(LEFT_OUT_BY, left_out, strict=True)
        if own and rule not in BEFORE
    }
    return kept + sum(by_rule.values()), kept, by_rule
