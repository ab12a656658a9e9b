"""What goes into the work on a reader, and what comes out of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

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


@dataclass(frozen=True, slots=True)
class Reader:
    """All that is known of one reader before the work begins.

    Attributes
    ----------
    participant : str
        The reader's id.
    log : CanonicalLog
        The fixations, in the order of the logs.
    file : (n,) int32 array
        Index of each fixation's log into the study's logs.
    trials : TrialColumns
        The trials that were recorded, in the order of the tables.
    note : str
        The experimenter's note on the reader, empty where there is none.
    hand : HandLines
        Lines that were set by hand.
    corrections : str
        The table in which they are, for messages.
    """

    participant: str
    log: CanonicalLog
    file: NDArray[np.int32]
    trials: TrialColumns
    note: str = ""
    hand: HandLines = NO_HAND
    corrections: str = ""


@dataclass(slots=True)
class ReaderTables:
    """The finished rows of one reader, and what was counted and noticed on the way.

    Attributes
    ----------
    participant : str
        The reader's id.
    batches : dict of str to pa.RecordBatch
        Rows of every table; empty where a problem was found.
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
