"""A study as understood, for the record of a build whose readers go by pseudonyms."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import replace
from functools import cache
from typing import Any

from etl.pseudonyms import WITHHELD, Pseudonyms, is_distinctive
from etl.study.models import StudyFile
from etl.variants.facts import Crossing

#: Where a study names a file or a folder: the tables around the key, and the key.
FILE_KEYS = (
    *(("participants", "table"), ("items", "table"), ("trials", "table"), ("regions", "file")),
    *(("lines", "corrections"), ("screening", "trials", "notes")),
    *(("screening", "participants", "notes"), ("output", "folder")),
)
#: Marks of a missing cell, and beginnings of remarks, in which no name can be: common words for
#: nothing. Other words may be the id of somebody whom the study leaves out in this way.
_COMMON_MARKS = frozenset({"na", "n/a", "nan", "null", "none", "nil", "missing", "rem"})


def hidden_study(understood: Mapping[str, Any], pseudonyms: Pseudonyms) -> dict[str, Any]:
    """A study as understood, with no id and no name of a log in it.

    Parameters
    ----------
    understood : mapping
        ``study.understood()``.
    pseudonyms : Pseudonyms
        Those of the study, when all readers are known.

    Returns
    -------
    dict
        Names of logs and the pattern for them are withheld, and so are words that stand for
        nothing or for a remark, but for common ones; ids, and names of files with an id in them,
        are replaced, and so are distinctive ids in any other text.
    """
    whole: dict[str, Any] = _each_text(dict(understood), pseudonyms.hidden)
    whole["title"] = pseudonyms.hidden_in_free_text(understood["title"])
    for keys in FILE_KEYS:
        given, inner = understood, whole
        for key in keys[:-1]:
            given, inner = (given or {}).get(key) or {}, (inner or {}).get(key) or {}
        if given.get(keys[-1]) is not None:
            inner[keys[-1]] = pseudonyms.shown_file(given[keys[-1]])
    logs = understood["logs"]
    whole["logs"]["files"] = [WITHHELD]
    if logs.get("participant_from_name") is not None:
        whole["logs"]["participant_from_name"] = WITHHELD
    for key in ("missing", "comment"):
        whole["logs"][key] = _marks(logs[key], pseudonyms)
    if logs.get("eye"):
        readers = {pseudonyms.of_reader(n): eye for n, eye in logs["eye"]["readers"].items()}
        whole["logs"]["eye"]["readers"] = dict(sorted(readers.items()))
    column = (logs.get("columns") or {}).get("participant") or {}
    for table, key in (("logs", "where"), ("trials", "skip")):
        named = {}
        for name, values in understood[table][key].items():
            if name in ("participant", column.get("column")):
                named[name] = sorted(map(pseudonyms.of_reader, values))
            else:
                named[name] = [pseudonyms.hidden_in_free_text(value) for value in values]
        whole[table][key] = {_key(name, pseudonyms.hidden): own for name, own in named.items()}
    return whole


def hidden_crossing(crossing: Crossing, pseudonyms: Pseudonyms) -> Crossing:
    """Variants with no id in what they are called, nor in the alternatives of their settings.

    Parameters
    ----------
    crossing : Crossing
        As the variants file has them.
    pseudonyms : Pseudonyms
        Those of the study, when all readers are known.

    Returns
    -------
    Crossing
    """

    def spelled(key: str, alternative: str) -> str:
        if key.endswith(".notes") and alternative.startswith('"'):
            return json.dumps(pseudonyms.shown_file(json.loads(alternative)), ensure_ascii=False)
        return alternative

    settings = tuple(
        replace(own, alternatives=tuple(spelled(own.key, one) for one in own.alternatives))
        for own in crossing.settings
    )
    names = tuple(map(pseudonyms.hidden_in_free_text, crossing.names))
    return replace(crossing, settings=settings, names=names)


def _marks(marks: Sequence[str], pseudonyms: Pseudonyms) -> list[str]:
    """Marks of a missing cell or of a remark, with what may be an id withheld."""
    readers = {text.casefold() for text in pseudonyms.readers().values()}

    def shown(mark: str) -> str:
        folded = mark.casefold()
        number = not any(sign.isalpha() for sign in mark)
        few = not is_distinctive(mark) or len(set(filter(str.isdigit, mark))) == 1  # -9999
        common = folded in _COMMON_MARKS or (number and few)
        return mark if common and folded not in readers else WITHHELD

    return [shown(mark) for mark in marks]


def _each_text(value: Any, change: Callable[[str], str]) -> Any:
    """A value with every text in it changed, names of keys included."""
    if isinstance(value, str):
        return _key(value, change)
    if isinstance(value, Mapping):
        return {_key(key, change): _each_text(inner, change) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_each_text(inner, change) for inner in value]
    return value


def _key(text: str, change: Callable[[str], str]) -> str:
    """A text changed, unless it is a word of the program: a reader may be called Layout."""
    return text if text in _own_words() else change(text)


@cache
def _own_words() -> frozenset[str]:
    """The keys of study files, and the words that they may be set to."""
    return frozenset(_words_in(StudyFile.model_json_schema()))


def _words_in(schema: Any) -> Iterator[str]:
    """The names of properties, and what is one of some words, anywhere in a schema."""
    if isinstance(schema, Mapping):
        yield from schema.get("properties", {})
        yield from (word for word in schema.get("enum", ()) if isinstance(word, str))
        if isinstance(schema.get("const"), str):
            yield schema["const"]
        for inner in schema.values():
            yield from _words_in(inner)
    elif isinstance(schema, list):
        for inner in schema:
            yield from _words_in(inner)
