"""Open questions: keys of a drafted study file that somebody still has to answer."""

from __future__ import annotations

import copy
from collections.abc import Collection, Iterator, Mapping
from typing import Any

from etl.study.columns import Column
from etl.study.positions import KeyPath
from etl.study.rule import Problem
from etl.study.shape import choices_in, field_at, table_in
from etl.study.wording import example, first_sentence, listed_choices

#: What stands in place of a value that nobody has given yet.
OPEN = "?"

#: Lists of texts as they stand in logs and tables, in which a question mark may be meant.
_LISTS_OF_TEXTS = (
    ("logs", "missing"),
    ("logs", "comment"),
    ("logs", "where"),
    ("logs", "bids"),
    ("trials", "levels"),
    ("trials", "skip"),
)


def open_questions(data: Mapping[str, Any]) -> list[KeyPath]:
    """The keys whose value is still a question.

    Parameters
    ----------
    data : mapping
        The study file as read.

    Returns
    -------
    list of tuple
        The path of each value that is ``"?"``, in the order of the file; keys that no study file
        has are left out, and so are lists of texts that stand in logs and tables, where a question
        mark may be meant.

    Examples
    --------
    >>> open_questions({"logs": {"missing": ["?"]}, "regions": {"file": "?", "kind": "words"}})
    [('regions', 'file')]
    """
    return [path for path in _marked(data, ()) if field_at(path) is not None]


def asked(path: KeyPath) -> Problem:
    """What is said about a question that is still open.

    Parameters
    ----------
    path : tuple of str and int
        The key.

    Returns
    -------
    Problem
    """
    problem, whole = "a question of the draft is still open", key_asked(path)
    field = field_at(whole)
    described = "" if field is None else first_sentence(str(field.description))
    if path[-1] == "unit" and path != whole:
        inner = None if field is None else table_in(field.annotation)
        units = () if inner is None else choices_in(inner.model_fields["unit"].annotation)
        return Problem(path, problem, OPEN, listed_choices(units), "write one of these")
    choices = () if field is None else choices_in(field.annotation)
    expected = listed_choices(choices) if choices else described
    return Problem(path, problem, OPEN, expected, example(whole))


def without(data: Mapping[str, Any], questions: Collection[KeyPath]) -> dict[str, Any]:
    """The study file without the keys that are still questions.

    Parameters
    ----------
    data : mapping
        The study file as read. It is not changed.
    questions : collection of tuple
        From :func:`open_questions`.

    Returns
    -------
    dict
    """
    left = copy.deepcopy(dict(data))
    for path in {key_asked(path) for path in questions}:
        inner: Any = left
        for part in path[:-1]:
            inner = inner[part]
        del inner[path[-1]]
    return left


def key_asked(path: KeyPath) -> KeyPath:
    """The key that a question leaves without a value: the whole list, or the whole column.

    Parameters
    ----------
    path : tuple of str and int
        The path of a question.

    Returns
    -------
    tuple of str

    Examples
    --------
    >>> key_asked(("logs", "columns", "x", "column"))
    ('logs', 'columns', 'x')
    """
    for length in range(1, len(path)):
        field = field_at(path[:length])
        table = None if field is None else table_in(field.annotation)
        if isinstance(path[length], int) or (table is not None and issubclass(table, Column)):
            return path[:length]
    return path


def _marked(value: Any, path: KeyPath) -> Iterator[KeyPath]:
    """The paths of all values that are a question mark."""
    if isinstance(value, str):
        if value.strip() == OPEN:
            yield path
    elif isinstance(value, Mapping):
        for key, inner in value.items():
            yield from _marked(inner, (*path, key))
    elif isinstance(value, list) and path[:2] not in _LISTS_OF_TEXTS:
        for place, inner in enumerate(value):
            yield from _marked(inner, (*path, place))
