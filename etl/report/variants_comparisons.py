"""The table of all comparisons on the page about variants."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final

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
from etl.report.wording import NOTHING, count
from etl.variants.facts import Standing, Summary

#: What is said of comparisons by what the decisions do to them.
_PARTS: Final[Mapping[Standing, tuple[str, str]]] = {
    "decided": (
        "The decisions decide",
        (
            "Of the variants that have a difference, the interval leaves out 0 in some, and in "
            "others it does not or lies on the other side."
        ),
    ),
    "held": (
        "The decisions do not decide",
        (
            "Of the variants that have a difference, all have the same sign, and the interval "
            "leaves out 0 in all of them or in none."
        ),
    ),
    "around 0": (
        "Around 0 in all variants",
        (
            "Of the variants that have a difference, not all have the same sign, but none has an "
            "interval that leaves out 0: a difference that small, or from so few values, has no "
            "sign to hold."
        ),
    ),
    "none": (
        "Cannot be made",
        "There is no variant in which both conditions have a value.",
    ),
}
#: The same of rates.
_PARTS_OF_RATES: Final[Mapping[Standing, tuple[str, str]]] = {
    "held": ("All rates", ""),
    "none": ("No rate", "There is no value in any variant."),
}
#: So many comparisons are shown at most; of those not decided, so many before they are folded.
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
    turned, sign_turns : bool
        Whether the decisions decide on which side of 0 the interval lies, or whether it does; and
        whether the sign does not hold.
    own, bounds, low, high : str
        The study's value with its interval; the lowest and the highest.
    values : tuple of str
        The study's value, the lowest, the highest, the variants in which the sign holds, the share
        of the decision, and the variants whose interval leaves out 0, as numbers for sorting.
    reach : Markup
        From the lowest to the highest, drawn.
    holds, apart : str
        In how many of the variants that have a difference the sign holds, and the interval leaves
        out 0, on either side; empty for rates.
    without : str
        In how many variants there is no value; empty where there is one in all or in none.
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
    sign_turns: bool
    own: str
    bounds: str
    low: str
    high: str
    values: tuple[str, ...]
    reach: Markup
    holds: str
    apart: str
    without: str
    matters: Markup
    share: str


@dataclass(frozen=True, slots=True)
class ComparisonPart:
    """Comparisons to which the decisions do the same.

    Attributes
    ----------
    title, how : str
        Which these are, and in a sentence what that means.
    rows : tuple of ComparisonRow
        The comparisons.
    folded : bool
        Whether they are folded.
    """

    title: str
    how: str
    rows: tuple[ComparisonRow, ...]
    folded: bool


@dataclass(frozen=True, slots=True)
class Comparisons:
    """All comparisons.

    Attributes
    ----------
    rate : bool
        Whether they are of rates.
    says : str
        How many hold, in a sentence.
    parts : tuple of ComparisonPart
        The comparisons by what the decisions do to them.
    left : Markup
        What is said of those that are not shown.
    """

    rate: bool
    says: str
    parts: tuple[ComparisonPart, ...]
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
        Those on which the decisions decide first.
    """
    rate = all(is_rate(one.compared.comparison) for one in facts.summaries)
    lead = {at: place for place, at in enumerate(facts.leading, start=1)}
    found = np.array([ends(one) for one in facts.summaries], dtype=float).reshape(-1, 2)
    factor = 100.0 if rate else 1.0
    known = found[np.isfinite(found).all(axis=1)] * factor
    scale = round_scale(min(known.min(), 0.0), known.max()) if len(known) else round_scale(0, 1)
    parts, left = [], MOST_COMPARISONS
    for standing, (title, how) in (_PARTS_OF_RATES if rate else _PARTS).items():
        places = [at for at, one in enumerate(facts.summaries) if one.standing == standing]
        shown = places[: max(0, left)]
        left -= len(places)
        if shown:
            rows = [_comparison(facts, facts.summaries[at], lead.get(at, 0), scale) for at in shown]
            folded = standing != "decided" and len(rows) > MOST_OPEN
            parts.append(ComparisonPart(title, how, tuple(rows), folded))
    return Comparisons(
        rate,
        comparisons_say(facts.summaries, rate=rate),
        tuple(parts),
        more_in(facts, "comparisons", max(0, -left)),
    )


def comparisons_say(summaries: Sequence[Summary], *, rate: bool, others: bool = False) -> str:
    """To how many comparisons decisions do what.

    Parameters
    ----------
    summaries : sequence of Summary
        The comparisons.
    rate : bool
        Whether they are of rates.
    others : bool
        Whether some have been told of before.

    Returns
    -------
    str
        Sentences.
    """
    if not summaries:
        return "The study has no binary outcome to compare."
    if rate:
        return (
            "The study names no factors, so there is nothing to compare and no sign that could "
            "turn: these are rates."
        )
    counted = Counter(one.standing for one in summaries)
    whole = f"{count(len(summaries))}{' other' * others} comparison" + "s" * (len(summaries) > 1)
    decided, around, none = (counted[key] for key in ("decided", "around 0", "none"))
    if decided:
        text = (
            f"In {count(decided)} of {whole} the decisions decide whether the interval leaves out 0"
        )
    else:
        text = f"In none of {whole} do the decisions decide whether the interval leaves out 0"
    if around:
        text += f"; in {count(around)} the sign does not hold, but no interval leaves out 0"
    if none:
        text += f"; {count(none)} cannot be made"
    if without := sum(one.without > 0 and one.standing != "none" for one in summaries):
        text += f". Of all these, {count(without)} have no value in some variants"
    return f"{text}."


def _apart(summary: Summary, there: int) -> str:
    """In how many of the variants that have a difference the interval leaves out 0."""
    if is_rate(summary.compared.comparison):
        return ""
    return f"{count(summary.apart)} of {count(there)}" if there else NOTHING


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
    numbers = (own, low, high, math.nan if rate else summary.same_sign, share, summary.apart)
    factor = 100.0 if rate else 1.0
    there = len(summary.order) - summary.without
    holds = "" if rate else f"{count(summary.same_sign)} of {count(there)}"
    if not rate and not own:
        holds = "the study has none"
    elif not rate and math.isnan(own):
        holds = "the study has no value"
    return ComparisonRow(
        code(compared.comparison.outcome),
        place_words(compared.comparison),
        Markup() if rate else levels_words(compared.comparison),
        curve,
        summary.standing == "decided",
        summary.standing == "decided"
        and there not in (summary.positive, summary.negative, summary.zero),
        value(own, rate=rate),
        interval(float(compared.low[base]), float(compared.high[base]), rate=rate),
        value(low, rate=rate),
        value(high, rate=rate),
        tuple("" if math.isnan(one) else f"{one:.6g}" for one in numbers),
        reach_bar(low * factor, high * factor, own * factor, scale, rate=rate),
        holds,
        _apart(summary, there),
        f"no value in {count(summary.without)}" if summary.without and there else "",
        matters,
        "" if math.isnan(share) else share_words(share),
    )
