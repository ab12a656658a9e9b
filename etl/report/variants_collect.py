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
from etl.report.variants_said import headline, odds_words
from etl.report.variants_words import alternative, code, comparison_words, is_rate, value
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
        Who or which rule chose the comparisons that lead; empty for rates that nobody named.
    odds : Markup
        What the difference of the first of them means in odds; empty where it has none.
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
    odds: Markup
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
    rate = bool(facts.summaries) and comparisons.rate
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
        rate,
        _chosen(facts, rate=rate),
        _odds(facts),
        tuple(collect_curve(facts, place) for place in range(len(facts.leading))),
        comparisons,
        collect_losses(facts),
        changes,
        collect_hanging(facts, "readers"),
        collect_hanging(facts, "trials"),
        tuple(map(code, facts.short_keys)),
        facts.tables,
    )


def _chosen(facts: VariantsInput, *, rate: bool) -> str:
    """Who or what chose the comparisons that lead."""
    if facts.named:
        return f"The variants file names these {'rates' if rate else 'comparisons'}."
    # The rule speaks of intervals around 0, which rates have not.
    return "" if rate else facts.rule


def _odds(facts: VariantsInput) -> Markup:
    """An example of what a difference means in odds: that of the first curve that has one."""
    for at in facts.leading:
        compared = facts.summaries[at].compared
        own = float(compared.difference[facts.crossing.base])
        if not is_rate(compared.comparison) and math.isfinite(own):
            return Markup("The study’s difference of {} for {} means {}.").format(
                value(own, rate=False), comparison_words(compared.comparison), odds_words(own)
            )
    return Markup()


def _lead(facts: VariantsInput) -> str:
    """What was computed, in two sentences."""
    crossing = facts.crossing
    settings = len(crossing.settings)
    decisions = counted(settings, "decision")
    named = any(crossing.names)
    if crossing.full and not named:
        numbers = [len(own.alternatives) for own in crossing.settings]
        product = f" ({' × '.join(map(str, numbers))})" if settings > 1 else ""
        which = f"{counted(len(crossing), 'variant')}: all combinations of {decisions}{product}."
    else:
        whole = math.prod(len(own.alternatives) for own in crossing.settings)
        kind = "named variant" if named else "variant"
        out_of = "" if crossing.full else f", out of {count(whole)} combinations"
        which = f"{counted(len(crossing), kind)} that differ in {decisions}{out_of}."
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
