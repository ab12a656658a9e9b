"""From logs to a study file to start from."""

from __future__ import annotations

import os
import textwrap
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

from etl.drafting.draft_bids import of_bids
from etl.drafting.draft_events import event_roles, of_events
from etl.drafting.draft_tables import of_tables
from etl.drafting.first_trial import first_trial
from etl.drafting.found_logs import RECORDING, find_named
from etl.drafting.heads import Head, read_head, share_of_each
from etl.drafting.made import Made
from etl.drafting.meanings import counted
from etl.drafting.table_heads import as_table, how_even, taken_for_table
from etl.drafting.toml_text import Question
from etl.errors import DataError, Finding, Findings

#: Lines of which so many are split into as many fields as the first one may be, or are, a table.
_EVEN, _ALL = 0.8, 0.995
#: Of the lines of a log of events at most this share are fixations.
_FIXATIONS = 0.95
#: Whether logs are tables is told by about so many of them.
_LOOKED_AT = 24
_WIDTH = 98


@dataclass(frozen=True, slots=True)
class Draft:
    """A study file to start from.

    Attributes
    ----------
    text : str
        The study file.
    questions : tuple of Question
        What is left for the lab to answer, in the order of the file.
    guesses : int
        How many keys were guessed, each with its evidence beside it.
    logs : int
        How many logs were looked at.
    first_trial : str
        The first trial as it is understood, as a table, with one from the middle where the first
        looks like practice, and how many readers and trials there are; empty where too much is
        open.
    findings : Findings
        Warnings: logs that differ from the rest, or do not read as the draft says.
    path : Path or None
        Where it was written.
    """

    text: str
    questions: tuple[Question, ...]
    guesses: int
    logs: int
    first_trial: str
    findings: Findings = field(default_factory=Findings)
    path: Path | None = None

    def told(self, *, on_terminal: bool) -> str:
        """What is said about it: where it is, the first trial, and what is asked.

        Parameters
        ----------
        on_terminal : bool
            Whether somebody looks on, who is shown the first trial.

        Returns
        -------
        str
        """
        name = "the study file" if self.path is None else str(self.path)
        guesses, logs = counted(self.guesses, "guess", "es"), counted(self.logs, "log")
        lines = [f"Written to {name}: {guesses} from {logs}, each with its evidence above it."]
        if on_terminal and self.first_trial:
            lines += ["", self.first_trial]
        if self.questions:
            count = counted(len(self.questions), "question")
            lines += ["", f'{count} to answer, each in place of a "?":']
            lines += [line for one in self.questions for line in _asked(one)]
        return "\n".join([*lines, "", f"Then: trialwright check {name}"])


def _asked(question: Question) -> list[str]:
    """A question on lines of its own, below where it stands."""
    indent = " " * 11
    said = textwrap.wrap(
        question.text,
        _WIDTH,
        initial_indent=indent,
        subsequent_indent=indent,
        break_long_words=False,
        break_on_hyphens=False,
    )
    return [f"  line {question.line:>3}  {question.key}", *said]


def draft(
    logs: Iterable[str | os.PathLike[str]] | str | os.PathLike[str],
    *,
    into: str | os.PathLike[str] | None = None,
) -> Draft:
    """Look at logs and write a study file to start from.

    Parameters
    ----------
    logs : path or iterable of path
        Logs, patterns with ``*``, or folders with logs in them.
    into : path, optional
        The study file, which must not be there yet. Nothing is written where absent; names of logs
        are then relative to the current folder.

    Returns
    -------
    Draft
        Every guess has its evidence in a remark above it; what nobody but the lab can know has
        the value ``"?"`` below a question.

    Raises
    ------
    DataError
        If a log cannot be read or understood, or the study file is there already. Nothing is
        written then.
    """
    names = [logs] if isinstance(logs, (str, os.PathLike)) else list(logs)
    target = None if into is None else Path(into)
    findings = Findings()
    if target is not None:
        _check_target(target, findings)
    paths, implied = find_named(names, findings)
    if findings.failed:
        raise DataError(findings)
    notes = Findings()
    made = _made(paths, implied, target, notes)
    text = made.out.text()
    shown = first_trial(text, made, notes)
    asked, guesses = tuple(made.out.questions), made.out.guesses
    drafted = Draft(text, asked, guesses, len(made.logs), shown, notes)
    if target is None:
        return drafted
    _write(target, text)
    return replace(drafted, path=target)


def _made(paths: Sequence[Path], implied: set[Path], target: Path | None, notes: Findings) -> Made:
    """The draft for logs of whatever kind they are."""
    findings = Findings()
    made: Made | None = None
    if all(path.name.endswith(RECORDING) for path in paths):
        made = of_bids(paths, target, findings)
    else:
        share = share_of_each(len(paths))
        left_out: list[Finding] = []
        heads = []
        for path in paths:
            own = Findings()
            head = read_head(path, path.as_posix(), share, own)
            if head is not None:
                heads.append(head)
            elif path in implied:
                left_out += own.of("error")
            else:
                findings.extend(own)
        made = _of_text(heads, implied, target, (findings, notes, left_out))
        for problem in left_out:
            if made is not None:
                notes.add(_left_out(problem))
            else:
                findings.add(problem)
    if made is None or findings.failed:
        raise DataError(findings)
    return made


def _of_text(
    heads: Sequence[Head],
    implied: set[Path],
    target: Path | None,
    told: tuple[Findings, Findings, list[Finding]],
) -> Made | None:
    """The draft for tables, or for lines of events where they are none."""
    findings, notes, left_out = told
    if findings.failed or not heads:
        return None
    some = heads[:: max(1, len(heads) // _LOOKED_AT)]
    even = [how_even(head.lines()) for head in some]
    if sum(share >= _ALL for share in even) < len(even) / 2:
        roles, commas = event_roles(heads)
        # Lines that say when trials start are no table, even where most are as wide as others.
        # Where every line is a fixation, it is a table that lacks its header.
        lines = sum(len(head.lines()) for head in heads)
        uneven = sum(share >= _EVEN for share in even) < len(even) / 2
        by_lines = uneven and roles.fixation and len(roles.fixation) < _FIXATIONS * lines
        if roles.fixation is not None and (roles.starts or by_lines):
            return of_events(heads, roles, target, commas=commas)
    tables = []
    for head in heads:
        own = Findings()
        table = as_table(head, own)
        if table is not None:
            tables.append(table)
            continue
        own = taken_for_table(head, own)
        if head.path in implied:
            left_out += own.of("error")
        else:
            findings.extend(own)
    if findings.failed or not tables:
        return None
    return of_tables(tables, implied, target, (findings, notes))


def _left_out(problem: Finding) -> Finding:
    """What is told of a file of a folder that is no log, where others are."""
    return Finding(
        f"this file of the folder was left out: {problem.problem}",
        "warning",
        path=problem.path,
        line=problem.line,
        fix="name the logs themselves if it is one",
    )


def _check_target(target: Path, findings: Findings) -> None:
    """Whether the study file can be written without harm to what is there."""
    if target.exists() or target.is_symlink():
        findings.error(
            "there is a file of this name already, and a draft never replaces one",
            path=str(target),
            fix="write the draft elsewhere with --into, or move the file away",
        )
    elif not target.absolute().parent.is_dir():
        findings.error(
            "there is no such folder",
            path=str(target.parent),
            fix="make the folder, or write the draft elsewhere with --into",
        )


def _write(target: Path, text: str) -> None:
    """Write the study file, unless one has appeared meanwhile."""
    findings = Findings()
    try:
        with target.open("x", encoding="utf-8", newline="\n") as file:
            file.write(text)
    except OSError as error:
        findings.error(
            f"the study file cannot be written: {error.strerror or error}",
            path=str(target),
            fix="write the draft elsewhere with --into",
        )
        raise DataError(findings) from None
