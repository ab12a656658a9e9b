"""Mistakes in single keys, in plain words: what was found, what was expected, what to write."""

from __future__ import annotations

import difflib
import re
from collections.abc import Callable, Mapping, Sequence
from datetime import date, time
from typing import Any

from pydantic_core import ErrorDetails

from etl.study.columns import Column
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted
from etl.study.shape import choices_in, field_at, known_keys, table_at, table_in
from etl.study.values import WrittenFloat

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")

#: What the kinds of value are called, by the name the validator gives to a wrong one.
_EXPECTED = {
    "string_type": "text in quotes",
    "int_type": "a whole number",
    "float_type": "a number",
    "bool_type": "true or false",
    "tuple_type": "a list in square brackets",
    "dict_type": "a table",
    "model_type": "a table",
}

#: What belongs where there is nothing, by the name the validator gives to emptiness.
_EMPTY = {"string_too_short": "some text", "too_short": "at least one entry"}

#: What a bound asks for, by the name the validator gives to its breach.
_BOUNDS = {
    "greater_than": "a number above {gt:g}",
    "greater_than_equal": "a number of {ge:g} or more",
    "less_than_equal": "a number of {le:g} or less",
}


def toml_text(value: Any) -> str:
    """A value as TOML writes it.

    Parameters
    ----------
    value : str, bool, int, float, date, time, list, tuple or dict

    Returns
    -------
    str

    Examples
    --------
    >>> toml_text({"column": "dur", "unit": "ms"})
    '{ column = "dur", unit = "ms" }'
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f"'{value}'" if "\\" in value and "'" not in value else quoted(value)
    if isinstance(value, WrittenFloat):
        return value.written
    if isinstance(value, (date, time)):
        return value.isoformat()
    if isinstance(value, Mapping):
        pairs = ", ".join(f"{_key(key)} = {toml_text(inner)}" for key, inner in value.items())
        return f"{{ {pairs} }}" if pairs else "{}"
    if isinstance(value, (list, tuple)):
        return f"[{', '.join(toml_text(inner) for inner in value)}]"
    return str(value)


def dotted(path: KeyPath) -> str:
    """A path of keys as a user would name it; entries of a list are counted from 1.

    Parameters
    ----------
    path : tuple of str and int

    Returns
    -------
    str

    Examples
    --------
    >>> dotted(("trials", "factors", 1))
    'trials.factors, entry 2'
    """
    keys = ".".join(_key(part) for part in path if isinstance(part, str))
    return keys + "".join(f", entry {part + 1}" for part in path if isinstance(part, int))


def meant(path: KeyPath, data: Mapping[str, Any]) -> KeyPath | None:
    """The key that an unknown one was probably meant to be.

    Parameters
    ----------
    path : tuple of str
        The unknown key.
    data : mapping
        The study file as read. A key that is there already was not meant.

    Returns
    -------
    tuple of str or None
        None where no key of the same table is near.
    """
    table = table_at(path[:-1])
    there = _at(path[:-1], data)
    candidates = [] if table is None else [key for key in table.model_fields if key not in there]
    near = difflib.get_close_matches(str(path[-1]).lower(), candidates, n=1)
    return (*path[:-1], near[0]) if near else None


def described(error: ErrorDetails, path: KeyPath, data: Mapping[str, Any]) -> Problem:
    """Turn an error of the validator into plain words.

    Parameters
    ----------
    error : dict
        As pydantic gives it.
    path : tuple of str and int
        The key at fault.
    data : mapping
        The study file as read.

    Returns
    -------
    Problem
    """
    kind, given = error["type"], error["input"]
    context: dict[str, Any] = error.get("ctx", {})
    found = given if isinstance(given, str) else toml_text(given)
    if kind == "extra_forbidden":
        return _unknown(path, data)
    if kind == "missing":
        return _missing(path)
    if kind == "refused":
        problem, expected, fix = (str(context[part]) for part in ("problem", "expected", "fix"))
        return Problem(path, problem, None if isinstance(given, list) else found, expected, fix)
    if kind == "literal_error":
        return _no_choice(path, found)
    if kind == "none_required":
        return Problem(path, "this column has no unit", found, "no unit", "remove unit")
    if kind in _BOUNDS:
        bound = _BOUNDS[kind].format(**context)
        return Problem(path, "out of bounds", found, bound, example(path))
    if kind == "finite_number":
        return Problem(path, "out of bounds", found, "a finite number", example(path))
    if kind in _EMPTY:
        return Problem(path, "this is empty", None, _EMPTY[kind], example(path))
    return _wrong_kind(path, kind, given, found)


def _key(key: Any) -> str:
    """A key, in quotes where TOML needs them."""
    return str(key) if _BARE_KEY.fullmatch(str(key)) else quoted(str(key))


def _at(path: KeyPath, data: Mapping[str, Any]) -> Any:
    """What stands at a path."""
    inner: Any = data
    for key in path:
        inner = inner[key]
    return inner


def _listed(words: list[str], last: str = "or") -> str:
    """Words with commas, and a word before the last."""
    return f" {last} ".join(part for part in (", ".join(words[:-1]), words[-1]) if part)


def _table_name(path: KeyPath) -> str:
    """A table as its header is written."""
    return f"[{dotted(path)}]" if path else "the top of the file, before the first [table]"


def first_sentence(description: str) -> str:
    """The first sentence of a description, to stand inside another.

    Parameters
    ----------
    description : str
        What a key means.

    Returns
    -------
    str
    """
    sentence = description.split(". ", 1)[0].rstrip(".")
    return sentence[:1].lower() + sentence[1:]


def example(path: KeyPath) -> str:
    """What could be written, from the key's own example.

    Parameters
    ----------
    path : tuple of str and int
        The key.

    Returns
    -------
    str
    """
    field = field_at(path)
    if field is None or not field.examples:
        is_table = table_at(path) is not None
        return f"write its keys under {_table_name(path)}" if is_table else "remove the key"
    keys = [part for part in path if isinstance(part, str)]
    # A path that leads into a value, such as a value of [logs.where], is explained by the whole.
    while len(keys) > 1 and field_at(keys[:-1]) is not None and table_at(keys[:-1]) is None:
        keys.pop()
    return f"write for example {_key(keys[-1])} = {toml_text(field.examples[0])}"


def _unknown(path: KeyPath, data: Mapping[str, Any]) -> Problem:
    """A key that the study file does not know."""
    near = meant(path, data)
    if near is not None:
        return Problem(path, "unknown key", fix=f"did you mean {quoted(str(near[-1]))}?")
    tables = [key[:-1] for key, _ in known_keys() if key[-1] == path[-1] and key[:-1] != path[:-1]]
    homes = [_table_name(home) for home in sorted(tables, key=len)]
    table = table_at(path[:-1])
    here = [] if table is None else list(table.model_fields)
    there = difflib.get_close_matches(str(path[-1]).lower(), here, n=1)
    if homes:
        fix = f"it belongs in {_listed(homes)}"
    else:
        fix = f"remove it; {quoted(there[0])} is there already" if there else "remove it"
    return Problem(
        path,
        "unknown key",
        expected=_listed(here),
        fix=fix,
    )


def _missing(path: KeyPath) -> Problem:
    """A key that the study file must have."""
    table = table_at(path)
    if table is not None:
        needed = [name for name, inner in table.model_fields.items() if inner.is_required()]
        return Problem(
            path,
            "this table is missing",
            expected=_table_name(path),
            fix=f"add {_table_name(path)}" + (f" with {_listed(needed, 'and')}" if needed else ""),
        )
    field = field_at(path)
    value = toml_text(field.examples[0]) if field is not None and field.examples else "…"
    return Problem(
        path,
        "this key is missing",
        expected="" if field is None else first_sentence(str(field.description)),
        fix=f"add for example {path[-1]} = {value}",
    )


def _no_choice(path: KeyPath, found: str) -> Problem:
    """A text that is not among those to choose from."""
    field = field_at(path)
    choices = () if field is None else choices_in(field.annotation)
    near = difflib.get_close_matches(found.lower(), choices, n=1)
    if near:
        fix = f"did you mean {quoted(near[0])}?"
    elif len(choices) == 1:
        fix = f"write {quoted(choices[0])}"
    else:
        fix = "take one of these"
    only = " (no other in this version)" if len(choices) == 1 else ""
    return Problem(
        path,
        "this is not one of the choices",
        found,
        listed_choices(choices) + only,
        fix,
    )


def listed_choices(choices: Sequence[str]) -> str:
    """Texts to choose from, as the study file writes them.

    Parameters
    ----------
    choices : sequence of str

    Returns
    -------
    str

    Examples
    --------
    >>> listed_choices(["px", "deg"])
    '"px" or "deg"'
    """
    return _listed([quoted(choice) for choice in choices])


def _wrong_kind(path: KeyPath, kind: str, given: Any, found: str) -> Problem:
    """A value of another kind than the key takes."""
    field = field_at(path)
    inner = None if field is None else table_in(field.annotation)
    expected = _EXPECTED.get(kind, "another value")
    if inner is not None and issubclass(inner, Column):
        expected = "the column's header in quotes, or a table with column and unit"
    better = _CORRECTED[kind](given) if kind in _CORRECTED else None
    if better is None:
        fix = example(path)
    else:
        entry = isinstance(path[-1], int)
        fix = f"write {better}" if entry else f"write {_key(path[-1])} = {better}"
    return Problem(path, f"this is {_kind_of(given)}", found, expected, fix)


def _kind_of(value: Any) -> str:
    """What a value is, in plain words."""
    kinds: tuple[tuple[type | tuple[type, ...], str], ...] = (
        (bool, "a true-or-false value"),
        (str, "text"),
        (int, "a whole number"),
        (float, "a number with decimals"),
        ((date, time), "a date or a time"),
        (list, "a list"),
    )
    return next((name for kind, name in kinds if isinstance(value, kind)), "a table")


def _as_text(given: Any) -> str | None:
    """The value in quotes, where it is a single one."""
    single = isinstance(given, (bool, int, float, date, time))
    return quoted(toml_text(given)) if single else None


def _as_number(given: Any) -> str | None:
    """The number that a text holds."""
    digits = isinstance(given, str) and re.fullmatch(r"[+-]?\d+(\.\d+)?", given.strip())
    return given.strip() if digits else None


def _as_whole_number(given: Any) -> str | None:
    """The whole number that a text or a number with decimals holds."""
    if isinstance(given, float) and given.is_integer():
        return str(int(given))
    number = _as_number(given)
    return number if number is not None and "." not in number else None


def _as_switch(given: Any) -> str | None:
    """True or false, where a text says so."""
    said = given.strip().lower() if isinstance(given, str) else ""
    return said if said in ("true", "false") else None


def _as_list(given: Any) -> str | None:
    """A list of the one value that was given."""
    return None if isinstance(given, (dict, list)) else toml_text([given])


_CORRECTED: dict[str, Callable[[Any], str | None]] = {
    "string_type": _as_text,
    "int_type": _as_whole_number,
    "float_type": _as_number,
    "bool_type": _as_switch,
    "tuple_type": _as_list,
}
