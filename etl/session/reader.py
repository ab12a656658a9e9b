"""What goes into the work on readers, and what comes out of it.

Readers are worked on in groups: a reader has a few thousand fixations, and to start some hundred
operations on arrays that small takes longer than the operations. What is known of the readers of a
group stands in arrays one reader after the other, with the places at which each begins.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.measures import NoOpportunity, Outside
from etl.parsers import CanonicalLog
from etl.report import LineGrid, LineTrust, ReaderProfile
from etl.screening import Limits
from etl.screening.ledger import Accounts
from etl.session.gallery import Candidate
from etl.session.labels import Unlisted
from etl.session.lines import NO_HAND, HandLines, LineChoice


@dataclass(frozen=True, slots=True)
class Options:
    """The decisions of the study that the work on a reader depends on.

    ``lines`` is None where no text has several lines.
    """

    repeated: str
    outside: Outside
    no_opportunity: NoOpportunity
    limits: Limits
    grid: LineGrid | None
    lines: LineChoice | None = None


@dataclass(frozen=True)
class ReaderGroup:
    """All that is known of some readers before the work begins, one reader after the other.

    Attributes
    ----------
    participants : tuple of str
        The readers' ids, in the order of the tables.
    log : CanonicalLog
        The fixations, those of each reader in the order of the logs.
    file : (n,) int32 array
        Index of each fixation's log into the study's logs.
    row_starts : (readers + 1,) int64 array
        Where the fixations of each reader begin, and how many there are.
    trials : TrialColumns
        The trials that were recorded, those of each reader in the order of the tables.
    trial_starts : (readers + 1,) int64 array
        Where the trials of each reader begin, and how many there are.
    notes : tuple of str
        The experimenter's note on each reader, empty where there is none.
    hand : HandLines
        Lines that were set by hand; of each the index of the trial among those of the group.
    corrections : str
        The table in which they are, for messages.
    labels : tuple of tuple of str
        For each reader the labels of the logs, in the order of the logs; empty where logs have no
        labels.
    """

    participants: tuple[str, ...]
    log: CanonicalLog
    file: NDArray[np.int32]
    row_starts: NDArray[np.int64]
    trials: TrialColumns
    trial_starts: NDArray[np.int64]
    notes: tuple[str, ...]
    hand: HandLines = NO_HAND
    corrections: str = ""
    labels: tuple[tuple[str, ...], ...] = ()

    def __len__(self) -> int:
        return len(self.participants)

    @cached_property
    def reader_of_row(self) -> NDArray[np.int64]:
        """(n,) int64 array: the reader of each fixation, also when they are in time order."""
        return np.repeat(np.arange(len(self)), np.diff(self.row_starts))

    @cached_property
    def reader_of_trial(self) -> NDArray[np.int64]:
        """(trials,) int64 array: the reader of each trial."""
        return np.repeat(np.arange(len(self)), np.diff(self.trial_starts))

    def of(self, readers: Sequence[int]) -> ReaderGroup:
        """Some of the readers.

        Parameters
        ----------
        readers : sequence of int
            Their places, ascending.

        Returns
        -------
        ReaderGroup
        """
        if len(readers) == len(self):
            return self
        wanted = np.zeros(len(self), dtype=bool)
        wanted[list(readers)] = True
        rows = np.flatnonzero(wanted[self.reader_of_row])
        trials = np.flatnonzero(wanted[self.reader_of_trial])
        place = np.zeros(len(self.trials), dtype=np.int64)
        place[trials] = np.arange(len(trials))
        hand = self.hand.take(wanted[self.reader_of_trial[self.hand.trial]])
        return ReaderGroup(
            tuple(self.participants[reader] for reader in readers),
            self.log.take(rows),
            self.file[rows],
            starts_of(np.diff(self.row_starts)[wanted]),
            self.trials.take(trials),
            starts_of(np.diff(self.trial_starts)[wanted]),
            tuple(self.notes[reader] for reader in readers),
            replace(hand, trial=place[hand.trial]),
            self.corrections,
            tuple(self.labels[reader] for reader in readers) if self.labels else (),
        )


def starts_of(counts: Sequence[int] | NDArray[np.integer]) -> NDArray[np.int64]:
    """Where stretches begin that lie one after the other, and where the last one ends.

    Parameters
    ----------
    counts : sequence of int
        How long each is.

    Returns
    -------
    (stretches + 1,) int64 array

    Examples
    --------
    >>> starts_of([2, 0, 3]).tolist()
    [0, 2, 2, 5]
    """
    return np.concatenate([[0], np.cumsum(counts, dtype=np.int64)]).astype(np.int64)


@dataclass(slots=True)
class ReaderTables:
    """What was counted and noticed in the work on one reader, and the finished rows.

    Attributes
    ----------
    participant : str
        The reader's id.
    batches : dict of str to pa.RecordBatch
        Rows of every table; empty where a problem was found, and for a reader of a group, whose
        rows are with those of the others.
    counts : dict of str to int
        What was counted.
    accounts : dict of str to Accounts
        What became of trials and fixations.
    profile : ReaderProfile or None
        For the audit page.
    candidates : list of Candidate
        Trials that may be worth a drawing.
    findings : Findings
        What is wrong.
    outside : dict of int to (int, int)
        For each log, by its place among the study's: how many fixations have a position, and how
        many of these lie outside every region. Without those on which there is a note.
    moved : dict of int to (int, int)
        For each log, by its place among the study's, in which rows were put in the order of their
        numbers: how many, and the first line of these.
    gaps : dict of int to (int, int)
        The same for fixations before which a number is left out.
    unlisted : dict of str to Unlisted
        Labels that no region definition lists.
    trust : LineTrust or None
        How far the lines of the trials can be trusted; None where texts have no lines.
    """

    participant: str
    batches: dict[str, pa.RecordBatch]
    counts: dict[str, int]
    accounts: dict[str, Accounts] = field(default_factory=dict)
    profile: ReaderProfile | None = None
    candidates: list[Candidate] = field(default_factory=list)
    findings: Findings = field(default_factory=Findings)
    outside: dict[int, tuple[int, int]] = field(default_factory=dict)
    moved: dict[int, tuple[int, int]] = field(default_factory=dict)
    gaps: dict[int, tuple[int, int]] = field(default_factory=dict)
    unlisted: dict[str, Unlisted] = field(default_factory=dict)
    trust: LineTrust | None = None

    def name_files(self, places: Sequence[int]) -> None:
        """Count logs by their places among the study's.

        Parameters
        ----------
        places : sequence of int
            Of each log by which they are counted so far.
        """
        self.outside = {places[file]: own for file, own in self.outside.items()}
        self.moved = {places[file]: own for file, own in self.moved.items()}
        self.gaps = {places[file]: own for file, own in self.gaps.items()}
        for found in self.unlisted.values():
            found.file = places[found.file]


@dataclass(slots=True)
class GroupTables:
    """The finished rows of some readers, and what was counted and noticed of each.

    Attributes
    ----------
    readers : list of ReaderTables
        In the order of the group, those with a problem too; without rows.
    batches : dict of str to pa.RecordBatch
        Rows of every table, reader after reader; empty where all readers have problems.
    row_starts : dict of str to (readers + 1,) int64 array
        For each table where the rows of each reader begin, and how many there are. A reader with a
        problem has none.
    """

    readers: list[ReaderTables]
    batches: dict[str, pa.RecordBatch] = field(default_factory=dict)
    row_starts: dict[str, NDArray[np.int64]] = field(default_factory=dict)

    def one_by_one(self) -> list[ReaderTables]:
        """The readers, each with the own rows.

        Returns
        -------
        list of ReaderTables
            Not copied.
        """
        for place, reader in enumerate(self.readers):
            if not reader.findings.failed:
                reader.batches = {
                    name: batch.slice(*_stretch(self.row_starts[name], place))
                    for name, batch in self.batches.items()
                }
        return self.readers


def _stretch(starts: NDArray[np.int64], place: int) -> tuple[int, int]:
    """Where a stretch begins, and how long it is."""
    return int(starts[place]), int(starts[place + 1] - starts[place])
