"""The table of all comparisons on the page about variants."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.charts import Scale, round_scale
from etl.report.variants_curve import reach_bar
from etl.report.variants_input import VariantsInput
from etl.report.variants_words import (
    code,
    ends,
    interval,
    is_rate,
    levels_words,
    more_in,
    place_words,
    share_words,
    value,
)
from etl.report.wording import count
from etl.variants.facts import Summary

#: So many comparisons are shown at most; of those that hold, so many before they are folded.
MOST_COMPARISONS = 500
MOST_OPEN = 15


@dataclass(frozen=True, slots=True)
class ComparisonRow:
    """A comparison in the table of all.

    Attributes
    ----------
    outcome, place, levels : Markup
        What is compared.
    curve : int
        Number of its curve; 0 where it has none.
    turned : bool
        Whether the sign does not hold in all variants.
    own, bounds, low, high : str
        The study's value with its interval; the lowest and the highest.
    values : tuple of str
        The study's value, the lowest, the highest, the variants in which the sign holds, and the
        share of the decision, as numbers for sorting.
    reach : Markup
        From the lowest to the highest, drawn.
    holds : str
        In how many variants the sign holds; empty for rates.
    matters : Markup
        The decision that matters most; a dash where that is not known.
    share : str
        How much it decides.
    """

    outcome: Markup
    place: Markup
    levels: Markup
    curve: int
    turned: bool
    own: str
    bounds: str
    low: str
    high: str
    values: tuple[str, ...]
    reach: Markup
    holds: str
    matters: Markup
    share: str


@dataclass(frozen=True, slots=True)
class Comparisons:
    """All comparisons.

    Attributes
    ----------
    rate : bool
        Whether they are of rates.
    says : str
        How many hold, in a sentence.
    turned, held : tuple of ComparisonRow
        Those whose sign does not hold, and the others.
    folded : bool
        Whether the others are folded.
    left : Markup
        What is said of those that are not shown.
    """

    rate: bool
    says: str
    turned: tuple[ComparisonRow, ...]
    held: tuple[ComparisonRow, ...]
    folded: bool
    left: Markup


def collect_comparisons(facts: VariantsInput) -> Comparisons:
    """Gather the table of all comparisons.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.

    Returns
    -------
    Comparisons
        Those whose sign does not hold first.
    """
    rate = all(is_rate(one.compared.comparison) for one in facts.summaries)
    lead = {at: place for place, at in enumerate(facts.leading, start=1)}
    found = np.array([ends(one) for one in facts.summaries], dtype=float).reshape(-1, 2)
    factor = 100.0 if rate else 1.0
    known = found[np.isfinite(found).all(axis=1)] * factor
    scale = round_scale(min(known.min(), 0.0), known.max()) if len(known) else round_scale(0, 1)
    turned = [at for at, one in enumerate(facts.summaries) if not one.holds]
    held = [at for at, one in enumerate(facts.summaries) if one.holds]
    shown = turned[:MOST_COMPARISONS], held[: max(0, MOST_COMPARISONS - len(turned))]
    rows = [
        tuple(_comparison(facts, facts.summaries[at], lead.get(at, 0), scale) for at in places)
        for places in shown
    ]
    left = len(facts.summaries) - sum(map(len, shown))
    return Comparisons(
        rate,
        _comparisons_say(len(turned), len(facts.summaries), rate=rate),
        rows[0],
        rows[1],
        len(held) > MOST_OPEN,
        more_in(facts, "comparisons", left),
    )


def _comparisons_say(turned: int, whole: int, *, rate: bool) -> str:
    """How many hold."""
    if not whole:
        return "The study has no binary outcome to compare."
    if rate:
        return (
            "The study names no factors, so there is nothing to compare and no sign that could "
            "turn: these are rates."
        )
    if not turned:
        if whole == 1:
            return "The sign of the one comparison holds in all variants."
        return f"The signs of all {count(whole)} comparisons hold in all variants."
    verb = "does" if turned == 1 else "do"
    return f"{count(turned)} of {count(whole)} {verb} not keep the sign in all variants."


def _comparison(facts: VariantsInput, summary: Summary, curve: int, scale: Scale) -> ComparisonRow:
    """One comparison."""
    compared, base = summary.compared, facts.crossing.base
    rate = is_rate(compared.comparison)
    low, high = ends(summary)
    own = float(compared.difference[base])
    matters, share = Markup("–"), math.nan
    if summary.matters is not None and summary.shares:
        matters = code(facts.short_keys[summary.matters])
        share = summary.shares[summary.matters].together
    numbers = (own, low, high, math.nan if rate else summary.same_sign, share)
    factor = 100.0 if rate else 1.0
    holds = "" if rate else f"{count(summary.same_sign)} of {count(len(summary.order))}"
    if not rate and not own:
        holds = "the study has none"
    elif not rate and math.isnan(own):
        holds = "the study has no value"
    return ComparisonRow(
        code(compared.comparison.outcome),
        place_words(compared.comparison),
        Markup() if rate else levels_words(compared.comparison),
        curve,
        not summary.holds,
        value(own, rate=rate),
        interval(float(compared.low[base]), float(compared.high[base]), rate=rate),
        value(low, rate=rate),
        value(high, rate=rate),
        tuple("" if math.isnan(one) else f"{one:.6g}" for one in numbers),
        reach_bar(low * factor, high * factor, own * factor, scale, rate=rate),
        holds,
        matters,
        "" if math.isnan(share) else share_words(share),
    )
