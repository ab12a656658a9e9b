"""Everything that is wrong with the values of a study file, in one pass."""

from __future__ import annotations

import copy
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from typing import Any

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from etl.errors import FaultError
from etl.study.models import StudyFile
from etl.study.output_rules import new_columns_called_like_others
from etl.study.positions import KeyPath
from etl.study.questions import asked, key_asked, open_questions, without
from etl.study.rule import Problem
from etl.study.rules import broken_rules
from etl.study.shape import field_at, table_at
from etl.study.trial_rules import facts_called_like_measures, unknown_outcomes
from etl.study.wording import described, meant

#: Rounds of mending; tables stand at most four deep, and each level may take two.
_ROUNDS = 10


@dataclass(slots=True)
class Examined:
    """What was found, and the study as far as it is sound.

    Attributes
    ----------
    draft : StudyFile
        The study, with defaults or examples in place of what is wrong.
    problems : list of Problem
        All that is wrong: open questions, then keys by themselves, then what several contradict.
    """

    draft: StudyFile
    problems: list[Problem] = field(default_factory=list)


def examine(data: Mapping[str, Any], known_outcomes: Collection[str] | None) -> Examined:
    """Check each key by itself, then the rules about several keys.

    Parameters
    ----------
    data : mapping
        The study file as read. It is not changed.
    known_outcomes : collection of str or None
        The names of all measures, or None to leave names of outcomes unchecked.

    Returns
    -------
    Examined
    """
    questions = open_questions(data)
    # What nobody has answered yet is wrong by itself; no other check is to complain about it.
    data = without(data, questions)
    errors = _errors(data)
    draft = _mended(data, errors)
    intended = {
        path: meant(path, data)
        for path in (_at_fault(error, data) for error in errors if _is(error, "extra_forbidden"))
    }
    wrong: set[KeyPath] = {path for path in intended.values() if path is not None}
    unanswered = {key_asked(path) for path in questions}
    wrong |= unanswered
    examined = Examined(draft, [asked(path) for path in questions])
    for error in errors:
        path = _at_fault(error, data)
        if _is(error, "missing") and path in wrong:
            continue  # it is there under a slightly wrong name, which is reported as such
        if _is(error, "too_short") and error["input"]:
            continue  # only sound entries were counted; the others are reported themselves
        examined.problems.append(described(error, path, data))
        if path not in intended:
            wrong.add(_key_of(path))
    if any(path[:2] == ("logs", "patterns") for path in wrong):
        wrong.add(("logs", "columns"))  # those that the pattern would have named are not known
    examined.problems.extend(broken_rules(draft, wrong, unanswered))
    if known_outcomes is not None:
        for make in (
            unknown_outcomes,
            facts_called_like_measures,
            new_columns_called_like_others,
        ):
            rule = make(known_outcomes)
            if rule.applies(wrong):
                examined.problems.extend(rule.check(draft))
    return examined


def _errors(data: Mapping[str, Any]) -> list[ErrorDetails]:
    """What the models say against each key by itself."""
    try:
        StudyFile.model_validate(data)
    except ValidationError as error:
        return error.errors(include_url=False)
    return []


def _is(error: ErrorDetails, kind: str) -> bool:
    """Whether an error is of a kind."""
    return error["type"] == kind


def _at_fault(error: ErrorDetails, data: Mapping[str, Any]) -> KeyPath:
    """The key at fault, as far as the file itself has it."""
    whole: KeyPath = tuple(error["loc"])
    if _is(error, "missing"):
        return whole
    inner: Any = data
    for length, part in enumerate(whole):
        # A header alone stands for a table that is not in the file, and a text for a list.
        listed = isinstance(inner, list) and isinstance(part, int)
        inside = part in inner if isinstance(inner, dict) else listed
        if not inside:
            return whole[:length]
        inner = inner[part]
    return whole


def _key_of(path: KeyPath) -> KeyPath:
    """The key that holds a value, also where the value is one of a list."""
    places = [place for place, part in enumerate(path) if isinstance(part, int)]
    return path[: places[0]] if places else path


def _mended(data: Mapping[str, Any], errors: list[ErrorDetails]) -> StudyFile:
    """The study with what is wrong removed, and examples for what must be there."""
    draft = copy.deepcopy(dict(data))
    for _ in range(_ROUNDS):
        # Two errors may lie in one value: find all places before anything is taken out.
        for error, path in [(error, _key_of(_at_fault(error, draft))) for error in errors]:
            table = _inside(draft, path[:-1])
            if not _is(error, "missing"):
                table.pop(path[-1], None)
            elif table_at(path) is not None:
                table[path[-1]] = {}
            else:
                known = field_at(path)
                table[path[-1]] = None if known is None else copy.deepcopy(known.examples or [])[0]
        errors = _errors(draft)
        if not errors:
            return StudyFile.model_validate(draft)
    raise FaultError(f"no sound study could be made of {sorted(data)}: {errors}")


def _inside(data: dict[str, Any], path: KeyPath) -> Any:
    """The table at a path."""
    inner: Any = data
    for part in path:
        inner = inner[part]
    return inner
