"""The numbers of a comparison, variant by variant, on the page about variants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from etl.report.variants_input import VariantsInput
from etl.report.variants_words import alternative, interval, is_rate, value, variant_name
from etl.report.wording import count, counted, name
from etl.variants.facts import Summary

#: Up to so many variants all have their numbers in the page; of more, so many at each end.
MOST_ROWS = 300
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


@dataclass(frozen=True, slots=True)
class Gap:
    """Variants along the curve that are not shown.

    Attributes
    ----------
    place : float
        Before the first of them, for sorting.
    text : str
        Where they are, and how many.
    """

    place: float
    text: str


def collect_numbers(
    facts: VariantsInput, summary: Summary
) -> tuple[tuple[NumbersRow | Gap, ...], int]:
    """Gather the variants along a curve, of many the two ends and the study.

    Parameters
    ----------
    facts : VariantsInput
        What the page is made from.
    summary : Summary
        Of the comparison.

    Returns
    -------
    tuple of (tuple of NumbersRow or Gap, int)
        The rows, and how many variants have none.
    """
    whole = len(summary.order)
    if whole <= MOST_ROWS:
        return tuple(_numbers_row(facts, summary, place) for place in range(whole)), 0
    # The end of the curve is where values end: variants without one come after it.
    there = whole - summary.without
    own = int(np.flatnonzero(summary.order == facts.crossing.base)[0])
    ends = {*range(min(MOST_AT_ENDS, there)), *range(max(0, there - MOST_AT_ENDS), there), own}
    rows: list[NumbersRow | Gap] = []
    done = 0
    for place in (*sorted(ends), whole):
        # No gap is of both kinds.
        if done < there < place:
            rows += _gap(summary, done, there)
            done = there
        rows += _gap(summary, done, place)
        if place < whole:
            rows.append(_numbers_row(facts, summary, place))
        done = place + 1
    return tuple(rows), whole - len(ends)


def _gap(summary: Summary, first: int, after: int) -> list[Gap]:
    """What is said of variants that are not shown; nothing where there are none."""
    if first >= after:
        return []
    left = after - first
    which = f"Place {count(first + 1)}"
    if left > 1:
        which = f"Places {count(first + 1)} to {count(after)}"
    what = "rate" if is_rate(summary.compared.comparison) else "difference"
    without = f" without a {what}" if first >= len(summary.order) - summary.without else ""
    verb = "is" if left == 1 else "are"
    return [Gap(first + 0.5, f"{which}: {counted(left, 'variant')}{without} {verb} not shown.")]


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
