"""What the lines of a log of events say about its trials."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.event_lines import Places, SortedLines
from etl.parsers.event_trials import TrialSpans

#: The kinds of line that tell of the trial in which they stand, or of the one above them.
_OF_TRIALS = ("trial_start", "trial_end", "facts")


@dataclass(frozen=True, slots=True)
class TrialFact:
    """What is said of each trial under one name.

    Attributes
    ----------
    said : Coded
        A text for each trial; -1 where nothing is said.
    lines : (n,) int64 array
        The place of the line that says it; -1 where none does.
    """

    said: Coded
    lines: Places


@dataclass(frozen=True, slots=True)
class _Sayings:
    """What lines say under one name: where, below the start of which trial, what, and for how long.

    Of a line above all trials the trial is -1.
    """

    lines: Places
    trial: Places
    codes: NDArray[np.int32]
    lasts: NDArray[np.bool_]

    def take(self, rows: NDArray[np.integer] | NDArray[np.bool_]) -> _Sayings:
        """Some of them."""
        return _Sayings(self.lines[rows], self.trial[rows], self.codes[rows], self.lasts[rows])


def trial_facts(
    lines: SortedLines, spans: TrialSpans, shown: str, findings: Findings
) -> dict[str, TrialFact]:
    """Gather what is said of trials, each fact once.

    Parameters
    ----------
    lines : SortedLines
        The lines of a log.
    spans : TrialSpans
        Its trials.
    shown : str
        The log's name for messages.
    findings : Findings
        Where it is recorded that something is said twice and differently.

    Returns
    -------
    dict of str to TrialFact
        By the names of groups.

    Notes
    -----
    A line of ``trial_start``, ``trial_end`` or ``facts`` tells of the trial that started last. A
    line of ``facts`` before the first trial tells of all trials, and so does one of ``lasting``,
    but only of those that start below it and until another one says it anew.
    """
    told = {kind: lines.of(kind) for kind in (*_OF_TRIALS, "lasting")}
    gathering = _Gathering(spans, shown, findings)
    facts = {}
    for name in dict.fromkeys(name for lines_told in told.values() for name in lines_told.groups):
        own = {kind: lines_told for kind, lines_told in told.items() if name in lines_told.groups}
        text = Coded.of(pa.concat_arrays([part.groups[name] for part in own.values()]), {""})
        place = np.concatenate([part.lines for part in own.values()])
        order = np.argsort(place, kind="stable")
        lasts = np.concatenate([np.full(len(t), kind == "lasting") for kind, t in own.items()])
        said = _Sayings(place, spans.trial_of(place), text.codes, lasts).take(order)
        facts[name] = gathering.fact(name, said.take(said.codes >= 0), text.values)
    return facts


@dataclass(frozen=True, slots=True)
class _Gathering:
    """Finds out what is said of each trial."""

    spans: TrialSpans
    shown: str
    findings: Findings

    def fact(self, name: str, said: _Sayings, values: tuple[str, ...]) -> TrialFact:
        """One fact of every trial."""
        of_all = said.take(~said.lasts & (said.trial < 0))
        of_one = said.take(~said.lasts & (said.trial >= 0))
        self._agree(of_all, f"the {name} of the log is said twice and differently", values)
        self._agree(of_one, f"the {name} of a trial is said twice and differently", values)
        codes = np.full(len(self.spans), -1, dtype=np.int32)
        lines = np.full(len(self.spans), -1, dtype=np.int64)
        lasting = said.take(said.lasts | (said.trial < 0))
        at = np.searchsorted(lasting.lines, self.spans.starts) - 1
        held = at >= 0
        codes[held], lines[held] = lasting.codes[at[held]], lasting.lines[at[held]]
        first = of_one.take(np.unique(of_one.trial, return_index=True)[1])
        before = codes[first.trial]
        for row in np.flatnonzero((before >= 0) & (before != first.codes)).tolist():
            self._tell(
                f"the {name} of a trial is not the one that was said of all",
                int(first.lines[row]),
                values[int(first.codes[row])],
                (values[int(before[row])], int(lines[first.trial[row]])),
            )
        codes[first.trial], lines[first.trial] = first.codes, first.lines
        return TrialFact(Coded(codes, values), lines)

    def _agree(self, said: _Sayings, problem: str, values: tuple[str, ...]) -> None:
        """Record what is said a second time of one trial, and is not the same."""
        _, first, own = np.unique(said.trial, return_index=True, return_inverse=True)
        for row in np.flatnonzero(said.codes != said.codes[first[own]]).tolist():
            other = int(first[own[row]])
            self._tell(
                problem,
                int(said.lines[row]),
                values[int(said.codes[row])],
                (values[int(said.codes[other])], int(said.lines[other])),
            )

    def _tell(self, problem: str, place: int, found: str, other: tuple[str, int]) -> None:
        """Record a contradiction with what another line says."""
        self.findings.error(
            problem,
            path=self.shown,
            line=place + 1,
            found=found,
            expected=f'"{other[0]}" as in line {other[1] + 1}',
            fix="correct one of the two lines; if it holds from there on until it is said anew, "
            "move its pattern to lasting in [logs.patterns]",
        )
