"""What is told about the logs in the output: their accounts, the run record, the audit page."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from typing import Any, Literal

from etl.errors import FaultError, Finding, Findings
from etl.export.log_accounts import Counted, LogAccount
from etl.files import FileAccount
from etl.files.tally import Tally
from etl.report import LogFate, LogMatter, LogsTold
from etl.session.compared_logs import Difference, compared
from etl.session.differing_logs import differences
from etl.session.notice_logs import MENDED, repairs_of, set_aside, told_of_logs
from etl.session.work import LogAnswer

_MOVED = "rows put in the order of their fixations' numbers"


def log_accounts(answers: Sequence[LogAnswer]) -> list[LogAccount]:
    """The accounts of the logs, as they are written.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds.

    Returns
    -------
    list of LogAccount
        In the order of the logs.
    """
    return [_account(answer.note.shown, answer.note.account) for answer in answers]


def _account(shown: str, account: FileAccount) -> LogAccount:
    """The account of one log."""
    return LogAccount(shown, account.total, _counted(account.lines), _counted(account.repairs))


def _counted(tallies: Mapping[str, Tally]) -> tuple[Counted, ...]:
    """What was counted, as it is written."""
    return tuple(Counted(what, tally.count, tally.first_line) for what, tally in tallies.items())


def account_for_moved(
    answers: Sequence[LogAnswer], moved: Mapping[int, Tally], findings: Findings
) -> None:
    """Count rows that were put in the order of their numbers among the repairs, and say so.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds; the accounts of logs with such rows are added to.
    moved : mapping of int to Tally
        For each log, by its place among the study's, how many rows.
    findings : Findings
        Where a note is recorded for each log.
    """
    for place, tally in sorted(moved.items()):
        note = answers[place].note
        note.account.repaired(_MOVED, tally.count, tally.first_line)
        findings.note(f"{_MOVED}: {tally.count:,}", path=note.shown, line=tally.first_line)


def log_counts(answers: Sequence[LogAnswer]) -> dict[str, int]:
    """What was counted in all logs together, for the run record.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds.

    Returns
    -------
    dict of str to int
        Logs, what was counted while reading them, where their lines went, what was mended.
    """
    counts: Counter[str] = Counter({"logs": len(answers)})
    for answer in answers:
        counts.update({f"log {name}": count for name, count in answer.note.counts.items()})
    for answer in answers:
        account = answer.note.account
        counts["log lines"] += account.total
        counts.update({f"log lines: {what}": t.count for what, t in account.lines.items()})
        counts.update({f"log repairs: {what}": t.count for what, t in account.repairs.items()})
    return dict(counts)


def log_inputs(answers: Sequence[LogAnswer]) -> list[dict[str, Any]]:
    """How each log was understood and what became of it, for the run record.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds.

    Returns
    -------
    list of dict
        For each log its name, digest, dialect, counts, the fates of its lines and repairs; and
        every file that was read with it.
    """
    inputs: list[dict[str, Any]] = []
    for answer in answers:
        note = answer.note
        inputs.append(
            {
                "file": note.shown,
                "role": "log",
                "sha256": note.sha256,
                "encoding": note.encoding,
                "delimiter": note.delimiter,
                "decimal": note.decimal,
                **note.counts,
                "lines": {what: tally.count for what, tally in note.account.lines.items()},
                "repairs": {what: tally.count for what, tally in note.account.repairs.items()},
            }
        )
        inputs += [{"file": file, "role": role, "sha256": sha} for file, role, sha in note.parts]
    return inputs


def check_nothing_lost(answers: Sequence[LogAnswer], read: int) -> None:
    """Check that every fixation of the logs has come to some reader.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds.
    read : int
        How many fixations the accounts of the readers have as read.

    Raises
    ------
    FaultError
        If the two differ.
    """
    held = sum(answer.figures.fixations for answer in answers if answer.figures is not None)
    if held != read:
        raise FaultError(f"the logs hold {held} fixations, and the readers have {read}")


def logs_told(answers: Sequence[LogAnswer]) -> LogsTold:
    """What the audit page tells of the logs.

    Parameters
    ----------
    answers : sequence of LogAnswer
        What each log holds.

    Returns
    -------
    LogsTold
        Where their lines went, how they differ, what was mended.
    """
    logs = compared(answers)
    lines: Counter[str] = Counter()
    having: Counter[str] = Counter()
    for log in logs:
        for what, tally in log.note.account.lines.items():
            lines[what] += tally.count
            having[what] += 1
    kinds: list[tuple[Difference, Literal["warning", "note", "mended"]]]
    kinds = [(about, about.severity) for about in differences(logs)]
    kinds += [(about, "mended") for about in repairs_of(logs)]
    return LogsTold(
        len(logs),
        tuple(LogFate(what, count, having[what]) for what, count in lines.items()),
        tuple(
            LogMatter(
                kind,
                (about.alone if alone else about.says).removeprefix(MENDED),
                # What a remark says of the only log, the sentence says too.
                tuple(
                    (log, "" if alone or not about.remarks else about.remarks[place])
                    for place, log in enumerate(about.logs)
                ),
            )
            for about, kind in kinds
            for alone in (len(about.logs) == 1,)
        ),
    )


def told_elsewhere(findings: Findings, answers: Sequence[LogAnswer]) -> Findings:
    """What was found, but for what the part of the page on the logs tells.

    Parameters
    ----------
    findings : Findings
        All that was found.
    answers : sequence of LogAnswer
        What each log holds.

    Returns
    -------
    Findings
        In the same order.
    """
    logs = compared(answers)
    told = {about.finding().kind for about in told_of_logs(logs)}
    told.add(Finding(set_aside(logs), "note").kind)
    return Findings([one for one in findings if one.kind not in told], findings.more)
