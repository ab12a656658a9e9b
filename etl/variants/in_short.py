"""What is said of a comparison over all variants, in a line or two."""

from __future__ import annotations

import numpy as np

from etl.variants.facts import Crossing, Floats, Summary
from etl.variants.sentences import (
    SIGNS,
    clear_variants,
    comparison_words,
    foremost,
    left_out,
    limits,
    span,
)
from etl.variants.shares import most_often, signs_with, turning
from etl.variants.words import all_of, all_so_many, any_of, listed, many, number, percent


def in_short(summary: Summary, crossing: Crossing) -> str:
    """The same for the console.

    Parameters
    ----------
    summary : Summary
        What is known of the comparison.
    crossing : Crossing
        The variants.

    Returns
    -------
    str
        One line; a second one where the sign turns or a setting matters most, which says with
        which.
    """
    compared, total, base = summary.compared, len(crossing), crossing.base
    head = f"{comparison_words(compared.comparison)}: "
    if summary.without == total:
        return f"{head}no value" + (f" in {any_of(total)}" if total > 1 else "")
    if np.isnan(compared.difference[base]):
        head += "no value in the study"
    else:
        what = "" if compared.comparison.factor else "rate "
        head += f"{what}{number(compared.difference[base])} ({limits(summary, base)}) in the study"
    if total == 1:
        return head
    head += f", {span(summary)} over {many(total, 'variant')}"
    if compared.comparison.factor:
        head += f"; {_signs_in_short(summary, crossing)}"
    if summary.without:
        head += f"; no value in {summary.without:,}"
    more = (
        _turns_in_short(summary, crossing)
        or _clears_in_short(summary, crossing)
        or _decides_in_short(summary, crossing)
    )
    return f"{head}\n{more}" if more else head


def _decides_in_short(summary: Summary, crossing: Crossing) -> str:
    """Which setting matters most, or which equally much; empty where that goes without saying."""
    first, total = foremost(summary), len(crossing.settings)
    if not first or total == 1:
        return ""
    share = f"{percent(first[0].together)} of the variance between variants"
    who = listed([crossing.settings[own.setting].key for own in first])
    if len(first) == total:
        return f"{all_so_many(total)} settings matter equally ({share} each)"
    if len(first) > 1:
        return f"{who} matter most, and equally ({share} each)"
    return f"{who} matters most ({share})"


def _signs_in_short(summary: Summary, crossing: Crossing) -> str:
    """In how many variants the sign holds."""
    signs = np.sign(summary.compared.difference)
    own = signs[crossing.base]
    if not abs(own) > 0:
        counts = zip(SIGNS.values(), _numbers(signs), strict=True)
        return listed([f"{word} in {some:,}" for word, some in counts if some])
    total = len(crossing)
    of = all_of(total) if summary.holds else f"{summary.same_sign:,} of {total:,} variants"
    return f"{SIGNS[own]} in {of} ({left_out(signs == own, clear_variants(summary))})"


def _turns_in_short(summary: Summary, crossing: Crossing) -> str:
    """Which setting turns the sign, with which of its alternatives; empty where none does."""
    signs = np.sign(summary.compared.difference)
    if summary.turns is None:
        several = np.count_nonzero(_numbers(signs)) > 1
        apart = "the sign turns, but not between variants that differ in one setting only"
        return apart if several else ""
    most, others = most_often(turning(summary.compared.difference, crossing))
    keys = [own.key for own in crossing.settings]
    if len(most) > 1:
        how = "most, and equally often," if others else "equally often"
        return f"the sign turns {how} with {listed([keys[place] for place in most])}"
    how = "most often with" if others else "with"
    parts: list[str] = []
    for alternative, (below, zero, above) in zip(
        crossing.settings[summary.turns].alternatives,
        signs_with(signs, crossing, summary.turns),
        strict=True,
    ):
        total = below + zero + above
        of = f"{total:,}" if parts else many(total, "variant")
        parts.append(
            f"in {above:,} of {of} with {alternative}" if total else f"no value with {alternative}"
        )
    return f"the sign turns {how} {keys[summary.turns]}: above 0 {', '.join(parts)}"


def _clears_in_short(summary: Summary, crossing: Crossing) -> str:
    """Which setting decides whether the interval leaves out 0; empty where none does."""
    if summary.clears is None:
        return ""
    most, others = most_often(turning(summary.side, crossing))
    keys = [own.key for own in crossing.settings]
    what = "whether the interval leaves out 0 hangs"
    if len(most) > 1:
        return f"{what} equally on {listed([keys[place] for place in most])}"
    how = "most on" if others else "on"
    parts: list[str] = []
    for alternative, (below, around, above) in zip(
        crossing.settings[summary.clears].alternatives,
        signs_with(summary.side, crossing, summary.clears),
        strict=True,
    ):
        total = below + around + above
        of = f"{total:,}" if parts else many(total, "variant")
        does = f"it does in {below + above:,} of {of}" if total else "no value"
        parts.append(f"{does} with {alternative}")
    return f"{what} {how} {keys[summary.clears]}: {', '.join(parts)}"


def _numbers(signs: Floats) -> list[int]:
    """How many signs there are of each."""
    return [int((signs == sign).sum()) for sign in SIGNS]
