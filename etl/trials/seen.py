"""The trials that logs show, one row a trial."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows

#: What identifies a fixation's trial; every log or table may carry these under canonical names.
IDS = ("participant", "session", "trial", "item")


@dataclass(frozen=True, slots=True)
class SeenTrials:
    """Trials as logs show them.

    Attributes
    ----------
    ids : dict of str to Coded
        ``participant``, ``trial`` and, where the logs have them, ``session`` and ``item``.
    facts : dict of str to Coded
        Facts about trials that stand in the logs.
    file : (trials,) int32 array
        The log in which each trial was first seen, as an index into the study's logs.
    line : (trials,) int32 array
        The line at which it begins there.
    """

    ids: dict[str, Coded]
    facts: dict[str, Coded]
    file: NDArray[np.int32]
    line: NDArray[np.int32]

    def __len__(self) -> int:
        return len(self.line)

    def take(self, rows: NDArray[np.int64]) -> SeenTrials:
        """Some of the trials."""
        return SeenTrials(
            {name: column.take(rows) for name, column in self.ids.items()},
            {name: column.take(rows) for name, column in self.facts.items()},
            self.file[rows],
            self.line[rows],
        )

    @classmethod
    def joined(cls, parts: Sequence[SeenTrials], places: Sequence[int]) -> SeenTrials:
        """The trials of several logs, one below the other.

        Parameters
        ----------
        parts : sequence of SeenTrials
            Those of each log, at least one.
        places : sequence of int
            What is added to the number of the log in each part.
        """
        lengths = [len(part) for part in parts]
        file = np.repeat(np.asarray(places, dtype=np.int32), lengths)
        stop = 0
        for part in parts:
            start, stop = stop, stop + len(part)
            file[start:stop] += part.file
        return cls(
            {name: Coded.joined([part.ids[name] for part in parts]) for name in parts[0].ids},
            {name: Coded.joined([part.facts[name] for part in parts]) for name in parts[0].facts},
            file,
            np.concatenate([part.line for part in parts]),
        )

    def once(self, shown: Sequence[str], findings: Findings) -> SeenTrials:
        """Each trial once, where it was first seen.

        Parameters
        ----------
        shown : sequence of str
            The names of the logs, for messages.
        findings : Findings
            Where an item or a fact that varies within a trial is recorded.
        """
        keys = [self.ids[name] for name in IDS[:3] if name in self.ids]
        first, group = group_rows(keys)
        if len(first) == len(self):
            return self
        again = np.ones(len(self), dtype=bool)
        again[first] = False
        rows = np.flatnonzero(again)
        self._compare(rows, first[group[rows]], shown, findings)
        del group
        return self.take(np.sort(first))

    def _compare(
        self,
        rows: NDArray[np.int64],
        firsts: NDArray[np.int64],
        shown: Sequence[str],
        findings: Findings,
    ) -> None:
        """Record where a later place of a trial says something else than its first."""
        item = {"item": self.ids["item"]} if "item" in self.ids else {}
        varying: dict[tuple[int, str], None] = {}
        for name, column in {**item, **self.facts}.items():
            differs = np.flatnonzero(column.codes[rows] != column.codes[firsts])
            for at in differs.tolist():
                row, first = int(rows[at]), int(firsts[at])
                if (first, name) in varying:
                    continue
                varying[first, name] = None
                findings.error(
                    f"{name} varies within a trial",
                    path=shown[int(self.file[row])],
                    line=int(self.line[row]),
                    where=f'column "{name}"' if name in self.facts else "logs.columns.item",
                    found=column.text(row),
                    expected=f'"{column.text(first)}" in all rows of trial '
                    f"{self.ids['trial'].text(row)} of reader "
                    f"{self.ids['participant'].text(row)}, as in "
                    f"{shown[int(self.file[first])]}:{int(self.line[first])}",
                    fix="correct the cells; if these are two trials, number them apart or name a "
                    "session column",
                )
