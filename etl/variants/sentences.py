"""What is said of a comparison over all variants, in plain sentences."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence

import numpy as np

from etl.variants.facts import Comparison, Crossing, Flags, Setting, SettingShare, Summary
from etl.variants.words import all_of, all_so_many, any_of, ends_of, listed, number, percent

#: What signs are called.
SIGNS = {-1.0: "below 0", 0.0: "exactly 0", 1.0: "above 0"}


def short_keys(settings: Sequence[Setting]) -> tuple[str, ...]:
    """What settings are called where there is little room.

    Parameters
    ----------
    settings : sequence of Setting
        All of them.

    Returns
    -------
    tuple of str
        For each the last part of its key, with as many parts before as tell it from the others.

    Examples
    --------
    >>> keys = ["regions.tolerance_px", "screening.fixations.under_ms",
    ...         "screening.fixations.merge.under_ms"]
    >>> short_keys([Setting(key, ("1", "2"), 0) for key in keys])
    ('tolerance_px', 'fixations.under_ms', 'merge.under_ms')
    """
    ends = [ends_of(own.key) for own in settings]
    shared = Counter(end for own in ends for end in own)
    return tuple(next((e for e in own if shared[e] == 1), own[-1]) for own in ends)


def setting_words(key: str, alternative: str) -> str:
    """A setting with one of its alternatives.

    Parameters
    ----------
    key : str
        What the setting is called.
    alternative : str
        The value as TOML writes it.

    Returns
    -------
    str
        As in the study file; ``false`` is off.

    Examples
    --------
    >>> setting_words("under_ms", "80"), setting_words("merge", "false")
    ('under_ms = 80', 'merge off')
    """
    return f"{key} off" if alternative == "false" else f"{key} = {alternative}"


def comparison_words(comparison: Comparison) -> str:
    """What is compared, where, and with what.

    Parameters
    ----------
    comparison : Comparison
        A comparison, or a rate.

    Returns
    -------
    str
        Outcome, region and levels, as far as there are any.

    Examples
    --------
    >>> comparison_words(Comparison("skip", "verb", "fit", "odd", "fitting"))
    'skip at verb, fit odd against fitting'
    """
    text = comparison.outcome
    if comparison.region:
        text += f" at {comparison.region}"
    if comparison.factor:
        text += f", {comparison.factor} {comparison.level} against {comparison.reference}"
    return text


def for_paper(summary: Summary, crossing: Crossing) -> str:
    """A passage for a paper: what was varied, and what became of the result.

    Parameters
    ----------
    summary : Summary
        What is known of the comparison.
    crossing : Crossing
        The variants.

    Returns
    -------
    str
        Whole sentences, in one paragraph.
    """
    return " ".join(_passage(summary, crossing))


def _passage(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """One sentence of the passage after the other."""
    compared, total, base = summary.compared, len(crossing), crossing.base
    factor = compared.comparison.factor
    yield f"{_compared(compared.comparison)} in {_varied(crossing)}."
    lacking = "since one of the two conditions has none" if factor else "since there are no data"
    if summary.without == total:
        where = f" in {any_of(total)}" if total > 1 else ""
        yield f"The {_what(summary)} has no value{where}, {lacking}."
        return
    if summary.without:
        where = f"in {summary.without:,} of {total:,} variants"
        yield f"The {_what(summary)} has no value {where}, {lacking}."
    yield from _own(summary, crossing)
    if _one_text(summary):
        if total > 1:
            others = total - summary.without
            rest = "the other one" if others == 1 else f"the other {others:,}"
            where = rest if summary.without else all_of(total)
            yield f"The {_what(summary)} is {span(summary)} in {where}."
    else:
        yield f"Over the variants the {_what(summary)} ranges from {span(summary)}."
    if factor:
        yield from _signs(summary, crossing)
    yield from _decides(summary, crossing)
    corrected = int(compared.corrected.sum())
    if corrected:
        where = f"in {corrected:,} of {total:,} variants" if total > 1 else "here"
        yield (
            f"Where one of the four counts is 0 ({where}), 0.5 was added to each (Haldane, 1956; "
            "Anscombe, 1956)."
        )
    source = "Woolf, 1955" if factor else "Wilson, 1927"
    yield f"Intervals ({source}) take trials as independent, though they share readers and items."


def _compared(comparison: Comparison) -> str:
    """What was compared with what, as the beginning of a sentence."""
    where = comparison.outcome + (f" at {comparison.region}" if comparison.region else "")
    if not comparison.factor:
        return f"The rate of {where} was computed"
    return (
        f"The rates of {where} with {comparison.factor} {comparison.level} and with "
        f"{comparison.reference} were compared"
    )


def _what(summary: Summary) -> str:
    """What a comparison gives a number for."""
    return "difference in log-odds" if summary.compared.comparison.factor else "rate"


def _own(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """What the study as it stands has."""
    compared, base = summary.compared, crossing.base
    head = "In the study as it stands" if len(crossing) > 1 else "Here"
    if np.isnan(compared.difference[base]):
        yield f"{head} it has no value."
        return
    (reference, level), comparison = compared.counts[base].tolist(), compared.comparison
    interval = f"95% interval {limits(summary, base)}"
    if not comparison.factor:
        value = number(compared.difference[base])
        yield f"{head} {_ones(level)} of the values are 1: a rate of {value} ({interval})."
        return
    yield (
        f"{head} {_ones(level)} of the values are 1 with {comparison.level} and {_ones(reference)} "
        f"with {comparison.reference}: a difference of {number(compared.difference[base])} in "
        f"log-odds ({interval})."
    )


def _ones(counts: Sequence[int]) -> str:
    """How many of some values are 1, with the rate."""
    zeros, ones = counts
    return f"{ones:,} of {zeros + ones:,} ({100 * ones / (zeros + ones):.1f}%)"


def _varied(crossing: Crossing) -> str:
    """How many variants there are, and of what."""
    total = len(crossing)
    if total == 1:
        return "one variant only, the study as it stands"
    source = "a multiverse analysis; Steegen, Tuerlinckx, Gelman, & Vanpaemel, 2016"
    if any(crossing.names):
        return f"{total:,} named variants of the data, the study as it stands among them ({source})"
    keys = short_keys(crossing.settings)
    decisions = listed(
        [
            f"{key} ({', '.join(map(_alternative, own.alternatives))})"
            for key, own in zip(keys, crossing.settings, strict=True)
        ]
    )
    which = "all combinations" if crossing.full else "combinations"
    of = f"{which} of {decisions}" if len(keys) > 1 else f"by {decisions}"
    return f"{total:,} variants of the data ({source}), {of}"


def variant_words(crossing: Crossing, variant: int) -> str:
    """A variant in words: what it is called, and how it differs from the study as it stands.

    Parameters
    ----------
    crossing : Crossing
        The variants.
    variant : int
        Which.

    Returns
    -------
    str
    """
    if variant == crossing.base:
        return "the study as it stands"
    keys = short_keys(crossing.settings)
    own, base = crossing.choices[variant].tolist(), crossing.choices[crossing.base].tolist()
    differs = ", ".join(
        setting_words(key, setting.alternatives[choice])
        for key, setting, choice, usual in zip(keys, crossing.settings, own, base, strict=True)
        if choice != usual
    )
    name = crossing.names[variant]
    return f"{name} ({differs})" if name else differs


def _signs(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """In how many variants the sign holds, and in how many of these and others it is clear."""
    compared, total, base = summary.compared, len(crossing), crossing.base
    signs, clear = np.sign(compared.difference), clear_variants(summary)
    if total == 1:
        if signs[base]:
            yield f"Its interval {'leaves out' if summary.clear else 'includes'} 0."
        return
    # An interval around 0 includes 0: nothing is to be said of it.
    counts = {
        sign: f"{word} in {int((signs == sign).sum()):,}"
        + (f" ({left_out(signs == sign, clear)})" if sign else "")
        for sign, word in SIGNS.items()
        if (signs == sign).any()
    }
    if not abs(signs[base]) > 0:
        yield f"So there is no sign that could hold; the value is {listed([*counts.values()])}."
        return
    same, own = signs == signs[base], SIGNS[signs[base]]
    if summary.holds:
        yield f"It is {own} in {all_of(total)} ({left_out(same, clear)})."
        return
    of = f"{summary.same_sign:,} of {total:,} variants"
    yield f"It is {own}, as in the study, in {of} ({left_out(same, clear)})."
    others = [text for sign, text in counts.items() if sign != signs[base]]
    if others:
        yield f"It is {listed(others)}."


def left_out(among: Flags, clear: Flags) -> str:
    """In how many of some variants the interval leaves out 0.

    Parameters
    ----------
    among, clear : (V,) bool arrays
        Some variants; and those whose interval leaves out 0.

    Returns
    -------
    str
    """
    total, some = int(among.sum()), int((among & clear).sum())
    if total == 1:
        return f"its interval {'leaves out' if some else 'includes'} 0"
    which = f"{some:,}"
    if some in (0, total):
        none, every = ("neither", "both") if total == 2 else ("none", "all")
        which = every if some else none
    return f"the interval leaves out 0 in {which} of these"


def _decides(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """Which decision explains most of the variance; nothing where there is one decision only."""
    first, keys = foremost(summary), short_keys(crossing.settings)
    if not first or len(keys) == 1:
        return
    together, alone = percent(first[0].together), percent(first[0].alone)
    who = listed([keys[own.setting] for own in first])
    if len(first) == len(keys):
        yield (
            f"{all_so_many(len(keys)).capitalize()} decisions explain equally much of the variance "
            f"between variants ({together} each, with interactions)."
        )
    elif len(first) > 1:
        yield (
            "The decisions that explain the largest shares of the variance between variants are "
            f"{who}, equally much ({together} each, with interactions)."
        )
    else:
        share = together
        if alone != together:
            share += f" with its interactions, {alone} by itself"
        yield (
            "The decision that explains the largest share of the variance between variants is "
            f"{who} ({share})."
        )


def foremost(summary: Summary) -> list[SettingShare]:
    """The settings with the largest share, as far as whole percents tell them apart.

    Parameters
    ----------
    summary : Summary
        Of a comparison.

    Returns
    -------
    list of SettingShare
    """
    if not summary.shares:
        return []
    most = max(own.together for own in summary.shares)
    return [own for own in summary.shares if percent(own.together) == percent(most)]


def clear_variants(summary: Summary) -> Flags:
    """Where the interval leaves out 0.

    Parameters
    ----------
    summary : Summary
        Of a comparison.

    Returns
    -------
    (V,) bool array
    """
    clear: Flags = (summary.compared.low > 0) | (summary.compared.high < 0)
    return clear


def limits(summary: Summary, variant: int) -> str:
    """The interval in one variant.

    Parameters
    ----------
    summary : Summary
        Of a comparison.
    variant : int
        Which variant.

    Returns
    -------
    str
    """
    compared = summary.compared
    return f"{number(compared.low[variant])} to {number(compared.high[variant])}"


def span(summary: Summary) -> str:
    """The lowest and the highest value; one, where two decimals do not tell them apart.

    Parameters
    ----------
    summary : Summary
        Of a comparison.

    Returns
    -------
    str
    """
    low, high = _lowest_and_highest(summary)
    if not _one_text(summary):
        return f"{number(low)} to {number(high)}"
    return number(low) if low == high else f"{number(low)} (to two decimals)"


def _one_text(summary: Summary) -> bool:
    """Whether all values are written alike."""
    low, high = _lowest_and_highest(summary)
    return number(low) == number(high)


def _lowest_and_highest(summary: Summary) -> tuple[float, float]:
    """The ends of the values, of which there is at least one."""
    ordered = summary.compared.difference[summary.order]
    return float(ordered[0]), float(ordered[-1 - summary.without])
