"""Logs that are tables: delimited text with one fixation a row."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import (
    Cells,
    Coded,
    NumberReading,
    cells_of,
    find_decimal,
    marks_of,
    number_of,
    numbers_in,
    read_text,
    truth_of,
)
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.coordinates import to_screen_px
from etl.parsers.time_checks import check_times, in_ms

if TYPE_CHECKING:
    from etl.study.models import Column, Logs, Screen

_IDS = ("participant", "session", "trial", "item")
_NUMBERS = ("onset", "end", "duration", "fixation", "x", "y")
#: How many values of a column that [logs.where] does not ask for are remembered, to tell a slip.
_MOST_OTHERS = 20


@dataclass(frozen=True, slots=True)
class LogReader:
    """Reads one table log after another by the study's description.

    Attributes
    ----------
    logs : Logs
        The study's ``[logs]``.
    screen : Screen or None
        The study's ``[screen]``.
    facts : tuple of str
        Headers of facts about trials that are taken from the log.
    """

    logs: Logs
    screen: Screen | None
    facts: tuple[str, ...]

    def read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log.

        Parameters
        ----------
        path : Path
            The file, plain or gzipped.
        shown : str
            Its name for messages.
        findings : Findings
            Where problems are recorded, each with its line.

        Returns
        -------
        CanonicalLog and LogNote, or None
            None where a problem was recorded.
        """
        own = Findings()
        read = self._read(path, shown, own)
        own.items.sort(key=lambda finding: finding.line or 0)
        findings.extend(own)
        return None if own.failed else read

    def _read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log; what is wrong is recorded as it is found."""
        named = self._ids_in_name(path, shown, findings)
        text = read_text(path, shown, findings, encoding=self.logs.encoding)
        if text is None or findings.failed:
            return None
        columns = {name: column.column for name, column in self._columns().items()}
        needed = [*columns.values(), *self.facts, *(h for h, _ in self._where())]
        cells = cells_of(text, findings, delimiter=self.logs.delimiter, needed=needed, wary=True)
        if cells is None:
            return None
        if not len(cells):
            findings.error(
                "the log has a header but no fixation",
                path=shown,
                line=cells.header_line,
                fix="remove the file from the folder, or copy it again",
            )
            return None
        note = LogNote(shown, text.sha256, text.encoding, cells.delimiter)
        note.counts["rows"] = len(cells)
        kept, lines = self._kept(cells, note, findings)
        note.counts["rows not asked for"] = note.counts["rows"] - len(lines)
        if cells.comments:
            note.counts["comment lines below the header"] = cells.comments
        if cells.comments_like_rows:
            note.counts["comment lines like rows"] = cells.comments_like_rows
        if findings.failed:
            return None
        if not len(lines):
            findings.error(
                "no row is left by [logs.where]",
                path=shown,
                expected="a row that has "
                + " and ".join(f"{header} {' or '.join(v)}" for header, v in self._where()),
                fix="correct [logs.where] in the study file, or remove the log",
            )
            return None
        log = self._canonical(kept, lines, columns, named, note, findings)
        return None if log is None else (log, note)

    def _columns(self) -> dict[str, Column]:
        """The columns that are read, by canonical name."""
        described = self.logs.columns
        wanted = (*_IDS, *_NUMBERS, "label", "eye", "blink")
        found = {name: getattr(described, name) for name in wanted}
        return {name: column for name, column in found.items() if column is not None}

    def _missing(self) -> frozenset[str]:
        """What stands in a cell that has no value; cells are compared without blanks around."""
        return marks_of(self.logs.missing)

    def _where(self) -> list[tuple[str, Sequence[str]]]:
        """Headers and values of ``[logs.where]``; a canonical name stands for its header."""
        columns = self._columns()
        return [
            (columns[name].column if name in columns else name, values)
            for name, values in self.logs.where.items()
        ]

    def _ids_in_name(self, path: Path, shown: str, findings: Findings) -> dict[str, str]:
        """What the file's name says about reader, session, trial or item."""
        pattern = self.logs.participant_from_name
        if pattern is None:
            return {}
        # One operating system keeps letters with accents decomposed in the names of files.
        found = re.search(pattern, unicodedata.normalize("NFC", path.name))
        if found is None:
            findings.error(
                "the file's name does not say whose log it is",
                path=shown,
                where="logs.participant_from_name",
                found=path.name,
                expected=f"a name in which {pattern} is found",
                fix="rename the file, correct the pattern, or narrow [logs] files",
            )
            return {}
        said = {name: (text or "").strip() for name, text in found.groupdict().items()}
        named = {name: text for name, text in said.items() if text not in self._missing()}
        for name in sorted(found.groupdict().keys() - named.keys() - self._columns().keys()):
            if name in ("session", "item"):
                named[name] = ""
                continue
            findings.error(
                f"the file's name does not say the {name}",
                path=shown,
                where="logs.participant_from_name",
                found=path.name,
                expected=f"a name in which the group {name} of {pattern} is not empty"
                + (f', and not "{said[name]}", which [logs] missing lists' if said[name] else ""),
                fix="rename the file, correct the pattern, or narrow [logs] files",
            )
        return named

    def _kept(
        self, cells: Cells, note: LogNote, findings: Findings
    ) -> tuple[dict[str, pa.Array], NDArray[np.int32]]:
        """The columns and lines of the rows that ``[logs.where]`` asks for."""
        columns = {name: cells.column(name) for name in cells.table.column_names}
        where = self._where()
        if not where:
            return columns, cells.lines
        mask = np.ones(len(cells), dtype=bool)
        for name, (header, values) in zip(self.logs.where, where, strict=True):
            coded = Coded.of(columns[header], ())
            asked = coded.among(values)
            others = [text for text in coded.values if text not in values][:_MOST_OTHERS]
            note.asked[name] = (*(v for v in values if v in coded.values), *others)
            if not asked.any():
                findings.error(
                    "no row has the value asked for",
                    path=cells.shown,
                    where=f'column "{header}"',
                    found=", ".join(coded.values[:5]),
                    expected=" or ".join(values),
                    fix="correct [logs.where] in the study file, or remove the log",
                )
            mask &= asked
        rows = np.flatnonzero(mask)
        return {name: column.take(pa.array(rows)) for name, column in columns.items()}, cells.lines[
            rows
        ]

    def _canonical(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        named: dict[str, str],
        note: LogNote,
        findings: Findings,
    ) -> CanonicalLog | None:
        """Cells into canonical columns."""
        missing = self._missing()
        ids = self._ids(cells, lines, columns, named, note.shown, findings)
        numbers = self._numbers(cells, lines, columns, note, findings)
        if numbers is None:
            return None
        duration_ms = check_times(numbers, cells, lines, columns, note.shown, findings)
        nowhere = np.full(len(lines), np.nan)
        x_px, y_px = to_screen_px(
            numbers.get("x", nowhere),
            numbers.get("y", nowhere),
            units=(self._unit("x"), self._unit("y")),
            screen=self.screen,
        )
        note.counts["fixations"] = len(lines)
        if "x" in numbers:
            note.counts["fixations without a position"] = int(
                (np.isnan(x_px) | (np.isnan(y_px) if "y" in numbers else False)).sum()
            )
        label = Coded.of(cells[columns["label"]], missing) if "label" in columns else None
        facts = {name: Coded.of(cells[name], missing) for name in self.facts}
        return CanonicalLog(
            ids,
            facts,
            numbers.get("onset", nowhere),
            numbers.get("fixation", nowhere),
            duration_ms,
            x_px,
            y_px,
            label,
            lines,
            self._blinks(cells, lines, columns, note.shown, findings),
        )

    def _blinks(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        shown: str,
        findings: Findings,
    ) -> NDArray[np.bool_]:
        """Whether a blink touches each fixation: a number that is not 0, or a word for yes."""
        if "blink" not in columns:
            return np.zeros(len(lines), dtype=bool)
        coded = Coded.of(cells[columns["blink"]], self._missing())
        known = [_touches(text) for text in coded.values]
        for code, touches in enumerate(known):
            if touches is None:
                row = int(np.flatnonzero(coded.codes == code)[0])
                findings.error(
                    "this does not say whether a blink touches the fixation",
                    path=shown,
                    line=int(lines[row]),
                    where=f'column "{columns["blink"]}"',
                    found=coded.values[code],
                    expected="a number (0 for no blink), or a word for yes or no",
                    fix="correct the cells, or take blink out of [logs.columns]",
                )
        return np.array([*(bool(touches) for touches in known), False])[coded.codes]

    def _unit(self, name: str) -> str:
        """The unit of a position column."""
        column = self._columns().get(name)
        return "px" if column is None else str(column.unit)

    def _ids(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        named: dict[str, str],
        shown: str,
        findings: Findings,
    ) -> dict[str, Coded]:
        """Reader, session, trial and item of every row; a missing one is an error."""
        missing = self._missing()
        ids: dict[str, Coded] = {}
        for name in _IDS:
            if name not in columns:
                if name in named:
                    unsaid = name == "item" and not named[name]
                    ids[name] = (
                        Coded.absent(len(lines))
                        if unsaid
                        else Coded.constant(named[name], len(lines))
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
                    row = int(np.flatnonzero(coded.codes == coded.values.index(text))[0])
                    findings.error(
                        f"the {name} is not the one in the file's name",
                        path=shown,
                        line=int(lines[row]),
                        where=where,
                        found=text,
                        expected=named[name],
                        fix="correct the log or its name, or remove logs.participant_from_name",
                    )
        return ids

    def _numbers(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        note: LogNote,
        findings: Findings,
    ) -> dict[str, NDArray[np.float64]] | None:
        """The columns of numbers, times in ms."""
        present = {name: columns[name] for name in _NUMBERS if name in columns}
        decimal = self.logs.decimal or find_decimal(
            {header: cells[header] for header in present.values()},
            note.shown,
            lambda row: int(lines[row]),
            findings,
        )
        if decimal is None:
            return None
        note.decimal = decimal
        reading = NumberReading(note.shown, lines, self._missing(), decimal)
        numbers: dict[str, NDArray[np.float64]] = {}
        sound = True
        for name, header in present.items():
            unit = getattr(self._columns()[name], "unit", None)
            expected = "a whole number" if name == "fixation" else f"a number in {unit}"
            values = numbers_in(cells[header], header, reading, findings, expected=expected)
            if values is None:
                sound = False
            elif name in ("onset", "end", "duration"):
                numbers[name] = in_ms(values, str(unit))
            else:
                numbers[name] = values
        return numbers if sound else None


def _touches(text: str) -> bool | None:
    """Whether a cell says that there was a blink; None where it does not say."""
    truth = truth_of(text)
    if truth is not None:
        return truth
    number = number_of(text.replace(",", "."))
    return None if number is None else number != 0
