"""Variants that have a name, each with its own values."""

from __future__ import annotations

import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final, TypeVar

import numpy as np

from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted
from etl.study.variant_alternatives import (
    MOST_VARIANTS,
    Varied,
    elsewhere,
    own_problems,
    too_many,
)
from etl.study.variant_crossing import settings_of, study_with
from etl.study.variant_keys import VARYING, entries
from etl.study.variant_told import Told
from etl.study.variant_values import meaning, means_off, tried, value_at
from etl.study.wording import toml_text
from etl.variants.facts import Crossing

SomeStudy = TypeVar("SomeStudy", bound=StudyFile)

#: What the study as it stands is called among named variants.
THE_STUDY: Final = "the study"


@dataclass(frozen=True, slots=True)
class _Named:
    """A variant that is sound: its name, and the values in which it is not the study."""

    name: str
    values: Mapping[KeyPath, Any]


def named(
    given: Any, study: SomeStudy, told: Told
) -> tuple[Crossing, tuple[SomeStudy, ...]] | None:
    """Read variants that are named one by one.

    A variant sets whole values: ``merge`` in it takes the place of the study's, with all its keys.

    Parameters
    ----------
    given : object
        What the variants file has under ``variants``.
    study : StudyFile
        The study.
    told : Told
        Where everything that is wrong is recorded.

    Returns
    -------
    crossing : Crossing
        Variant 0 is the study, the others are in the order of the file. A key that no variant sets
        to anything but the study's own value is none of the settings.
    studies : tuple of StudyFile
        One for each variant.
    None
        In place of both, where something was recorded.
    """
    if not isinstance(given, list) or not all(isinstance(one, Mapping) for one in given):
        told.add(
            ("variants",),
            Problem(
                ("variants",),
                "these are no variants",
                expected="a table for each variant",
                fix="write [[variants]] on a line of its own before each variant",
            ),
        )
        return None
    if len(given) + 1 > MOST_VARIANTS:
        told.add(("variants",), too_many(len(given) + 1, "name fewer variants"))
        return None
    before = len(told)
    known = own_problems(study)
    sound: list[_Named] = []
    names: dict[str, int] = {}
    for place, table in enumerate(given):
        at: KeyPath = ("variants", place)
        name = _name(table, at, names, told)
        values = _values(table, at, study, known, told)
        if values is not None:
            _told_apart(values, at, sound, told)
            sound.append(_Named(name, values))
    if len(told) > before:
        return None
    varied = tuple(
        _varied(key, study, sound) for key in VARYING if any(key in one.values for one in sound)
    )
    choices = [[0] * len(varied), *(_choice(one, varied) for one in sound)]
    studies = tuple(study_with(study, varied, chosen) for chosen in choices)
    called = (THE_STUDY, *(one.name for one in sound))
    return Crossing(settings_of(varied), called, np.array(choices, dtype=np.int64), 0), studies


def _name(table: Mapping[str, Any], at: KeyPath, names: dict[str, int], told: Told) -> str:
    """The name of a variant; empty where something about it was recorded."""
    path = (*at, "name")
    given = table.get("name")
    if given is None:
        problem = Problem(path, "this variant has no name", fix='add name = "…"')
    elif not isinstance(given, str):
        said = toml_text(given)
        problem = Problem(
            path, "this is no text", said, "text in quotes", f"write name = {quoted(said)}"
        )
    elif not given.strip():
        problem = Problem(path, "this is empty", None, "some text", "name the variant")
    else:
        name = unicodedata.normalize("NFC", given.strip())
        first = names.setdefault(name, int(at[1]))
        if name == THE_STUDY:
            problem = Problem(
                path, "the study as it stands has this name", name, "another name", "rename it"
            )
        elif first != at[1]:
            problem = Problem(
                path,
                "two variants have this name",
                name,
                "a name for each variant",
                "rename one of the two",
            )
        else:
            return name
    told.add(path, problem)
    return ""


def _values(
    table: Mapping[str, Any], at: KeyPath, study: StudyFile, known: frozenset[Problem], told: Told
) -> dict[KeyPath, Any] | None:
    """The values in which a variant is not the study; None where something was recorded."""
    before = len(told)
    settings = {key: value for key, value in table.items() if key != "name"}
    given = {entry.key: entry.value for entry in entries(settings, at, told, crossed=False)}
    for key, value in given.items():
        off = means_off(key, value)
        if off is not None:
            told.add((*at, *key), off)
    if len(told) > before:
        return None
    if not given:
        told.add(at, _is_the_study(at, "this variant sets nothing: it is the study itself"))
        return None
    examined = tried(study, given)
    for problem in examined.problems:
        if problem in known:
            continue
        path = problem.path
        own = next(
            (key for key in given if path[: len(key)] == key or key[: len(path)] == path), ()
        )
        told.add((*at, *path) if own else at, elsewhere(problem, own or at, "this variant"))
    if len(told) > before:
        return None
    values = {key: value_at(examined.draft, key) for key in given}
    differing = {
        key: value
        for key, value in values.items()
        if meaning(value) != meaning(value_at(study, key))
    }
    if not differing:
        said = "this variant sets only what the study has already: it is the study itself"
        told.add(at, _is_the_study(at, said))
        return None
    return differing


def _is_the_study(at: KeyPath, problem: str) -> Problem:
    """A variant that is none."""
    return Problem(
        at,
        problem,
        expected="at least one value that the study does not have",
        fix="set what it does otherwise, or remove it",
    )


def _told_apart(
    values: Mapping[KeyPath, Any], at: KeyPath, earlier: list[_Named], told: Told
) -> None:
    """Record where an earlier variant has the same settings."""
    own = {key: meaning(value) for key, value in values.items()}
    for other in earlier:
        if own == {key: meaning(value) for key, value in other.values.items()}:
            told.add(
                at,
                Problem(
                    at,
                    "this variant has the same settings as "
                    + (quoted(other.name) if other.name else "an earlier one"),
                    expected="settings of its own",
                    fix="keep one of the two",
                ),
            )
            return


def _varied(key: KeyPath, study: StudyFile, variants: list[_Named]) -> Varied:
    """A key with the distinct values that it has, the study's own first."""
    own = value_at(study, key)
    values = {meaning(own): own}
    for one in variants:
        if key in one.values:
            values.setdefault(meaning(one.values[key]), one.values[key])
    return Varied(key, tuple(values.values()), (None,) * len(values), 0)


def _choice(one: _Named, varied: tuple[Varied, ...]) -> list[int]:
    """Which alternative of each key a variant takes."""
    return [
        [meaning(value) for value in own.values].index(meaning(one.values[own.key]))
        if own.key in one.values
        else own.base
        for own in varied
    ]
