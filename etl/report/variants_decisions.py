"""What each decision does to a comparison, in the tables of the page about variants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_curve import shares_bar
from etl.report.variants_input import VariantsInput
from etl.report.variants_words import alternative, code, is_rate, share_words, value
from etl.report.wording import NOTHING, count
from etl.variants.facts import Crossing, Flags, Summary
from etl.variants.shares import signs_with, turning


@dataclass(frozen=True, slots=True)
class Sides:
    """On which side of 0 the intervals of some variants lie.

    Attributes
    ----------
    of : int
        How many of the variants have a difference.
    above, below : int
        Those whose interval lies above 0, and below.
    both : bool
        Whether intervals of the comparison lie on both sides, in these variants or in others.
    """

    of: int
    above: int
    below: int
    both: bool

    @property
    def apart(self) -> int:
        """How many intervals leave out 0, on either side."""
        return self.above + self.below

    @property
    def split(self) -> str:
        """How many of these lie on which side; empty where all of the comparison lie on one."""
        if not self.both or not self.apart:
            return ""
        return f"{count(self.above)} above, {count(self.below)} below"


@dataclass(frozen=True, slots=True)
class AlternativeRow:
    """The variants with an alternative.

    Attributes
    ----------
    label : Markup
        The alternative.
    own : bool
        Whether it is the study's.
    mean : str
        The mean value; empty without shares.
    apart : str
        In how many of them the interval leaves out 0.
    """

    label: Markup
    own: bool
    mean: str
    apart: str


@dataclass(frozen=True, slots=True)
class DecisionRow:
    """How much a decision matters for a comparison.

    Attributes
    ----------
    key : Markup
        The setting in full.
    alone, together : str
        In percent; empty without shares.
    bar : Markup
        Alone and together, drawn.
    flips, clears : str
        How often choosing it anew changes the sign, and whether the interval leaves out 0.
    alternatives : tuple of AlternativeRow
        One each.
    """

    key: Markup
    alone: str
    together: str
    bar: Markup
    flips: str
    clears: str
    alternatives: tuple[AlternativeRow, ...]


@dataclass(frozen=True, slots=True)
class Decisions:
    """The decisions of a comparison.

    Attributes
    ----------
    shares : bool
        Whether the variance is split among them.
    signs : bool
        Whether there are signs, which rates have not.
    clears : bool
        Whether the interval leaves out 0 in some variants only, or on both sides.
    rows : tuple of DecisionRow
        One a setting, the one that decides most first; none where there is nothing to say.
    """

    shares: bool
    signs: bool
    clears: bool
    rows: tuple[DecisionRow, ...]


def labelled(facts: VariantsInput, setting: int, place: int) -> tuple[Markup, bool]:
    """An alternative, and whether it is the study's."""
    own = facts.crossing.settings[setting]
    return code(alternative(own.alternatives[place])), place == own.base


def by_weight(summary: Summary, crossing: Crossing) -> list[int]:
    """The settings, the one that decides most first.

    Parameters
    ----------
    summary : Summary
        Of the comparison.
    crossing : Crossing
        The variants.

    Returns
    -------
    list of int
        By share of the variance; without shares by how often they decide whether the interval
        leaves out 0. Equal ones as they come.
    """
    weight = {share.setting: share.together for share in summary.shares}
    if not weight and summary.standing == "decided":
        weight = dict(enumerate(turning(summary.side, crossing).tolist()))
    return sorted(range(len(crossing.settings)), key=lambda setting: -weight.get(setting, 0.0))


def sides_with(summary: Summary, crossing: Crossing, setting: int) -> list[tuple[int, Sides]]:
    """On which side of 0 the intervals lie with each alternative of a setting.

    Parameters
    ----------
    summary : Summary
        Of a comparison of two levels.
    crossing : Crossing
        The variants.
    setting : int
        Which setting.

    Returns
    -------
    list of (int, Sides)
        The place of each alternative, and its variants.
    """
    side = summary.side
    both = bool((side > 0).any() and (side < 0).any())
    return [
        (place, Sides(below + around + above, above, below, both))
        for place, (below, around, above) in enumerate(signs_with(side, crossing, setting))
    ]


def collect_decisions(facts: VariantsInput, summary: Summary) -> Decisions:
    """Gather what each decision does to a comparison.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.
    summary : Summary
        Of the comparison.

    Returns
    -------
    Decisions
        Without rows where there are no shares, and no decision changes a sign or an interval.
    """
    clears = summary.standing == "decided"
    signs = not is_rate(summary.compared.comparison)
    if not summary.shares and summary.turns is None and not clears:
        return Decisions(shares=False, signs=signs, clears=False, rows=())
    turned = turning(summary.compared.difference, facts.crossing).tolist()
    cleared = turning(summary.side, facts.crossing).tolist()
    rows = tuple(
        _row(facts, summary, one, turned[one], cleared[one])
        for one in by_weight(summary, facts.crossing)
    )
    return Decisions(bool(summary.shares), signs, clears, rows)


def _row(
    facts: VariantsInput, summary: Summary, setting: int, turned: float, cleared: float
) -> DecisionRow:
    """One decision."""
    crossing = facts.crossing
    rate = is_rate(summary.compared.comparison)
    share = {own.setting: own for own in summary.shares}.get(setting)
    pairs = _has_pairs(crossing, ~np.isnan(summary.compared.difference), setting)
    rows = []
    for place, sides in sides_with(summary, crossing, setting):
        mean = value(share.means[place], rate=rate) if share else ""
        split = f" ({sides.split})" if sides.split else ""
        apart = f"{count(sides.apart)} of {count(sides.of)}{split}" if sides.of else NOTHING
        rows.append(AlternativeRow(*labelled(facts, setting, place), mean, apart))
    return DecisionRow(
        code(crossing.settings[setting].key),
        share_words(share.alone) if share else "",
        share_words(share.together) if share else "",
        shares_bar(share.alone, share.together) if share else Markup(),
        share_words(turned) if pairs else NOTHING,
        share_words(cleared) if pairs else NOTHING,
        tuple(rows),
    )


def _has_pairs(crossing: Crossing, there: Flags, setting: int) -> bool:
    """Whether two of these variants differ in this setting only."""
    others = np.delete(crossing.choices[there], setting, axis=1)
    return len(np.unique(others, axis=0)) < len(others)
