"""The numbers of a comparison, variant by variant, on the page about variants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_input import VariantsInput
from etl.report.variants_words import alternative, interval, is_rate, value, variant_name
from etl.report.wording import count, name
from etl.variants.facts import Summary

#: Of so many variants at each end of a curve the numbers are in the page.
MOST_AT_ENDS = 50


@dataclass(frozen=True, slots=True)
class NumbersRow:
    """A variant with its numbers.

    Attributes
    ----------
    place : int
        Along the curve, from 1.
    label : Markup
        Number and name of the variant.
    own : bool
        Whether it is the study.
    choices : tuple of (str, bool)
        Each alternative, and whether it is the study's.
    figure, bounds : str
        Value and interval.
    counts : tuple of str
        Ones of values, of the reference and of the level; of all without factors.
    corrected : bool
        Whether 0.5 was added to each count.
    """

    place: int
    label: Markup
    own: bool
    choices: tuple[tuple[str, bool], ...]
    figure: str
    bounds: str
    counts: tuple[str, ...]
    corrected: bool


def collect_numbers(facts: VariantsInput, summary: Summary) -> tuple[tuple[NumbersRow, ...], int]:
    """Gather the variants along a curve, of many the two ends and the study.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.
    summary : Summary
        Of the comparison.

    Returns
    -------
    tuple of (tuple of NumbersRow, int)
        The rows, and how many variants have none.
    """
    whole = len(summary.order)
    places = list(range(whole))
    if whole > 2 * MOST_AT_ENDS:
        own = int(np.flatnonzero(summary.order == facts.crossing.base)[0])
        ends = {*places[:MOST_AT_ENDS], *places[-MOST_AT_ENDS:], own}
        places = sorted(ends)
    return tuple(_numbers_row(facts, summary, place) for place in places), whole - len(places)


def _numbers_row(facts: VariantsInput, summary: Summary, place: int) -> NumbersRow:
    """One variant."""
    compared, crossing = summary.compared, facts.crossing
    rate = is_rate(compared.comparison)
    variant = int(summary.order[place])
    counts = [
        f"{count(int(ones))} of {count(int(zeros + ones))}"
        for zeros, ones in compared.counts[variant]
    ]
    return NumbersRow(
        place + 1,
        name(variant_name(crossing, variant)),
        variant == crossing.base,
        choices_of(facts, variant),
        value(float(compared.difference[variant]), rate=rate),
        interval(float(compared.low[variant]), float(compared.high[variant]), rate=rate),
        tuple(counts[:1] if rate else counts),
        bool(compared.corrected[variant]),
    )


def choices_of(facts: VariantsInput, variant: int) -> tuple[tuple[str, bool], ...]:
    """What a variant takes of each setting, and whether that is as in the study.

    Parameters
    ----------
    facts : VariantsInput
        With the crossing.
    variant : int
        Its place, from 0.

    Returns
    -------
    tuple of (str, bool)
        By setting.
    """
    return tuple(
        (alternative(own.alternatives[int(place)]), int(place) == own.base)
        for own, place in zip(facts.crossing.settings, facts.crossing.choices[variant], strict=True)
    )
