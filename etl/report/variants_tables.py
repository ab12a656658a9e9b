"""Tables of the page about variants: all comparisons, and what each variant loses."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.charts import Scale, round_scale
from etl.report.variants_curve import reach_bar
from etl.report.variants_curve_part import choices_of
from etl.report.variants_input import VariantLoss, VariantsInput
from etl.report.variants_words import (
    alternative,
    code,
    ends,
    interval,
    is_rate,
    levels_words,
    more_in,
    place_words,
    share_words,
    value,
    variant_name,
)
from etl.report.wording import count, name, percent
from etl.variants.facts import Summary

#: So many comparisons are shown at most; of those that hold, so many before they are folded.
MOST_COMPARISONS = 500
MOST_OPEN = 15
MOST_VARIANTS = 200


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


@dataclass(frozen=True, slots=True)
class LossRow:
    """What a variant keeps.

    Attributes
    ----------
    label : Markup
        Number and name of the variant.
    number : int
        Its number, for sorting.
    own : bool
        Whether it is the study.
    choices : tuple of (str, bool)
        Each alternative, and whether it is the study's.
    cells : tuple of (str, int)
        Figures in words and as numbers: trials, fixations, readers kept, readers lost, values set
        missing, cells changed, trials of these.
    by_rule : tuple of str
        Trials and fixations by rule.
    """

    label: Markup
    number: int
    own: bool
    choices: tuple[tuple[str, bool], ...]
    cells: tuple[tuple[str, int], ...]
    by_rule: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class AlternativeLoss:
    """What variants with an alternative keep on average.

    Attributes
    ----------
    key : Markup
        The setting; empty in all rows but its first.
    spoken : str
        The setting, for programs that read aloud.
    label : Markup
        The alternative.
    own : bool
        Whether it is the study's.
    cells : tuple of str
        Means of trials and fixations kept, readers lost, cells changed.
    """

    key: Markup
    spoken: str
    label: Markup
    own: bool
    cells: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Losses:
    """What the variants lose.

    Attributes
    ----------
    says : str
        From the fewest trials kept to the most.
    by_alternative : tuple of AlternativeLoss
        Means.
    rows : tuple of LossRow
        The study first.
    chosen : str
        Which variants these are; empty where they are all.
    left : Markup
        What is said of the others.
    """

    says: str
    by_alternative: tuple[AlternativeLoss, ...]
    rows: tuple[LossRow, ...]
    chosen: str
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


def collect_losses(facts: VariantsInput) -> Losses:
    """Gather what each variant loses.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.

    Returns
    -------
    Losses
        Of many variants those that change most cells of ``outcomes``.
    """
    crossing, losses = facts.crossing, facts.losses
    others = [at for at in range(len(crossing)) if at != crossing.base]
    chosen = ""
    if len(crossing) > MOST_VARIANTS:
        others.sort(key=lambda at: (-losses[at].cells_changed, at))
        others = others[: MOST_VARIANTS - 1]
        chosen = (
            f"These are the study and the {count(len(others))} variants in which most cells are "
            "not as in the study, most first."
        )
    shown = [crossing.base, *others]
    kept = [one.trials_kept for one in losses]
    fixations = [one.fixations_kept for one in losses]
    own = losses[crossing.base]
    says = (
        f"{_span(kept, 'trials')} kept ({count(own.trials_kept)} in the study), "
        f"{_span(fixations, 'fixations')} ({count(own.fixations_kept)} in the study)."
    )
    return Losses(
        says,
        _by_alternative(facts),
        tuple(_loss(facts, at) for at in shown),
        chosen,
        more_in(facts, "variants", len(crossing) - len(shown)),
    )


def _span(numbers: list[int], things: str) -> str:
    """From the fewest to the most."""
    low, high = min(numbers), max(numbers)
    return f"{count(low)} {things}" if low == high else f"{count(low)} to {count(high)} {things}"


def _by_alternative(facts: VariantsInput) -> tuple[AlternativeLoss, ...]:
    """Means over the variants with each alternative."""
    figures = np.array(
        [
            (one.trials_kept, one.fixations_kept, one.readers_lost, one.cells_changed)
            for one in facts.losses
        ],
        dtype=float,
    )
    out = []
    for setting, own in enumerate(facts.crossing.settings):
        for place, text in enumerate(own.alternatives):
            takes = facts.crossing.choices[:, setting] == place
            means = figures[takes].mean(axis=0) if takes.any() else np.full(4, math.nan)
            out.append(
                AlternativeLoss(
                    code(own.key) if place == 0 else Markup(),
                    own.key,
                    code(alternative(text)),
                    place == own.base,
                    tuple(_mean(float(one)) for one in means),
                )
            )
    return tuple(out)


def _mean(amount: float) -> str:
    """A mean, with one place only where it is no whole number."""
    if math.isnan(amount):
        return "–"
    return f"{amount:,.0f}" if amount == round(amount) or amount >= 1000 else f"{amount:,.1f}"


def _loss(facts: VariantsInput, at: int) -> LossRow:
    """One variant."""
    loss = facts.losses[at]
    cells = (
        (_kept(loss.trials_kept, loss.trials_read), loss.trials_kept),
        (_kept(loss.fixations_kept, loss.fixations_read), loss.fixations_kept),
        *(
            (count(one), one)
            for one in (
                loss.readers,
                loss.readers_lost,
                loss.values_set_missing,
                loss.cells_changed,
                loss.cells_trials,
            )
        ),
    )
    return LossRow(
        name(variant_name(facts.crossing, at)),
        at + 1,
        at == facts.crossing.base,
        choices_of(facts, at),
        cells,
        by_rule(loss),
    )


def _kept(kept: int, read: int) -> str:
    """How many, and what share of those read."""
    return f"{count(kept)} ({percent(kept / read)})" if read else count(kept)


def by_rule(loss: VariantLoss) -> tuple[str, str]:
    """Trials and fixations that each rule left out, rules that left out none unnamed.

    Parameters
    ----------
    loss : VariantLoss
        Of one variant.

    Returns
    -------
    tuple of (str, str)
        Of trials and of fixations.
    """

    def spelled(left_out: Mapping[str, int]) -> str:
        said = ", ".join(f"{rule} {count(number)}" for rule, number in left_out.items() if number)
        return said or "none"

    return spelled(loss.trials_by_rule), spelled(loss.fixations_by_rule)
