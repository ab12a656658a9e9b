"""The experimenter's notes: trials and readers to be left out, by hand and with a reason."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Cells, Coded, place_rows, read_table
from etl.files.packed import RowTexts
from etl.pseudonyms import WITHHELD, Pseudonyms
from etl.trials.fact_tables import FactTable
from etl.trials.labels import without_prefix
from etl.trials.seen import SeenTrials


@dataclass(frozen=True, slots=True)
class Notes:
    """The notes of one file.

    Attributes
    ----------
    shown : str
        The file as the user would name it.
    sha256 : str
        Digest of the file.
    columns : dict of str to Coded
        ``participant``, ``trial``, ``reason`` and, where the file has it, ``session``.
    lines : (notes,) int32 array
        The line of each note.
    """

    shown: str
    sha256: str
    columns: dict[str, Coded]
    lines: NDArray[np.int32]

    def under(self, pseudonyms: Pseudonyms | None) -> Notes:
        """The notes with pseudonyms in place of readers' ids, and without what people wrote.

        Free text may tell of a reader in more ways than can be looked for: by an id of one sign,
        by a nickname. What was written stays in the laboratory's own file.
        """
        if pseudonyms is None:
            return self
        readers = pseudonyms.readers_of(self.columns["participant"], either=True)
        reason = self.columns["reason"]
        told = Coded(np.where(reason.codes < 0, -1, 0).astype(np.int32), (WITHHELD,))
        return replace(self, columns={**self.columns, "participant": readers, "reason": told})

    def on_trials(self) -> NDArray[np.bool_]:
        """Which notes are on a trial; the others are on a reader."""
        return self.columns["trial"].codes >= 0


def read_notes(
    path: Path,
    shown: str,
    synonyms: Mapping[str, str],
    missing: Collection[str],
    findings: Findings,
    *,
    on_trials: bool = True,
    prefixes: Mapping[str, str] = MappingProxyType({}),
) -> Notes | None:
    """Read a file of notes.

    Parameters
    ----------
    path : Path
        The file, delimited text or a workbook, its sheet after a hash: columns ``participant``,
        ``trial``, ``reason``, and ``session`` where readers came more than once. A note without a
        trial is on the reader.
    shown : str
        Its name for messages.
    synonyms : mapping of str to str
        The logs' own header for a canonical name.
    missing : collection of str
        Cells that stand for no value.
    findings : Findings
        Where problems are recorded.
    on_trials : bool
        Whether notes on trials are asked for; then the file must have a column ``trial``, since a
        misspelt one would turn every note on a trial into one on its reader.
    prefixes : mapping of str to str
        As in :func:`~etl.trials.fact_tables.read_fact_table`.

    Returns
    -------
    Notes or None
        None where a problem was recorded.
    """
    before = findings.count("error")
    cells = read_table(path, shown, findings)
    if cells is None:
        return None
    absent = frozenset(mark.strip() for mark in missing) | {""}
    columns: dict[str, Coded] = {}
    for name in ("participant", "trial", "reason", "session"):
        header = name if name in cells.header else synonyms.get(name, name)
        if header in cells.header:
            coded = Coded.of(cells.column(header), absent)
            columns[name] = without_prefix(coded, prefixes.get(name))
        elif name == "trial" and not on_trials:
            columns[name] = Coded.absent(len(cells))
        elif name != "session":
            _tell_missing_column(name, cells, findings)
    if findings.count("error") > before:
        return None
    for row in np.flatnonzero(columns["participant"].codes < 0).tolist():
        findings.error(
            "the note does not say which reader",
            path=shown,
            line=int(cells.lines[row]),
            where='column "participant"',
            expected="a reader of the logs",
            fix="fill in the cell, or remove the row",
        )
    if findings.count("error") > before:
        return None
    return Notes(shown, cells.text.sha256, columns, cells.lines)


def _tell_missing_column(name: str, cells: Cells, findings: Findings) -> None:
    """Record that a file of notes lacks a column."""
    findings.error(
        f'there is no column "{name}"',
        path=cells.shown,
        line=cells.header_line,
        found=", ".join(header for header in cells.header if header),
        expected="columns participant, trial and reason",
        fix="rename or add the column",
    )


def notes_on_trials(
    notes: Notes, seen: SeenTrials, trial_list: FactTable | None, findings: Findings
) -> RowTexts:
    """The note on each trial; a note that matches no trial is an error.

    Parameters
    ----------
    notes : Notes
        The experimenter's notes.
    seen : SeenTrials
        The trials of the logs, each once.
    trial_list : FactTable or None
        A note on a trial that is in the list, and in no log, says why it was not recorded.
    findings : Findings
        Where notes that match nothing are recorded.

    Returns
    -------
    list of str
        The reason for each trial, several joined by ``; ``; empty where there is none.
    """
    rows = np.flatnonzero(notes.on_trials())
    keys = ["participant", "trial"]
    if "session" in seen.ids and "session" in notes.columns:
        keys.append("session")
    reasons = RowTexts(len(seen))
    if not rows.size:
        return reasons
    # Several notes may be on one trial, so the notes are placed among the trials.
    wanted = [notes.columns[key].take(rows) for key in keys]
    if "session" in seen.ids and "session" not in keys:
        return _without_session(notes, rows, seen, trial_list, findings)
    places = place_rows(wanted, [seen.ids[key] for key in keys])
    listed = np.full(len(rows), -1)
    if trial_list is not None and set(trial_list.keys) <= set(keys):
        own = [notes.columns[key].take(rows) for key in trial_list.keys]
        listed = place_rows(own, [trial_list.columns[key] for key in trial_list.keys])
    for row, at, known in zip(rows.tolist(), places.tolist(), listed.tolist(), strict=True):
        if at < 0 and known >= 0:
            _tell_unrecorded(notes, row, findings)
            continue
        if at < 0:
            _tell_unmatched(notes, row, seen, findings)
            continue
        _add(reasons, at, notes.columns["reason"].text(row))
    return reasons


def _without_session(
    notes: Notes,
    rows: NDArray[np.int64],
    seen: SeenTrials,
    trial_list: FactTable | None,
    findings: Findings,
) -> RowTexts:
    """Notes that name no session although trials have one: good where only one trial fits."""
    reasons = RowTexts(len(seen))
    for row in rows.tolist():
        fits = _fitting(notes, row, seen.ids)
        if len(fits) == 1:
            _add(reasons, int(fits[0]), notes.columns["reason"].text(row))
        elif len(fits) == 0 and trial_list is not None and _is_listed(notes, row, trial_list):
            _tell_unrecorded(notes, row, findings)
        elif len(fits) == 0:
            _tell_unmatched(notes, row, seen, findings)
        else:
            findings.error(
                "the note fits trials of several sessions",
                path=notes.shown,
                line=int(notes.lines[row]),
                found=_spelled(notes, row),
                expected="one trial",
                fix="add a column session",
            )
    return reasons


def _fitting(notes: Notes, row: int, ids: Mapping[str, Coded]) -> NDArray[np.int64]:
    """The rows of some trials that have the reader and the trial of a note."""
    names = ("participant", "trial")
    same = [ids[name].among({notes.columns[name].text(row)}) for name in names]
    return np.flatnonzero(same[0] & same[1])


def _is_listed(notes: Notes, row: int, trial_list: FactTable) -> bool:
    """Whether the trial list has the trial of a note in some session."""
    named = {"participant", "trial"} <= set(trial_list.keys) <= {"participant", "session", "trial"}
    return named and len(_fitting(notes, row, trial_list.columns)) > 0


def notes_on_readers(notes: Notes, seen: SeenTrials, findings: Findings) -> dict[str, str]:
    """The note on each reader; a note that matches no reader is an error.

    Parameters
    ----------
    notes : Notes
        The experimenter's notes.
    seen : SeenTrials
        The trials of the logs.
    findings : Findings
        Where notes that match nothing are recorded.

    Returns
    -------
    dict of str to str
        Reader to reason.
    """
    readers = set(seen.ids["participant"].values)
    found: dict[str, str] = {}
    for row in np.flatnonzero(~notes.on_trials()).tolist():
        reader = notes.columns["participant"].text(row)
        if reader not in readers:
            _tell_unmatched(notes, row, seen, findings)
            continue
        reason = notes.columns["reason"].text(row) or "no reason given"
        found[reader] = f"{found[reader]}; {reason}" if reader in found else reason
    return found


def _add(reasons: RowTexts, at: int, reason: str) -> None:
    """Add a reason to a trial's."""
    reason = reason or "no reason given"
    reasons[at] = f"{reasons[at]}; {reason}" if reasons[at] else reason


def _spelled(notes: Notes, row: int) -> str:
    """What a note is on, for messages."""
    return ", ".join(
        f"{name} {notes.columns[name].text(row)}"
        for name in ("participant", "session", "trial")
        if name in notes.columns and notes.columns[name].codes[row] >= 0
    )


def _tell_unrecorded(notes: Notes, row: int, findings: Findings) -> None:
    """Say that a note explains why a trial of the list is in no log."""
    findings.note(
        "the note is on a trial that was not recorded",
        path=notes.shown,
        line=int(notes.lines[row]),
        found=_spelled(notes, row),
    )


def _tell_unmatched(notes: Notes, row: int, seen: SeenTrials, findings: Findings) -> None:
    """Record a note that matches nothing."""
    reader = notes.columns["participant"].text(row)
    known = reader in seen.ids["participant"].values
    what = "trial" if known and notes.columns["trial"].codes[row] >= 0 else "reader"
    findings.error(
        f"the note is on a {what} that no log has",
        path=notes.shown,
        line=int(notes.lines[row]),
        found=_spelled(notes, row),
        expected=f"a {what} of the logs",
        fix="correct the row, or remove it",
    )
