"""What the tokens of lines about trials are called: the trial, the text, and facts."""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np

from etl.drafting.columns import share_of
from etl.drafting.event_roles import EventRoles, Lines, Telling
from etl.drafting.event_shapes import Shape
from etl.drafting.meanings import listed
from etl.drafting.structure import side_of
from etl.drafting.vocabulary import likeness, words_of

#: Words for practice (common practice, no source).
PRACTICE = ("practice", "prac", "train", "warm", "uebung", "ubung", "probe")
_TRIAL = ("trial", "durchgang", "essai", "ensayo", "prova", "试次")
_COUNTS = (*_TRIAL, *PRACTICE)
#: A number of at most nine digits, perhaps with letters before it.
_COUNTER = re.compile(r"([^\W\d_]*)(\d{1,9})")
_ITEM = ("text", "item", "sent", "satz", "stim", "passage", "note", "phrase", "frase")
#: Names that only the line of a fixation can give.
_OF_FIXATIONS = frozenset(("onset", "fixation", "duration", "end", "x", "y", "label", "blink"))
#: Words that may name a reader in the header of a table, but anything in a line.
_SAYS_LITTLE = frozenset(("id", "code", "who", "name"))
#: Words before the time at which a line was written.
_STAMPS = frozenset(("t", "ts", "time", "timestamp", "stamp", "clock", "zeit", "temps", "tiempo"))
#: Words between a thing and what is said of it.
_LINKS = frozenset(("is", "was", "are", "to", "ist", "war", "est", "es", "era", "será", "è", "are"))
_WORDS = ("word", "quoted", "rest")
_SEVERAL = 4


def counts_trials(lines: Lines, shape: Shape, place: int) -> bool:
    """Whether a number, or an id such as T12, grows by about one from line to line of a log.

    Parameters
    ----------
    lines : Lines
        All lines.
    shape : Shape
        The lines.
    place : int
        The token.

    Returns
    -------
    bool
    """
    found = [_COUNTER.fullmatch(cell) for cell in shape.cells[place]]
    known = [match for match in found if match is not None]
    if len(known) < len(found) or len({match[1] for match in known}) > 1:
        return False
    numbers = np.array([int(match[2]) for match in known])
    within = np.diff(lines.file_of(shape)) == 0
    moved = np.diff(numbers)[within]
    if not moved.size:
        return len(numbers) > 0 and bool((numbers <= len(numbers) * 10).all())
    # In one log of many readers it begins anew with each of them.
    anew = numbers[1:][within] == numbers.min()
    by_one, grows = share_of(moved == 1), share_of((moved > 0) | anew)
    return by_one >= 0.5 and grows >= 0.8


def name_start(lines: Lines, telling: Telling, roles: EventRoles) -> None:
    """Name the tokens of a line with which trials start.

    Parameters
    ----------
    lines : Lines
        All lines.
    telling : Telling
        The line; its names are replaced.
    roles : EventRoles
        The first of its starts sets the names where a line is like it.
    """
    shape, first = telling.shape, roles.starts[0]
    names: dict[int, str] = {}
    if telling is not first and shape.is_like(first.shape):
        names = {p: n for p, n in first.names.items() if p < len(shape.tokens)}
    if "trial" not in names.values():
        trial = _trial_in(lines, shape)
        if trial is not None:
            names[trial] = "trial"
    if "item" not in names.values():
        item, candidates = _item_in(shape, names)
        if item is not None:
            names[item] = "item"
        elif candidates and "item" not in roles.questions:
            told = listed((_told(shape, place) for place in candidates), "or")
            roles.questions["item"] = (
                f"which part of the line of trial_start says which text was read? It may be {told}:"
                " put (?P<item>…) around it and remove this line"
            )
    for place, name in _facts_in(shape, names, all_words=True).items():
        names[place] = name
    telling.names = names


def _trial_in(lines: Lines, shape: Shape) -> int | None:
    """The token that names the trial."""
    counting = [p for p in shape.variables() if counts_trials(lines, shape, p)]
    named = [p for p in shape.variables() if says(shape, p, _COUNTS)]
    both = [p for p in counting if p in named]
    words = [p for p in named if shape.kind(p) in _WORDS]
    if both or counting or words:
        return next(iter(both or words or counting))
    ids = [p for p in shape.variables() if shape.kind(p) in _WORDS]
    each = [p for p in ids if len(set(shape.cells[p])) > len(shape) // 2]
    return next(iter(each or named), None)


def _item_in(shape: Shape, names: dict[int, str]) -> tuple[int | None, list[int]]:
    """The token that names the text; where several may do so, those."""
    left = [place for place in shape.variables() if place not in names]
    named = [place for place in left if says(shape, place, _ITEM)]
    if named:
        return named[0], []
    several = [
        place
        for place in left
        if shape.kind(place) in _WORDS and len(set(shape.cells[place])) > _SEVERAL
    ]
    if len(several) == 1:
        return several[0], []
    return None, several


def _told(shape: Shape, place: int) -> str:
    """A token, as it stands in the first line."""
    word = shape.word_before(place)
    text = shape.cells[place][0]
    return f'"{text}" after "{word}"' if word else f'"{text}"'


def says(shape: Shape, place: int, beginnings: Iterable[str]) -> bool:
    """Whether the word before a token begins in a certain way."""
    starts = tuple(beginnings)
    return any(word.startswith(starts) for word in words_of(shape.word_before(place)))


def _facts_in(shape: Shape, known: dict[int, str], *, all_words: bool) -> dict[int, str]:
    """Names for the other tokens that may be facts: the word before each.

    ``all_words``: words without one are facts as well.
    """
    names: dict[int, str] = {}
    last = max(
        (p for p, t in enumerate(shape.tokens) if t.kind not in ("sign", "blank")), default=0
    )
    for place in shape.variables():
        if place in known:
            continue
        word = _naming_word(shape, place)
        number = shape.kind(place) == "number"
        name = _fact_name(word)
        whose = name in ("participant", "session")
        stamp = word.casefold() in _STAMPS and len(shape.words()) > 1
        echo = not all_words and says(shape, place, _TRIAL)
        if number and (stamp or echo or not name):
            continue
        given = shape.sign_beside(place, -1) == "="
        if number and not (whose or given or (place == last and not all_words)):
            continue
        if not name and not (all_words and shape.kind(place) in _WORDS):
            continue
        names[place] = _unique(name or "fact", {*known.values(), *names.values()})
    return names


def _naming_word(shape: Shape, place: int) -> str:
    """The word that says what a token is: the one before it, and before "is" or the like."""
    word = shape.word_before(place)
    if word.casefold() not in _LINKS:
        return word
    linking = [p for p, text in shape.constants().items() if p < place and text == word]
    return shape.word_before(linking[-1]) if linking else word


def _fact_name(word: str) -> str:
    """A word as the name of a fact; empty where it can be none."""
    words = words_of(word)
    if len(words) == 1 and words[0] not in _SAYS_LITTLE:
        for meant in ("participant", "session"):
            if likeness(word, meant) >= 1.0:
                return meant
    name = "_".join(words)
    if not name or not name.replace("_", "").isalnum() or name[0].isdigit():
        return ""
    return f"{name}_said" if name in _OF_FIXATIONS or name in ("trial", "item") else name


def _unique(name: str, taken: set[str]) -> str:
    """A name that is not taken yet."""
    number, unique = 2, name
    while unique in taken:
        unique, number = f"{name}_{number}", number + 1
    return unique


def stand_apart(lines: Lines, roles: EventRoles) -> None:
    """Where practice counts its trials anew, take the word before the number for a part of it.

    Parameters
    ----------
    lines : Lines
        All lines.
    roles : EventRoles
        Its starts, whose names are known.
    """
    seen: set[tuple[int, str]] = set()
    for telling in sorted(roles.starts, key=lambda one: -len(one.shape)):
        shape, place = telling.shape, telling.place("trial")
        if place is None:
            continue
        own = set(zip(lines.file_of(shape).tolist(), shape.cells[place], strict=True))
        if own & seen:
            words = [p for p in shape.constants() if p < place]
            if words and all(
                shape.kind(p) in ("blank", "sign") for p in range(words[-1] + 1, place)
            ):
                telling.wide[place] = words[-1]
        seen |= own


def find_facts(roles: EventRoles, telling: Telling) -> bool:
    """Name the facts in a line about a trial.

    Parameters
    ----------
    roles : EventRoles
        What other lines tell, for names that are not taken.
    telling : Telling
        The line; its names are replaced.

    Returns
    -------
    bool
        Whether it has any.
    """
    shape = telling.shape
    taken = roles.names()
    telling.names = {}
    for place, name in _facts_in(shape, {}, all_words=False).items():
        if all(map(side_of, set(shape.cells[place]))) and name == "eye":
            continue
        telling.names[place] = _unique(name, taken - {"participant", "session"})
        taken.add(telling.names[place])
    return bool(telling.names)
