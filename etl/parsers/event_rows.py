"""From the lines of a log of events to rows of fixations, each with the facts of its trial."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.event_facts import TrialFact, trial_facts
from etl.parsers.event_lines import SortedLines, Told
from etl.parsers.event_timing import EventTiming
from etl.parsers.event_trials import TrialSpans, tell_unfinished, trial_spans
from etl.parsers.identifiers import IDS
from etl.parsers.log_rows import LogRows, RowReading

if TYPE_CHECKING:
    from etl.study.models import LinePatterns


@dataclass(frozen=True, slots=True)
class EventRows:
    """The lines of one log, on their way to fixations.

    Attributes
    ----------
    reading : RowReading
        How rows become fixations.
    lines : SortedLines
        The lines of the log by what they are.
    patterns : LinePatterns
        The study's ``[logs.patterns]``.
    note : LogNote
        Where it is told how the log was understood; its lines are counted there.
    findings : Findings
        Where problems are recorded.
    """

    reading: RowReading
    lines: SortedLines
    patterns: LinePatterns
    note: LogNote
    findings: Findings

    def canonical(self, named: dict[str, str]) -> CanonicalLog | None:
        """The fixations of the log.

        Parameters
        ----------
        named : dict of str to str
            What the file's name says.

        Returns
        -------
        CanonicalLog or None
            None where a problem was recorded that hides others.
        """
        starts, ends = self.lines.of("trial_start").lines, self.lines.of("trial_end").lines
        spans = trial_spans(starts, ends, self.note.shown, self.findings)
        if not self.patterns.trial_end:
            # Without lines that say so, a trial lasts until the next one starts.
            spans = TrialSpans(starts, np.append(starts[1:], np.iinfo(np.int64).max))
        facts = trial_facts(self.lines, spans, self.note.shown, self.findings)
        if self.patterns.trial_end:
            names, spelled = self._trials(facts, len(spans)), partial(self._spelled, facts)
            keep = self.patterns.unfinished == "keep"
            self.note.counts["trials that do not end"] = len(spans.unfinished())
            tell_unfinished(spans, (names, spelled), self.note.shown, self.findings, keep=keep)
        every = self.lines.of("fixation")
        inside = spans.within(every.lines)
        fixations, outside = every.take(inside), every.take(~inside)
        self._set_aside("fixations", outside)
        trial = spans.trial_of(fixations.lines)
        self._tell_empty(spans, facts, trial)
        if not len(fixations):
            self.findings.error(
                "no fixation lies within a trial",
                path=self.note.shown,
                line=int(every.lines[0]) + 1,
                expected="lines as trial_start describes them above those of fixations",
                fix="correct trial_start or trial_end in [logs.patterns], or remove the log",
            )
            return None
        columns = self._columns(fixations, trial, facts)
        if not self._ids_are_said(fixations, facts, spans.starts, np.unique(trial)):
            return None
        lines = (fixations.lines + 1).astype(np.int32)
        rows = LogRows(columns, lines, recording=trial.astype(np.int32))
        log = self.reading.canonical(rows, named, self.note, self.findings)
        if log is None:
            return None
        timing = EventTiming(
            self.reading, log, self._eyes(log, columns, lines), self.note, self.findings
        )
        timing.tell_misplaced(outside, spans)
        blinks = self.lines.of("blink")
        inside = spans.within(blinks.lines)
        self._set_aside("blinks", blinks.take(~inside))
        self.note.counts["blinks"] = int(inside.sum())
        return replace(log, blink=log.blink | timing.touched(blinks.take(inside), spans))

    def _trials(self, facts: Mapping[str, TrialFact], count: int) -> NDArray[np.int64]:
        """A number for each trial that is the same where the trial is; -1 where it is not known."""
        headers = self.reading.headers()
        names = [headers[name] for name in ("participant", "session", "trial") if name in headers]
        known = [facts[name].said for name in names if name in facts]
        if headers.get("trial") not in facts:
            return np.full(count, -1, dtype=np.int64)
        _, groups = group_rows(known)
        return np.where(facts[headers["trial"]].said.codes >= 0, groups, -1)

    def _spelled(self, facts: Mapping[str, TrialFact], trial: int) -> str | None:
        """The name of a trial, as far as its lines say it."""
        fact = facts.get(self.reading.headers().get("trial", ""))
        text = "" if fact is None else fact.said.text(trial)
        return f"trial {text}" if text else None

    def _set_aside(self, fate: str, outside: Told) -> None:
        """Count the lines of a kind that belong to no trial."""
        if len(outside):
            first = int(outside.lines[0]) + 1
            self.note.account.move(fate, f"{fate} outside every trial", len(outside), first)

    def _tell_empty(
        self, spans: TrialSpans, facts: Mapping[str, TrialFact], trial: NDArray[np.int64]
    ) -> None:
        """Warn of the trials that have no fixation."""
        empty = np.setdiff1d(np.arange(len(spans)), trial)
        self.note.counts["trials"] = len(spans)
        self.note.counts["trials without a fixation"] = len(empty)
        for one in empty.tolist():
            self.findings.warning(
                "a trial has no fixation",
                path=self.note.shown,
                line=int(spans.starts[one]) + 1,
                found=self._spelled(facts, one),
                fix="if there should be some, look at the lines below this one",
            )

    def _columns(
        self, fixations: Told, trial: NDArray[np.int64], facts: Mapping[str, TrialFact]
    ) -> dict[str, pa.Array]:
        """The cells of fixations: what their own lines say, and what is said of their trials."""
        columns = {}
        for name in dict.fromkeys(self.reading.needed()):
            own, fact = fixations.groups.get(name), facts.get(name)
            if fact is None:
                columns[name] = pa.repeat("", len(fixations)) if own is None else own
                continue
            said = fact.said.take(trial)
            if own is not None:
                mine, said = _under_one_list(Coded.of(own, {""}), said)
                clash = (mine.codes >= 0) & (said.codes >= 0) & (mine.codes != said.codes)
                for row in np.flatnonzero(clash).tolist():
                    self.findings.error(
                        f"the line of a fixation says another {name} than its trial",
                        path=self.note.shown,
                        line=int(fixations.lines[row]) + 1,
                        found=mine.text(row),
                        expected=f'"{said.text(row)}" as in line {fact.lines[trial[row]] + 1}',
                        fix="correct one of the two lines, or look for the start of a trial that "
                        "is lost between them",
                    )
                said = Coded(np.where(mine.codes >= 0, mine.codes, said.codes), said.values)
            texts = pa.array([*said.values, ""], pa.string())
            codes = np.where(said.codes < 0, len(said.values), said.codes)
            columns[name] = texts.take(pa.array(codes))
        return columns

    def _ids_are_said(
        self,
        fixations: Told,
        facts: Mapping[str, TrialFact],
        starts: NDArray[np.int64],
        trials: NDArray[np.int64],
    ) -> bool:
        """Whether the lines say who read what in each trial with fixations; tells where not."""
        before = self.findings.count("error")
        for name, header in self.reading.headers().items():
            # What a fixation's own line says is looked at row by row.
            if name not in IDS or header in fixations.groups:
                continue
            fact = facts.get(header)
            said = np.zeros(len(starts), dtype=bool)
            if fact is not None:
                said = (fact.said.codes >= 0) & ~fact.said.among(self.reading.missing())
            lacking = trials[~said[trials]]
            if len(lacking) == len(trials):
                self.findings.error(
                    f"no line of the log says the {name}",
                    path=self.note.shown,
                    where="logs.patterns",
                    expected=f"a line that a pattern with the group {header} describes",
                    fix="correct the pattern, or add the line to the log",
                )
                continue
            for trial in lacking.tolist():
                self.findings.error(
                    f"no line says the {name} of this trial",
                    path=self.note.shown,
                    line=int(starts[trial]) + 1,
                    found=None if name == "trial" else self._spelled(facts, trial),
                    expected=f"a line that a pattern with the group {header} describes",
                    fix="correct the pattern, or add the line to the log",
                )
        return self.findings.count("error") == before

    def _eyes(
        self, log: CanonicalLog, columns: Mapping[str, pa.Array], lines: NDArray[np.int32]
    ) -> Coded:
        """The eye of each fixation; -1 where nothing says it."""
        eye = self.reading.logs.eye
        if eye is not None and eye.columns:
            reader = log.ids["participant"]
            chosen = [self.reading.eyes.of_reader(name) for name in reader.values]
            return Coded.of(pa.array(chosen, pa.string()), {""}).take(reader.codes)
        header = self.reading.headers().get("eye")
        if header is None:
            return Coded.absent(len(log))
        rows = np.searchsorted(lines, log.source_line)
        return Coded.of(columns[header], self.reading.missing()).take(rows)


def _under_one_list(one: Coded, other: Coded) -> tuple[Coded, Coded]:
    """Two columns under one list of texts."""
    both = Coded.joined([one, other])
    return Coded(both.codes[: len(one)], both.values), Coded(both.codes[len(one) :], both.values)
