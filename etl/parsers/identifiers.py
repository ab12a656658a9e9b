"""Who read what: identifiers from a file's name and from the cells of its rows."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Collection, Mapping

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.parts import Part
from etl.pseudonyms import Pseudonyms

#: What identifies a fixation's trial.
IDS = ("participant", "session", "trial", "item")


def ids_in_name(
    pattern: str | None,
    name_of_file: str,
    known: tuple[Collection[str], Collection[str]],
    shown: str,
    findings: Findings,
) -> dict[str, str]:
    """What a file's name says about reader, session, trial or item.

    Parameters
    ----------
    pattern : str or None
        The study's ``participant_from_name``.
    name_of_file : str
        The name, without folders.
    known : tuple of two collections of str
        What stands for no value, and the canonical names that the log's columns say.
    shown : str
        The file's name for messages.
    findings : Findings
        Where a name that does not say what it should is recorded.

    Returns
    -------
    dict of str to str
        By canonical name; empty text where a session or an item is not said.
    """
    missing, in_columns = known[0], set(known[1])
    if pattern is None:
        return {}
    # One operating system keeps letters with accents decomposed in the names of files.
    found = re.search(pattern, unicodedata.normalize("NFC", name_of_file))
    if found is None:
        findings.error(
            "the file's name does not say whose log it is",
            path=shown,
            where="logs.participant_from_name",
            found=name_of_file,
            expected=f"a name in which {pattern} is found",
            fix="rename the file, correct the pattern, or narrow [logs] files",
        )
        return {}
    said = {name: (text or "").strip() for name, text in found.groupdict().items()}
    named = {name: text for name, text in said.items() if text not in missing}
    for name in sorted(found.groupdict().keys() - named.keys() - in_columns):
        if name in ("session", "item"):
            named[name] = ""
            continue
        findings.error(
            f"the file's name does not say the {name}",
            path=shown,
            where="logs.participant_from_name",
            found=name_of_file,
            expected=f"a name in which the group {name} of {pattern} is not empty"
            + (f', and not "{said[name]}", which [logs] missing lists' if said[name] else ""),
            fix="rename the file, correct the pattern, or narrow [logs] files",
        )
    return named


def read_ids(
    rows: tuple[Mapping[str, pa.Array], NDArray[np.int32]],
    columns: Mapping[str, str],
    named: Mapping[str, str],
    missing: Collection[str],
    place: tuple[str, Pseudonyms | None],
    findings: Findings,
    part: Part | None = None,
) -> dict[str, Coded]:
    """Reader, session, trial and item of every row; a missing one is an error.

    Parameters
    ----------
    rows : tuple of mapping and (n,) int32 array
        The cells by header, and the line of each row.
    columns : mapping of str to str
        The header of each column that is read, by canonical name.
    named : mapping of str to str
        What the file's name says, from :func:`ids_in_name`.
    missing : collection of str
        What stands for no value.
    place : tuple of str and Pseudonyms or None
        The log's name for messages; and what gives pseudonyms in place of readers' ids, where the
        study asks for them.
    findings : Findings
        Where missing identifiers, and those that contradict the file's name, are recorded.
    part : Part, optional
        The part of the log that the rows are. Identifiers that contradict the file's name are put
        down there.

    Returns
    -------
    dict of str to Coded
        By canonical name.
    """
    (cells, lines), (shown, pseudonyms) = rows, place
    ids: dict[str, Coded] = {}
    for name in IDS:
        if name not in columns:
            if name in named:
                unsaid = name == "item" and not named[name]
                ids[name] = (
                    Coded.absent(len(lines)) if unsaid else Coded.constant(named[name], len(lines))
                )
            continue
        coded = Coded.of(cells[columns[name]], missing)
        ids[name] = coded
        where = f'column "{columns[name]}"'
        for row in np.flatnonzero(coded.codes < 0).tolist():
            findings.error(
                f"the {name} is missing",
                path=shown,
                line=int(lines[row]),
                where=where,
                found=cells[columns[name]][row].as_py(),
                expected=f"the {name} this fixation belongs to",
                fix="fill in the cell, remove the row, or leave such rows out by [logs.where]",
            )
        if name in named:
            for text in sorted(set(coded.values) - {named[name]}):
                line = int(lines[np.flatnonzero(coded.codes == coded.values.index(text))[0]])
                if part is not None:
                    part.misnamed.setdefault(name, {})[text] = line
                else:
                    tell_misnamed(name, (text, named[name]), line, (shown, where), findings)
    if pseudonyms is not None and "participant" in ids:
        ids["participant"] = pseudonyms.readers_of(ids["participant"])
    return ids


def tell_misnamed(
    name: str, texts: tuple[str, str], line: int, place: tuple[str, str], findings: Findings
) -> None:
    """Record an identifier that contradicts the file's name.

    Parameters
    ----------
    name : str
        Its canonical name.
    texts : tuple of str
        What the row says, and what the file's name says.
    line : int
        Where it is found first.
    place : tuple of str
        The log's name, and the column in words.
    findings : Findings
        Where it is recorded.
    """
    findings.error(
        f"the {name} is not the one in the file's name",
        path=place[0],
        line=line,
        where=place[1],
        found=texts[0],
        expected=texts[1],
        fix="correct the log or its name, or remove logs.participant_from_name",
    )
