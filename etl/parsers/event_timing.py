"""What the times of a log of events say beyond its lines: blinks, and fixations out of place."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, NumberReading, numbers_in
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.event_blinks import Moments, touched_by_blinks
from etl.parsers.event_lines import Told
from etl.parsers.event_trials import TrialSpans
from etl.parsers.log_rows import RowReading
from etl.parsers.time_checks import in_ms


@dataclass(frozen=True, slots=True)
class EventTiming:
    """The fixations of a log whose other lines have times too.

    Attributes
    ----------
    reading : RowReading
        How rows became fixations.
    log : CanonicalLog
        The fixations; their recordings are the trials of the log.
    eye : Coded
        The eye of each fixation; -1 where nothing says it.
    note : LogNote
        The log.
    findings : Findings
        Where problems are recorded.
    """

    reading: RowReading
    log: CanonicalLog
    eye: Coded
    note: LogNote
    findings: Findings

    def touched(self, blinks: Told, spans: TrialSpans) -> NDArray[np.bool_]:
        """Which fixations a blink touches.

        Parameters
        ----------
        blinks : Told
            The lines of blinks within trials.
        spans : TrialSpans
            The trials.

        Returns
        -------
        (n,) bool array
        """
        if not len(blinks):
            return np.zeros(len(self.log), dtype=bool)
        theirs = Coded.absent(len(blinks))
        if "eye" in blinks.groups:
            theirs = Coded.of(blinks.groups["eye"], self.reading.missing())
        eyes = Coded.joined([self.eye, theirs]).codes
        log = self.log
        fixations = Moments(
            log.source_line.astype(np.int64) - 1,
            log.recording.astype(np.int64),
            eyes[: len(log)],
            log.onset_ms,
            log.onset_ms + log.duration_ms,
        )
        times = self._times_of_blinks(blinks)
        own = Moments(blinks.lines, spans.trial_of(blinks.lines), eyes[len(log) :], *times)
        return touched_by_blinks(fixations, own)

    def _times_of_blinks(self, blinks: Told) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Onset and end of each blink, NaN where they are not said."""
        onset_ms = self._times(blinks, "onset", self.findings)
        end_ms = self._times(blinks, "end", self.findings)
        if "duration" in blinks.groups:
            end_ms = onset_ms + self._times(blinks, "duration", self.findings)
        for row in np.flatnonzero(end_ms < onset_ms).tolist():
            self.findings.error(
                "the blink ends before it begins",
                path=self.note.shown,
                line=int(blinks.lines[row]) + 1,
                found=f"from {_ms(onset_ms[row])} to {_ms(end_ms[row])}",
                expected="an end after its onset",
                fix="correct the line, or leave such lines out by a pattern of ignore",
            )
        return onset_ms, end_ms

    def _times(self, told: Told, name: str, findings: Findings) -> NDArray[np.float64]:
        """Times that lines tell under a canonical name, in the unit of the fixations' own."""
        columns = self.reading.logs.columns
        unsaid = np.full(len(told), np.nan)
        if name not in told.groups:
            return unsaid
        column = getattr(columns, name) or columns.onset
        lines = (told.lines + 1).astype(np.int32)
        reading = NumberReading(self.note.shown, lines, self.reading.missing(), self.note.decimal)
        unit = "ms" if column is None else str(column.unit)
        cells = told.groups[name]
        values = numbers_in(cells, name, reading, findings, expected=f"a number in {unit}")
        return unsaid if values is None else in_ms(values, unit)

    def tell_misplaced(self, outside: Told, spans: TrialSpans) -> None:
        """Record the fixations below a trial that lie in time before its last one.

        Lines that are out of order would otherwise be taken for looks after the trial.

        Parameters
        ----------
        outside : Told
            The lines of fixations outside every trial.
        spans : TrialSpans
            The trials.
        """
        header, eye = self.reading.headers().get("onset"), self.reading.logs.eye
        both = eye is not None and bool(eye.columns)  # with the times of each eye
        if not len(outside) or header is None or header not in outside.groups or both:
            return
        own_eye = self.reading.headers().get("eye", "")
        named = Coded.absent(len(outside))
        if own_eye in outside.groups:
            named = Coded.of(outside.groups[own_eye], self.reading.missing())
        # No time that cannot be read matters here: the line is not used.
        told = Told(outside.lines, {"onset": outside.groups[header]})
        onset_ms = self._times(told, "onset", Findings())
        eyes = Coded.joined([self.eye, named])
        width = len(eyes.values) + 1
        last_ms = np.full(len(spans) * width, -np.inf)
        inside = self.log.recording * width + eyes.codes[: len(self.log)] + 1
        np.maximum.at(last_ms, inside, self.log.onset_ms)
        trial = spans.trial_of(outside.lines)
        latest_ms = last_ms[np.maximum(trial, 0) * width + eyes.codes[len(self.log) :] + 1]
        for row in np.flatnonzero((trial >= 0) & (onset_ms < latest_ms)).tolist():
            self.findings.error(
                "the fixation stands below the end of the trial during which it began",
                path=self.note.shown,
                line=int(outside.lines[row]) + 1,
                found=f"onset {_ms(onset_ms[row])}",
                expected=f"an onset after {_ms(latest_ms[row])}, when the last fixation of the "
                f"trial began that starts in line {spans.starts[trial[row]] + 1}",
                fix="bring the lines into the order of time",
            )


def _ms(time_ms: np.float64) -> str:
    """A time with all its digits: seven are usual where a recorder counts from its start."""
    return f"{np.format_float_positional(time_ms, precision=3, trim='-')} ms"
