"""Which trials a log shows, found from its runs of rows."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows
from etl.parsers import CanonicalLog
from etl.parsers.canonical import LogNote
from etl.trials import IDS, SeenTrials


def seen_trials(log: CanonicalLog, shown: str, findings: Findings) -> SeenTrials:
    """List the trials of a log, each with its item and the facts that stand in the log.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.
    shown : str
        Its name for messages.
    findings : Findings
        Where a fact that varies within a trial is recorded.

    Returns
    -------
    SeenTrials
        In order of first appearance, all of log 0.
    """
    return trial_runs(log).once((shown,), findings)


def trial_runs(log: CanonicalLog) -> SeenTrials:
    """The runs of rows of one trial, each with the facts that stand in its first row.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log, or of a part of it.

    Returns
    -------
    SeenTrials
        In the order of the log; a trial that comes again is there again.
    """
    changes = np.zeros(len(log), dtype=bool)
    changes[:1] = True
    for coded in (*log.ids.values(), *log.facts.values()):
        changes[1:] |= coded.codes[1:] != coded.codes[:-1]
    rows = np.flatnonzero(changes)
    return SeenTrials(
        {name: column.take(rows) for name, column in log.ids.items()},
        {name: column.take(rows) for name, column in log.facts.items()},
        np.zeros(len(rows), dtype=np.int32),
        log.source_line[rows],
    )


def distinct_runs(runs: SeenTrials) -> SeenTrials:
    """The first of all runs that are alike in everything.

    Parameters
    ----------
    runs : SeenTrials
        From :func:`trial_runs`.

    Returns
    -------
    SeenTrials
        Enough to tell what varies within a trial, and where first.
    """
    if not len(runs):
        return runs
    first, _ = group_rows([*runs.ids.values(), *runs.facts.values()])
    return runs.take(np.sort(first))


class Sharing:
    """Lets what is kept of very many logs share what they have in common.

    What comes from a worker is a copy in every part: the names of the same trials and columns over
    and over. Two texts that are equal become one; so do two arrays of codes in a row.
    """

    def __init__(self) -> None:
        self._texts: dict[str, str] = {}
        self._last: dict[str, Any] = {}

    def trials(self, seen: SeenTrials) -> SeenTrials:
        """The trials of one more log, in less memory.

        Parameters
        ----------
        seen : SeenTrials
            The trials that a log shows.

        Returns
        -------
        SeenTrials
            The same trials.
        """
        return SeenTrials(
            self._columns(seen.ids),
            self._columns(seen.facts),
            self._codes("file", seen.file),
            seen.line,
        )

    def note(self, note: LogNote) -> LogNote:
        """What is told of one more log, in less memory.

        Parameters
        ----------
        note : LogNote
            What is told of a log.

        Returns
        -------
        LogNote
            The same.
        """
        account = note.account
        return replace(
            note,
            encoding=self._text(note.encoding),
            delimiter=self._text(note.delimiter),
            decimal=self._text(note.decimal),
            columns=self._same("columns", tuple(map(self._text, note.columns))),
            counts={self._text(name): count for name, count in note.counts.items()},
            account=replace(
                account,
                lines={self._text(fate): tally for fate, tally in account.lines.items()},
                repairs={self._text(what): tally for what, tally in account.repairs.items()},
            ),
        )

    def _columns(self, columns: Mapping[str, Coded]) -> dict[str, Coded]:
        """Columns of trials, whose texts are often those of other logs."""
        return {
            self._text(name): Coded(self._codes(name, column.codes), self._values(name, column))
            for name, column in columns.items()
        }

    def _values(self, name: str, column: Coded) -> tuple[str, ...]:
        """The texts of a column; a fact that is another one in every trial is no use to others."""
        if column.values == self._last.get(f"texts of {name}"):
            shared: tuple[str, ...] = self._last[f"texts of {name}"]
            return shared
        if name not in IDS and 2 * len(column.values) > len(column):
            return column.values
        return self._same(f"texts of {name}", tuple(map(self._text, column.values)))

    def _text(self, text: str) -> str:
        """The first text that is equal to one."""
        return self._texts.setdefault(text, text)

    def _same(self, name: str, texts: tuple[str, ...]) -> tuple[str, ...]:
        """The last texts of this name where they are equal."""
        if texts != self._last.get(name):
            self._last[name] = texts
        shared: tuple[str, ...] = self._last[name]
        return shared

    def _codes(self, name: str, codes: NDArray[np.int32]) -> NDArray[np.int32]:
        """One number for all trials takes no room; else the last codes where they are equal."""
        if not len(codes):
            return codes
        if (codes == codes[0]).all():
            return np.broadcast_to(codes[0], len(codes))
        name = f"codes of {name}"
        if not np.array_equal(codes, self._last.get(name, ())):
            self._last[name] = codes
        shared: NDArray[np.int32] = self._last[name]
        return shared
