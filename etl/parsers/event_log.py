"""Logs of events: lines that say that a trial starts or ends, a fixation is over, a blink was.

What each line says is described in the study file by patterns with named groups; the groups are the
columns of the fixations. Every line is given to one pattern, or is counted as set aside, or stops
the build.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from etl.errors import FaultError, Findings
from etl.files import read_text
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.event_lines import LogLines, PatternError, SortedLines, lines_of, sort_lines
from etl.parsers.event_rows import EventRows
from etl.parsers.event_unfit import tell_unfit
from etl.parsers.line_order import in_line_order
from etl.parsers.log_rows import RowReading

if TYPE_CHECKING:
    from etl.study.models import LinePatterns

#: What the lines of each kind are called in the account of a log.
_FATES = {
    "fixation": "fixations",
    "blink": "blinks",
    "trial_start": "starts of trials",
    "trial_end": "ends of trials",
    "facts": "facts",
    "lasting": "lasting facts",
}


@dataclass(frozen=True, slots=True)
class EventReader:
    """Reads one log of events after another by the study's description.

    Attributes
    ----------
    reading : RowReading
        How rows become fixations.
    """

    reading: RowReading

    #: Nothing but the log itself says what is in it.
    reads_one_file = True

    def header(self, path: Path) -> tuple[str, ...]:  # noqa: ARG002 - it is the same for all logs
        """What the lines of a log can say, by the names of groups."""
        every = self._patterns().every()
        named = [pattern.groups for kind in _FATES if kind != "blink" for pattern in every[kind]]
        return tuple(dict.fromkeys(name for groups in named for name in groups))

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
        return in_line_order(lambda own: self._read(path, shown, own), findings)

    def _patterns(self) -> LinePatterns:
        """The patterns of the study, which a study of such logs must have."""
        patterns = self.reading.logs.patterns
        if patterns is None:
            raise FaultError("a log of events has no patterns")
        return patterns

    def _read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log; what is wrong is recorded as it is found."""
        logs, patterns = self.reading.logs, self._patterns()
        named = self.reading.named(path, shown, findings)
        text = read_text(path, shown, findings, encoding=logs.encoding, tell_guess=False)
        if text is None or findings.failed:
            return None
        lines, every = lines_of(text.data), patterns.every()
        try:
            found = sort_lines(lines, every, logs.comment, leave_others=patterns.other == "ignore")
        except PatternError as error:
            findings.error(
                f"a pattern cannot be matched: {error.why}",
                where="logs.patterns",
                found=error.written,
                expected="a regular expression that RE2 knows too",
                fix="write the pattern in another way",
            )
            return None
        tell_unfit(lines, found, every, shown, findings)
        # A line that is not understood may be the start of a trial: nothing else is certain then.
        if findings.failed or not _has_lines(found, shown, findings):
            return None
        note = LogNote(shown, text.sha256, text.encoding, columns=self.header(path))
        note.ends_open = not text.data.endswith(b"\n")
        _account(lines, found, note)
        if len(found.like_lines):
            first = int(found.like_lines[0])
            # Where readers have pseudonyms no line is repeated: it may name one.
            told = lines.text(first) if self.reading.pseudonyms is None else None
            _warn_of_remarks(len(found.like_lines), (shown, first + 1, told), findings)
        log = EventRows(self.reading, found, patterns, note, findings).canonical(named)
        return None if log is None else (log, note)


def _has_lines(found: SortedLines, shown: str, findings: Findings) -> bool:
    """Whether there are trials and fixations at all; says so if not."""
    for kind, what in (
        ("trial_start", "says that a trial starts"),
        ("fixation", "tells of a fixation"),
    ):
        if not len(found.of(kind)):
            findings.error(
                f"no line of the log {what}",
                path=shown,
                where="logs.patterns",
                expected=f"lines as {kind} describes them",
                fix="correct the pattern, or remove the file from the folder",
            )
    return not findings.failed


def _account(lines: LogLines, found: SortedLines, note: LogNote) -> None:
    """Count every line of a log under what became of it."""
    note.account.total = len(lines)
    told = {_FATES[kind]: own.lines for kind, own in found.told.items()}
    for fate, places in {**told, **found.aside}.items():
        note.account.line(fate, len(places), int(places[0]) + 1 if len(places) else None)
    if not note.account.balances():
        raise FaultError(f"lines of {note.shown} are lost: {note.account}")


def _warn_of_remarks(count: int, first: tuple[str, int, str | None], findings: Findings) -> None:
    """Warn of remarks that look like lines; ``first``: the log, the first line and its text."""
    findings.warning(
        f"{count:,} remarks would be lines of the log without the mark of a remark"
        if count > 1
        else "a remark would be a line of the log without the mark of a remark",
        path=first[0],
        line=first[1],
        found=first[2],
        expected="remarks, which are not read",
        fix="if it is to be read, take the mark away, or out of [logs] comment",
    )
