"""What is said of a comparison over all variants, in plain sentences."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

from etl.variants.facts import Comparison, Crossing, Flags, Setting, SettingShare, Summary
from etl.variants.words import ends_of, number, percent

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


def alternative_words(alternative: str) -> str:
    """A value as a list of alternatives has it.

    Parameters
    ----------
    alternative : str
        The value as TOML writes it.

    Returns
    -------
    str
        ``false`` is off.
    """
    return "off" if alternative == "false" else alternative


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
    if not in_one_text(summary):
        return f"{number(low)} to {number(high)}"
    return number(low) if low == high else f"{number(low)} (to two decimals)"


def _lowest_and_highest(summary: Summary) -> tuple[float, float]:
    """The ends of the values, of which there is at least one."""
    ordered = summary.compared.difference[summary.order]
    return float(ordered[0]), float(ordered[-1 - summary.without])


def in_one_text(summary: Summary) -> bool:
    """Whether all values are written alike.

    Parameters
    ----------
    summary : Summary
        Of a comparison.

    Returns
    -------
    bool
    """
    low, high = _lowest_and_highest(summary)
    return number(low) == number(high)
