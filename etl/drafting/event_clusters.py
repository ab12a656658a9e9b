"""Lines sorted by their shapes: alike are those whose words that stay stand in the same places."""

from __future__ import annotations

import unicodedata
from collections import Counter
from collections.abc import Iterable, Sequence
from itertools import pairwise

from etl.drafting.event_shapes import Shape, joined
from etl.drafting.event_tokens import (
    NO_NUMBER,
    Token,
    first_word,
    has_decimal_commas,
    is_number,
    is_word,
    numbers_within,
    tokens_of,
)
from etl.drafting.structure import side_of

#: Of one form of line so many first words are told apart; of more, only the frequent ones.
_MOST_FIRST_WORDS = 30
_MOST_KEYS = 12
#: Lines that come where others come too share at least so much of what stands beside them.
_ALIKE, _UNLIKE = 0.5, 0.2
#: A word that says what a line tells hardly ever stands in two lines of its form in a row.
_MOST_REPEATS = 0.02
#: Shapes of fewer lines are too few to tell from what stands beside them.
_ENOUGH = 5
#: A number, or a word with a digit, in the form of lines whose words differ in number.
_ANY = "\0N"


def shapes_of(lines: Sequence[str], file: Sequence[int] = ()) -> list[Shape]:
    """Find the shapes of lines.

    Parameters
    ----------
    lines : sequence of str
        Lines, none blank.
    file : sequence of int, optional
        Which log each is from; all are from one where absent.

    Returns
    -------
    list of Shape
        The most frequent first.
    """
    commas = has_decimal_commas(lines[:2000])
    forms: dict[str, dict[int | None, dict[str, Shape]]] = {}
    around: list[str] = []
    for number, raw in enumerate(lines):
        line = unicodedata.normalize("NFC", raw.rstrip())
        tokens = tokens_of(line, commas=commas)
        place = first_word(tokens)
        word = "" if place is None else tokens[place].text
        around.append(word)
        form = "".join(_form(token) for token in tokens)
        own = forms.setdefault(form, {}).setdefault(place, {})
        shape = own.get(word)
        if shape is None:
            shape = own[word] = Shape(tokens, [], [[] for _ in tokens], line)
        shape.lines.append(number)
        for cells, token in zip(shape.cells, tokens, strict=True):
            cells.append(token.text)
    found: list[Shape] = []
    for by_place in forms.values():
        for own in by_place.values():
            parts = [_with_kinds(one) for one in _few_words(list(own.values()))]
            for part in _same_but_first(parts, around, file):
                found += _split_by_key(part, around)
    found = [_with_numbers_apart(shape, commas=commas) for shape in _with_rests(found, around)]
    return sorted(found, key=lambda shape: (-len(shape), shape.lines[0]))


def _form(token: Token) -> str:
    """A token as part of the form of a line; runs of blanks are all alike."""
    if token.kind == "sign":
        return token.text
    return {"quoted": '"\0W"', "blank": " "}.get(token.kind, "\0W")


def _with_kinds(shape: Shape) -> Shape:
    """A shape whose tokens are numbers where all of their cells are."""
    for place, token in enumerate(shape.tokens):
        if token.kind not in ("number", "word"):
            continue
        texts = set(shape.cells[place]) - NO_NUMBER
        numeric = bool(texts) and all(map(is_number, texts))
        shape.tokens[place] = Token("number" if numeric else "word", token.text)
    return shape


def _few_words(parts: Sequence[Shape]) -> list[Shape]:
    """Shapes apart by their first word; where there are too many words, the rare ones as one."""
    if len(parts) <= _MOST_FIRST_WORDS:
        return list(parts)
    least = max(_ENOUGH, sum(map(len, parts)) / _MOST_FIRST_WORDS)
    frequent = [part for part in parts if len(part) >= least]
    return [*frequent, _together([part for part in parts if len(part) < least])]


def _together(parts: Sequence[Shape]) -> Shape:
    """Several shapes of one form as one."""
    order = sorted(
        (line, part, row) for part, s in enumerate(parts) for row, line in enumerate(s.lines)
    )
    whole = Shape(list(parts[order[0][1]].tokens), [], [[] for _ in parts[0].tokens])
    whole.sample = parts[order[0][1]].sample
    for line, part, row in order:
        whole.lines.append(line)
        for cells, own in zip(whole.cells, parts[part].cells, strict=True):
            cells.append(own[row])
    return _with_kinds(whole)


def _same_but_first(
    parts: Sequence[Shape], around: Sequence[str], file: Sequence[int]
) -> list[Shape]:
    """Shapes of one form, those as one that only differ in a first word that is a value."""
    left = list(parts)
    found: list[Shape] = []
    while left:
        one = left.pop(0)
        for other in list(left):
            alike = _same_words(one, other) and _beside_alike(one, other, around)
            if alike and not _count_apart(one, other, file):
                left = [shape for shape in left if shape is not other]
                one = _together([one, other])
        found.append(one)
    return found


def _same_words(one: Shape, other: Shape) -> bool:
    """Whether two shapes have the same words but for the first one, and there are any."""
    place = one.first_word()
    own = {p: text for p, text in one.constants().items() if p != place}
    theirs = {p: text for p, text in other.constants().items() if p != place}
    return own == theirs and any(is_word(text) for text in own.values())


def _count_apart(one: Shape, other: Shape, file: Sequence[int]) -> bool:
    """Whether a number of two shapes counts in each by itself, as practice and trials may do."""
    for place in one.numbers():
        own, theirs = (
            [(file[line] if len(file) else 0, text) for line, text in pairs]
            for pairs in (
                zip(shape.lines, shape.cells[place], strict=True) for shape in (one, other)
            )
        )
        counts = len(set(own)) == len(own) and len(set(theirs)) == len(theirs)
        if counts and 2 * len(set(own) & set(theirs)) >= min(len(own), len(theirs)):
            return True
    return False


def _beside_alike(one: Shape, other: Shape, around: Sequence[str], least: float = _ALIKE) -> bool:
    """Whether lines of two shapes stand above and below lines of the same kinds."""
    return all(
        _shared(_beside(one.lines, around, step), _beside(other.lines, around, step)) >= least
        for step in (-1, 1)
    )


def _beside(lines: Iterable[int], around: Sequence[str], step: int) -> Counter[str]:
    """What lines stand above or below."""
    beside = (line + step for line in lines)
    return Counter(around[line] for line in beside if 0 <= line < len(around))


def _shared(one: Counter[str], other: Counter[str]) -> float:
    """Which share two countings have in common."""
    counts = one.total(), other.total()
    if not all(counts):
        return 1.0  # nothing speaks against it
    return sum(min(one[key] / counts[0], other[key] / counts[1]) for key in one)


def _split_by_key(shape: Shape, around: Sequence[str]) -> list[Shape]:
    """A shape taken apart by a word that says what a line tells, and not what of it."""
    first = shape.first_word()
    for place in shape.variables():
        if shape.kind(place) not in ("word", "quoted") or place == first:
            continue
        cells = shape.cells[place]
        keys = list(dict.fromkeys(cells))
        wordy = 2 <= len(keys) <= _MOST_KEYS and all(map(is_word, keys))
        if not wordy or all(map(side_of, keys)):
            continue
        if _say_what(shape, place, keys, around) or _name_values(shape, place, keys):
            rows = {key: [r for r, cell in enumerate(cells) if cell == key] for key in keys}
            parts = [_with_kinds(shape.only(own)) for own in rows.values()]
            return [one for part in parts for one in _split_by_key(part, around)]
    return [shape]


def _say_what(shape: Shape, place: int, keys: Sequence[str], around: Sequence[str]) -> bool:
    """Whether lines with different words stand beside different lines, as starts and ends do."""
    cells = shape.cells[place]
    repeats = sum(one == other for one, other in pairwise(cells))
    if repeats > _MOST_REPEATS * len(cells):
        return False
    named = dict(zip(shape.lines, cells, strict=True))
    # The word tells lines of the shape itself apart when they stand beside each other.
    told = {line: f"{around[line]}\0{cell}" for line, cell in named.items()}
    beside: dict[tuple[str, int], Counter[str]] = {(k, s): Counter() for k in keys for s in (-1, 1)}
    for line, key in named.items():
        for step in (-1, 1):
            if 0 <= line + step < len(around):
                beside[key, step][told.get(line + step, around[line + step])] += 1
    return all(
        min(_shared(beside[one, step], beside[other, step]) for step in (-1, 1)) < _UNLIKE
        for number, one in enumerate(keys)
        for other in keys[:number]
    )


def _name_values(shape: Shape, place: int, keys: Sequence[str]) -> bool:
    """Whether words are names of what stands after them: each is followed by values of its own."""
    after = place + 1
    while after < len(shape.tokens) and shape.kind(after) in ("blank", "sign"):
        after += 1
    if after >= len(shape.tokens) or not shape.varies(after):
        return False
    values: dict[str, Counter[str]] = {key: Counter() for key in keys}
    for key, value in zip(shape.cells[place], shape.cells[after], strict=True):
        values[key][value] += 1
    if any(own.total() < 2 for own in values.values()):
        return False
    wordy = {key: all(map(is_word, own)) for key, own in values.items()}
    again = all(2 * len(own) <= own.total() for key, own in values.items() if wordy[key])
    apart = all(
        not values[one].keys() & values[other].keys() and (wordy[one] or wordy[other])
        for number, one in enumerate(keys)
        for other in keys[:number]
    )
    return again and apart


def _with_rests(shapes: Sequence[Shape], around: Sequence[str]) -> list[Shape]:
    """Shapes that differ only in how many words stand in one place, taken together."""
    groups: dict[tuple[str, ...], list[Shape]] = {}
    for shape in shapes:
        groups.setdefault(_runs(shape), []).append(shape)
    out: list[Shape] = []
    for form, own in groups.items():
        usual = max(own, key=len)
        like = [s for s in own if s is usual or _may_be_one(usual, s, around)]
        out += [shape for shape in own if not any(shape is one for one in like)]
        before, after = _in_common(like)
        stays = any(is_word(t.text) for t in (*usual.tokens[:before], *_last(usual, after)))
        joins = len(like) > 1 and _ANY in form and stays
        out += [_rest_joined(like, before, after)] if joins else like
    return out


def _may_be_one(one: Shape, other: Shape, around: Sequence[str]) -> bool:
    """Whether lines may be of one kind by what stands beside them."""
    return _beside_alike(one, other, around, _UNLIKE if len(other) < _ENOUGH else _ALIKE)


def _runs(shape: Shape) -> tuple[str, ...]:
    """The form of a line but for how many words follow each other, and its first word."""
    first = shape.first_word()
    form = ["" if first is None else shape.tokens[first].text]
    for place, token in enumerate(shape.tokens):
        if token.kind == "blank":
            continue
        if token.kind == "sign":
            form.append(token.text)
        elif token.kind == "number" or not all(map(is_word, shape.cells[place])):
            form.append(_ANY)
        elif form[-1] != "\0R" or len(form) == 1:
            form.append("\0R")
    return tuple(form)


def _in_common(shapes: Sequence[Shape]) -> tuple[int, int]:
    """How many tokens shapes have in common at their beginning, and how many at their end."""
    before, after = _common(shapes, 1), _common(shapes, -1)
    return before, min(after, min(len(shape.tokens) for shape in shapes) - before)


def _common(shapes: Sequence[Shape], step: int) -> int:
    """How many tokens shapes have in common at their beginning or, with -1, at their end."""
    count = 0
    while all(count < len(shape.tokens) for shape in shapes):
        at = count if step > 0 else -1 - count
        kinds = {shape.tokens[at].kind for shape in shapes}
        texts = {text for shape in shapes for text in set(shape.cells[at])}
        if len(kinds) > 1 or (kinds & {"word", "quoted", "sign"} and len(texts) > 1):
            break
        count += 1
    return count


def _last(shape: Shape, count: int) -> list[Token]:
    """The last tokens of a shape."""
    return shape.tokens[len(shape.tokens) - count :]


def _rest_joined(shapes: Sequence[Shape], before: int, after: int) -> Shape:
    """Several shapes as one in which all between what they have in common is one token."""
    lines = sorted(
        (line, part, row) for part, one in enumerate(shapes) for row, line in enumerate(one.lines)
    )
    first = shapes[lines[0][1]]
    tokens = [*first.tokens[:before], Token("rest", ""), *_last(first, after)]
    whole = Shape(tokens, [], [[] for _ in tokens], first.sample)
    kept = [*whole.cells[:before], *whole.cells[before + 1 :]]
    for line, part, row in lines:
        shape = shapes[part]
        end = len(shape.tokens) - after
        whole.lines.append(line)
        places = (*range(before), *range(end, len(shape.tokens)))
        for cells, place in zip(kept, places, strict=True):
            cells.append(shape.cells[place][row])
        kinds = (token.kind for token in shape.tokens[before:end])
        rest = zip(kinds, (own[row] for own in shape.cells[before:end]), strict=True)
        whole.cells[before].append(joined([Token(kind, text) for kind, text in rest]))
    return _with_kinds(whole)


def _with_numbers_apart(shape: Shape, *, commas: bool) -> Shape:
    """A shape in which numbers that are written as one word are tokens of their own."""
    tokens: list[Token] = []
    cells: list[list[str]] = []
    for place, token in enumerate(shape.tokens):
        own = shape.cells[place]
        found = numbers_within(own, commas=commas) if token.kind == "word" else None
        if found is None or found.between == ("", ""):
            tokens.append(token)
            cells.append(own)
            continue
        for number, between in enumerate(found.between):
            if between:
                tokens.append(Token("sign", between))
                cells.append([between] * len(own))
            if number < len(found.numbers):
                tokens.append(Token("number", found.numbers[number][0]))
                cells.append(found.numbers[number])
    shape.tokens, shape.cells = tokens, cells
    return shape
