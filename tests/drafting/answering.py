"""A lab that answers the questions of a draft, as somebody would in an editor."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

from etl.drafting.toml_text import key_text, value_text

_TABLE = re.compile(r"^(?P<off># )?\[(?P<name>[\w.\"' -]+)\]\s*$")
_KEY = re.compile(r"^(?P<off># )?(?P<key>[A-Za-z_]\w*) = (?P<value>.*)$")
#: What a lab knows of its logs and no draft can: the rest of ``[logs]`` is for the draft to find.
_KNOWN_OF_LOGS = (
    *("logs.eye.use", "logs.eye.column", "logs.eye.readers", "logs.columns.blink"),
    "logs.samples.shortest_fixation_ms",
)


def answered(text: str, answers: Mapping[str, str | None]) -> str:
    """The draft with answers in place: ``regions.file`` and the like, to values as TOML.

    A key that is there, be it open, guessed or an example, gets the value, or goes where that is
    None; one that is not there is put at the top of its table; the header of a table that is only
    an example loses its ``#``.
    """
    left = dict(answers)
    lines: list[str] = []
    headers: dict[str, int] = {}
    table = ""
    for line in text.split("\n"):
        header, key = _TABLE.match(line), _KEY.match(line)
        if header is not None:
            table = header["name"]
            headers[table] = len(lines)
            wanted = any(name.rpartition(".")[0] == table for name in answers)
            lines.append(f"[{table}]" if wanted or not header["off"] else line)
        elif key is not None and (name := f"{table}.{key['key']}".lstrip(".")) in left:
            value = left.pop(name)
            if value is not None:
                lines.append(f"{key['key']} = {value}")
        else:
            lines.append(line)
    for name, value in left.items():
        if value is None:
            continue
        table, _, last = name.rpartition(".")
        if table in headers:
            at = headers[table]
            lines.insert(at + 1, f"{last} = {value}")
            headers = {one: place + (place > at) for one, place in headers.items()}
        else:
            headers[table] = len(lines)
            lines += [f"[{table}]", f"{last} = {value}"]
    return "\n".join(lines)


def lab_knows(study: Mapping[str, Any]) -> dict[str, str | None]:
    """What a lab that wrote a study file by hand would answer to a draft of it."""
    answers: dict[str, str | None] = {}
    for name, value in _keys(study, ""):
        if not name.startswith("logs.") or name in _KNOWN_OF_LOGS:
            answers[name] = value_text(value)
    # A study file that says nothing means downwards; a lab that is asked says so.
    answers.setdefault("screen.y_axis", '"down"')
    if "logs.eye.use" not in answers and "eye" in study["logs"]:
        answers["logs.eye.use"] = None
    return answers


def _keys(table: Mapping[str, Any], path: str) -> Iterator[tuple[str, Any]]:
    """Every key of a study file, dotted; columns, and tables whose keys are free, are values."""
    free = ("logs.eye.readers", "trials.levels", "trials.skip", "logs.where")
    for key, value in table.items():
        name = f"{path}.{key_text(key)}".lstrip(".")
        if isinstance(value, dict) and not name.startswith("logs.columns.") and name not in free:
            yield from _keys(value, name)
        else:
            yield name, value
