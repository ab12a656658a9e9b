"""What a rule of the study file is, and what it reports."""

from __future__ import annotations

import json
from collections.abc import Callable, Collection, Iterator
from dataclasses import dataclass

from etl.study.models import StudyFile
from etl.study.positions import KeyPath

Check = Callable[[StudyFile], Iterator["Problem"]]


@dataclass(frozen=True, slots=True)
class Problem:
    """Something wrong at a key of the study file; see :class:`etl.errors.Finding`."""

    path: KeyPath
    problem: str
    found: str | None = None
    expected: str = ""
    fix: str = ""


@dataclass(frozen=True, slots=True)
class Rule:
    """A check, and the keys it reads.

    Attributes
    ----------
    check : callable
        Takes the study and yields what contradicts the rule.
    reads : tuple of tuple
        The paths of the keys that the check reads.
    """

    check: Check
    reads: tuple[KeyPath, ...]

    def applies(self, wrong: Collection[KeyPath]) -> bool:
        """Whether none of the keys it reads is wrong in itself, nor a table around them."""
        return not any(key[: len(path)] == path for key in self.reads for path in wrong)

    def awaits(self, questions: Collection[KeyPath]) -> bool:
        """Whether a key it reads, or a key in a table it reads, is a question still open."""
        return any(path[: len(key)] == key for key in self.reads for path in questions)


def rule(*keys: str) -> Callable[[Check], Rule]:
    """Make a rule of a check, given the dotted names of the keys it reads."""

    def made(check: Check) -> Rule:
        return Rule(check, tuple(tuple(key.split(".")) for key in keys))

    return made


def quoted(text: str) -> str:
    """Text in double quotes, as TOML and the messages write it."""
    return json.dumps(text, ensure_ascii=False)
