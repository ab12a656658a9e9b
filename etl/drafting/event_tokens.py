"""The pieces of a line of a log: words and numbers, quoted text, blanks and signs."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from etl.drafting.structure import side_of

#: Marks that stand in the place of a number.
NO_NUMBER = frozenset((".", "-", "--", "NA", "NaN", "nan"))
_INSIDE = r"[^\s\"|,;:=()\[\]{}<>]"
#: Units that may be glued to a number (common practice, no source).
_UNITS = frozenset(("ms", "msec", "us", "s", "sec", "px", "pix", "deg", "hz", "mm", "cm", "%", "°"))
_LETTERS_OF_UNITS = re.compile(r"^(?:ms|s|sec|px|deg|°)")
#: Letters that may be glued to the front of a measure, as in x281.2.
_MEASURES = frozenset("xytd")
#: Signs between two numbers of which the second is the end of what begins with the first.
_RANGES = ("..", "...", "…", "-", "–", "—", "->", "→", "~")
#: A number of two joined ones that is this large, or has decimals, is measured and no id.
_MEASURED = 50.0
_NEARLY_ALL = 0.95
#: Of numbers with a comma, so many tell whether it joins two whole ones.
_ENOUGH = 20


@dataclass(frozen=True, slots=True)
class Token:
    """A piece of a line.

    Attributes
    ----------
    kind : {"number", "word", "quoted", "blank", "sign", "rest"}
        What it is.
    text : str
        As it stands in the line; of quoted text, what the quotes hold.
    """

    kind: str
    text: str


def tokens_of(line: str, *, commas: bool = False) -> list[Token]:
    """Cut a line into numbers, words, quoted text, blanks and signs.

    Parameters
    ----------
    line : str
        The line.
    commas : bool
        Whether numbers have decimal commas.

    Returns
    -------
    list of Token

    Examples
    --------
    >>> [(token.kind, token.text) for token in tokens_of('fix 12 at "P01"')]
    [('word', 'fix'), ('blank', ' '), ('number', '12'), ('blank', ' '), ('word', 'at'), \
('blank', ' '), ('quoted', 'P01')]
    """
    pattern, number = (_WITH_COMMAS, _COMMA_NUMBER) if commas else (_WITH_POINTS, _NUMBER)
    found = []
    for match in pattern.finditer(line):
        kind, text = str(match.lastgroup), match.group()
        if kind == "word" and (text in NO_NUMBER or number.fullmatch(text)):
            kind = "number"
        found.append(Token(kind, text[1:-1] if kind == "quoted" else text))
    return found


def _tokenizer(within: str) -> re.Pattern[str]:
    """The pattern by which lines are cut; a comma within a number may be a part of it."""
    return re.compile(
        rf'(?P<quoted>"[^"]*")|(?P<word>(?:{_INSIDE}{within})+)|(?P<blank>[^\S\t]+)|(?P<sign>.)'
    )


_WITH_POINTS, _WITH_COMMAS = _tokenizer(""), _tokenizer(r"|(?<=\d),(?=\d)")
# A point is the beginning of a number only where no other one stands before it.
_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d+)?|(?<![\d.])\.\d+)")
_COMMA_NUMBER = re.compile(r"[+-]?(?:\d+(?:[.,]\d+)?|(?<![\d.,])[.,]\d+)")


@lru_cache(maxsize=50_000)
def is_word(text: str) -> bool:
    """Whether a text is a word: it has a letter and no digit, and is no mark for no number.

    Examples
    --------
    >>> is_word("begins"), is_word("U1"), is_word("NA"), is_word("..")
    (True, False, False, False)
    """
    return (
        text not in NO_NUMBER
        and any(sign.isalpha() for sign in text)
        and not any(sign.isdigit() for sign in text)
    )


def is_number(text: str) -> bool:
    """Whether a text is a number, with a decimal point or comma or none."""
    return _COMMA_NUMBER.fullmatch(text) is not None


def first_word(tokens: Sequence[Token]) -> int | None:
    """The place of the first word that may say what a line tells; None where there is no word.

    Words that may name an eye do so only where there is no other, and so do those of a number that
    follows, as in t=4512.
    """
    words = [
        place
        for place, token in enumerate(tokens)
        if token.kind in ("word", "quoted") and is_word(token.text)
    ]
    saying = [p for p in words if not side_of(tokens[p].text)]
    return next((p for p in saying if not _names_number(tokens, p)), next(iter(saying), None))


def _names_number(tokens: Sequence[Token], place: int) -> bool:
    """Whether a sign and a number, or an id, follow a word."""
    after = [token for token in tokens[place + 1 : place + 4] if token.kind != "blank"][:2]
    signs = len(after) == 2 and after[0].kind == "sign" and after[0].text in (":", "=")
    return signs and any(sign.isdigit() for sign in after[1].text)


def has_decimal_commas(lines: Iterable[str]) -> bool:
    """Whether numbers of lines are written with decimal commas.

    Examples
    --------
    >>> has_decimal_commas(["fix 245,3 510,1"]), has_decimal_commas(["fix,245,510"])
    (True, False)
    """
    with_comma = re.compile(r"(?<![\w,.])\d+,(\d+)(?![\w,.])")
    with_point = re.compile(r"(?<![\w.])\d+\.\d+(?![\w.])")
    fractions: list[str] = []
    points = 0
    for line in lines:
        fractions += with_comma.findall(line)
        points += bool(with_point.search(line))
    if not fractions or points:
        return False
    # Two whole numbers with a comma between them: the second never begins with 0 and is long.
    long = [fraction for fraction in fractions if len(fraction) >= 3]
    joined = len(fractions) >= _ENOUGH and len(long) > 0.5 * len(fractions)
    return not (joined and not any(fraction[0] == "0" for fraction in long))


@dataclass(frozen=True, slots=True)
class Joined:
    """Numbers that are written as one word, such as 281.2/317.6 or 151ms, in many lines.

    Attributes
    ----------
    between : tuple of str
        What stands before, between and after the numbers, the same in all lines.
    numbers : list of list of str
        For each number its text in each line.
    """

    between: tuple[str, ...]
    numbers: list[list[str]]


def numbers_within(cells: Sequence[str], *, commas: bool = False) -> Joined | None:
    """The numbers of which a word consists, where it does so alike in all lines.

    Parameters
    ----------
    cells : sequence of str
        The word in each line.
    commas : bool
        Whether numbers have decimal commas.

    Returns
    -------
    Joined or None
        None where the word is no measure, but for example an id.

    Examples
    --------
    >>> numbers_within(["802..914", "948..1166"]).numbers
    [['802', '948'], ['914', '1166']]
    >>> numbers_within(["151ms", "90ms"]).between
    ('', 'ms')
    >>> numbers_within(["P01", "P02"]) is None, numbers_within(["4-2", "3-7"]) is None
    (True, True)
    """
    pattern = _COMMA_NUMBER if commas else _NUMBER
    apart = {cell: _apart(cell, pattern) for cell in dict.fromkeys(cells)}
    forms = {between for between, numbers in apart.values() if numbers}
    if len(forms) != 1:
        return None
    between = forms.pop()
    marks = "(.+?)".join(map(re.escape, between))
    split: dict[str, list[str]] = {}
    for cell, (_, numbers) in apart.items():
        missing = re.fullmatch(marks, cell) if not numbers else None
        split[cell] = numbers or list(missing.groups() if missing is not None else ())
        if not numbers and not (split[cell] and NO_NUMBER.issuperset(split[cell])):
            return None
    rows = [split[cell] for cell in cells]
    columns = [list(column) for column in zip(*rows, strict=True)]
    values = [
        np.array([float(t.replace(",", ".")) for t in column if t not in NO_NUMBER])
        for column in columns
    ]
    measured = any(text[-1].isdigit() and set(text) & set(".,") for c in columns for text in c)
    measured = measured or any(float(np.median(column)) >= _MEASURED for column in values)
    return Joined(between, columns) if _sound(between, values, measured=measured) else None


def _apart(cell: str, pattern: re.Pattern[str]) -> tuple[tuple[str, ...], list[str]]:
    """What stands around the numbers of a word, and the numbers."""
    between: list[str] = []
    numbers: list[str] = []
    at = 0
    for match in pattern.finditer(cell):
        start = match.start()
        if start == at and numbers and match.group()[0] in "+-":
            start += 1  # a sign right after a number stands between the two
        between.append(cell[at:start])
        numbers.append(cell[start : match.end()])
        at = match.end()
    return (*between, cell[at:]), numbers


def _sound(between: tuple[str, ...], values: Sequence[np.ndarray], *, measured: bool) -> bool:
    """Whether words of this form are numbers with signs or units around them."""
    before, after = between[0], between[-1]
    if any(sign.isalpha() for sign in before) and not (before.lower() in _MEASURES and measured):
        return False
    if any(sign.isalpha() for sign in after) and after.lower() not in _UNITS:
        return False
    for number, sign in enumerate(between[1:-1]):
        bare = sign if sign == "x" else _LETTERS_OF_UNITS.sub("", sign)
        if bare in ("", ".", ",") or (any(letter.isalpha() for letter in bare) and bare != "x"):
            return False
        if bare in _RANGES and not (measured and _grows(values[number], values[number + 1])):
            return False
    # Of an id such as 4/2 no part means anything by itself; of 3/40 one says how many there are.
    varying = sum(len(np.unique(column)) > 1 for column in values)
    return measured or varying < 2


def _grows(first: np.ndarray, second: np.ndarray) -> bool:
    """Whether the second of two numbers is the larger one in nearly all lines."""
    return len(first) == len(second) and float((second > first).mean()) >= _NEARLY_ALL
