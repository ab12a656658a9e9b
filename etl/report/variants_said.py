"""A comparison over all variants summed up: how far it spreads, its sign, what it hangs on."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from markupsafe import Markup

from etl.report.variants_decisions import Sides, sides_with
from etl.report.variants_input import VariantsInput
from etl.report.variants_words import (
    alternative,
    code,
    ends,
    is_rate,
    share_words,
    so_many,
    value,
)
from etl.report.wording import count, counted, listed, number
from etl.variants.facts import Summary
from etl.variants.sentences import foremost
from etl.variants.shares import most_often, turning

#: Of a decision with more alternatives than this the two that are farthest apart are named.
MOST_ALTERNATIVES: Final = 4
#: Odds beyond so many times as high, or below one part of it, are not spelled out.
_MOST_ODDS: Final = 1000.0


def headline(summary: Summary, facts: VariantsInput) -> Markup:
    """A comparison summed up: how far it spreads, whether its sign holds, what it hangs on.

    Parameters
    ----------
    summary : Summary
        Of the comparison.
    facts : VariantsInput
        Names the settings.

    Returns
    -------
    Markup
        Sentences with a full stop, escaped.
    """
    plain = [spread_words(summary, facts.crossing.base), sign_words(summary, facts.crossing.base)]
    hangs = [_clears_words(summary, facts), _turns_words(summary, facts)]
    moves = _moves_words(summary, facts, told_apart=any(hangs))
    return Markup(" ").join(part for part in (*plain, *hangs, moves) if part)


def spread_words(summary: Summary, base: int) -> str:
    """From where to where the values go, held against the study's own interval.

    Parameters
    ----------
    summary : Summary
        Of the comparison.
    base : int
        Which variant is the study as it stands.

    Returns
    -------
    str
        Sentences.
    """
    compared = summary.compared
    rate = is_rate(compared.comparison)
    what = "rate" if rate else "difference"
    low, high = ends(summary)
    if math.isnan(low):
        return f"No variant has a {what}."
    measure = what if rate else "difference in log-odds"
    own = float(compared.difference[base])
    odds = "" if rate or math.isnan(own) else f" ({odds_words(own)})"
    texts = value(low, rate=rate), value(high, rate=rate)
    if texts[0] == texts[1]:
        there = len(summary.order) - summary.without
        said = f"The {measure} is {texts[0]}{odds} in {_all_there(there, summary.without)}."
    else:
        width = float(compared.high[base] - compared.low[base])
        said = (
            f"The {measure} goes from {texts[0]} to {texts[1]} over the variants: a range of "
            f"{_size(high - low, rate=rate)}"
        )
        if width > 0:
            said += (
                f", {_against((high - low) / width)} of the study’s interval "
                f"({_size(width, rate=rate)})"
            )
        said += "."
        if not math.isnan(own):
            said += f" In the study it is {value(own, rate=rate)}{odds}."
    if summary.without:
        verb = "has" if summary.without == 1 else "have"
        among = ""
        if math.isnan(own):
            is_it = summary.without == 1
            among = ": the study as it stands" if is_it else ", the study as it stands among them"
        said += f" {counted(summary.without, 'variant')} {verb} no {what}{among}."
    return said


def odds_words(difference: float) -> str:
    """A difference in log-odds as a ratio of odds, to two figures.

    Examples
    --------
    >>> odds_words(0.88), odds_words(-0.5), odds_words(0.02)
    ('odds 2.4 times as high', 'odds 0.61 times as high', 'odds 1.02 times as high')
    >>> odds_words(0.001), odds_words(0.0)
    ('odds almost the same', 'odds the same')
    >>> odds_words(3.0), odds_words(-9.0)
    ('odds 20 times as high', 'odds less than 0.001 times as high')
    """
    if difference == 0:
        return "odds the same"
    # Beyond this the exponential need not be a number.
    if abs(difference) >= math.log(_MOST_ODDS):
        times = "more than 1,000" if difference > 0 else "less than 0.001"
        return f"odds {times} times as high"
    ratio = math.exp(difference)
    if round(ratio, 2) == 1:
        return "odds almost the same"
    if 0.95 <= ratio < 1.05:
        times = f"{ratio:.2f}"
    elif ratio < 1:
        times = f"{ratio:.2g}"
    else:
        times = number(ratio, 1 if ratio < 9.95 else 0)
    return f"odds {times} times as high"


def sign_words(summary: Summary, base: int) -> str:
    """In how many variants the sign holds, and in how many of these the interval leaves out 0.

    Parameters
    ----------
    summary : Summary
        Of the comparison.
    base : int
        Which variant is the study as it stands.

    Returns
    -------
    str
        Sentences; empty for rates, and where no variant has a difference.
    """
    there = len(summary.order) - summary.without
    if is_rate(summary.compared.comparison) or not there:
        return ""
    same, clear = summary.same_sign, summary.clear
    if not same:
        why = "" if np.isnan(summary.compared.difference[base]) else ", its difference is exactly 0"
        # The one variant that has a difference of 0 says nothing more.
        if there == 1 and why:
            return f"The study as it stands has no sign{why}."
        return (
            f"The study as it stands has no sign{why}; over the variants {_split(summary)}. "
            f"{_interval(summary.apart, there)}."
        )
    if same == there:
        text = f"The sign holds in {_all_there(there, summary.without)}"
        if there == 1:
            return f"{text}, and its interval {'leaves out' if clear else 'includes'} 0."
        return f"{text}, and the interval leaves out 0 in {so_many(clear, there)} of these."
    among = " that have a difference" if summary.without else ""
    text = f"The sign holds in {count(same)} of {counted(there, 'variant')}{among}"
    if same == 1:
        text += f", and its interval {'leaves out' if clear else 'includes'} 0"
    else:
        text += f", and the interval leaves out 0 in {_of_these(clear, same)}"
    text += f"; over all, {_split(summary)}."
    if other := summary.apart - clear:
        text += (
            f" In {count(other)} of the others the interval leaves out 0 too, on the other side."
        )
    return text


def _interval(apart: int, there: int) -> str:
    """In how many variants the interval leaves out 0, where there is no sign to hold."""
    if there == 1:
        return f"Its interval {'leaves out' if apart else 'includes'} 0"
    return f"The interval leaves out 0 in {_of_these(apart, there)}"


def _of_these(some: int, of: int) -> str:
    """Some of variants of which others were told of too, hence with their number."""
    return f"{so_many(some, of)} of these{f' {count(of)}' if 0 < some < of else ''}"


def _all_there(there: int, without: int) -> str:
    """All variants that have a value."""
    those = " that have a value" if without and there > 1 else " that has a value" * bool(without)
    if there == 1:
        return f"the one variant{those}"
    return f"{'both' if there == 2 else f'all {count(there)}'} variants{those}"


def _split(summary: Summary) -> str:
    """How many variants lie on each side of 0."""
    parts = [
        (summary.positive, "above 0"),
        (summary.negative, "below 0"),
        (summary.zero, "exactly 0"),
    ]
    return str(
        listed([f"{count(n)} {'is' if n == 1 else 'are'} {words}" for n, words in parts if n])
    )


def _size(amount: float, *, rate: bool) -> str:
    """A range or a width, which has no sign."""
    shown, digits, unit = (100 * amount, 1, " percentage points") if rate else (amount, 2, "")
    text = number(shown, digits)
    least = number(10.0**-digits, digits)
    return f"less than {least}{unit}" if float(text.replace(",", "")) == 0 else f"{text}{unit}"


def _against(share: float) -> str:
    """A range in widths of an interval."""
    if share < 1.05:
        return f"{share_words(share)} of the width"
    return f"{number(share, 1 if share < 9.95 else 0)} times the width"


def _keys(facts: VariantsInput, settings: list[int]) -> Markup:
    """Settings by their short names."""
    return listed([code(facts.short_keys[setting]) for setting in settings])


def _clears_words(summary: Summary, facts: VariantsInput) -> Markup:
    """On which decision it hangs most whether the interval leaves out 0, with numbers."""
    if summary.standing != "decided":
        return Markup()
    changed = turning(summary.side, facts.crossing)
    if not changed.any():
        return Markup(
            "On which decision it hangs whether the interval leaves out 0 cannot be told: no two "
            "variants that differ in one decision only differ in that."
        )
    most, others = most_often(changed)
    both = (summary.side > 0).any() and (summary.side < 0).any()
    what = "Whether the interval leaves out 0" + ", and on which side," * bool(both)
    if len(most) > 1:
        how = "most, and equally," if others else "equally"
        return Markup("{} hangs {} on {}.").format(what, how, _keys(facts, most))
    how = "hangs most on" if others else "hangs on"
    return Markup("{} {} {}: it does in {}.").format(
        what, how, _keys(facts, most), _with_each(summary, facts, most[0])
    )


def _with_each(summary: Summary, facts: VariantsInput, setting: int) -> Markup:
    """In how many variants with each alternative the interval leaves out 0."""
    sides = sides_with(summary, facts.crossing, setting)
    found = [own for own in sides if own[1].of]
    texts = facts.crossing.settings[setting].alternatives
    none = [code(alternative(texts[place])) for place, own in sides if not own.of]
    if len(found) > MOST_ALTERNATIVES:
        found.sort(key=lambda own: (own[1].apart / own[1].of, own[0]))
        found = [found[0], found[-1]]

    def said(at: int, place: int, sides: Sides) -> Markup:
        of = count(sides.of) if at else counted(sides.of, "variant")
        split = f" ({sides.split})" if sides.split else ""
        return Markup("{} of {} with {}{}").format(
            count(sides.apart), of, code(alternative(texts[place])), split
        )

    text = Markup(", in ").join(said(at, *own) for at, own in enumerate(found))
    if none:
        text += Markup("; with {} no variant has a difference").format(listed(none))
    return text


def _turns_words(summary: Summary, facts: VariantsInput) -> Markup:
    """With which decision the sign changes most often."""
    if summary.turns is None:
        return Markup()
    turned = turning(summary.compared.difference, facts.crossing)
    most, others = most_often(turned)
    often = "" if not others else " most often" if len(most) == 1 else " most often, and equally,"
    which = "in this decision" if len(most) == 1 else "in one of these"
    return Markup(
        "The sign changes{} with {}: it is not the same in {} of all pairs of variants that differ "
        "{} only."
    ).format(often, _keys(facts, most), share_words(float(turned.max())), which)


def _moves_words(summary: Summary, facts: VariantsInput, *, told_apart: bool) -> Markup:
    """Which decision explains most of the variance; empty where there is one decision only."""
    first = foremost(summary)
    if not first or len(facts.crossing.settings) == 1:
        return Markup()
    what = "rate" if is_rate(summary.compared.comparison) else "difference"
    each = "" if len(first) == 1 else " each"
    return Markup("The {}{} moves most{} with {}: {} of the variance between variants{}.").format(
        what,
        " itself" * told_apart,
        "" if len(first) == 1 else ", and equally,",
        _keys(facts, [own.setting for own in first]),
        share_words(first[0].together),
        each,
    )
