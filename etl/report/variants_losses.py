"""What the page about variants tells of trials, fixations and readers that each variant loses."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_input import VariantLoss, VariantsInput
from etl.report.variants_numbers import choices_of
from etl.report.variants_words import alternative, code, fine_share_words, more_in, variant_name
from etl.report.wording import count, name

#: So many variants have a row at most.
MOST_VARIANTS = 200


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
    return f"{count(kept)} ({fine_share_words(kept / read)})" if read else count(kept)


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
