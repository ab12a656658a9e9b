"""What the codebook tells of a study besides its tables."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from etl.tables import Column


@dataclass(frozen=True, slots=True)
class Rule:
    """One rule of screening that the study uses.

    Attributes
    ----------
    name : str
        As in ``left_out_by``, in the ledger and in the accounts.
    judges : str
        What it looks at: a fixation, a trial, a reader, a recording of a trial, or a value.
    meaning : str
        What it leaves out, with its limit, without a full stop.
    """

    name: str
    judges: str
    meaning: str


@dataclass(frozen=True, slots=True)
class StudyFacts:
    """A study's decisions, as far as they bear on what its tables mean.

    Attributes
    ----------
    title : str
        What the study is called; empty where it has no title.
    outside : {"ignore", "interrupt"}
        What a fixation outside every region does.
    no_opportunity : {"missing", "zero"}
        What an outcome is where the reader had no chance of it.
    line_method : str
        How the lines of texts are told; empty where no text has several lines.
    rules : tuple of Rule
        The rules of screening that the study uses, in order of application.
    reasons : mapping of str to str
        What each reason for a missing value means.
    origins : mapping of str to str
        For factors and covariates, where they come from, such as ``the trial list``.
    region_keys : tuple of Column
        The columns by which a row of the table of regions is joined to trials.
    pseudonyms : bool
        Whether the readers' ids are replaced.
    """

    title: str
    outside: str
    no_opportunity: str
    line_method: str = ""
    rules: tuple[Rule, ...] = ()
    reasons: Mapping[str, str] = field(default_factory=dict)
    origins: Mapping[str, str] = field(default_factory=dict)
    region_keys: tuple[Column, ...] = ()
    pseudonyms: bool = False
