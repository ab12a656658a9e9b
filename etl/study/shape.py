"""Which keys the study file knows, read off the models."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any, Literal, get_args, get_origin

from pydantic.fields import FieldInfo

from etl.study.columns import Column
from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.values import Table


def table_in(annotation: Any) -> type[Table] | None:
    """The table that a field holds, also where it may be absent.

    Parameters
    ----------
    annotation : type
        The field's annotation.

    Returns
    -------
    type or None
        None where the field holds a value.
    """
    if get_origin(annotation) is dict:
        return None
    for candidate in (annotation, *get_args(annotation)):
        if isinstance(candidate, type) and issubclass(candidate, Table):
            return candidate
    return None


def _tables_in(annotation: Any) -> type[Table] | None:
    """The table that a field holds under any names, such as one for each eye."""
    if get_origin(annotation) is not dict:
        return None
    inner = get_args(annotation)[1]
    return inner if isinstance(inner, type) and issubclass(inner, Table) else None


def _walked(path: Sequence[str | int]) -> Iterator[tuple[FieldInfo | None, type[Table] | None]]:
    """For each key of a path its field, and the table that it is or holds."""
    table: type[Table] | None = StudyFile
    any_name: type[Table] | None = None
    field: FieldInfo | None = None
    for key in path:
        if any_name is not None:
            table, any_name = any_name, None
        else:
            field = None if table is None else table.model_fields.get(str(key))
            table = None if field is None else table_in(field.annotation)
            any_name = None if field is None else _tables_in(field.annotation)
        yield field, table


def table_at(path: Sequence[str | int]) -> type[Table] | None:
    """The table at a path of keys.

    Parameters
    ----------
    path : sequence of str
        Keys from the outermost table inwards; empty for the whole file.

    Returns
    -------
    type or None
        None where the models have no table.

    Examples
    --------
    >>> table_at(("regions", "layout")).__name__
    'Layout'
    """
    table: type[Table] | None = StudyFile
    for _, inner in _walked(path):
        table = inner
    return table


def field_at(path: Sequence[str | int]) -> FieldInfo | None:
    """The field that a path of keys leads to, or into.

    Parameters
    ----------
    path : sequence of str and int
        Keys from the outermost table inwards, and places in arrays.

    Returns
    -------
    FieldInfo or None
        None where the models know no such key.

    Examples
    --------
    >>> field_at(("trials", "factors", 2)).examples
    [['cue', 'fit']]
    """
    found: FieldInfo | None = None
    for found, inner in _walked(path):
        if inner is None and (found is None or _tables_in(found.annotation) is None):
            break
    return found


def choices_in(annotation: Any) -> tuple[str, ...]:
    """The texts among which a field lets choose.

    Parameters
    ----------
    annotation : type
        The field's annotation.

    Returns
    -------
    tuple of str
        Empty where any text will do.

    Examples
    --------
    >>> choices_in(Literal["down", "up"] | None)
    ('down', 'up')
    """
    if get_origin(annotation) is Literal:
        return tuple(str(choice) for choice in get_args(annotation))
    return tuple(choice for inner in get_args(annotation) for choice in choices_in(inner))


def known_keys(
    table: type[Table] = StudyFile, path: KeyPath = ()
) -> Iterator[tuple[KeyPath, FieldInfo]]:
    """All keys of the study file, tables before what is in them, in the order of the file.

    Parameters
    ----------
    table : type
        Where to begin.
    path : tuple of str
        The path of that table.

    Yields
    ------
    path : tuple of str
        The path of a key. A column of the log is one key, though it may be written as a table.
    field : FieldInfo
        Its field.
    """
    for name, field in table.model_fields.items():
        yield (*path, name), field
        inner = table_in(field.annotation)
        if inner is not None and not issubclass(inner, Column):
            yield from known_keys(inner, (*path, name))
