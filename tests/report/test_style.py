"""Colours of the style sheet: contrasts, in every look of the page."""

from __future__ import annotations

import re
from importlib import resources

import pytest

STYLE = (resources.files("etl.report") / "templates" / "style.css").read_text(encoding="utf-8")
LOOKS = ("light", "dark", "print")


def colours(look: str) -> dict[str, str]:
    """The colours of a look by name; dark and print change those of light."""
    blocks = re.findall(r":root \{(.*?)\}", STYLE, re.DOTALL)
    own = [blocks[0], *([blocks[LOOKS.index(look)]] if look != "light" else [])]
    return {name: code for block in own for name, code in re.findall(r"--(\w+): (#\w+);", block)}


def luminance(code: str) -> float:
    """Relative luminance (WCAG 2.2)."""
    digits = code[1:] if len(code) == 7 else "".join(2 * c for c in code[1:])
    parts = [int(digits[i : i + 2], 16) / 255 for i in (0, 2, 4)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio (WCAG 2.2)."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def test_contrast_of_black_on_white_is_21() -> None:
    """The largest there is, by definition."""
    assert contrast("#fff", "#000") == pytest.approx(21)


@pytest.mark.parametrize("look", LOOKS)
@pytest.mark.parametrize("name", ["ink", "soft", "accent", "alarm"])
def test_words_can_be_read(look: str, name: str) -> None:
    """Text has a contrast of at least 4.5 (WCAG 2.2, 1.4.3)."""
    known = colours(look)
    assert contrast(known[name], known["paper"]) >= 4.5


@pytest.mark.parametrize("look", LOOKS)
def test_drawings_can_be_seen(look: str) -> None:
    """What a drawing shows has a contrast of at least 3 to the paper (WCAG 2.2, 1.4.11)."""
    known = colours(look)
    shown = {"kept", "range", *(f"r{i}" for i in range(8)), *(f"l{i}" for i in range(6))}
    faint = {n: contrast(known[n], known["paper"]) for n in shown}
    assert {n: round(c, 2) for n, c in faint.items() if c < 3} == {}


@pytest.mark.parametrize("look", LOOKS)
def test_hatchings_can_be_told_from_their_ground(look: str) -> None:
    """The marks of a hatching have a contrast of at least 3 to its tint."""
    known = colours(look)
    hatched = [i for i in range(8) if f"t{i}" in known]
    faint = {i: contrast(known[f"r{i}"], known[f"t{i}"]) for i in hatched}
    assert {i: round(c, 2) for i, c in faint.items() if c < 3} == {}
