"""The study as understood, laid out for reading."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True)
class Section:
    """A table of the study file.

    Attributes
    ----------
    name : str
        As in the file; empty for keys that stand above all tables.
    keys : tuple of (str, str)
        Each key with its value, as the study file writes it.
    unused : tuple of str
        Keys that the study does without.
    """

    name: str
    keys: tuple[tuple[str, str], ...]
    unused: tuple[str, ...]


def sections(study: Mapping[str, Any]) -> tuple[Section, ...]:
    """Lay out a study.

    Parameters
    ----------
    study : mapping
        The study as understood, defaults filled in.

    Returns
    -------
    tuple of Section
        In the order of the file; tables that the study does without are named in the first.

    Examples
    --------
    >>> sections({"title": "A", "lines": None, "logs": {"files": ["*.tsv"], "decimal": None}})[1]
    Section(name='logs', keys=(('files', '["*.tsv"]'),), unused=('decimal',))
    """
    tables = {name: value for name, value in study.items() if isinstance(value, Mapping)}
    top = {name: value for name, value in study.items() if name not in tables}
    return (
        _section("", top),
        *(_section(name, value) for name, value in tables.items()),
    )


def _section(name: str, table: Mapping[str, Any]) -> Section:
    """One table with its keys."""
    keys = list(_flat(table))
    return Section(
        name,
        tuple((key, _spelled(value)) for key, value in keys if value is not None),
        tuple(key for key, value in keys if value is None),
    )


def _flat(table: Mapping[str, Any], above: str = "") -> Iterator[tuple[str, Any]]:
    """Keys with values; a table within is spelled by its keys, unless it holds plain values."""
    for key, value in table.items():
        if isinstance(value, Mapping) and any(isinstance(v, Mapping) for v in value.values()):
            yield from _flat(value, f"{above}{key}.")
        elif isinstance(value, Mapping) and all(v is None for v in value.values()) and value:
            yield f"{above}{key}", None
        else:
            yield f"{above}{key}", value


def _spelled(value: Any) -> str:
    """A value as TOML writes it; what is absent within a table is left out."""
    if isinstance(value, Mapping):
        inner = (f"{k} = {_spelled(v)}" for k, v in value.items() if v is not None)
        return "{ " + ", ".join(inner) + " }" if value else "{}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(map(_spelled, value)) + "]"
    if isinstance(value, float):
        return f"{value:g}"
    return json.dumps(value, ensure_ascii=False)
