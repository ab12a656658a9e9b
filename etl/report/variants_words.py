"""How the page about variants names comparisons, decisions and numbers."""

from __future__ import annotations

import math

import numpy as np
from markupsafe import Markup, escape

from etl.report.variants_input import FILES, VariantsInput
from etl.report.wording import NOTHING, count, counted, name, number, percent
from etl.variants.facts import Comparison, Crossing, Summary
from etl.variants.words import ROUNDING, SMALL, SMALLEST
from etl.variants.words import percent as whole_percent

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
    # With two decimals a small one would look like 0, on neither side of which it lies.
    text = number(amount, 3 if SMALLEST <= abs(amount) < SMALL else 2, signed=True)
    return "0.00" if text in ("+0.00", "−0.00") else text


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
    """A share in whole percent, as the sentences for the console and for papers write it.

    Examples
    --------
    >>> share_words(0.624), share_words(0.0004), share_words(0.9996), share_words(float("nan"))
    ('62%', 'less than 1%', 'more than 99%', '–')
    """
    return NOTHING if math.isnan(share) else whole_percent(share)


def fine_share_words(share: float) -> str:
    """A share to one place; what is not quite none or all is not called so.

    Examples
    --------
    >>> fine_share_words(0.0984), fine_share_words(0.0004), fine_share_words(0.99996)
    ('9.8%', 'less than 0.1%', 'more than 99.9%')
    """
    text = percent(share)
    if text == "0.0%":
        return "less than 0.1%" if share > ROUNDING else "0%"
    if text == "100.0%":
        return "more than 99.9%" if share < 1 - ROUNDING else "100%"
    return text


def so_many(some: int, of: int) -> str:
    """A number out of so many, in the words that none and all have.

    Examples
    --------
    >>> so_many(0, 8), so_many(3, 8), so_many(8, 8), so_many(0, 2), so_many(2, 2)
    ('none', '3', 'all', 'neither', 'both')
    """
    if some == 0:
        return "neither" if of == 2 else "none"
    if some == of:
        return "both" if of == 2 else "all"
    return count(some)


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
