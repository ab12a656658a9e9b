"""What goes into the work on a reader, and what comes out of it."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.measures import NoOpportunity, Outside
from etl.parsers import CanonicalLog
from etl.report import LineGrid, ReaderProfile
from etl.screening import Limits
from etl.screening.ledger import Accounts
from etl.session.gallery import Candidate


@dataclass(frozen=True, slots=True)
class Options:
    """The decisions of the study that the work on a reader depends on."""

    repeated: str
    outside: Outside
    no_opportunity: NoOpportunity
    limits: Limits
    grid: LineGrid | None


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
    """

    participant: str
    log: CanonicalLog
    file: NDArray[np.int32]
    trials: TrialColumns
    note: str = ""


@dataclass(slots=True)
class ReaderTables:
    """The finished rows of one reader, and what was counted and noticed on the way."""

    participant: str
    batches: dict[str, pa.RecordBatch]
    counts: dict[str, int]
    accounts: dict[str, Accounts] = field(default_factory=dict)
    profile: ReaderProfile | None = None
    candidates: list[Candidate] = field(default_factory=list)
    findings: Findings = field(default_factory=Findings)
