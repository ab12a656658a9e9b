"""What is to be said of a comparison over all variants, and which of many are looked at first."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from etl.variants.facts import Compared, Crossing, SettingShare, Summary
from etl.variants.shares import setting_shares, turning

#: By which rule :func:`leading` chooses, for users.
LEADING_RULE = (
    "Comparisons in which the decisions decide whether the interval leaves out 0 come first; of "
    "these and the others, those whose values spread widest over the variants, measured by the "
    "width of the study's own interval; comparisons without a value in some variant come last."
)


def summarise(compared: Compared, crossing: Crossing) -> Summary:
    """Count signs, order the variants, and find out which setting decides most.

    Parameters
    ----------
    compared : Compared
        A comparison over all variants.
    crossing : Crossing
        The variants.

    Returns
    -------
    Summary
        For rates, which have no sign to speak of, ``positive``, ``negative``, ``zero`` and
        ``clear`` are 0, ``same_sign`` counts every variant, ``turns`` and ``clears`` are None, and
        no share has ``flips``. Of settings that decide equally much the first is named.

    Raises
    ------
    ValueError
        If there is not one difference for each variant.
    """
    values = compared.difference
    shares = setting_shares(values, crossing)
    order = np.argsort(values, kind="stable").astype(np.int64)
    without = int(np.isnan(values).sum())
    if not compared.comparison.factor:
        shares = tuple(replace(own, flips=0.0) for own in shares)
        most = _most(shares)
        return Summary(compared, order, 0, 0, 0, without, len(values), 0, shares, most, None)
    above, below = values > 0, values < 0
    base = crossing.base
    same = above if above[base] else below if below[base] else np.zeros_like(above)
    clear = same & ((compared.low > 0) | (compared.high < 0))
    turned = turning(values, crossing)
    summary = Summary(
        compared=compared,
        order=order,
        positive=int(above.sum()),
        negative=int(below.sum()),
        zero=int((values == 0).sum()),
        without=without,
        same_sign=int(same.sum()),
        clear=int(clear.sum()),
        shares=shares,
        matters=_most(shares),
        turns=int(turned.argmax()) if turned.any() else None,
    )
    cleared = turning(summary.side, crossing)
    return replace(summary, clears=int(cleared.argmax()) if cleared.any() else None)


def leading(summaries: Sequence[Summary], most: int, base: int = 0) -> tuple[int, ...]:
    """Which comparisons deserve a curve of their own where nobody has named any.

    Parameters
    ----------
    summaries : sequence of Summary
        All comparisons.
    most : int
        How many are chosen at most.
    base : int
        Which variant is the study as it stands.

    Returns
    -------
    tuple of int
        Their places, by :data:`LEADING_RULE`; equal ones in the order in which they come.
    """

    def rank(place: int) -> tuple[bool, bool, float]:
        own = summaries[place]
        return own.without > 0, own.standing != "decided", -_spread(own.compared, base)

    return tuple(sorted(range(len(summaries)), key=rank)[: max(most, 0)])


def _most(shares: tuple[SettingShare, ...]) -> int | None:
    """The setting with the largest share; the first of equal ones."""
    return max(shares, key=lambda own: own.together).setting if shares else None


def _spread(compared: Compared, base: int) -> float:
    """The range over all variants in widths of the study's own interval."""
    values = compared.difference[~np.isnan(compared.difference)]
    width = float(compared.high[base] - compared.low[base])
    # Without a value of its own the study gives no measure.
    return float(np.ptp(values)) / width if len(values) and width > 0 else 0.0
