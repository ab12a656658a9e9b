"""Gathers what the page about variants shows, part by part."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from etl.report.variants_changes import (
    Changes,
    HangingTable,
    collect_changes,
    collect_hanging,
)
from etl.report.variants_comparisons import Comparisons, collect_comparisons, comparisons_say
from etl.report.variants_curve_part import CurvePart, collect_curve
from etl.report.variants_input import VariantsInput
from etl.report.variants_losses import Losses, collect_losses
from etl.report.variants_words import alternative, code, comparison_words, headline, is_rate
from etl.report.wording import count, counted

#: Comparisons of which the page has a headline.
MOST_HEADLINES = 8


@dataclass(frozen=True, slots=True)
class Headline:
    """What is to be looked at first.

    Attributes
    ----------
    kind : str
        Name of its sign: ``loss`` or ``fine``.
    href : str
        Where more of it is told.
    label : Markup
        What it is about.
    text : Markup
        What is the matter.
    """

    kind: str
    href: str
    label: Markup
    text: Markup


@dataclass(frozen=True, slots=True)
class Decision:
    """One of the decisions.

    Attributes
    ----------
    short, key : Markup
        Its names.
    alternatives : tuple of (Markup, bool)
        Each, and whether it is the study's.
    """

    short: Markup
    key: Markup
    alternatives: tuple[tuple[Markup, bool], ...]


@dataclass(frozen=True, slots=True)
class VariantsPage:
    """All that the page shows.

    Attributes
    ----------
    title, about : str
        Titles of study and variants; the second may be empty.
    lead : str
        What was computed.
    files : tuple of str
        Study file and variants file.
    headlines : tuple of Headline
        What to look at first.
    notices : tuple of str
        Warnings.
    decisions : tuple of Decision
        What is varied.
    rate : bool
        Whether the study has no factors, so that rates are looked at.
    chosen : str
        By which rule the comparisons that lead were chosen.
    curves : tuple of CurvePart
        One a leading comparison.
    comparisons : Comparisons
        All of them.
    losses : Losses
        What the variants lose.
    changes : Changes
        Cells that are not the same in all variants.
    readers, trials : HangingTable
        Those that hang most.
    keys : tuple of Markup
        Short names of the settings, heads of columns.
    tables : tuple of (str, str)
        Tables beside the page, and what is in them.
    """

    title: str
    about: str
    lead: str
    files: tuple[str, str]
    headlines: tuple[Headline, ...]
    notices: tuple[str, ...]
    decisions: tuple[Decision, ...]
    rate: bool
    chosen: str
    curves: tuple[CurvePart, ...]
    comparisons: Comparisons
    losses: Losses
    changes: Changes
    readers: HangingTable
    trials: HangingTable
    keys: tuple[Markup, ...]
    tables: tuple[tuple[str, str], ...]


def collect_variants(facts: VariantsInput) -> VariantsPage:
    """Gather all that the page shows.

    Parameters
    ----------
    facts : VariantsInput
        What it is made from.

    Returns
    -------
    VariantsPage
        Ready for the templates.
    """
    comparisons, changes = collect_comparisons(facts), collect_changes(facts)
    return VariantsPage(
        facts.title,
        facts.about,
        _lead(facts),
        (facts.study_file, facts.variants_file),
        _headlines(facts, comparisons, changes),
        facts.notices,
        tuple(
            Decision(
                code(short),
                code(own.key),
                tuple(
                    (code(alternative(text)), place == own.base)
                    for place, text in enumerate(own.alternatives)
                ),
            )
            for short, own in zip(facts.short_keys, facts.crossing.settings, strict=True)
        ),
        bool(facts.summaries) and all(is_rate(one.compared.comparison) for one in facts.summaries),
        "The variants file names these comparisons." if facts.named else facts.rule,
        tuple(collect_curve(facts, place) for place in range(len(facts.leading))),
        comparisons,
        collect_losses(facts),
        changes,
        collect_hanging(facts, "readers"),
        collect_hanging(facts, "trials"),
        tuple(map(code, facts.short_keys)),
        facts.tables,
    )


def _lead(facts: VariantsInput) -> str:
    """What was computed, in two sentences."""
    crossing = facts.crossing
    settings = len(crossing.settings)
    decisions = counted(settings, "decision")
    if crossing.full:
        numbers = [len(own.alternatives) for own in crossing.settings]
        product = f" ({' × '.join(map(str, numbers))})" if settings > 1 else ""
        which = f"{counted(len(crossing), 'variant')}: all combinations of {decisions}{product}."
    else:
        whole = math.prod(len(own.alternatives) for own in crossing.settings)
        which = (
            f"{counted(len(crossing), 'variant')} that differ in {decisions}, out of "
            f"{count(whole)} combinations."
        )
    return (
        f"{which} Each was computed from the same fixations as the study as it stands, which is "
        "one of them, before any model was fitted."
    )


def _headlines(
    facts: VariantsInput, comparisons: Comparisons, changes: Changes
) -> tuple[Headline, ...]:
    """The leading comparisons, the others together, and the cells that change."""
    out = []
    for place, at in enumerate(facts.leading[:MOST_HEADLINES], start=1):
        one = facts.summaries[at]
        label = comparison_words(one.compared.comparison)
        kind = "fine" if one.standing == "held" else "loss"
        out.append(Headline(kind, f"#curve-{place}", label, headline(one, facts)))
    left = _others(facts, facts.leading[:MOST_HEADLINES])
    if left and not comparisons.rate:
        own = [facts.summaries[at] for at in left]
        text = comparisons_say(own, rate=False, others=bool(facts.leading))
        kind = "loss" if any(one.standing == "decided" for one in own) else "fine"
        out.append(
            Headline(kind, "#comparisons", Markup("All comparisons"), Markup("{}").format(text))
        )
    text = Markup("{} {}").format(changes.says, changes.hint)
    kind = "cells" if changes.measures else "fine"
    out.append(Headline(kind, "#cells", Markup("Cells of outcomes"), text))
    return tuple(out)


def _others(facts: VariantsInput, leading: Sequence[int]) -> list[int]:
    """Comparisons that have no headline of their own."""
    return [at for at in range(len(facts.summaries)) if at not in set(leading)]
