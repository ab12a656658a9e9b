"""Lists of alternatives: each is tried alone in the study, before any two are combined."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, replace
from math import prod
from typing import Any, Final

from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem
from etl.study.rules import broken_rules
from etl.study.shape import field_at
from etl.study.variant_keys import MERGE, Entry
from etl.study.variant_told import Told
from etl.study.variant_values import meaning, means_off, spelled, tried, value_at
from etl.study.wording import dotted, toml_text

#: More than these nobody looks at, and each is the study computed once more.
MOST_VARIANTS: Final = 10_000


@dataclass(frozen=True, slots=True)
class Varied:
    """A key with its alternatives, all of them sound in the study as it stands.

    Attributes
    ----------
    key : tuple of str
        The key, as in the study file.
    values : tuple
        The alternatives as a study holds them, in the order of the variants file; the study's own
        is put in front where the file leaves it out.
    places : tuple of (tuple of str and int) or None
        Where each stands in the variants file; None for the one put in front.
    base : int
        Which is the study's own.
    """

    key: KeyPath
    values: tuple[Any, ...]
    places: tuple[KeyPath | None, ...]
    base: int


def own_problems(study: StudyFile) -> frozenset[Problem]:
    """What rules say against the study as it stands: nothing, but for one made in memory.

    Parameters
    ----------
    study : StudyFile
        The study.

    Returns
    -------
    frozenset of Problem
        No variant is to be blamed for these.
    """
    return frozenset(broken_rules(study, ()))


def varied_keys(entries: Sequence[Entry], study: StudyFile, told: Told) -> tuple[Varied, ...]:
    """Check lists of alternatives, and try each alternative alone.

    Parameters
    ----------
    entries : sequence of Entry
        What the variants file names, in the order of the study file.
    study : StudyFile
        The study whose decisions vary.
    told : Told
        Where everything that is wrong is recorded.

    Returns
    -------
    tuple of Varied
        Those that are sound, with two alternatives or more each.
    """
    listed = [entry for entry in entries if _is_a_list_of_values(entry, study, told)]
    number = prod(
        len({meaning(value_at(study, entry.key)), *map(meaning, entry.value)}) for entry in listed
    )
    if number > MOST_VARIANTS:
        told.add(listed[-1].at, too_many(number, "vary fewer keys, or with fewer values"))
        return ()
    known = own_problems(study)
    made = (_varied(entry, study, known, told) for entry in listed)
    return tuple(varied for varied in made if varied is not None)


def too_many(number: int, fix: str) -> Problem:
    """Refuse more variants than can be computed.

    Parameters
    ----------
    number : int
        How many there would be.
    fix : str
        What to do about it.

    Returns
    -------
    Problem
    """
    return Problem(
        (),
        f"these are {number:,} variants, more than can be computed",
        expected=f"at most {MOST_VARIANTS:,}",
        fix=fix,
    )


def elsewhere(problem: Problem, key: KeyPath, who: str) -> Problem:
    """A problem as it is told at a key that the variants file sets.

    Parameters
    ----------
    problem : Problem
        What the study file would be told.
    key : tuple of str
        The key that is set.
    who : str
        What does not go with the rest, as a message begins.

    Returns
    -------
    Problem
        The same where it is about this key; otherwise with the key that it is about in words,
        since that stands in the study file.
    """
    path = problem.path
    if path[: len(key)] == key or key[: len(path)] == path:
        return problem
    return replace(
        problem,
        path=key,
        problem=f"{who} does not go with {dotted(path)} of the study: {problem.problem}",
    )


def _is_a_list_of_values(entry: Entry, study: StudyFile, told: Told) -> bool:
    """Whether an entry can be taken apart; what stands in the way is recorded."""
    problems = list(_against_the_list(entry, study))
    for problem in problems:
        told.add(entry.at, problem)
    return not problems


def _against_the_list(entry: Entry, study: StudyFile) -> Iterator[Problem]:
    """What is wrong with a list as a whole."""
    key, given, name = entry.key, entry.value, entry.key[-1]
    if key[: len(MERGE)] == MERGE != key and value_at(study, MERGE) is None:
        yield Problem(
            key,
            "the study merges no fixations, so this key has no value in it",
            expected="alternatives of merge as a whole",
            fix="write for example merge = [false, { under_ms = 80, within_px = 14 }] under "
            "[screening.fixations]",
        )
        return
    own = value_at(study, key)
    if not isinstance(given, list):
        meant = False if means_off(key, given) else given
        other = "…" if meaning(own) == meaning(meant) else toml_text(meant)
        yield Problem(
            key,
            "this is no list of alternatives",
            given if isinstance(given, str) else toml_text(given),
            "a list in square brackets",
            f"write {name} = [{spelled(own)}, {other}]",
        )
    elif not given:
        yield Problem(
            key,
            "this list is empty",
            expected="the alternatives, with commas between them",
            fix=f"write for example {name} = [{spelled(own)}, …], or remove the key",
        )
    elif _holds_a_list(key) and not any(isinstance(one, (list, bool)) for one in given):
        other = "…" if meaning(own) == meaning(given) else toml_text(given)
        yield Problem(
            key,
            "this is one value, not a list of alternatives",
            toml_text(given),
            "a value that is itself a list in square brackets of its own",
            f"write {name} = [{spelled(own)}, {other}]",
        )


def _holds_a_list(key: KeyPath) -> bool:
    """Whether a single value of a key is a list, as the key's own example is."""
    field = field_at(key)
    examples = None if field is None else field.examples
    return examples is not None and isinstance(next(iter(examples), None), list)


def _varied(
    entry: Entry, study: StudyFile, known: Collection[Problem], told: Told
) -> Varied | None:
    """The alternatives of a key; None where something about them was recorded."""
    key, before = entry.key, len(told)
    values: list[Any] = []
    places: list[KeyPath | None] = []
    seen: dict[Any, int] = {}
    for place, given in enumerate(entry.value):
        at = (*entry.at, place)
        value = _sound(Entry(key, at, given), study, known, told)
        if value is _NOT_SOUND:
            continue
        first = seen.setdefault(meaning(value), place)
        if first != place:
            told.add(at, _named_twice(key, entry.value[first], given))
            continue
        values.append(value)
        places.append(at)
    if len(told) > before:
        return None
    own = value_at(study, key)
    base = next((n for n, one in enumerate(values) if meaning(one) == meaning(own)), None)
    if base is None:
        values, places, base = [own, *values], [None, *places], 0
    if len(values) == 1:
        told.add(
            entry.at,
            Problem(
                key,
                "this is the study's own value: nothing to vary",
                spelled(own),
                "another value beside it",
                "add a value, or remove the key",
            ),
        )
        return None
    return Varied(key, tuple(values), tuple(places), base)


def _named_twice(key: KeyPath, first: Any, second: Any) -> Problem:
    """Two alternatives that are one."""
    one, other = toml_text(first), toml_text(second)
    problem = "this alternative is named twice"
    if one != other:
        problem = f"this alternative is the same as {one}, which is named already"
    return Problem(key, problem, other, fix="keep one of the two")


_NOT_SOUND: Final = object()


def _sound(entry: Entry, study: StudyFile, known: Collection[Problem], told: Told) -> Any:
    """An alternative as a study holds it; what is wrong with it is recorded."""
    key, given = entry.key, entry.value
    off = means_off(key, given)
    if off is not None:
        told.add(entry.at, off)
        return _NOT_SOUND
    examined = tried(study, {key: given})
    problems = [problem for problem in examined.problems if problem not in known]
    for problem in problems:
        inside = problem.path[len(key) :] if problem.path[: len(key)] == key else ()
        told.add((*entry.at, *inside), elsewhere(_in_a_list(problem, key), key, spelled(given)))
    return _NOT_SOUND if problems else value_at(examined.draft, key)


def _in_a_list(problem: Problem, key: KeyPath) -> Problem:
    """A problem whose fix writes a key, as it is for one of several values of that key."""
    if problem.path[: len(key)] != key:
        return problem
    written = rf"^(write (?:for example )?){re.escape(str(key[-1]))} = "
    return replace(problem, fix=re.sub(written, r"\1", problem.fix))
