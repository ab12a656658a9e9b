"""Values of keys that vary: read from a study, put into one, compared and spelled."""

from __future__ import annotations

import unicodedata
from collections.abc import Hashable, Mapping
from typing import Any, TypeVar

from etl.errors import FaultError
from etl.study.examine import Examined, examine
from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted
from etl.study.shape import field_at, table_in
from etl.study.values import Table, WrittenFloat
from etl.study.wording import toml_text

SomeTable = TypeVar("SomeTable", bound=Table)

#: Texts that are written where a rule is meant to be off.
_MEANT_OFF = ("off", "false", "none")


def value_at(study: StudyFile, key: KeyPath) -> Any:
    """What a study has at a key.

    Parameters
    ----------
    study : StudyFile
        Any sound study.
    key : tuple of str
        The key.

    Returns
    -------
    object
        Its default where the table around it is absent. A rule that is off is None or False.
    """
    inner: Any = study
    for part in key:
        if inner is None:
            field = field_at(key)
            return None if field is None else field.default
        inner = getattr(inner, str(part))
    return inner


def with_value(table: SomeTable, key: KeyPath, value: Any) -> SomeTable:
    """A study with another value at a key; all else is shared with the one given.

    Parameters
    ----------
    table : Table
        A study, or a table of one.
    key : tuple of str
        The key; tables around it that are absent are made.
    value : object
        A value that was found sound, as :func:`value_at` gives it.

    Returns
    -------
    Table
        Of the same kind as was given.
    """
    name, rest = str(key[0]), key[1:]
    if rest:
        inner = getattr(table, name)
        if inner is None:
            made = table_in(type(table).model_fields[name].annotation)
            if made is None:
                raise FaultError(f"{name} is no table")
            inner = made()
        value = with_value(inner, rest, value)
    return table.model_copy(update={name: value})


def tried(study: StudyFile, values: Mapping[KeyPath, Any]) -> Examined:
    """Examine a study with other values, as if its file had them.

    Parameters
    ----------
    study : StudyFile
        The study. Tables that hold none of the values are taken as they are.
    values : mapping of tuple to object
        For each key what a file has there, as TOML reads it.

    Returns
    -------
    Examined
        All that is wrong, in the words of the study file.
    """
    data = _written(study)
    for key, value in values.items():
        data = _put(data, key, value)
    return examine(data, None)


def meaning(value: Any) -> Hashable:
    """What a value comes to: two values are the same where this is.

    Parameters
    ----------
    value : object
        As TOML reads it, or as a study holds it.

    Returns
    -------
    hashable
        A rule that is off is None. Numbers are compared as numbers, tables without regard to the
        order of their keys, and names in a list without regard to theirs.

    Examples
    --------
    >>> meaning({"under_ms": 80, "within_px": 14.0}) == meaning({"within_px": 14, "under_ms": 80.0})
    True
    >>> meaning(False) == meaning(0)
    False
    """
    if value is None or value is False:
        return None
    if value is True:
        return ("on",)
    if isinstance(value, Table):
        value = value.model_dump()
    if isinstance(value, Mapping):
        return frozenset((key, meaning(inner)) for key, inner in value.items() if inner is not None)
    if isinstance(value, (list, tuple)):
        parts = tuple(meaning(inner) for inner in value)
        return frozenset(parts) if all(isinstance(part, str) for part in parts) else parts
    if isinstance(value, str):
        return unicodedata.normalize("NFC", value)
    known: Hashable = value
    return known


def spelled(value: Any) -> str:
    """A value as TOML writes it on one line.

    Parameters
    ----------
    value : object
        As TOML reads it, or as a study holds it.

    Returns
    -------
    str
        With ``false`` for a rule that is off, and numbers with the digits they need.

    Examples
    --------
    >>> spelled(80.0), spelled(None), spelled((500.0, 30000.0))
    ('80', 'false', '[500, 30000]')
    """
    return toml_text(_plain(value))


def means_off(key: KeyPath, value: Any) -> Problem | None:
    """Refuse a text that stands where a rule of screening is meant to be off.

    Parameters
    ----------
    key : tuple of str
        The key, as in the study file.
    value : object
        As TOML reads it.

    Returns
    -------
    Problem or None
        None where the value is another one.
    """
    of_a_rule = key[0] == "screening" and len(key) == 3
    if not of_a_rule or not isinstance(value, str) or value.strip().lower() not in _MEANT_OFF:
        return None
    return Problem(
        key,
        f"the text {quoted(value)} switches no rule off",
        expected="false where the rule is off",
        fix="write false",
    )


def _written(table: Table) -> dict[str, Any]:
    """The keys that a table was given, with their values; tables within stay what they are."""
    return {name: getattr(table, name) for name in table.model_fields_set}


def _put(data: Mapping[str, Any], key: KeyPath, value: Any) -> dict[str, Any]:
    """Data with another value at a key; only tables on the way to it are opened."""
    name, rest = str(key[0]), key[1:]
    if rest:
        inner = data.get(name)
        opened = _written(inner) if isinstance(inner, Table) else inner or {}
        value = _put(opened, rest, value)
    return {**data, name: value}


def _plain(value: Any) -> Any:
    """A value made of what TOML has."""
    if value is None:
        return False
    if isinstance(value, float):
        return WrittenFloat(repr(float(value)).removesuffix(".0"))
    if isinstance(value, Table):
        value = value.model_dump(exclude_none=True)
    if isinstance(value, Mapping):
        return {key: _plain(inner) for key, inner in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(inner) for inner in value]
    return value
