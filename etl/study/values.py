"""The kinds of value a study file holds, and how a value is refused."""

from __future__ import annotations

import codecs
import json
import re
import unicodedata
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    WithJsonSchema,
)
from pydantic_core import PydanticCustomError

#: Named groups that a pattern for file names may have.
GROUPS = ("participant", "session", "trial", "item")


class Table(BaseModel):
    """A table of the study file: frozen, and unknown keys are refused."""

    model_config = ConfigDict(extra="forbid", frozen=True)


class WrittenFloat(float):
    """A number with decimals that remembers how the study file wrote it.

    A value that is compared with the text of a log's cell must keep its digits: 1.50 is not 1.5.

    Examples
    --------
    >>> WrittenFloat("1.50"), WrittenFloat("1.50").written
    (1.5, '1.50')
    """

    written: str

    def __new__(cls, written: str) -> WrittenFloat:
        """Read the number and keep its text."""
        number = super().__new__(cls, written)
        number.written = written
        return number


def refusal(problem: str, *, expected: str = "", fix: str = "") -> PydanticCustomError:
    """An error for a validator to raise; the loader turns it into a finding as it stands."""
    return PydanticCustomError(
        "refused", "{problem}", {"problem": problem, "expected": expected, "fix": fix}
    )


def _number_as_text(value: Any) -> Any:
    """Whole and decimal numbers as they were written; all else as it is."""
    if isinstance(value, WrittenFloat):
        return value.written
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        return str(value)
    return value


def _composed(text: str) -> str:
    """Letters with accents in the one form (Unicode NFC) in which cells are compared."""
    return unicodedata.normalize("NFC", text)


def _as_in_a_cell(text: str) -> str:
    """A value as cells are compared: composed, without blanks around it."""
    return _composed(text).strip()


def no_repeats(values: tuple[str, ...]) -> tuple[str, ...]:
    """Refuse a list that names something twice."""
    twice = [value for place, value in enumerate(values) if value in values[:place]]
    if twice:
        named = ", ".join(json.dumps(value, ensure_ascii=False) for value in dict.fromkeys(twice))
        raise refusal(f"named twice in this list: {named}", fix="keep one of each")
    return values


def _forward_slashes(text: str) -> str:
    """Refuse backslashes between folders: they mean that only on one operating system."""
    if "\\" in text:
        raise refusal(
            "folders are separated by a backslash, which only one operating system understands",
            expected="a forward slash between folders",
            fix=f"write {json.dumps(text.replace(chr(92), '/'), ensure_ascii=False)}",
        )
    return text


def _known_encoding(name: str) -> str:
    """Refuse an encoding that Python does not know, or that is no encoding of text."""
    try:
        codecs.lookup(name)
        b"a".decode(name)
    except UnicodeError:  # a text encoding to which one byte is no whole character
        return name
    except (LookupError, ValueError):
        raise refusal(
            "this text encoding is not known",
            expected='a name such as "utf-8", "utf-16" or "windows-1252"',
            fix="correct the name, or remove the key to have the encoding found out",
        ) from None
    return name


def _sound_pattern(pattern: str) -> str:
    """Refuse a pattern that is no regular expression or does not name the groups it should."""
    try:
        compiled = re.compile(pattern)
    except (re.error, RecursionError, OverflowError) as error:
        raise refusal(
            f"this is no regular expression: {error}",
            expected="a regular expression",
            fix=r"""write for example participant_from_name = '(?P<participant>P\d+)'""",
        ) from None
    strange = [name for name in compiled.groupindex if name not in GROUPS]
    if "participant" not in compiled.groupindex:
        raise refusal(
            "the pattern does not say which part is the participant",
            expected="a group named participant",
            fix="put (?P<participant>…) around the part that names the reader"
            if not strange
            else f"rename its group {strange[0]} to participant",
        )
    if strange:
        raise refusal(
            f"the pattern has a group that means nothing here: {', '.join(strange)}",
            expected=f"groups named {', '.join(GROUPS[:-1])} or {GROUPS[-1]}",
            fix="rename the group, or write (?:…) where it only groups",
        )
    return pattern


_UNIQUE = {"uniqueItems": True}

Switch = Annotated[bool, Field(strict=True)]
WholeNumber = Annotated[int, Field(strict=True)]
Number = Annotated[float, Field(strict=True, allow_inf_nan=False)]

#: A name that somebody chose: a column's header, a factor, a measure.
Name = Annotated[str, Field(min_length=1), AfterValidator(_composed)]
Names = Annotated[tuple[Name, ...], Field(json_schema_extra=_UNIQUE), AfterValidator(no_repeats)]
#: The same, where a list without a name would say nothing.
SomeNames = Annotated[
    tuple[Name, ...],
    Field(min_length=1, json_schema_extra=_UNIQUE),
    AfterValidator(no_repeats),
]
#: Text that may be empty, such as a mark for a missing value.
Texts = Annotated[
    tuple[Annotated[str, AfterValidator(_composed)], ...],
    Field(json_schema_extra=_UNIQUE),
    AfterValidator(no_repeats),
]

#: A value as it stands in a table's cell; a number in the study file is taken as its text.
CellText = Annotated[
    str,
    BeforeValidator(_number_as_text),
    AfterValidator(_as_in_a_cell),
    WithJsonSchema({"type": ["string", "number"]}),
]
CellTexts = Annotated[
    tuple[CellText, ...],
    Field(min_length=1, json_schema_extra=_UNIQUE),
    AfterValidator(no_repeats),
]

#: A file, relative to the study file.
FileName = Annotated[str, Field(min_length=1), AfterValidator(_forward_slashes)]
FileNames = Annotated[
    tuple[FileName, ...],
    Field(min_length=1, json_schema_extra=_UNIQUE),
    AfterValidator(no_repeats),
]

Encoding = Annotated[str, Field(min_length=1), AfterValidator(_known_encoding)]
NamePattern = Annotated[
    str, Field(min_length=1), AfterValidator(_composed), AfterValidator(_sound_pattern)
]

TimeUnit = Literal["ms", "s", "us"]
PlaceUnit = Literal["px", "deg"]
