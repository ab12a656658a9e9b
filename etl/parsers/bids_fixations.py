"""Fixations among the events that the open standard (BIDS) keeps beside a recording."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, NumberReading, number_of, numbers_in, truth_of
from etl.parsers.bids_samples import DIGITS, SampleClock
from etl.parsers.bids_sidecars import TIME_UNITS, Sidecar
from etl.parsers.bids_tables import Headerless
from etl.parsers.time_checks import in_ms

if TYPE_CHECKING:
    from etl.study.models import Bids

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

#: Columns that the events of a recording must have (BIDS 1.11 schema,
#: ``rules.tabular_data.physio.PhysioEventsColumns``), and those without which they hold no
#: fixation.
EVENT_COLUMNS = ("onset",)
FIXATION_COLUMNS = ("onset", "duration", "trial_type")
#: What a sidecar says where onsets count rows of the recording.
ROWS = "n/a"
#: The longest middle (median) fixation in seconds that is believed where nothing says the unit.
#: Fixations last some 0.1 to 0.5 s (Rayner 1998, doi:10.1037/0033-2909.124.3.372), in
#: milliseconds some 100 to 500.
_LONGEST_MEDIAN_S = 10.0
_SACCADE = "saccade"


@dataclass(frozen=True, slots=True)
class EventFixations:
    """The fixations among the events of a recording, in the order of the file.

    Attributes
    ----------
    row : (n,) int64 array
        Row of each in the file, from 0.
    onset_ms, duration_ms : (n,) float64 array, milliseconds
        In the recording's clock.
    blinks_ms : tuple of two (blinks,) float64 arrays, milliseconds
        When each blink began and ended.
    last_ms : float, milliseconds
        When the last fixation or blink was over.
    cells : dict of str to (n,) pa.Array of text
        All columns of the file.
    fates : dict of str to (k,) int64 array
        The other rows, by what they are.
    """

    row: NDArray[np.int64]
    onset_ms: Floats
    duration_ms: Floats
    blinks_ms: tuple[Floats, Floats]
    last_ms: float
    cells: dict[str, pa.Array]
    fates: dict[str, NDArray[np.int64]]


@dataclass(frozen=True, slots=True)
class EventReading:
    """How the events of a recording are read.

    Attributes
    ----------
    table : Headerless
        The events.
    sidecar : Sidecar
        What is said of them.
    clock : SampleClock
        The recording's clock.
    source : (samples,) float64 array or None
        The column of the recording that onsets refer to, where it is none of times.
    bids : Bids
        The study's ``[logs.bids]``.
    missing : frozenset of str
        What stands for no value.
    blink : str
        The column that says whether there was a blink, where there is one.
    """

    table: Headerless
    sidecar: Sidecar
    clock: SampleClock
    source: Floats | None
    bids: Bids
    missing: frozenset[str]
    blink: str

    def fixations(self, findings: Findings) -> EventFixations | None:
        """The fixations; None where a problem was recorded."""
        cells = self.table.cells(self.table.columns, findings)
        if cells is None:
            return None
        kinds = Coded.of(cells["trial_type"], self.missing)
        fixation, named_blink = kinds.among(self.bids.fixation), kinds.among(self.bids.blink)
        blinks = self._blink_cells(cells, findings)
        onset = self._numbers(cells["onset"], "onset", findings)
        lasts = self._numbers(cells["duration"], "duration", findings)
        if onset is None or lasts is None or blinks is None:
            return None
        lost = (kinds.codes < 0) & ~blinks & (lasts > 0)
        if not self._types_are_known(kinds, lost, cells["trial_type"], findings):
            return None
        blinks |= named_blink
        # Where it is not known when a blink was, it touches nothing.
        timeless = blinks & ~fixation & np.isnan(onset)
        wanted = np.flatnonzero(fixation | (blinks & ~timeless))
        onset_ms = self._onsets(onset[wanted], cells["onset"], wanted, findings)
        duration_ms = self._durations(
            lasts[wanted], cells["duration"], wanted, fixation[wanted], findings
        )
        if onset_ms is None or duration_ms is None:
            return None
        ends_ms = np.round(onset_ms + np.nan_to_num(duration_ms), DIGITS)
        own, blink = fixation[wanted], blinks[wanted]
        beyond = own & (ends_ms > self.clock.time_ms[-1] + 2 * self.clock.step_ms)
        for row in wanted[beyond].tolist():
            self._tell(
                row,
                "duration",
                cells["duration"],
                "the fixation lasts beyond the end of the recording",
                f"an end by {self.clock.time_ms[-1]:.10g} ms, when the last sample was taken",
                findings,
            )
        if beyond.any():
            return None
        row = wanted[own]
        named_blink &= ~fixation
        saccade = kinds.among((_SACCADE,)) & ~fixation & ~named_blink
        others = {
            "blinks": named_blink & ~timeless,
            "blinks without an onset": named_blink & timeless,
            "saccades": saccade,
            "other events": ~fixation & ~saccade & ~named_blink,
        }
        return EventFixations(
            row,
            onset_ms[own],
            duration_ms[own],
            (onset_ms[blink], ends_ms[blink]),
            float(ends_ms.max()),
            {name: cell.take(pa.array(row)) for name, cell in cells.items()},
            {fate: np.flatnonzero(rows) for fate, rows in others.items()},
        )

    def _types_are_known(
        self, kinds: Coded, lost: Flags, cells: pa.Array, findings: Findings
    ) -> bool:
        """Whether it is known of every event what it means; says of which it is not.

        A message takes no time: what does, and has no type, has lost it.
        """
        bids, shown = self.bids, self.table.text.shown
        if not kinds.among(bids.fixation).any():
            findings.error(
                "no event is a fixation",
                path=shown,
                where='column "trial_type"',
                found=", ".join(kinds.values[:5]),
                expected=" or ".join(bids.fixation),
                fix='name it in the study file, [logs.bids] fixation = ["…"]; or describe by '
                "[logs.samples] how fixations are found",
            )
            return False
        before = findings.count("error")
        known = {*bids.fixation, *bids.blink, *bids.ignore}
        unknown = (kinds.codes >= 0) & ~kinds.among(known)
        for row in np.flatnonzero(unknown).tolist():
            findings.error(
                "nothing says what this type of event is",
                path=shown,
                line=row + 1,
                where='column "trial_type"',
                found=kinds.text(row),
                expected=", ".join(sorted(known)) + ", or n/a for a message",
                fix="correct the event, or name its type in [logs.bids] fixation, blink or ignore",
            )
        problem, expected = "the event lasts for some time, and has no type", sorted(known)
        for row in np.flatnonzero(lost).tolist():
            self._tell(row, "trial_type", cells, problem, ", ".join(expected), findings)
        return findings.count("error") == before

    def _tell(
        self,
        row: int,
        column: str,
        cells: pa.Array,
        problem: str,
        expected: str,
        findings: Findings,
    ) -> None:
        """Record that an event cannot be used."""
        findings.error(
            problem,
            path=self.table.text.shown,
            line=row + 1,
            where=f'column "{column}"',
            found=cells[row].as_py(),
            expected=expected,
            fix="correct the events, or their sidecar",
        )

    def _numbers(self, cells: pa.Array, name: str, findings: Findings) -> Floats | None:
        """A column as numbers."""
        reading = NumberReading(self.table.text.shown, self.table.lines, self.missing, ".")
        return numbers_in(cells, name, reading, findings, expected="a number or n/a")

    def _onsets(
        self, values: Floats, cells: pa.Array, rows: NDArray[np.int64], findings: Findings
    ) -> Floats | None:
        """When events began, in ms of the recording's clock."""
        before = findings.count("error")
        for at in np.flatnonzero(np.isnan(values)).tolist():
            self._tell(
                int(rows[at]), "onset", cells, "the event has no onset", "a number", findings
            )
        unit = self.sidecar.unit("onset", TIME_UNITS, findings)
        if findings.count("error") > before:
            return None
        source, time_ms = self.sidecar.values["OnsetSource"], self.clock.time_ms
        if source == "timestamp":
            onset_ms = in_ms(values, unit or self.clock.unit)
            inside = self.clock.holds(onset_ms)
            problem, expected = (
                "the event lies outside the recording",
                f"a time from {time_ms[0]:.10g} to {time_ms[-1]:.10g} ms, in the recording's clock",
            )
        elif source == ROWS:
            first = self.bids.first_row
            index = values - first
            inside = (index >= 0) & (index < len(time_ms)) & (index == np.floor(index))
            onset_ms = time_ms[np.where(inside, index, 0).astype(np.int64)]
            problem, expected = (
                "the recording has no such row",
                f"a whole number from {first} to {len(time_ms) - 1 + first}",
            )
        else:
            assert self.source is not None  # noqa: S101
            near = np.searchsorted(self.source, values, "left")
            near = np.minimum(near, len(time_ms) - 1)
            inside, onset_ms = self.source[near] == values, time_ms[near]
            problem, expected = "no sample has this onset", f'a value of the column "{source}"'
        for at in np.flatnonzero(~inside).tolist():
            self._tell(int(rows[at]), "onset", cells, problem, expected, findings)
        return onset_ms if inside.all() else None

    def _durations(
        self,
        values: Floats,
        cells: pa.Array,
        rows: NDArray[np.int64],
        fixation: Flags,
        findings: Findings,
    ) -> Floats | None:
        """How long events lasted, in ms; NaN where a blink's is not known."""
        before = findings.count("error")
        unit = self.sidecar.unit("duration", TIME_UNITS, findings)
        if findings.count("error") > before:
            return None
        wrong = np.where(fixation, ~(values > 0), values < 0)
        for at in np.flatnonzero(wrong).tolist():
            problem = "the fixation has no duration" if fixation[at] else "the blink has none"
            expected = "a duration above 0" if fixation[at] else "0 or more, or n/a"
            self._tell(int(rows[at]), "duration", cells, problem, expected, findings)
        if wrong.any():
            return None
        unit = unit or self.bids.duration_unit
        if unit is None and np.median(values[fixation]) > _LONGEST_MEDIAN_S:
            own = rows[fixation]
            findings.error(
                "nothing says the unit of the durations, and seconds, which the standard has, "
                "would be absurd",
                path=self.table.text.shown,
                line=int(own[0]) + 1,
                where='column "duration"',
                found=", ".join(cells[int(row)].as_py() for row in own[:5]),
                expected=f"fixations whose median is below {_LONGEST_MEDIAN_S:g} s",
                fix=f'say the unit in {self.sidecar.place("duration")[0]}, "duration": {{"Units": '
                '"ms"}, or in the study file by [logs.bids] duration_unit = "ms"',
            )
            return None
        return in_ms(values, unit or "s")

    def _blink_cells(self, cells: dict[str, pa.Array], findings: Findings) -> Flags | None:
        """Which events have a blink by their column ``blink``."""
        if self.blink not in cells:
            return np.zeros(self.table.rows, dtype=bool)
        coded = Coded.of(cells[self.blink], self.missing)
        known = [_says_blink(text) for text in coded.values]
        for code, says in enumerate(known):
            if says is None:
                row = int(np.flatnonzero(coded.codes == code)[0])
                self._tell(
                    row,
                    self.blink,
                    cells[self.blink],
                    "this does not say whether there was a blink",
                    "a number (0 for none), or n/a",
                    findings,
                )
        if None in known:
            return None
        return np.array([*(bool(says) for says in known), False])[coded.codes]


def _says_blink(text: str) -> bool | None:
    """Whether a cell says that there was a blink; None where it does not say."""
    truth, number = truth_of(text), number_of(text)
    return truth if truth is not None else None if number is None else number != 0


def touched_by_blinks(
    onset_ms: Floats, end_ms: Floats, trial: NDArray[np.int64], blinks_ms: tuple[Floats, Floats]
) -> Flags:
    """Which fixations a blink touches.

    Parameters
    ----------
    onset_ms, end_ms : (n,) float64 array, milliseconds
        When each fixation began and ended, in any order.
    trial : (n,) int64 array
        The trial that each belongs to.
    blinks_ms : tuple of two (blinks,) float64 arrays, milliseconds
        When each blink began and ended.

    Returns
    -------
    (n,) bool array
        A blink touches the fixations that it overlaps; where it overlaps none and lies between
        two fixations of a trial, it touches both.

    Examples
    --------
    >>> onset, end = np.array([0.0, 100.0, 300.0]), np.array([90.0, 200.0, 400.0])
    >>> touched_by_blinks(onset, end, np.zeros(3, int), (np.array([210.0]), np.array([290.0])))
    array([False,  True,  True])
    """
    touched = np.zeros(len(onset_ms), dtype=bool)
    began, ended = blinks_ms
    if not len(began) or not len(onset_ms):
        return touched
    order = np.argsort(onset_ms, kind="stable")
    starts, ends, own = onset_ms[order], np.maximum.accumulate(end_ms[order]), trial[order]
    first = np.searchsorted(ends, began, "right")
    beyond = np.searchsorted(starts, ended, "left")
    # A blink that takes no time at the very start of a fixation is in it.
    beyond = np.maximum(
        beyond, np.where(began == ended, np.searchsorted(starts, began, "right"), 0)
    )
    steps = np.zeros(len(starts) + 1, dtype=np.int64)
    over = first < beyond
    np.add.at(steps, first[over], 1)
    np.add.at(steps, beyond[over], -1)
    inside = np.cumsum(steps[:-1]) > 0
    between = first[~over & (first > 0) & (first < len(starts))]
    between = between[own[between - 1] == own[between]]
    inside[between] = True
    inside[between - 1] = True
    touched[order] = inside
    return touched
