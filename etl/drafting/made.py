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
    log : Path
        The first log.
    shown : str
        Its name for messages.
    logs : int
        How many logs there are.
    eye : str
        The eye that is shown where the draft asks which one counts; empty where it does not.
    """

    out: StudyText
    log: Path
    shown: str
    logs: int
    eye: str = ""
