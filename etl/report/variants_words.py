"""How the page about variants names comparisons, decisions and numbers, and sums a curve up."""

from __future__ import annotations

import math

import numpy as np
from markupsafe import Markup, escape

from etl.report.variants_input import FILES, VariantsInput
from etl.report.wording import NOTHING, count, counted, name, number, percent
from etl.variants.facts import Comparison, Crossing, Summary

#: Regions counted together, as the comparisons write it.
TOGETHER = "(all)"
_SPELLED = {"false": "off", "true": "on"}


def code(text: str) -> Markup:
    """A name as a program writes it; it may break after an underscore or a full stop.

    Examples
    --------
    >>> code("under_ms")
    Markup('<code>under_<wbr>ms</code>')
    """
    shown = escape(text).replace("_", Markup("_<wbr>")).replace(".", Markup(".<wbr>"))
    return Markup("<code>{}</code>").format(shown)


def alternative(text: str) -> str:
    """A value of a setting; switched off or on is said so.

    Examples
    --------
    >>> alternative("false"), alternative("80")
    ('off', '80')
    """
    return _SPELLED.get(text, text)


def variant_name(crossing: Crossing, variant: int) -> str:
    """What a variant is called: its number from 1, and its name where it has one.

    Parameters
    ----------
    crossing : Crossing
        The variants.
    variant : int
        Its place, from 0.

    Returns
    -------
    str
        Plain text.
    """
    own = crossing.names[variant]
    return f"{variant + 1:,}{f' {own}' if own else ''}"


def is_rate(comparison: Comparison) -> bool:
    """Whether a rate is looked at, since the study has no factors."""
    return not comparison.factor


def place_words(comparison: Comparison) -> Markup:
    """Where an outcome is taken."""
    if not comparison.region:
        return Markup("whole trials")
    if comparison.region == TOGETHER:
        return Markup("all regions together")
    return name(comparison.region)


def comparison_words(comparison: Comparison) -> Markup:
    """A comparison as a heading names it, escaped.

    Examples
    --------
    >>> print(comparison_words(Comparison("fixated", "verb", "", "", "")))
    <code>fixated</code> at <bdi>verb</bdi>
    """
    where = place_words(comparison)
    within = "at" if comparison.region not in ("", TOGETHER) else "over"
    said = Markup("{} {} {}").format(code(comparison.outcome), within, where)
    if is_rate(comparison):
        return said
    return Markup("{}, {}").format(said, levels_words(comparison))


def levels_words(comparison: Comparison) -> Markup:
    """The levels that are compared, escaped."""
    return Markup("{} {} against {}").format(
        name(comparison.factor), name(comparison.level), name(comparison.reference)
    )


def comparison_text(comparison: Comparison) -> str:
    """The same as plain text, for programs that read aloud."""
    parts = (comparison.outcome, comparison.region, comparison.factor, comparison.level)
    return ", ".join(part for part in parts if part)


def value(amount: float, *, rate: bool) -> str:
    """A difference in log-odds, or a rate.

    Examples
    --------
    >>> value(-0.412, rate=False), value(0.0, rate=False), value(0.125, rate=True)
    ('−0.41', '0.00', '12.5%')
    """
    if math.isnan(amount):
        return NOTHING
    if rate:
        return percent(amount)
    text = number(amount, 2, signed=True)
    return "0.00" if text == "+0.00" else text


def interval(low: float, high: float, *, rate: bool) -> str:
    """An interval in brackets; empty where there is none.

    Examples
    --------
    >>> interval(-0.5, 1.25, rate=False)
    '[−0.50, +1.25]'
    """
    if math.isnan(low) or math.isnan(high):
        return ""
    return f"[{value(low, rate=rate)}, {value(high, rate=rate)}]"


def share_words(share: float) -> str:
    """A share in whole percent; what is more than none is never said to be none.

    Examples
    --------
    >>> share_words(0.624), share_words(0.0004), share_words(0.0), share_words(float("nan"))
    ('62%', '<1%', '0%', '–')
    """
    if math.isnan(share):
        return NOTHING
    if 0 < share < 0.005:
        return "<1%"
    return f"{max(0.0, share):.0%}"


def ends(summary: Summary) -> tuple[float, float]:
    """The lowest and the highest value over the variants; NaN where no variant has one."""
    known = summary.compared.difference[np.isfinite(summary.compared.difference)]
    return (float(known.min()), float(known.max())) if len(known) else (math.nan, math.nan)


def more_in(facts: VariantsInput, kind: str, left: int) -> Markup:
    """What is said under a list that was cut; empty where all is shown.

    Parameters
    ----------
    facts : VariantsInput
        Names the tables beside the page.
    kind : str
        Which list, a key of ``FILES``.
    left : int
        How many entries are not shown.

    Returns
    -------
    Markup
        With the table that has all of them.
    """
    if left <= 0:
        return Markup()
    if FILES[kind] in dict(facts.tables):
        return Markup("and {} more: {} has all").format(count(left), code(FILES[kind]))
    return Markup('and {} more: the <a href="#tables">tables beside this page</a> have all').format(
        count(left)
    )


def why_no_shares(summary: Summary, crossing: Crossing) -> str:
    """Why nothing can be said of shares; empty where it can.

    Parameters
    ----------
    summary : Summary
        Of a comparison.
    crossing : Crossing
        The variants.

    Returns
    -------
    str
        A sentence.
    """
    if summary.shares:
        return ""
    what = "rate" if is_rate(summary.compared.comparison) else "difference"
    if not crossing.full:
        return (
            "There are no shares: not every combination of the alternatives is among the variants, "
            "so what one decision does cannot be told from what the others do."
        )
    if summary.without:
        verb = "has" if summary.without == 1 else "have"
        return (
            f"There are no shares: {counted(summary.without, 'variant')} {verb} no {what}, and "
            "shares need one in every combination."
        )
    return f"There are no shares: the {what} is the same in all variants."


def sign_words(summary: Summary) -> str:
    """In how many variants the sign holds, in a clause without a full stop.

    Parameters
    ----------
    summary : Summary
        Of a comparison of two levels.

    Returns
    -------
    str
        With what becomes of the others.
    """
    whole = len(summary.order)
    has = summary.positive + summary.negative + summary.zero
    if not has:
        return "no variant has a difference"
    if summary.same_sign == 0:
        parts = _split(summary)
        return f"the study as it stands has no sign; over the variants {parts}"
    every = summary.clear == summary.same_sign
    clear = f"the interval leaves out 0 in {'all' if every else count(summary.clear)} of these"
    if summary.holds:
        each = "the one variant" if whole == 1 else f"all {count(whole)} variants"
        return f"the sign holds in {each}; {clear}"
    return (
        f"the sign holds in {count(summary.same_sign)} of {count(whole)} variants; {clear}; "
        f"over all, {_split(summary)}"
    )


def _split(summary: Summary) -> str:
    """How many variants lie on each side of 0."""
    parts = [
        (summary.positive, "above 0"),
        (summary.negative, "below 0"),
        (summary.zero, "exactly 0"),
        (summary.without, "without a difference"),
    ]
    said = [f"{count(n)} {'is' if n == 1 else 'are'} {words}" for n, words in parts if n]
    return " and ".join([", ".join(said[:-1]), said[-1]] if len(said) > 1 else said)


def headline(summary: Summary, facts: VariantsInput) -> Markup:
    """A comparison summed up: its sign or range, and the decision that matters most.

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
    rate = is_rate(summary.compared.comparison)
    low, high = ends(summary)
    base = float(summary.compared.difference[facts.crossing.base])
    if rate and math.isnan(low):
        said = "no variant has a rate"
    elif rate:
        said = f"{value(base, rate=True)} in the study, {_range(low, high, rate=True)}"
    else:
        said = sign_words(summary)
        if summary.positive + summary.negative + summary.zero:
            said += f"; log-odds {value(base, rate=False)} in the study, "
            said += _range(low, high, rate=False)
    out = Markup("{}.").format(f"{said[:1].upper()}{said[1:]}")
    if rate and summary.without and not math.isnan(low):
        out += Markup(" {} without a rate.").format(counted(summary.without, "variant"))
    if summary.turns is not None:
        flips = summary.shares[summary.turns].flips if summary.shares else math.nan
        often = "" if math.isnan(flips) else f" ({share_words(flips)} of such pairs)"
        out += Markup(" Choosing {} anew turns the sign most often{}.").format(
            code(facts.short_keys[summary.turns]), often
        )
    if summary.turns is None and summary.clears is not None:
        out += Markup(" Choosing {} anew most often decides whether the interval does.").format(
            code(facts.short_keys[summary.clears])
        )
    if summary.matters is not None and summary.shares:
        out += Markup(" {} decides most: {} of the variance between variants.").format(
            code(facts.short_keys[summary.matters]),
            share_words(summary.shares[summary.matters].together),
        )
    return out


def _range(low: float, high: float, *, rate: bool) -> str:
    """From the lowest to the highest."""
    texts = value(low, rate=rate), value(high, rate=rate)
    if texts[0] == texts[1]:
        return f"{texts[0]} throughout"
    return f"from {texts[0]} to {texts[1]} over the variants"
