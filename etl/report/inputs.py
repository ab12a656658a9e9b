"""What the audit page is made from."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, Literal

from etl.readiness.facts import Readiness
from etl.report.logs import LogsTold
from etl.report.reader_profile import Profiles
from etl.tables import TableDesign


@dataclass(frozen=True, slots=True)
class AccountRow:
    """One row of the accounts: read = kept + the sum over rules.

    Attributes
    ----------
    participant : str
        The reader.
    unit : {"trials", "fixations"}
        What is counted.
    read : int
        How many the logs hold.
    left_out : mapping of str to int
        How many each rule left out, in the order in which the rules apply.
    kept : int
        How many the outcomes are computed from.
    """

    participant: str
    unit: Literal["trials", "fixations"]
    read: int
    left_out: Mapping[str, int]
    kept: int


@dataclass(frozen=True, slots=True)
class NotRecorded:
    """A trial of the trial list that no log has.

    Attributes
    ----------
    participant : str
        The reader.
    trial : str
        The trial.
    session : str
        The visit; empty where readers came once.
    """

    participant: str
    trial: str
    session: str = ""

    def spelled(self) -> str:
        """The trial in words."""
        named = (
            ("participant", self.participant),
            ("session", self.session),
            ("trial", self.trial),
        )
        return ", ".join(f"{name} {text}" for name, text in named if text)


@dataclass(frozen=True, slots=True)
class UnsureTrial:
    """A trial that is not sure of its lines.

    Attributes
    ----------
    participant, session, trial : str
        Which; session is empty where readers came once.
    confidence : float
        Chance that its lines are right.
    """

    participant: str
    session: str
    trial: str
    confidence: float


@dataclass(frozen=True, slots=True)
class GalleryEntry:
    """A trial worth looking at.

    Attributes
    ----------
    title : str
        Reader and trial, in words.
    why : str
        Why it was chosen, in a sentence.
    svg : str
        The drawing, an ``<svg>`` element with a title of its own. It goes into the page as it
        stands, so everything in it that comes from data must be escaped already.
    link_text : str
        What the list above the drawings calls it.
    """

    title: str
    why: str
    svg: str
    link_text: str


@dataclass(frozen=True, slots=True)
class AuditInput:
    """Everything that the page tells of, ready counted.

    Attributes
    ----------
    study : mapping
        The study as understood, defaults filled in: ``study.understood()``.
    design : TableDesign
        What the study's tables have in common.
    profiles : Profiles
        One summary a reader, and what was counted over all of them.
    accounts : sequence of AccountRow
        Two rows a reader, trials and fixations, without the rows for all readers.
    reasons : mapping of str to str
        What each reason for a missing value means.
    warnings : sequence of str
        What was noticed, as in the run record.
    not_recorded : sequence of NotRecorded
        Trials of the trial list that no log has.
    gallery : sequence of GalleryEntry
        Drawings of the trials most worth looking at.
    logs : LogsTold
        Where the lines of the logs went, and how the logs differ.
    unsure : sequence of UnsureTrial
        The trials least sure of their lines, the least sure first.
    readiness : Readiness or None
        What is told of the binary outcomes before a model is fitted; None where nothing is.
    """

    study: Mapping[str, Any]
    design: TableDesign
    profiles: Profiles
    accounts: Sequence[AccountRow]
    reasons: Mapping[str, str]
    warnings: Sequence[str] = ()
    not_recorded: Sequence[NotRecorded] = ()
    gallery: Sequence[GalleryEntry] = field(default_factory=tuple)
    logs: LogsTold = field(default_factory=LogsTold)
    unsure: Sequence[UnsureTrial] = ()
    readiness: Readiness | None = None
