"""Lines that were set by hand: the table read, and matched to readers and trials."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.cells import plain_array
from etl.errors import Findings
from etl.files import Cells, Coded, marks_of, number_of, read_table
from etl.files.packed import Narrow, RowTexts
from etl.session.lines import HandLines
from etl.trials import IDS
from etl.trials.facts import shown_path
from etl.trials.labels import labels_of, without_prefix

if TYPE_CHECKING:
    from etl.study import Study
    from etl.tables import TableDesign

COLUMNS = ("participant", "trial", "fixation", "line")
#: No trial has more fixations, no text more lines; a greater number is a slip.
MOST = 1_000_000


@dataclass(frozen=True, slots=True)
class LineCorrections:
    """A table of corrections as read.

    Attributes
    ----------
    shown : str
        The file as the user would name it.
    sha256 : str
        Digest of the file.
    ids : dict of str to Coded
        ``participant``, ``trial`` and, where the table has it, ``session``.
    fixation : (k,) int64 array
        Numbers of fixations, from 1.
    line : (k,) int32 array
        Their lines, from 1; 0 for none.
    source_line : (k,) int32 array
        Where in the file each stands.
    """

    shown: str
    sha256: str
    ids: dict[str, Coded]
    fixation: NDArray[np.int64]
    line: NDArray[np.int32]
    source_line: NDArray[np.int32]


def read_corrections(study: Study, findings: Findings) -> LineCorrections | None:
    """Read the table of corrections that a study names.

    Parameters
    ----------
    study : Study
        As loaded.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    LineCorrections or None
        None where the study names none, or a problem was recorded.
    """
    if study.lines is None or study.lines.corrections is None:
        return None
    given = study.lines.corrections
    shown, before = shown_path(study, given), findings.count("error")
    cells = read_table(study.folder / given, shown, findings)
    if cells is None:
        return None
    headers = headers_of(cells, study, findings)
    if headers is None:
        return None
    reading = _Reading(cells, headers, findings)
    absent = marks_of(study.logs.missing)
    prefixes = labels_of(study.logs.kind)
    ids: dict[str, Coded] = {
        name: without_prefix(
            Coded.of(plain_array(cells.column(headers[name])), absent), prefixes.get(name)
        )
        for name in ("participant", "session", "trial")
        if name in headers
    }
    for name, column in ids.items():
        reading.tell_empty(name, column)
    fixation, line = reading.numbers("fixation", 1), reading.numbers("line", 0)
    if findings.count("error") > before:
        return None
    return LineCorrections(
        shown,
        cells.text.sha256,
        ids,
        fixation,
        line.astype(np.int32),
        cells.lines.astype(np.int32),
    )


def headers_of(cells: Cells, study: Study, findings: Findings) -> dict[str, str] | None:
    """The table's own header for each column: our name, else that of the logs.

    Parameters
    ----------
    cells : Cells
        The table of corrections.
    study : Study
        As loaded.
    findings : Findings
        Where a column that is not there is recorded.

    Returns
    -------
    dict of str to str
        By our name; None where a column that is needed is not there.
    """
    columns = study.logs.columns
    synonyms = {n: column.column for n in IDS if (column := getattr(columns, n)) is not None}
    headers, complete = {}, True
    for name in (*COLUMNS, "session"):
        header = name if name in cells.header else synonyms.get(name, name)
        if header in cells.header:
            headers[name] = header
        elif name != "session":
            complete = False
            also = f' (or "{header}", as in the logs)' if header != name else ""
            findings.error(
                f'there is no column "{name}"',
                path=cells.shown,
                line=cells.header_line,
                found=", ".join(one for one in cells.header if one),
                expected=f"columns {', '.join(COLUMNS[:-1])} and {COLUMNS[-1]}{also}",
                fix="rename or add the column",
            )
    return headers if complete else None


@dataclass(frozen=True, slots=True)
class _Reading:
    """Reads the columns of a table and says where a cell is wrong."""

    cells: Cells
    headers: Mapping[str, str]
    findings: Findings

    def tell_empty(self, name: str, column: Coded) -> None:
        """Record cells of an id that are empty."""
        for row in np.flatnonzero(column.codes < 0).tolist():
            self._error(row, name, "the cell is empty", "", f"the {name} of the fixation")

    def numbers(self, name: str, least: int) -> NDArray[np.int64]:
        """A column of whole numbers from a least one."""
        values = np.full(len(self.cells), least, dtype=np.int64)
        for row, text in enumerate(self.cells.texts(self.headers[name])):
            number = number_of(text)
            if number is None or number != int(number) or not least <= number <= MOST:
                expected = f"a whole number from {least}" + ("; 0 is no line" if not least else "")
                problem = f"this is no number of a {name}" if text else "the cell is empty"
                self._error(row, name, problem, text, expected)
            else:
                values[row] = int(number)
        return values

    def _error(self, row: int, name: str, problem: str, found: str, expected: str) -> None:
        self.findings.error(
            problem,
            path=self.cells.shown,
            line=int(self.cells.lines[row]),
            where=f'column "{self.headers[name]}"',
            found=found,
            expected=expected,
            fix="correct the cell, or remove the row",
        )


def _tell_repeats(table: LineCorrections, rows: list[int], findings: Findings) -> None:
    """Record fixations of a trial whose line is set twice."""
    first: dict[int, int] = {}
    for row in rows:
        other = first.setdefault(int(table.fixation[row]), row)
        if other != row:
            findings.error(
                "the line of a fixation is set twice",
                path=table.shown,
                line=int(table.source_line[row]),
                found=_spelled(table, row),
                expected=f"one row for each; line {table.source_line[other]} holds the other",
                fix="remove one of the two rows",
            )


def _spelled(table: LineCorrections, row: int) -> str:
    """The fixation that a row is about."""
    ids = [f"{name} {column.text(row)}" for name, column in table.ids.items()]
    return ", ".join([*ids, f"fixation {table.fixation[row]}"])


def match_corrections(
    table: LineCorrections,
    trials: tuple[Mapping[str, Narrow], RowTexts],
    design: TableDesign,
    findings: Findings,
    *,
    complete: bool,
) -> dict[int, NDArray[np.int64]]:
    """Find the trial of each correction.

    Parameters
    ----------
    table : LineCorrections
        As read.
    trials : tuple of mapping of str to (trials,) array of whole numbers, and RowTexts
        All trials of the study, each once: the places of their ids among the design's values, and
        why each is no part of the study.
    design : TableDesign
        The values of the ids.
    findings : Findings
        Where corrections of trials that no log has, and two of one fixation, are recorded.
    complete : bool
        Whether every log could be read; if not, nothing can be said of what matches nothing.

    Returns
    -------
    dict of int to (k,) int64 array
        The rows of the table that are about each trial, by the trial's place among all.
    """
    ids, skipped_by = trials
    names = [name for name in ("participant", "session", "trial") if name in design.ids]
    given = [name for name in names if name in table.ids]
    places: dict[tuple[str, ...], list[int]] = {}
    # Only the readers whom the table names are looked through: there may be very many others.
    named = np.unique(table.ids["participant"].recoded(design.ids["participant"].values))
    of_named = np.isin(ids["participant"], named)
    for trial in np.flatnonzero(of_named).tolist():
        key = tuple([design.ids[name].values[int(ids[name][trial])] for name in given])
        places.setdefault(key, []).append(trial)
    found: dict[int, list[int]] = {}
    for row in range(len(table.fixation)):
        fits = places.get(tuple([table.ids[name].text(row) for name in given]), [])
        if len(fits) == 1:
            found.setdefault(fits[0], []).append(row)
        elif fits or complete:
            _tell_unmatched(table, row, design, findings, several=len(fits) > 1)
    for trial, rows in found.items():
        _tell_repeats(table, rows, findings)
        if skipped_by[trial]:
            findings.note(
                "lines are set in a trial that is no part of the study, which changes nothing",
                path=table.shown,
                line=int(table.source_line[rows[0]]),
                found=_spelled(table, rows[0]),
            )
    return {trial: np.array(rows, dtype=np.int64) for trial, rows in found.items()}


def _tell_unmatched(
    table: LineCorrections, row: int, design: TableDesign, findings: Findings, *, several: bool
) -> None:
    """Record a correction that is about no trial, or about several."""
    known = table.ids["participant"].text(row) in design.ids["participant"].ranks
    what = "trial" if known else "reader"
    findings.error(
        "the correction fits trials of several sessions"
        if several
        else f"the correction is on a {what} that no log has",
        path=table.shown,
        line=int(table.source_line[row]),
        found=_spelled(table, row),
        expected="one trial" if several else f"a {what} of the logs",
        fix="add a column session" if several else "correct the row, or remove it",
    )


def hand_lines(
    table: LineCorrections, of_trials: Mapping[int, NDArray[np.int64]], trials: range
) -> HandLines:
    """The corrections of one reader.

    Parameters
    ----------
    table : LineCorrections
        As read.
    of_trials : mapping of int to (k,) int64 array
        From :func:`match_corrections`.
    trials : range
        The reader's trials, as places among all trials, in the order of the tables.

    Returns
    -------
    HandLines
    """
    own = [(at, of_trials[t]) for at, t in enumerate(trials) if t in of_trials]
    none = np.zeros(0, dtype=np.int64)
    rows = np.concatenate([none, *(rows for _, rows in own)])
    trial = np.concatenate([none, *(np.full(len(rows), at) for at, rows in own)])
    return HandLines(
        trial.astype(np.int64), table.fixation[rows], table.line[rows], table.source_line[rows]
    )
