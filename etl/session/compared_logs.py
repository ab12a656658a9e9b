"""Logs beside one another, and what is told where some differ from the rest."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from etl.errors import Finding
from etl.parsers.canonical import LogNote
from etl.session.log_figures import LogFigures
from etl.session.work import LogAnswer


@dataclass(frozen=True, slots=True)
class Difference:
    """Something that some logs have or are, and the rest not.

    Attributes
    ----------
    severity : {"warning", "note"}
        A warning where it may well be a fault.
    says : str
        What it is, about several logs.
    alone : str
        The same about one.
    logs : tuple of str
        The names of all logs that it is about.
    remarks : tuple of str
        A remark on each of them; empty where there is nothing to add.
    line : int or None
        Where it is in the only log.
    fix : str
        What to do about it.
    """

    severity: Literal["warning", "note"]
    says: str
    alone: str
    logs: tuple[str, ...]
    remarks: tuple[str, ...] = ()
    line: int | None = None
    fix: str = ""

    def named(self) -> tuple[str, ...]:
        """The logs, each with its remark in brackets."""
        if not self.remarks:
            return self.logs
        pairs = zip(self.logs, self.remarks, strict=True)
        return tuple(f"{log} ({remark})" for log, remark in pairs)

    def finding(self) -> Finding:
        """The difference as something found."""
        if len(self.logs) == 1:
            return Finding(self.alone, self.severity, self.logs[0], self.line, fix=self.fix)
        return Finding(self.says, self.severity, fix=self.fix, files=self.named())


@dataclass(frozen=True, slots=True)
class ComparedLog:
    """A log that was read, ready to be compared."""

    note: LogNote
    figures: LogFigures

    @property
    def shown(self) -> str:
        """Its name."""
        return self.note.shown


def compared(answers: Sequence[LogAnswer]) -> list[ComparedLog]:
    """The logs that could be read."""
    return [ComparedLog(a.note, a.figures) for a in answers if a.figures is not None]
