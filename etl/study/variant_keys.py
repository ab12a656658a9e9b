"""Which keys a variants file may name, and what it names."""

from __future__ import annotations

import difflib
from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Final

from etl.study.lines import WITH_SETTINGS
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted
from etl.study.shape import field_at, known_keys
from etl.study.variant_told import Told
from etl.study.wording import dotted, toml_text

#: The one value below [screening] that is a table of its own.
MERGE: Final[KeyPath] = ("screening", "fixations", "merge")

#: The keys of a variants file that say something about the file, and set nothing.
BESIDE: Final = ("title", "variants", "comparisons")

#: What may vary, to stand in a message.
WHAT_VARIES: Final = (
    "a key below [screening], regions.tolerance_px, measures.outside, measures.no_opportunity, "
    "lines.method, or a setting of a line method"
)

_SINGLE_KEYS = (
    ("regions", "tolerance_px"),
    ("measures", "outside"),
    ("measures", "no_opportunity"),
    ("lines", "method"),
)


def _varies(key: KeyPath) -> bool:
    """Whether a key of the study file holds a decision that another lab could take otherwise."""
    of_a_line_method = len(key) == 3 and key[0] == "lines" and key[1] in WITH_SETTINGS
    of_screening = len(key) > 2 and key[0] == "screening"
    return of_screening or of_a_line_method or key in _SINGLE_KEYS


#: Every key that may vary, in the order of the study file.
VARYING: Final = tuple(key for key, _ in known_keys() if _varies(key))


@dataclass(frozen=True, slots=True)
class Entry:
    """A key that a variants file gives a value, or a list of values.

    Attributes
    ----------
    key : tuple of str
        The key, as in the study file.
    at : tuple of str and int
        Where it stands in the variants file.
    value : object
        What stands there, as TOML reads it.
    """

    key: KeyPath
    at: KeyPath
    value: Any


def short(key: KeyPath, others: Collection[KeyPath]) -> str:
    """A key by as few of its parts as tell it from others.

    Parameters
    ----------
    key : tuple of str
        The key.
    others : collection of tuple
        All keys that are spoken of; the key itself may be among them.

    Returns
    -------
    str

    Examples
    --------
    >>> under, merged = ("screening", "fixations", "under_ms"), (*MERGE, "under_ms")
    >>> short(under, [under]), short(under, [under, merged]), short(merged, [merged])
    ('under_ms', 'fixations.under_ms', 'merge.under_ms')
    """
    # Settings of a line method, and of merging, say little without the name of their table.
    for length in range(2 if key[-2] in WITH_SETTINGS else 1, len(key)):
        end = key[-length:]
        if all(other == key or other[-length:] != end for other in others):
            return dotted(end)
    return dotted(key)


def entries(data: Mapping[str, Any], above: KeyPath, told: Told, *, crossed: bool) -> list[Entry]:
    """The keys that a variants file, or one named variant, gives a value.

    Parameters
    ----------
    data : mapping
        The tables as read, without what is beside them.
    above : tuple of str and int
        Where they stand in the file.
    told : Told
        Where a key that may not vary is recorded.
    crossed : bool
        Whether keys hold lists of alternatives; then ``[screening.fixations.merge]`` may hold a
        list for each of its own keys. In a named variant it is one value.

    Returns
    -------
    list of Entry
        In the order of the study file.
    """
    found = list(_found(data, (), above, told, crossed=crossed))
    return sorted(found, key=lambda entry: VARYING.index(entry.key))


def _found(
    table: Mapping[str, Any], path: KeyPath, above: KeyPath, told: Told, *, crossed: bool
) -> Iterator[Entry]:
    """Walk through the tables; what may not vary is recorded on the way."""
    for name, value in table.items():
        key = (*path, name)
        by_its_keys = (
            crossed
            and key == MERGE
            and isinstance(value, Mapping)
            and any(isinstance(inner, list) for inner in value.values())
        )
        if key in VARYING and not by_its_keys:
            yield Entry(key, (*above, *key), value)
        elif any(other[: len(key)] == key for other in VARYING):
            if isinstance(value, Mapping):
                yield from _found(value, key, above, told, crossed=crossed)
            else:
                told.add((*above, *key), _no_table(key, value))
        elif not path and isinstance(value, Mapping) and value and field_at(key) is not None:
            # A table of the study file that holds nothing that may vary: its keys are named.
            for inner in value:
                place = (*key, inner)
                told.add((*above, *place), _refused(place, value, beside=()))
        else:
            told.add((*above, *key), _refused(key, table, beside=BESIDE if not above else ()))


def _no_table(key: KeyPath, value: Any) -> Problem:
    """A value where keys belong."""
    return Problem(
        key,
        "this is no table",
        found=value if isinstance(value, str) else toml_text(value),
        expected="a table",
        fix=f"write its keys under [{dotted(key)}]",
    )


def _refused(key: KeyPath, table: Mapping[str, Any], *, beside: tuple[str, ...]) -> Problem:
    """A key that may not vary, or that no study file knows."""
    path, name = key[:-1], str(key[-1])
    here = dict.fromkeys(
        str(other[len(path)]) for other in VARYING if other[: len(path)] == path != other
    )
    choices = [*here, *(() if path else beside)]
    homes = " or ".join(
        dict.fromkeys(
            f"[{dotted(other[:place])}]"
            for other in VARYING
            for place in range(1, len(other))
            if other[place] == name and other[:place] != path
        )
    )
    if field_at(key) is not None:
        return Problem(
            key,
            "this key may not vary",
            expected=WHAT_VARIES,
            fix=f"remove it, or move it to {homes} if that is meant"
            if homes
            else "remove it; it is the same in all variants",
        )
    near = difflib.get_close_matches(name.lower(), [own for own in choices if own not in table], 1)
    if not choices:
        fix = f"it belongs in {homes}" if homes else "remove it"
        return Problem(key, "unknown key", expected=WHAT_VARIES, fix=fix)
    if near:
        return Problem(key, "unknown key", fix=f"did you mean {quoted(near[0])}?")
    return Problem(
        key,
        "unknown key",
        expected=" or ".join(part for part in (", ".join(choices[:-1]), choices[-1]) if part),
        fix=f"it belongs in {homes}" if homes else "remove it",
    )
