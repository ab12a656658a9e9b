"""Rows of a log as text cells, whatever its kind, and from them canonical fixations."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, NumberReading, find_decimal, marks_of, numbers_in
from etl.files.numeric_cells import decimal_signs
from etl.parsers.asked_rows import rows_asked_for
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.coordinates import degrees_to_px, tell_far_positions, to_screen_px
from etl.parsers.detection import SampleRows, log_of_samples
from etl.parsers.event_blinks import tell_blink, touches
from etl.parsers.eyes import ChosenEye, EyeChoice
from etl.parsers.identifiers import IDS, ids_in_name, read_ids
from etl.parsers.parts import Part, Step
from etl.parsers.time_checks import DIFFERENCE_DIGITS, check_times, in_ms
from etl.pseudonyms import Pseudonyms

if TYPE_CHECKING:
    from etl.study.models import Column, Logs, Screen

_NUMBERS = ("onset", "end", "duration", "fixation", "x", "y")
#: What a gaze sample has none of.
_NOT_OF_SAMPLES = ("end", "duration", "fixation", "label")


@dataclass(frozen=True, slots=True)
class LogRows:
    """Rows of a log as text cells.

    Attributes
    ----------
    columns : dict of str to (n,) pa.Array of text
        The cells by header.
    lines : (n,) int32 array
        The line on which each row begins, from 1.
    recording : (n,) int32 array or None
        As in :class:`~etl.parsers.canonical.CanonicalLog`; None where the log does not say.
    blink : (n,) bool array or None
        Whether a blink touches each fixation, where no column says so.
    """

    columns: dict[str, pa.Array]
    lines: NDArray[np.int32]
    recording: NDArray[np.int32] | None = None
    blink: NDArray[np.bool_] | None = None

    def __len__(self) -> int:
        return len(self.lines)

    def take(self, rows: NDArray[np.int64]) -> LogRows:
        """Some of the rows."""
        picked = pa.array(rows)
        return LogRows(
            {name: column.take(picked) for name, column in self.columns.items()},
            self.lines[rows],
            None if self.recording is None else self.recording[rows],
            None if self.blink is None else self.blink[rows],
        )


@dataclass(frozen=True, slots=True)
class RowReading:
    """How rows of text cells become canonical fixations, by the study's description.

    Attributes
    ----------
    logs : Logs
        The study's ``[logs]``.
    screen : Screen or None
        The study's ``[screen]``.
    facts : tuple of str
        Headers of facts about trials that are taken from the log.
    eyes : EyeChoice
        Which eye counts for each reader.
    pseudonyms : Pseudonyms or None
        What gives pseudonyms in place of readers' ids, where the study asks for them.
    """

    logs: Logs
    screen: Screen | None
    facts: tuple[str, ...]
    eyes: EyeChoice = field(default_factory=EyeChoice)
    pseudonyms: Pseudonyms | None = None
    _columns: dict[str, Column] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        described = self.logs.columns
        wanted = (*IDS, *_NUMBERS, "label", "eye", "blink")
        absent = () if self.logs.samples is None else _NOT_OF_SAMPLES
        found = {name: getattr(described, name) for name in wanted if name not in absent}
        present = {name: column for name, column in found.items() if column is not None}
        # Asked for many times a log.
        object.__setattr__(self, "_columns", present)

    def columns(self) -> dict[str, Column]:
        """The columns that are read, by canonical name."""
        return self._columns

    def headers(self) -> dict[str, str]:
        """The header of each column that is read, by canonical name."""
        return {name: column.column for name, column in self.columns().items()}

    def needed(self) -> list[str]:
        """The headers that a log must have."""
        return [
            *self.headers().values(),
            *self.eyes.headers(self.logs),
            *self.facts,
            *(header for header, _ in self.where()),
        ]

    def missing(self) -> frozenset[str]:
        """What stands in a cell that has no value; cells are compared without blanks around."""
        return marks_of(self.logs.missing)

    def where(self) -> list[tuple[str, Sequence[str]]]:
        """Headers and values of ``[logs.where]``; a canonical name stands for its header."""
        columns = self.columns()
        return [
            (columns[name].column if name in columns else name, values)
            for name, values in self.logs.where.items()
        ]

    def named(self, path: Path, shown: str, findings: Findings) -> dict[str, str]:
        """What a file's name says; see :func:`~etl.parsers.identifiers.ids_in_name`."""
        return ids_in_name(
            self.logs.participant_from_name,
            path.name,
            (self.missing(), self.headers().keys()),
            shown,
            findings,
        )

    def asked_for(
        self, rows: LogRows, note: LogNote, findings: Findings, part: Part | None = None
    ) -> LogRows | None:
        """The rows that ``[logs.where]`` asks for.

        Parameters
        ----------
        rows : LogRows
            All rows.
        note : LogNote
            Where it is counted how many there are of the others.
        findings : Findings
            Where it is recorded that no row has a value asked for.
        part : Part, optional
            The part of the log that the rows are.

        Returns
        -------
        LogRows or None
            None where a problem was recorded.
        """
        where = self.where()
        note.counts["rows"] = len(rows)
        note.counts["rows not asked for"] = 0
        if not where:
            return rows
        asked = rows_asked_for(rows.columns, where, note.shown, findings, part)
        if asked is None:
            return None
        mask, occurring = asked
        for name, (header, _), there in zip(self.logs.where, where, occurring, strict=True):
            note.asked[name] = self._hidden(
                header, Coded.of(pa.array(there, pa.string()), ())
            ).values
        return _without(rows, ~mask, "rows not asked for", note)

    def canonical(
        self,
        rows: LogRows,
        named: dict[str, str],
        note: LogNote,
        findings: Findings,
        part: Part | None = None,
    ) -> CanonicalLog | None:
        """Cells into canonical fixations; where the study has ``[logs.samples]``, those in samples.

        Parameters
        ----------
        rows : LogRows
            The rows (fixations or samples), each counted among the lines of the note as
            ``"fixations"``.
        named : dict of str to str
            What the file's name says, from :meth:`ids_in_name`.
        note : LogNote
            Where it is told how the log was understood.
        findings : Findings
            Where every cell that cannot be used is recorded, with its line.
        part : Part, optional
            The part of the log that the rows are; what is found is recorded there by steps, and
            what holds for the whole log is not judged.

        Returns
        -------
        CanonicalLog or None
            None where a problem was recorded that hides others, or no row of a part is asked for.
        """
        asked = self.asked_for(rows, note, findings, part)
        if asked is None or not len(asked):
            return None
        rows, columns, told = asked, self.headers(), Findings()
        chosen: ChosenEye | None = None
        place = (note.shown, self.pseudonyms)
        cells = (rows.columns, rows.lines)
        own = findings if part is None else part.at(Step.IDS)
        ids = read_ids(cells, columns, named, self.missing(), place, own, part)
        if self.logs.eye is not None and "participant" in ids:
            if own.failed:
                return None
            chosen = self.eyes.choose(cells, columns, ids, self.logs, note, findings, part)
            if chosen is None:
                return None
            left = np.flatnonzero(chosen.rows)
            ids = {name: coded.take(left) for name, coded in ids.items()}
            rows = replace(rows, columns={**rows.columns, **chosen.columns})
            rows = _without(rows, ~chosen.rows, "rows of the other eye", note)
            columns = chosen.headers
        own = told if part is None else part.at(Step.NUMBERS)
        numbers = self._numbers(rows.columns, rows.lines, columns, note, own, part)
        if part is not None:
            if numbers is None:
                part.stopped = Step.NUMBERS
                return None
            own = part.at(Step.FIXATIONS)
            return self._fixations(rows, columns, ids, numbers, note, own, part)
        log = None if numbers is None else self._fixations(rows, columns, ids, numbers, note, told)
        findings.extend(told if chosen is None else chosen.under_own_headers(told))
        return log

    def _fixations(
        self,
        rows: LogRows,
        columns: dict[str, str],
        ids: dict[str, Coded],
        numbers: dict[str, NDArray[np.float64]],
        note: LogNote,
        findings: Findings,
        part: Part | None = None,
    ) -> CanonicalLog | None:
        """Rows of fixations, or of samples, into canonical columns."""
        cells, lines, missing = rows.columns, rows.lines, self.missing()
        nowhere = np.full(len(lines), np.nan)
        x_px, y_px = to_screen_px(
            numbers.get("x", nowhere),
            numbers.get("y", nowhere),
            units=(self._unit("x"), self._unit("y")),
            screen=self.screen,
        )
        tell_far_positions(
            {name: px for name, px in (("x", x_px), ("y", y_px)) if name in numbers},
            {name: (columns[name], cells[columns[name]]) for name in ("x", "y") if name in numbers},
            lines,
            self.screen,
            note.shown,
            findings,
        )
        facts = {name: self._hidden(name, Coded.of(cells[name], missing)) for name in self.facts}
        blink = self._blinks(cells, lines, columns, note.shown, findings, part)
        blink = blink if rows.blink is None else blink | rows.blink
        if self.logs.samples is not None:
            onset = (columns["onset"], cells[columns["onset"]])
            if findings.failed:
                return None
            samples = SampleRows(
                ids, facts, numbers["onset"], (x_px, y_px), lines, blink, rows.recording, onset
            )
            return log_of_samples(samples, self.logs.samples, self._dispersion_px(), note, findings)
        duration_ms = check_times(numbers, cells, lines, columns, note.shown, findings)
        note.counts["fixations"] = len(lines)
        if "x" in numbers:
            note.counts["fixations without a position"] = int(
                (np.isnan(x_px) | (np.isnan(y_px) if "y" in numbers else False)).sum()
            )
        label = Coded.of(cells[columns["label"]], missing) if "label" in columns else None
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
            blink,
            np.full(len(lines), -1, dtype=np.int32) if rows.recording is None else rows.recording,
        )

    def _blinks(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        shown: str,
        findings: Findings,
        part: Part | None,
    ) -> NDArray[np.bool_]:
        """Whether a blink touches each fixation: a number that is not 0, or a word for yes."""
        if "blink" not in columns:
            return np.zeros(len(lines), dtype=bool)
        coded = Coded.of(cells[columns["blink"]], self.missing())
        known = [touches(text) for text in coded.values]
        for code, said in enumerate(known):
            if said is None:
                line = int(lines[np.flatnonzero(coded.codes == code)[0]])
                if part is not None:
                    part.blink_words[coded.values[code]] = line
                else:
                    tell_blink(coded.values[code], line, columns["blink"], shown, findings)
        return np.array([*(bool(said) for said in known), False])[coded.codes]

    def _hidden(self, header: str, column: Coded) -> Coded:
        """A column of the log; pseudonyms where it is that of the readers."""
        if self.pseudonyms is None or header != self.headers().get("participant"):
            return column
        return self.pseudonyms.readers_of(column)

    def _dispersion_px(self) -> float:
        """The limit of dispersion in pixels; one in degrees is converted at the screen's middle."""
        samples, screen = self.logs.samples, self.screen
        if samples is None or samples.dispersion_px is not None:
            return 0.0 if samples is None else float(samples.dispersion_px or 0.0)
        if samples.dispersion_deg is None or screen is None:
            return 0.0
        pixels = degrees_to_px(
            np.array([samples.dispersion_deg]),
            size_px=screen.width_px,
            size_cm=screen.width_cm or 0.0,
            distance_cm=screen.distance_cm or 0.0,
        )
        return float(pixels[0])

    def _unit(self, name: str) -> str:
        """The unit of a position column."""
        column = self.columns().get(name)
        return "px" if column is None else str(column.unit)

    def _numbers(
        self,
        cells: dict[str, pa.Array],
        lines: NDArray[np.int32],
        columns: dict[str, str],
        note: LogNote,
        findings: Findings,
        part: Part | None = None,
    ) -> dict[str, NDArray[np.float64]] | None:
        """The columns of numbers, times in ms."""
        present = {name: columns[name] for name in _NUMBERS if name in columns}
        decimal: str | None = self.logs.decimal
        texts = {header: cells[header] for header in present.values()}
        if decimal is None and part is None:
            decimal = find_decimal(texts, note.shown, lambda row: int(lines[row]), findings)
        elif decimal is None and part is not None:
            part.signs = decimal_signs(texts, lambda row: int(lines[row]), points=True)
            decimal = part.decimal or part.signs.decide(note.shown, Findings()) or "."
        if decimal is None:
            return None
        note.decimal = decimal
        reading = NumberReading(note.shown, lines, self.missing(), decimal)
        numbers: dict[str, NDArray[np.float64]] = {}
        sound = True
        for name, header in present.items():
            unit = getattr(self.columns()[name], "unit", None)
            expected = "a whole number" if name == "fixation" else f"a number in {unit}"
            values = numbers_in(cells[header], header, reading, findings, expected=expected)
            if values is None:
                sound = False
            elif name in ("onset", "end", "duration"):
                numbers[name] = in_ms(values, str(unit))
            else:
                numbers[name] = values
        if sound and "onset" not in numbers and {"end", "duration"} <= numbers.keys():
            onset = numbers["end"] - numbers["duration"]
            numbers["onset"] = np.round(onset, DIFFERENCE_DIGITS)
        return numbers if sound else None


def _without(rows: LogRows, mask: NDArray[np.bool_], fate: str, note: LogNote) -> LogRows:
    """The rows but for some, which are counted under a fate of their own."""
    out = np.flatnonzero(mask)
    note.counts[fate] = len(out)
    if not out.size:
        return rows
    note.account.move("fixations", fate, len(out), int(rows.lines[out[0]]))
    left = np.flatnonzero(~mask)
    if left.size and "fixations" in note.account.lines:
        note.account.lines["fixations"].first_line = int(rows.lines[left[0]])
    return rows.take(left)
