"""All combinations of alternatives, and what only a combination contradicts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import product
from math import prod
from typing import TypeVar

import numpy as np

from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, Rule
from etl.study.rules import RULES
from etl.study.variant_alternatives import MOST_VARIANTS, Varied, own_problems, too_many
from etl.study.variant_keys import short
from etl.study.variant_told import Told
from etl.study.variant_values import spelled, with_value
from etl.study.wording import dotted
from etl.variants.facts import Crossing, Setting

SomeStudy = TypeVar("SomeStudy", bound=StudyFile)

#: So many combinations that contradict themselves in one way are spelled out.
_SPELLED_OUT = 5

#: Which alternative of which setting, for some of the settings.
_Chosen = frozenset[tuple[int, int]]


@dataclass(slots=True)
class _Contradiction:
    """One thing that is wrong with combinations only."""

    problem: Problem
    variants: int = 0
    by: list[_Chosen] = field(default_factory=list)
    more: bool = False


def settings_of(varied: Sequence[Varied]) -> tuple[Setting, ...]:
    """The settings with their alternatives spelled.

    Parameters
    ----------
    varied : sequence of Varied
        The keys that vary.

    Returns
    -------
    tuple of Setting
    """
    return tuple(
        Setting(dotted(own.key), tuple(map(spelled, own.values)), own.base) for own in varied
    )


def study_with(study: SomeStudy, varied: Sequence[Varied], chosen: Sequence[int]) -> SomeStudy:
    """The study with some alternatives in place of its own values.

    Parameters
    ----------
    study : StudyFile
        The study.
    varied : sequence of Varied
        The keys that vary.
    chosen : sequence of int
        For each of them which alternative is taken.

    Returns
    -------
    StudyFile
        The study itself where only its own values are taken. Keys that keep their value are not
        written: whether a file names a key matters to some rules.
    """
    for own, place in zip(varied, chosen, strict=True):
        if place != own.base:
            study = with_value(study, own.key, own.values[place])
    return study


def crossed(
    varied: Sequence[Varied], study: SomeStudy, told: Told
) -> tuple[Crossing, tuple[SomeStudy, ...]] | None:
    """Combine all alternatives.

    Parameters
    ----------
    varied : sequence of Varied
        The keys that vary, at least one, in the order of the study file.
    study : StudyFile
        The study.
    told : Told
        Where contradictions are recorded: each once, whatever the number of variants.

    Returns
    -------
    crossing : Crossing
        The first key changes slowest, and of each key the study's own value comes first: variant 0
        is the study.
    studies : tuple of StudyFile
        One for each variant.
    None
        In place of both, where something was recorded.
    """
    number = prod(len(own.values) for own in varied)
    if number > MOST_VARIANTS:
        at = (varied[-1].places[-1] or ())[: len(varied[-1].key)]
        told.add(at, too_many(number, "vary fewer keys, or with fewer values"))
        return None
    choices = list(product(*map(_own_first, varied)))
    studies = tuple(study_with(study, varied, chosen) for chosen in choices)
    contradictions = _contradictions(varied, study, choices, studies)
    for one in contradictions:
        _tell(one, varied, number, told)
    if contradictions:
        return None
    table = np.array(choices, dtype=np.int64)
    return Crossing(settings_of(varied), ("",) * number, table, 0), studies


def _own_first(varied: Varied) -> list[int]:
    """The places of the alternatives, the study's own before the others."""
    return sorted(range(len(varied.values)), key=lambda place: place != varied.base)


def _rules_about(keys: Sequence[KeyPath]) -> list[Rule]:
    """The rules that read any of some keys, a table around one, or a key within one."""
    return [
        rule
        for rule in RULES
        if any(read[: len(key)] == key[: len(read)] for read in rule.reads for key in keys)
    ]


def _contradictions(
    varied: Sequence[Varied],
    study: StudyFile,
    choices: Sequence[tuple[int, ...]],
    studies: Sequence[StudyFile],
) -> list[_Contradiction]:
    """What rules say against combinations; each alternative by itself is sound."""
    rules = _rules_about([own.key for own in varied])
    known = own_problems(study)
    found: dict[tuple[KeyPath, str], _Contradiction] = {}

    def against(made: StudyFile) -> dict[tuple[KeyPath, str], Problem]:
        said = (problem for rule in rules for problem in rule.check(made))
        return {(one.path, one.problem): one for one in said if one not in known}

    def needed(chosen: tuple[int, ...], kind: tuple[KeyPath, str]) -> _Chosen:
        """The alternatives without any one of which the combination would be sound."""
        left = list(chosen)
        for place, own in enumerate(varied):
            kept, left[place] = left[place], own.base
            if kind not in against(study_with(study, varied, left)):
                left[place] = kept
        return frozenset((n, at) for n, at in enumerate(left) if at != varied[n].base)

    for chosen, made in zip(choices, studies, strict=True):
        for kind, problem in against(made).items():
            one = found.setdefault(kind, _Contradiction(problem))
            one.variants += 1
            if one.more or any(by <= set(enumerate(chosen)) for by in one.by):
                continue
            one.more = len(one.by) == _SPELLED_OUT
            if not one.more:
                one.by.append(needed(chosen, kind))
    return list(found.values())


def _tell(one: _Contradiction, varied: Sequence[Varied], number: int, told: Told) -> None:
    """Record a contradiction at the last alternative that has a part in it."""
    keys = [own.key for own in varied]
    named = [
        " and ".join(
            f"{short(varied[n].key, keys)} = {spelled(varied[n].values[place])}"
            for n, place in sorted(by)
        )
        for by in one.by
    ]
    places = [varied[n].places[place] or () for n, place in sorted(one.by[0])]
    at = max(places, key=lambda place: told.line_of(place) or 0)
    told.add(
        at,
        Problem(
            one.problem.path,
            f"{one.problem.problem}, in {one.variants:,} of {number:,} variants: those with "
            + ", or with ".join(named)
            + (", or with others" if one.more else ""),
            fix="leave one of them out, or name variants one by one with [[variants]]",
        ),
    )
