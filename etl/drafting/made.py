"""A draft in the making, as the parts for each kind of log hand it over."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from etl.drafting.toml_text import StudyText


@dataclass(frozen=True, slots=True)
class Made:
    """A study file, and what is needed to show its first trial.

    Attributes
    ----------
    out : StudyText
        The study file.
    logs : tuple of Path
        The logs, the first one of those that are like most before all others.
    eye : str
        The eye that is shown where the draft asks which one counts; empty where it does not.
    facts : tuple of str
        Columns or groups that may be factors.
    """

    out: StudyText
    logs: tuple[Path, ...]
    eye: str = ""
    facts: tuple[str, ...] = ()
