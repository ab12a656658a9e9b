"""The shapes of the lines of a log of events: what stays the same, and what changes."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

from etl.drafting.structure import side_of

#: Marks that stand in the place of a number.
NO_NUMBER = frozenset((".", "-", "--", "NA", "NaN", "nan"))
_UNIT = r"(?:ms|msec|us|s|sec|px|deg)"
_INSIDE = r"[^\s\"|,;:=()\[\]{}<>]"
_SIGNS = "|,;:=()[]{}<>\"'"
#: Of one form of line so many first words are told apart; with more, the first word is no key.
_MOST_FIRST_WORDS = 30
_MOST_KEYS = 12
#: Of neighbouring lines of one shape, the share that must hold each key once.
_IN_TURN = 0.9
_VALUE_FOLLOWS = (":", "=")


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


@dataclass(slots=True)
class Shape:
    """Lines that are alike but for numbers and words that change.

    Attributes
    ----------
    tokens : list of Token
        Those of its first line.
    lines : list of int
        Where its lines stand, by their place in all that was looked at.
    cells : list of list of str
        For each token its text in each of the lines.
    sample : str
        Its first line.
    keyed : bool
        Whether a word that says what a line tells sets it apart from others of its form.
    """

    tokens: list[Token]
    lines: list[int] = field(default_factory=list)
    cells: list[list[str]] = field(default_factory=list)
    sample: str = ""
    keyed: bool = False

    def __len__(self) -> int:
        return len(self.lines)

    def varies(self, place: int) -> bool:
        """Whether a token changes from line to line; numbers and ids are taken to, always."""
        kind = self.tokens[place].kind
        if kind in ("blank", "sign"):
            return False
        return kind in ("number", "rest") or len(set(self.cells[place])) > 1 or self._is_id(place)

    def _is_id(self, place: int) -> bool:
        """Whether a word is a value: it has a digit, or a sign says that a value follows."""
        before = _beside(self.tokens, place, -1)
        after = _beside(self.tokens, place, 1)
        if after in _VALUE_FOLLOWS or place == 0:
            return False
        told = before in _VALUE_FOLLOWS and place == len(self.tokens) - 1
        return told or any(sign.isdigit() for sign in self.tokens[place].text)

    def variables(self) -> list[int]:
        """The places of the tokens that change."""
        return [place for place in range(len(self.tokens)) if self.varies(place)]

    def words(self) -> list[str]:
        """The words that stand in each of its lines."""
        return [
            token.text
            for place, token in enumerate(self.tokens)
            if token.kind in ("word", "quoted") and not self.varies(place)
        ]

    def word_before(self, place: int) -> str:
        """The word that stands before a token in each line, up to the last token that changes."""
        words: list[str] = []
        for earlier in range(place - 1, -1, -1):
            if self.tokens[earlier].kind in ("word", "quoted", "number", "rest"):
                if self.varies(earlier):
                    break
                words.append(self.tokens[earlier].text)
        return words[0] if words else ""


def _beside(tokens: Sequence[Token], place: int, step: int) -> str:
    """The sign that stands beside a token, blanks aside; empty where something else does."""
    place += step
    while 0 <= place < len(tokens) and tokens[place].kind == "blank":
        place += step
    inside = 0 <= place < len(tokens) and tokens[place].kind == "sign"
    return tokens[place].text if inside else ""


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
    found = []
    for match in (_WITH_COMMAS if commas else _WITH_POINTS).finditer(line):
        kind, text = str(match.lastgroup), match.group()
        if kind == "word" and text in NO_NUMBER:
            kind = "number"
        found.append(Token(kind, text[1:-1] if kind == "quoted" else text))
    return found


def _tokenizer(decimal: str) -> re.Pattern[str]:
    """The pattern by which lines are cut."""
    number = rf"(?<![\w.])[+-]?(?:\d+(?:{decimal}\d+)?|{decimal}\d+)"
    return re.compile(
        rf'(?P<quoted>"[^"]*")|(?P<number>{number}(?={_UNIT}?(?!{_INSIDE})))'
        rf"|(?P<word>{_INSIDE}+)|(?P<blank>[^\S\t]+)|(?P<sign>.)",
    )


_WITH_POINTS, _WITH_COMMAS = _tokenizer(r"\."), _tokenizer("[.,]")


def has_decimal_commas(lines: Iterable[str]) -> bool:
    """Whether numbers of lines are written with decimal commas.

    Examples
    --------
    >>> has_decimal_commas(["fix 245,3 510,1"]), has_decimal_commas(["fix,245,510"])
    (True, False)
    """
    with_comma = re.compile(r"(?<![\w,.])\d+,\d+(?![\w,.])")
    with_point = re.compile(r"(?<![\w.])\d+\.\d+(?![\w.])")
    commas = points = 0
    for line in lines:
        commas += bool(with_comma.search(line))
        points += bool(with_point.search(line))
    return commas > 0 and points == 0


def shapes_of(lines: Sequence[str]) -> list[Shape]:
    """Find the shapes of lines.

    Parameters
    ----------
    lines : sequence of str
        Lines, none blank.

    Returns
    -------
    list of Shape
        The most frequent first.
    """
    commas = has_decimal_commas(lines[:2000])
    forms: dict[str, dict[str, Shape]] = {}
    for number, raw in enumerate(lines):
        line = unicodedata.normalize("NFC", raw.rstrip())
        tokens = tokens_of(line, commas=commas)
        form = "".join(_form(token) for token in tokens)
        own = forms.setdefault(form, {})
        first = _first_word(tokens)
        shape = own.get(first)
        if shape is None:
            shape = own[first] = Shape(tokens, [], [[] for _ in tokens], line)
        shape.lines.append(number)
        for cells, token in zip(shape.cells, tokens, strict=True):
            cells.append(token.text)
    shapes: list[Shape] = []
    for own in forms.values():
        if len(own) > _MOST_FIRST_WORDS:
            shapes.append(_joined(list(own.values())))
        else:
            shapes += own.values()
    shapes = [part for shape in shapes for part in _split_by_key(shape)]
    return sorted(_with_rests(shapes), key=lambda shape: (-len(shape), shape.lines[0]))


def _form(token: Token) -> str:
    """A token as part of the form of a line; runs of blanks are all alike."""
    if token.kind == "sign":
        return token.text
    return {"number": "\0N", "word": "\0W", "quoted": '"\0W"', "blank": " "}[token.kind]


def _first_word(tokens: Sequence[Token]) -> str:
    """The first word of a line, where it is none that counts or names something."""
    for token in tokens:
        if token.kind in ("word", "quoted"):
            return "" if any(sign.isdigit() for sign in token.text) else token.text
    return ""


def _joined(parts: Sequence[Shape]) -> Shape:
    """Several shapes of one form as one."""
    order = sorted(
        (line, part, row) for part, s in enumerate(parts) for row, line in enumerate(s.lines)
    )
    whole = Shape(parts[order[0][1]].tokens, [], [[] for _ in parts[0].tokens])
    whole.sample = parts[order[0][1]].sample
    for line, part, row in order:
        whole.lines.append(line)
        for cells, own in zip(whole.cells, parts[part].cells, strict=True):
            cells.append(own[row])
    return whole


def _split_by_key(shape: Shape) -> list[Shape]:
    """A shape taken apart by a word that says what a line tells, and not what of it."""
    for place in shape.variables():
        if shape.tokens[place].kind not in ("word", "quoted"):
            continue
        cells = shape.cells[place]
        keys = list(dict.fromkeys(cells))
        if not 2 <= len(keys) <= _MOST_KEYS or any(any(c.isdigit() for c in key) for key in keys):
            continue
        if all(side_of(key) for key in keys):
            continue
        # Keys come in turn, each once in each trial; levels of a factor do not.
        windows = [cells[at : at + len(keys)] for at in range(0, len(cells), len(keys))]
        in_turn = sum(len(set(w)) == len(keys) for w in windows) / len(windows)
        if len(windows) > 1 and in_turn >= _IN_TURN:
            parts = [
                _only(shape, [row for row, cell in enumerate(cells) if cell == k]) for k in keys
            ]
            return [one for part in parts for one in _split_by_key(part)]
    return [shape]


def _only(shape: Shape, rows: Sequence[int]) -> Shape:
    """Some of the lines of a shape."""
    cells = [[own[row] for row in rows] for own in shape.cells]
    tokens = [Token(token.kind, own[0]) for token, own in zip(shape.tokens, cells, strict=True)]
    sample = "".join(f'"{t.text}"' if t.kind == "quoted" else t.text for t in tokens)
    return Shape(tokens, [shape.lines[row] for row in rows], cells, sample, keyed=True)


def _with_rests(shapes: Sequence[Shape]) -> list[Shape]:
    """Shapes that differ only in the words at their end, taken together."""
    groups: dict[tuple[str, ...], list[Shape]] = {}
    out = [shape for shape in shapes if shape.keyed]
    for shape in shapes:
        if not shape.keyed:
            groups.setdefault(_start(shape), []).append(shape)
    for start, own in groups.items():
        if len(own) < 2 or "\0N" not in start:
            out += own
            continue
        out.append(_rest_joined(own, _common(own)))
    return out


def _start(shape: Shape) -> tuple[str, ...]:
    """The form of a line up to its last number or sign, with the words that stay."""
    last = max(
        (p for p, token in enumerate(shape.tokens) if token.kind in ("number", "sign")), default=-1
    )
    return tuple(
        _form(token) if shape.varies(place) or token.kind in ("number", "blank") else token.text
        for place, token in enumerate(shape.tokens[: last + 1])
    )


def _common(shapes: Sequence[Shape]) -> int:
    """How many tokens the shapes have in common at their beginning, words that change apart."""
    place = 0
    while all(place < len(shape.tokens) for shape in shapes):
        kinds = {shape.tokens[place].kind for shape in shapes}
        changes = any(shape.varies(place) for shape in shapes)
        texts = {shape.tokens[place].text for shape in shapes}
        word = kinds <= {"word", "quoted"}
        if len(kinds) > 1 or (
            word and (changes or len(texts) > 1) and place >= len(_start(shapes[0]))
        ):
            break
        place += 1
    return place


def _rest_joined(shapes: Sequence[Shape], common: int) -> Shape:
    """Several shapes as one whose end is all that follows the common beginning."""
    lines = sorted(
        (line, s, row) for s, one in enumerate(shapes) for row, line in enumerate(one.lines)
    )
    first = shapes[lines[0][1]]
    whole = Shape([*first.tokens[:common], Token("rest", "")], [], [[] for _ in range(common + 1)])
    whole.sample = first.sample
    for line, part, row in lines:
        shape = shapes[part]
        whole.lines.append(line)
        for place in range(common):
            whole.cells[place].append(shape.cells[place][row])
        rest = "".join(
            f'"{own[row]}"' if token.kind == "quoted" else own[row]
            for token, own in zip(shape.tokens[common:], shape.cells[common:], strict=True)
        )
        whole.cells[common].append(rest)
    return whole
