"""The bytes of a study file into the values they write, or what stands in the way."""

from __future__ import annotations

import codecs
import re
import tomllib
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.study.positions import KeyPath, lines_of_keys
from etl.study.values import WrittenFloat

_PLACE = re.compile(r" \(at (?:line (\d+), column (\d+)|end of document)\)$")

_BACKSLASH = (
    "a backslash in double quotes begins a special character",
    "write the text in single quotes, where a backslash is only itself",
)

#: Beginnings of what the reader of TOML says, in the words of somebody who writes a study file:
#: the problem, and what to do. What is not listed is passed on as it stands.
_SAID = (
    ("Unescaped '\\'", *_BACKSLASH),
    ("Invalid hex value", *_BACKSLASH),
    ("Escaped character", *_BACKSLASH),
    (
        "Cannot overwrite a value",
        "this key is given a second time",
        "keep one of the two, or put the second under its own [table]",
    ),
    ("Duplicate inline table key", "this key is given a second time", "keep one of the two"),
    ("Cannot declare", "this table is begun a second time", "put its keys under one header"),
    ("Cannot redefine namespace", "this is given a second time", "keep one of the two"),
    (
        "Cannot mutate immutable namespace",
        "this adds to what is already complete",
        "put all its keys in one place",
    ),
    ("Unterminated string", "a text has no closing quote", "close the quotes"),
    ('Expected "\'"', "a text has no closing quote", "close the quotes"),
    ("Found invalid character '\\n'", "a text has no closing quote", "close the quotes"),
    ("Illegal character '\\n'", "a text has no closing quote", "close the quotes"),
    ("Invalid statement", "this is no line of a study file", "write key = value, or [table]"),
    (
        "Invalid initial character for a key part",
        "this is no key",
        "write a key in letters, digits, - and _; put any other in quotes",
    ),
    (
        "Expected ']'",
        "the name of a table has no closing bracket",
        "write [table] on a line of its own",
    ),
    (
        "Invalid value",
        "this is no value",
        "write text in quotes, numbers with a point, and true or false in small letters",
    ),
    (
        "Expected '=' after a key",
        "a key has no value",
        "write key = value, one on a line",
    ),
    (
        "Expected newline or end of document",
        "something follows the value on its line",
        "put it on a line of its own, or after # if it is a comment; decimals take a point",
    ),
    ("Unclosed array", "a list has no closing bracket", "close the list with ], commas between"),
    (
        "Unclosed inline table",
        "a table in braces has no closing brace on its line",
        "close it with } on the same line, commas between",
    ),
    ("Invalid date", "there is no such date or time", "write text in quotes"),
)

_OTHER_ENCODINGS = ((codecs.BOM_UTF16_LE, "UTF-16"), (codecs.BOM_UTF16_BE, "UTF-16"))


def read_bytes(path: Path, shown: str, findings: Findings) -> bytes | None:
    """Read the study file as bytes.

    Parameters
    ----------
    path : Path
        The study file.
    shown : str
        Its name for messages.
    findings : Findings
        Where it is recorded that the file cannot be read.

    Returns
    -------
    bytes or None
        None where a problem was recorded.
    """
    try:
        if path.is_dir():
            findings.error(
                "this is a folder",
                path=shown,
                expected="a study file",
                fix="name the study file in it, for example study.toml",
            )
            return None
        return path.read_bytes()
    except (FileNotFoundError, NotADirectoryError, ValueError):
        findings.error(
            "there is no such file",
            path=shown,
            expected="a study file",
            fix="correct the name, or change to the folder that holds it",
        )
    except OSError as error:
        findings.error(
            f"the file cannot be read: {error.strerror or error}",
            path=shown,
            expected="a study file",
            fix="see to it that you may read the file",
        )
    return None


def decode(raw: bytes, shown: str, findings: Findings) -> str | None:
    """Decode the study file, with or without a byte-order mark.

    Parameters
    ----------
    raw : bytes
        The file.
    shown : str
        Its name for messages.
    findings : Findings
        Where it is recorded that the file is not UTF-8.

    Returns
    -------
    str or None
        None where a problem was recorded.
    """
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        marked = [name for mark, name in _OTHER_ENCODINGS if raw.startswith(mark)]
        findings.error(
            f"the file is {marked[0]} text" if marked else "this is no UTF-8 text",
            path=shown,
            line=None if marked else raw.count(b"\n", 0, error.start) + 1,
            found=None if marked else f"byte {raw[error.start]:02X}",
            expected="UTF-8 text",
            fix="save the file as UTF-8 in your editor",
        )
        return None


def parse(
    text: str, shown: str, findings: Findings
) -> tuple[dict[str, Any], dict[KeyPath, int]] | None:
    """Read TOML, and where each key stands.

    Parameters
    ----------
    text : str
        The study file.
    shown : str
        Its name for messages.
    findings : Findings
        Where a mistake in the TOML is recorded; the reader stops at the first.

    Returns
    -------
    data : dict
        The values; a number with decimals is a :class:`WrittenFloat`.
    lines : dict
        From :func:`etl.study.positions.lines_of_keys`.
    None
        In place of both, where a problem was recorded.
    """
    try:
        return tomllib.loads(text, parse_float=WrittenFloat), lines_of_keys(text)
    except RecursionError:
        findings.error(
            "lists or tables stand too deep inside one another",
            path=shown,
            expected="a study file",
            fix="correct the brackets",
        )
    except tomllib.TOMLDecodeError as error:
        _record(str(error), text, shown, findings)
    except ValueError:  # Python refuses to read numbers of thousands of digits
        findings.error(
            "a number has too many digits",
            path=shown,
            expected="a study file",
            fix="correct the number, or write it in quotes",
        )
    return None


def _record(said: str, text: str, shown: str, findings: Findings) -> None:
    """Record a mistake in the TOML, in plain words where there are some."""
    place = _PLACE.search(said)
    plain = _PLACE.sub("", said)
    problem, fix = next(
        ((problem, fix) for begins, problem, fix in _SAID if plain.startswith(begins)),
        (
            plain[:1].lower() + plain[1:],
            "correct the line; see https://toml.io for what TOML takes",
        ),
    )
    last = text.rstrip().count("\n") + 1
    at_end = place is None or place[1] is None
    findings.error(
        problem,
        path=shown,
        line=last if at_end or place is None else int(place[1]),
        where="end of file" if at_end or place is None else f"column {place[2]}",
        expected="TOML",
        fix=fix,
    )
