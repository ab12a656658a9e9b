"""From counts to facts: everything that is told of one outcome in one region."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from etl.coding import Coding
from etl.readiness.counts import OutcomeCounts
from etl.readiness.facts import CellCount, OutcomeReadiness, Separation
from etl.readiness.intervals import wilson_interval
from etl.readiness.ladder import Grouping, Ladder, Model, ladder_of
from etl.readiness.sentences import sentences_of
from etl.readiness.separation import separations
from etl.readiness.terms import (
    design_matrix,
    highest_order,
    numeric_columns,
    quoted,
    terms_of,
    written,
)
from etl.readiness.variation import Behind, cell_unit_counts, unit_counts, variations
from etl.readiness.verdicts import separation_of_the_ladder, verdict_of, with_reasons


def outcome_readiness(counts: OutcomeCounts, codings: Mapping[str, Coding]) -> OutcomeReadiness:
    """What is to be known of one outcome in one region before the first fit.

    Parameters
    ----------
    counts : OutcomeCounts
        Its zeros, ones and missing values by condition, by reader and by item.
    codings : mapping of str to Coding
        Each factor as numeric columns, as the tables or the starter scripts have them.

    Returns
    -------
    OutcomeReadiness
        With a ladder of formulas unless there is no value, or one value only.
    """
    zeros, ones, missing = counts.cells.sum(axis=0).tolist()
    total = _cell((), (zeros, ones, missing))
    cells = tuple(
        _cell(counts.conditions.named(place), tuple(own))
        for place, own in enumerate(counts.cells.tolist())
    )
    told: tuple[Separation, ...] = ()
    behind: tuple[Behind, ...] = ()
    ladder = Ladder((), 0, free=False)
    order = highest_order([len(counts.active[place]) for place in counts.varying])
    if zeros + ones:
        behind = variations(counts, order)
    if zeros and ones:
        told = separations(counts)
        ladder = _ladder(counts, codings, behind, order)
    fixed = separation_of_the_ladder(told, order)
    verdict = verdict_of(zeros, ones, fixed, ladder)
    units = unit_counts(counts)
    facts = OutcomeReadiness(
        counts.outcome,
        counts.region,
        total,
        cells,
        units,
        tuple(own.variation for own in behind),
        told,
        ladder.steps,
        ladder.start,
        verdict,
        (),
        cell_unit_counts(counts),
    )
    return with_reasons(sentences_of(facts, counts, fixed), fixed)


def _cell(levels: tuple[str, ...], values: tuple[int, ...]) -> CellCount:
    """Zeros, ones and missing with the interval."""
    zeros, ones, missing = values
    low, high = (float("nan"),) * 2
    if zeros + ones:
        low, high = wilson_interval(ones, zeros + ones)
    return CellCount(levels, zeros, ones, missing, low, high)


def _ladder(
    counts: OutcomeCounts, codings: Mapping[str, Coding], behind: tuple[Behind, ...], order: int
) -> Ladder:
    """The formulas for one outcome."""
    places = counts.varying
    names = [counts.conditions.factors[place] for place in places]
    there = counts.values > 0
    codes = np.zeros((int(there.sum()), len(places)), dtype=np.int64)
    for column, place in enumerate(places):
        own = counts.conditions.codes[there, place]
        codes[:, column] = np.searchsorted(counts.active[place], own)
    sizes = [len(counts.active[place]) for place in places]
    if order == len(places):
        coefficients = len(codes)  # with all interactions, one for each combination that occurs
    else:
        coefficients = int(np.linalg.matrix_rank(design_matrix(codes, sizes, order)))
    sums = counts.cells.sum(axis=0)
    fixed = written(terms_of(names, order), {name: (quoted(name),) for name in names})
    model = Model(
        counts.outcome,
        fixed or "1",
        coefficients,
        int(sums[:2].sum()),
        int(sums[counts.rarer]),
        ("zeros", "ones")[counts.rarer],
        {
            name: numeric_columns(codings[name], counts.active[place])
            for name, place in zip(names, places, strict=True)
        },
    )
    groupings = []
    for own, units in zip(counts.units, unit_counts(counts), strict=True):
        slopes = {
            b.variation.factors: b.rarer
            for b in behind
            if b.variation.unit == own.unit and b.variation.supported
        }
        if units.units > 1:
            groupings.append(Grouping(own.unit, units.units, int(own.values.sum()), slopes))
    return ladder_of(model, groupings)
