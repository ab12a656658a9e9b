"""How a factor becomes numbers: what the study file may say, and how it is refused."""

from __future__ import annotations

import difflib
import json
import math
from collections.abc import Mapping
from typing import Annotated, Any, Final

from pydantic import PlainSerializer, PlainValidator, WithJsonSchema

from etl.coding import NAMED, plain_name
from etl.study.values import refusal

#: Numbers given without a name stand in a column of this name, after that of the factor.
UNNAMED: Final = "contrast"
_WANTED: Final = (
    ", ".join(f'"{name}"' for name in NAMED) + ", a number for each level, or columns by name, "
    "each with a number for each level"
)
_EXAMPLE: Final = 'write for example { cue = "sum" }, { cue = [-0.5, 0.5] } or { cue = { late = '
_EXAMPLE_END: Final = "[-0.5, 0.5] } }"

#: Numbers beyond these are slips, and would leave a model nothing to compute with.
_LEAST, _GREATEST = 1e-6, 1e6

#: Columns by name, each with a number for each level.
Numbers = Mapping[str, tuple[float, ...]]


def _contrast(value: Any) -> str | Numbers:
    """Take a name, or numbers as columns by name; refuse all else."""
    if isinstance(value, str):
        if value in NAMED:
            return value
        near = difflib.get_close_matches(value.lower(), NAMED, n=1)
        fix = f'did you mean "{near[0]}"?' if near else _EXAMPLE + _EXAMPLE_END
        raise refusal("there is no such contrast", expected=_WANTED, fix=fix)
    if isinstance(value, Mapping):
        if not value:
            raise refusal("this is empty", expected=_WANTED, fix=_EXAMPLE + _EXAMPLE_END)
        for name in value:
            _named_plainly(name)
        return {name: _numbers(numbers, f"the column {name}") for name, numbers in value.items()}
    if isinstance(value, list | tuple):
        return {UNNAMED: _numbers(value, "this")}
    raise refusal("this is no contrast", expected=_WANTED, fix=_EXAMPLE + _EXAMPLE_END)


def _spelled(contrast: str | Numbers) -> str | dict[str, list[float]]:
    """A contrast as records hold it."""
    if isinstance(contrast, str):
        return contrast
    return {name: list(numbers) for name, numbers in contrast.items()}


def _named_plainly(name: str) -> None:
    """Refuse a name that a formula would have to put in quotes."""
    plain = plain_name(name)
    if plain != name or not name:
        raise refusal(
            f"a formula would need quotes around {json.dumps(name, ensure_ascii=False)}",
            expected="unaccented letters and digits, with single underscores between",
            fix=f"write {plain}" if plain else "give it another name",
        )


def _numbers(values: Any, what: str) -> tuple[float, ...]:
    """Numbers, one for each level."""
    if not isinstance(values, list | tuple):
        raise refusal(
            f"{what} is no list",
            expected="a number for each level, in square brackets",
            fix=_EXAMPLE + _EXAMPLE_END,
        )
    if not values:
        raise refusal(
            f"{what} is empty", expected="a number for each level", fix=_EXAMPLE + _EXAMPLE_END
        )
    for place, value in enumerate(values, start=1):
        number = isinstance(value, int | float) and not isinstance(value, bool)
        if not number or not math.isfinite(value):
            raise refusal(
                f"entry {place} of {'the list' if what == 'this' else what} is no finite number",
                expected="a number for each level",
                fix="write numbers without quotes, such as -0.5",
            )
        if value and not _LEAST <= abs(value) <= _GREATEST:
            raise refusal(
                f"entry {place} of {'the list' if what == 'this' else what} is {value:g}",
                expected="0, or a number between a millionth and a million, or minus that",
                fix="write numbers such as -0.5, 1 or 2",
            )
    # A zero with a minus sign would be another text in the tables.
    return tuple(float(value) + 0.0 for value in values)


_NUMBERS_SCHEMA: Final[dict[str, Any]] = {
    "type": "array",
    "items": {"type": "number"},
    "minItems": 1,
}

#: A contrast: its name, or numbers for each level.
Contrast = Annotated[
    str | Numbers,
    PlainValidator(_contrast),
    PlainSerializer(_spelled),
    WithJsonSchema(
        {
            "anyOf": [
                {"enum": list(NAMED), "type": "string"},
                _NUMBERS_SCHEMA,
                {
                    "type": "object",
                    "additionalProperties": _NUMBERS_SCHEMA,
                    "propertyNames": {"pattern": "^[0-9A-Za-z]+(_[0-9A-Za-z]+)*$"},
                    "minProperties": 1,
                },
            ]
        }
    ),
]
