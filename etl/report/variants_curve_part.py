"""What the page shows of each leading comparison: its curve, its decisions, its numbers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_curve import (
    COLUMNS,
    Curve,
    curve_of,
    cut_off,
    leaves_out,
    numbers_row,
    passing,
    plot,
    row,
    scale_of,
    ticks,
)
from etl.report.variants_decisions import Decisions, by_weight, collect_decisions, labelled
from etl.report.variants_input import VariantsInput
from etl.report.variants_numbers import Gap, NumbersRow, collect_numbers
from etl.report.variants_said import headline
from etl.report.variants_words import (
    code,
    comparison_text,
    comparison_words,
    is_rate,
    more_in,
    share_words,
    why_no_shares,
)
from etl.report.wording import count, counted, name
from etl.variants.facts import Summary


@dataclass(frozen=True, slots=True)
class Strip:
    """A row beneath the curve.

    Attributes
    ----------
    label : Markup
        The alternative.
    own : bool
        Whether it is the study's.
    svg : Markup
        Where it is taken.
    """

    label: Markup
    own: bool
    svg: Markup


@dataclass(frozen=True, slots=True)
class StripGroup:
    """A decision beneath the curve.

    Attributes
    ----------
    heading : Markup
        Its short name.
    share : str
        How much it decides; empty where that is not known.
    strips : tuple of Strip
        One an alternative.
    """

    heading: Markup
    share: str
    strips: tuple[Strip, ...]


@dataclass(frozen=True, slots=True)
class Drawn:
    """A curve ready to be shown.

    Attributes
    ----------
    density : str
        How close its columns stand.
    above, below : Markup
        What it means to lie above and below 0; empty for rates.
    ticks, plot : Markup
        Numbers of the axis, and the values.
    between : Markup
        The line of the study where it passes a heading.
    numbers : Markup
        The numbers of the variants; empty where they would stand too close.
    clear : Markup
        The row of intervals that leave out 0; empty for rates.
    groups : tuple of StripGroup
        The decisions, the one that decides most first.
    remarks : tuple of str
        What must be known to read it.
    """

    density: str
    above: Markup
    below: Markup
    ticks: Markup
    plot: Markup
    between: Markup
    numbers: Markup
    clear: Markup
    groups: tuple[StripGroup, ...]
    remarks: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class CurvePart:
    """All that the page shows of a leading comparison.

    Attributes
    ----------
    place : int
        Its number, from 1.
    title : Markup
        Outcome, region, levels.
    spoken : str
        The same, for programs that read aloud.
    says : Markup
        It summed up.
    rate : bool
        Whether it is of a rate.
    drawn : Drawn or None
        None where no variant has a value.
    decisions : Decisions
        What each of them does.
    no_shares : str
        Why there are no shares; empty where there are.
    passage : str
        For a paper.
    rows : tuple of NumbersRow or Gap
        Variants along the curve; of many the two ends, with what is left out between.
    rows_left : Markup
        What is said of those that are not shown.
    heads : tuple of Markup
        What ``counts`` are of.
    """

    place: int
    title: Markup
    spoken: str
    says: Markup
    rate: bool
    drawn: Drawn | None
    decisions: Decisions
    no_shares: str
    passage: str
    rows: tuple[NumbersRow | Gap, ...]
    rows_left: Markup
    heads: tuple[Markup, ...]


def collect_curve(facts: VariantsInput, place: int) -> CurvePart:
    """Gather what is shown of a leading comparison.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.
    place : int
        Its place among those that lead, from 0.

    Returns
    -------
    CurvePart
        Ready to be shown.
    """
    summary = facts.summaries[facts.leading[place]]
    comparison = summary.compared.comparison
    rate = is_rate(comparison)
    curve = curve_of(summary.order, summary.compared.difference, facts.crossing.base)
    rows, left = collect_numbers(facts, summary)
    heads = (name(comparison.reference), name(comparison.level))
    return CurvePart(
        place + 1,
        comparison_words(comparison),
        comparison_text(comparison),
        headline(summary, facts),
        rate,
        _drawn(facts, summary, curve) if curve.columns else None,
        collect_decisions(facts, summary),
        why_no_shares(summary, facts.crossing),
        facts.passages[place],
        rows,
        more_in(facts, "differences", left),
        (Markup("all"),) if rate else heads,
    )


def _drawn(facts: VariantsInput, summary: Summary, curve: Curve) -> Drawn:
    """The curve with its rows."""
    compared, crossing = summary.compared, facts.crossing
    rate = is_rate(compared.comparison)
    scale = scale_of(curve, compared, rate=rate)
    together = {share.setting: share.together for share in summary.shares}
    groups = []
    for setting in by_weight(summary, crossing):
        strips = []
        for place in range(len(crossing.settings[setting].alternatives)):
            label, own = labelled(facts, setting, place)
            strips.append(Strip(label, own, row(curve, crossing.choices[:, setting] == place)))
        decides = share_words(together[setting]) if setting in together else ""
        groups.append(StripGroup(code(facts.short_keys[setting]), decides, tuple(strips)))
    what = "rate" if rate else "difference"
    remarks = []
    if not curve.single:
        fewest = int(np.diff(curve.bounds).min())
        most = int(np.diff(curve.bounds).max())
        each = count(most) if fewest == most else f"{count(fewest)} or {count(most)}"
        remarks.append(
            f"Each of the {COLUMNS} columns stands for {each} variants that follow one another: "
            "the thick mark spans their values, the thin one their intervals, and a bar beneath is "
            "as high as the share of them that take the alternative."
        )
    if cut := cut_off(curve, compared, scale, rate=rate):
        reach = "reaches" if cut == 1 else "reach"
        remarks.append(
            f"{counted(cut, 'interval')} {reach} beyond the drawing and end at its edge."
        )
    if summary.without:
        verb = "has" if summary.without == 1 else "have"
        remarks.append(
            f"{counted(summary.without, 'variant')} {verb} no {what} and "
            f"{'is' if summary.without == 1 else 'are'} not drawn."
        )
    if curve.base is None:
        remarks.append(f"The study as it stands has no {what}, so it is not marked.")
    level, reference = compared.comparison.level, compared.comparison.reference
    return Drawn(
        curve.density,
        Markup() if rate else Markup("↑ more ones with {}").format(name(level)),
        Markup() if rate else Markup("↓ more ones with {}").format(name(reference)),
        ticks(scale, rate=rate),
        plot(curve, compared, scale, rate=rate),
        passing(curve),
        numbers_row(curve),
        Markup() if rate else row(curve, leaves_out(compared)),
        tuple(groups),
        tuple(remarks),
    )
