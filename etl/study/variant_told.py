"""What is wrong with a variants file, each at its line."""

from __future__ import annotations

from collections.abc import Mapping

from etl.errors import Finding, Findings
from etl.study.positions import KeyPath, nearest_line
from etl.study.rule import Problem
from etl.study.wording import dotted


class Told:
    """Problems of a variants file.

    Parameters
    ----------
    shown : str
        The name of the file for messages.
    lines : mapping of tuple to int
        The line of each of its keys, from 1.
    """

    def __init__(self, shown: str, lines: Mapping[KeyPath, int]) -> None:
        self._shown = shown
        self._lines = lines
        self._told: list[Finding] = []

    def __len__(self) -> int:
        return len(self._told)

    def add(self, at: KeyPath, problem: Problem) -> None:
        """Record a problem.

        Parameters
        ----------
        at : tuple of str and int
            Where it stands in the variants file.
        problem : Problem
            What is the matter. Its path is named in the message: the key of the study file for
            what is set, and the place in the variants file for all else.
        """
        self._told.append(
            Finding(
                problem.problem,
                path=self._shown,
                line=nearest_line(self._lines, at),
                where=dotted(problem.path),
                found=problem.found,
                expected=problem.expected,
                fix=problem.fix,
            )
        )

    def line_of(self, at: KeyPath) -> int | None:
        """The line of a key of the variants file.

        Parameters
        ----------
        at : tuple of str and int
            Keys, and places in arrays from 0.

        Returns
        -------
        int or None
            From 1; None where not even the outermost table is in the file.
        """
        return nearest_line(self._lines, at)

    def findings(self) -> Findings:
        """All problems, by line; what has no line is at the end.

        Returns
        -------
        Findings
        """
        placed = sorted(self._told, key=lambda one: (one.line is None, one.line or 0))
        findings = Findings()
        for finding in placed:
            findings.add(finding)
        return findings
