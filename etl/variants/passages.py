"""A passage for a paper on a comparison over all variants."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from etl.variants.facts import Comparison, Crossing, Summary
from etl.variants.sentences import (
    SIGNS,
    alternative_words,
    clear_variants,
    foremost,
    in_one_text,
    left_out,
    limits,
    short_keys,
    span,
)
from etl.variants.shares import most_often, signs_with, turning
from etl.variants.words import all_of, all_so_many, any_of, listed, number, percent


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
    compared, total = summary.compared, len(crossing)
    factor = compared.comparison.factor
    yield f"{_compared(compared.comparison)} in {_varied(crossing)}."
    lacking = f"since {_lacking(summary)}"
    if summary.without == total:
        where = f" in {any_of(total)}" if total > 1 else ""
        yield f"The {_what(summary)} has no value{where}, {lacking}."
        return
    if summary.without:
        where = f"in {summary.without:,} of {total:,} variants"
        yield f"The {_what(summary)} has no value {where}, {lacking}."
    yield from _own(summary, crossing)
    if in_one_text(summary):
        if total > 1:
            others = total - summary.without
            rest = "the other one" if others == 1 else f"the other {others:,}"
            where = rest if summary.without else all_of(total)
            yield f"The {_what(summary)} is {span(summary)} in {where}."
    else:
        yield f"Over the variants the {_what(summary)} ranges from {span(summary)}."
    if factor:
        yield from _signs(summary, crossing)
        yield from _turns(summary, crossing)
        yield from _clears(summary, crossing)
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


def _lacking(summary: Summary) -> str:
    """Why there is no number in those variants that have none."""
    compared = summary.compared
    if not compared.comparison.factor:
        return "there are no data"
    values = compared.counts[np.isnan(compared.difference)].sum(axis=-1)
    empty = (values == 0).any(axis=-1)
    if empty.all():
        return "at least one of the two conditions has none"
    if empty.any():
        return "at least one of the two conditions has none, or all values of both are the same"
    return "all values of both conditions are the same"


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
        yield f"{head} {_ones(level)} are 1: a rate of {value} ({interval})."
        return
    yield (
        f"{head} {_ones(level)} are 1 with {comparison.factor} {comparison.level} and "
        f"{_ones(reference)} with {comparison.reference}: a difference of "
        f"{number(compared.difference[base])} in log-odds ({interval})."
    )


def _ones(counts: Sequence[int]) -> str:
    """How many of some values are 1."""
    zeros, ones = counts
    return f"{ones:,} of {zeros + ones:,} values ({100 * ones / (zeros + ones):.1f}%)"


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
            f"{key} ({', '.join(map(alternative_words, own.alternatives))})"
            for key, own in zip(keys, crossing.settings, strict=True)
        ]
    )
    which = "all combinations" if crossing.full else "combinations"
    of = f"{which} of {decisions}" if len(keys) > 1 else f"by {decisions}"
    return f"{total:,} variants of the data ({source}), {of}"


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


def _turns(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """On which decision the sign hangs, where it hangs on any."""
    if summary.turns is None:
        return
    values, keys = summary.compared.difference, short_keys(crossing.settings)
    most, others = most_often(turning(values, crossing))
    if len(most) > 1:
        yield f"The sign hangs equally on {listed([keys[place] for place in most])}."
        return
    parts = []
    for alternative, signs in zip(
        crossing.settings[summary.turns].alternatives,
        signs_with(values, crossing, summary.turns),
        strict=True,
    ):
        if any(signs):
            of = f"{signs[-1]:,} of {sum(signs):,}"
            parts.append(f"in {of} with {alternative_words(alternative)}")
    how = "most on" if others else "on"
    yield f"The sign hangs {how} {keys[summary.turns]}: it is above 0 {listed(parts)}."


def _clears(summary: Summary, crossing: Crossing) -> Iterator[str]:
    """On which decision it hangs where the interval lies, where it hangs on any."""
    if summary.clears is None:
        return
    sides = summary.side
    # Where intervals lie on both sides of 0, not only whether they leave it out hangs on something.
    around, both = bool((sides == 0).any()), {-1.0, 1.0} <= {*sides.tolist()}
    what = "Whether the interval leaves out 0"
    if both and around:
        what += ", and on which side it lies,"
    elif both:
        what = "On which side of 0 the interval lies"
    keys = short_keys(crossing.settings)
    most, others = most_often(turning(sides, crossing))
    if len(most) > 1:
        yield f"{what} hangs equally on {listed([keys[place] for place in most])}."
        return
    parts = []
    for alternative, (below, inside, above) in zip(
        crossing.settings[summary.clears].alternatives,
        signs_with(sides, crossing, summary.clears),
        strict=True,
    ):
        total = below + inside + above
        some = f"{above:,}" if both else f"{below + above:,}"
        if both and around:
            some = f"above 0 in {above:,} and below 0 in {below:,}"
        if total:
            parts.append(f"{some} of {total:,} with {alternative_words(alternative)}")
    how = "most on" if others else "on"
    told = f"it does {listed([f'in {part}' for part in parts])}"
    if both and around:
        told = f"it lies {'; '.join(parts)}"
    elif both:
        told = f"it lies above 0 {listed([f'in {part}' for part in parts])}"
    yield f"{what} hangs {how} {keys[summary.clears]}: {told}."


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
