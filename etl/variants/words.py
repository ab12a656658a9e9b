"""Numbers and counts as sentences about variants write them."""

from __future__ import annotations

from collections.abc import Sequence

#: Shares nearer to 0 or 1 than this differ from them by rounding only.
ROUNDING = 1e-9
#: What is smaller rounds to 0 with two decimals, or with three.
SMALL, SMALLEST = 0.005, 0.0005


def number(value: float) -> str:
    """A number with two decimals; with three where two would make it look like 0.

    Examples
    --------
    >>> number(-1.234), number(0.0046), number(0.0), number(0.00004)
    ('−1.23', '0.005', '0.00', '0.00')
    """
    digits = 3 if SMALLEST <= abs(value) < SMALL else 2
    # Adding 0 turns -0.0, as rounding leaves it, into 0.0.
    return f"{round(float(value), digits) + 0.0:,.{digits}f}".replace("-", "−")


def percent(share: float) -> str:
    """A share in whole percents; what is not quite all or nothing is not called so."""
    whole = round(100 * share)
    if whole == 0 and share > ROUNDING:
        return "less than 1%"
    if whole == 100 and share < 1 - ROUNDING:
        return "more than 99%"
    return f"{whole}%"


def all_of(variants: int) -> str:
    """All variants."""
    return "both variants" if variants == 2 else f"all {variants:,} variants"


def all_so_many(total: int) -> str:
    """All of so many."""
    return "both" if total == 2 else f"all {total:,}"


def any_of(variants: int) -> str:
    """None of the variants, after a word that says no."""
    return "either variant" if variants == 2 else f"any of the {variants:,} variants"


def many(count: int, word: str) -> str:
    """A count with its word."""
    return f"{count:,} {word}{'' if count == 1 else 's'}"


def listed(names: Sequence[str]) -> str:
    """Names with commas, and an "and" before the last."""
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def ends_of(key: str) -> list[str]:
    """The ends of a key, from its last part to the whole."""
    parts = key.split(".")
    return [".".join(parts[start:]) for start in reversed(range(len(parts)))]
