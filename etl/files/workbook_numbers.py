"""Numbers of a workbook as its number formats show them."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from decimal import ROUND_HALF_UP, Context, Decimal
from functools import lru_cache

#: Significant digits that spreadsheet programs keep and show of a number (common practice, no
#: source); what a double holds beyond them is noise such as that of 0.1 + 0.2.
SIGNIFICANT_DIGITS = 15
#: Decimal exponents from which on a number of the format General is written with an E.
_LARGEST_PLAIN, _SMALLEST_PLAIN = 15, -10
#: Room for every digit of the largest double, about 1.8e308, and for its decimals.
_WIDE = Context(prec=400)
_ROUND_HALF_UP = Context(prec=400, rounding=ROUND_HALF_UP)

#: The built-in format 44 as one library writes it, without the signs between its sections, and as
#: it is (ECMA-376-1:2016, section 18.8.30).
_MISPRINTED = {
    '_("$"* #,##0.00_)_("$"* \\(#,##0.00\\)_("$"* "-"??_)_(@_)': '_("$"* #,##0.00_);'
    '_("$"* \\(#,##0.00\\);_("$"* "-"??_);_(@_)'
}

_TOKEN = re.compile(r'"[^"]*"|\\.|_.|\*.|\[[^\]]*\]|General|E[+-]|.', re.IGNORECASE | re.DOTALL)
_COLOUR = re.compile(
    r"\[(black|blue|cyan|green|magenta|red|white|yellow|color ?\d+)\]", re.IGNORECASE
)
_LOCALE = re.compile(r"\[\$([^\]-]*)(?:-[^\]]*)?\]")
#: Signs that stand for themselves without quotes; letters beyond ASCII, and currency signs, too.
_PLAIN_SIGNS = frozenset(" $-+():!^&'~{}<>=")
_SIGNS_OF_LESS = "-()"
_DIGITS = frozenset("0#?")
_MARKS = _DIGITS | frozenset(".,%")
#: A section that is understood, a letter a token, L for what stands for itself. A comma behind the
#: last whole place would divide by a thousand: there is no room for one.
_SHAPE = re.compile(
    r"(?P<before>[L%]*)(?P<integer>(?:[0#?](?:[0#?,L]*[0#?])?)?)(?:\.(?P<decimals>[0#?]*))?"
    r"(?:E(?P<exponent>[0#?]+))?(?P<after>[L%]*)"
)


@dataclass(frozen=True, slots=True)
class ShownNumber:
    """A number as a sheet shows it.

    Attributes
    ----------
    text : str
        The number, without thousands signs; a minus sign where it is negative.
    exact : bool
        Whether the text tells all that the cell holds.
    understood : bool
        Whether the number format was followed; otherwise the text is that of General.
    """

    text: str
    exact: bool = True
    understood: bool = True


def number_as_shown(value: float, number_format: str) -> ShownNumber:
    """Write a number as a sheet shows it.

    Parameters
    ----------
    value : float
        The number, finite.
    number_format : str
        The format code of the cell, such as ``"0.00"``.

    Returns
    -------
    ShownNumber
        Digits, decimals, percent signs, exponents and texts of the format are followed; signs
        between thousands are not, nor are brackets for negative numbers, since both would make
        numbers that can be read in two ways. A format that does more (fractions, conditions,
        scaling by thousands) is not understood.

    References
    ----------
    Format codes: ECMA-376-1:2016, sections 18.8.30 and 18.8.31.

    Examples
    --------
    >>> [number_as_shown(1234.5, code).text for code in ("General", "#,##0.00", "0", "0%")]
    ['1234.5', '1234.50', '1235', '123450%']
    >>> number_as_shown(7, '"P"000').text, number_as_shown(0.1 + 0.2, "General").text
    ('P007', '0.3')
    """
    number = _decimal(value)
    pattern = _pattern_for(number, number_format)
    if pattern is None:
        return ShownNumber(general(value), understood=False)
    if pattern.is_general:
        return ShownNumber(pattern.before + general(value) + pattern.after)
    size = number.copy_abs().scaleb(2 * pattern.percents, _WIDE)
    shown, text = _scientific(size, pattern) if pattern.exponent else _fixed(size, pattern)
    if not text:  # a format without a 0 shows nothing at all of a number below a half
        return ShownNumber(general(value), understood=False)
    sign = "-" if number < 0 and shown else ""
    return ShownNumber(f"{sign}{pattern.before}{text}{pattern.after}", shown == size)


def general(value: float) -> str:
    """Write a number as the format General holds it: 15 significant digits, no trailing zeros.

    Parameters
    ----------
    value : float
        The number, finite.

    Returns
    -------
    str

    Examples
    --------
    >>> [general(number) for number in (3.0, -0.0, 1e-5, 2.5e20, 12345678901234567)]
    ['3', '0', '0.00001', '2.5E+20', '1.23456789012346E+16']
    """
    number = _decimal(value)
    if number and not _SMALLEST_PLAIN < number.adjusted() < _LARGEST_PLAIN:
        return format(value, f".{SIGNIFICANT_DIGITS}G")
    whole = f"{number:f}"
    whole = whole.rstrip("0").rstrip(".") if "." in whole else whole
    return "0" if whole == "-0" else whole


def _decimal(value: float) -> Decimal:
    """The number that a spreadsheet program takes a double for."""
    return Decimal(format(value, f".{SIGNIFICANT_DIGITS}g"))


@dataclass(frozen=True, slots=True)
class _Pattern:
    """What one section of a number format says."""

    before: str
    integer: tuple[str, ...]
    decimals: tuple[str, ...]
    after: str
    percents: int = 0
    exponent: str = ""
    exponent_digits: int = 0
    is_general: bool = False

    def without(self, signs: str) -> _Pattern:
        """The same but for some signs around the number."""
        before, after = (
            "".join(sign for sign in text if sign not in signs)
            for text in (self.before, self.after)
        )
        return replace(self, before=before, after=after)

    @property
    def fewest_decimals(self) -> int:
        """How many decimals are shown even where they are zero."""
        return max((place for place, t in enumerate(self.decimals, start=1) if t == "0"), default=0)


def _pattern_for(number: Decimal, number_format: str) -> _Pattern | None:
    """The pattern of the section that a number takes; None where it is not understood."""
    sections = _sections(number_format)
    if number < 0 and len(sections) > 1:
        pattern = _parsed(sections[1])
        # Brackets, and the minus sign itself, say what our minus sign will.
        return None if pattern is None else pattern.without(_SIGNS_OF_LESS)
    # Accounting formats show a mere dash for zero, which may be a mark of a missing value too.
    own = 2 if not number and len(sections) > 2 and not _is_dash(sections[2]) else 0
    return _parsed(sections[own])


def _is_dash(section: Sequence[str]) -> bool:
    """Whether a section shows a dash and no letter or digit besides, at most a currency's sign."""
    shown = "".join(_literal(token) or "" for token in section)
    return "-" in shown and not any(sign.isalnum() for sign in shown)


@lru_cache(maxsize=256)
def _sections(number_format: str) -> tuple[tuple[str, ...], ...]:
    """The sections of a format (positive; negative; zero; text), each as its tokens."""
    sections: list[list[str]] = [[]]
    for sign in _TOKEN.findall(_MISPRINTED.get(number_format, number_format) or "General"):
        if sign == ";":
            sections.append([])
        else:
            sections[-1].append(sign)
    return tuple(tuple(section) for section in sections)


@lru_cache(maxsize=256)
def _parsed(section: tuple[str, ...]) -> _Pattern | None:
    """The pattern of one section; None where it is not understood."""
    tokens: list[str] = []
    for token in section:
        literal = _literal(token)
        if literal is None:
            return None
        # What stands for itself is marked, so that a quoted zero is no place for a digit.
        tokens += [f"={sign}" for sign in literal] if literal != token else [token]
    if "@" in tokens or any(token.casefold() == "general" for token in tokens):
        return _general_pattern(tokens)
    return _numeric_pattern(tokens)


def _literal(token: str) -> str | None:
    """What a token shows: itself where it is a sign of the format, None if not understood."""
    first = token[0]
    if first in '"\\' and len(token) > 1:
        return token[1:-1] if first == '"' else token[1]
    if first in "_*" and len(token) > 1:
        return ""  # room as wide as a letter, or filled up with one
    if first == "[" and len(token) > 1:
        if _COLOUR.fullmatch(token):
            return ""
        place = _LOCALE.fullmatch(token)
        return place.group(1) if place else None
    if token.casefold() == "general" or token in ("E+", "E-"):
        return token
    if first in "0#?.,%@" or first in _PLAIN_SIGNS or not first.isascii():
        return token
    return None


def _general_pattern(tokens: list[str]) -> _Pattern | None:
    """The pattern of General, or of text (@), with literals around it."""
    marks = [place for place, t in enumerate(tokens) if t == "@" or t.casefold() == "general"]
    if len(marks) > 1 or any(t in _DIGITS or t in (".", ",", "%") for t in tokens):
        return None
    before, after = _spelled(tokens[: marks[0]]), _spelled(tokens[marks[0] + 1 :])
    return _Pattern(before.lstrip(), (), (), after.rstrip(), is_general=True)


def _numeric_pattern(tokens: list[str]) -> _Pattern | None:
    """The pattern of a section with places for digits."""
    shape = "".join(t if t in _MARKS else "E" if t in ("E+", "E-") else "L" for t in tokens)
    found = _SHAPE.fullmatch(shape)
    if found is None or not (found["integer"] or found["decimals"]):
        return None
    whole = tokens[slice(*found.span("integer"))]
    power = tokens[found.start("exponent") - 1] if found["exponent"] else ""
    if power and len(whole) != 1:
        return None  # several places before an E make steps of a thousand and the like
    return _Pattern(
        _spelled(tokens[: found.end("before")]).lstrip(),
        tuple(place for place in whole if place != ","),
        tuple(tokens[slice(*found.span("decimals"))]),
        _spelled(tokens[found.start("after") :]).rstrip(),
        shape.count("%"),
        power,
        len(found["exponent"] or ""),
    )


def _spelled(tokens: Sequence[str]) -> str:
    """What tokens without places for digits show."""
    return "".join(t[1:] if len(t) > 1 and t[0] == "=" else t for t in tokens)


def _fixed(size: Decimal, pattern: _Pattern) -> tuple[Decimal, str]:
    """A number as shown by whole places and decimals: its value, and its text."""
    step = Decimal(1).scaleb(-len(pattern.decimals))
    shown = size.quantize(step, context=_ROUND_HALF_UP)
    integer, _, decimals = f"{shown:f}".partition(".")
    kept = decimals.rstrip("0").ljust(pattern.fewest_decimals, "0") if decimals else ""
    whole = _filled(pattern.integer, integer.lstrip("0"))
    return shown, whole + ("." + kept if kept else "")


def _filled(places: Sequence[str], digits: str) -> str:
    """Digits put into their places from the right, what stands between the places in between."""
    out: list[str] = []
    open_places = sum(place in _DIGITS for place in places)
    left = list(digits)
    for place in reversed(places):
        if place not in _DIGITS:
            out.append(_spelled([place]))
            continue
        open_places -= 1
        if left:
            out.append(left.pop())
        elif place == "0":
            out.append("0")
        if not open_places:
            out += reversed(left)
            left = []
    return "".join(left) + "".join(reversed(out))


def _scientific(size: Decimal, pattern: _Pattern) -> tuple[Decimal, str]:
    """A number as shown with an exponent: its value, and its text."""
    power = size.adjusted() if size else 0
    step = Decimal(1).scaleb(-len(pattern.decimals))
    head = size.scaleb(-power, _WIDE).quantize(step, context=_ROUND_HALF_UP)
    if head >= 10:
        power += 1
        head = size.scaleb(-power, _WIDE).quantize(step, context=_ROUND_HALF_UP)
    integer, _, decimals = f"{head:f}".partition(".")
    kept = decimals.rstrip("0").ljust(pattern.fewest_decimals, "0") if decimals else ""
    sign = "-" if power < 0 else "+" if pattern.exponent == "E+" else ""
    mantissa = integer + ("." + kept if kept else "")
    text = f"{mantissa}E{sign}{abs(power):0{pattern.exponent_digits}d}"
    return head.scaleb(power, _WIDE), text
