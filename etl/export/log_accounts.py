"""The accounts of the logs: where every line of each log went, and what was mended in it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from etl.cells import write_csv
from etl.errors import FaultError

LOG_ACCOUNTS = "log_accounts.csv"
#: The columns, each with its meaning.
COLUMNS = {
    "source_file": "the log",
    "unit": "what is counted: lines, or repairs within lines that are counted already",
    "what": "what became of the lines, or what was mended; all lines: their sum",
    "count": "how many",
    "first_line": "the first line of the log at which it is, from 1; empty where it is on none",
}
ALL_LINES = "all lines"


@dataclass(frozen=True, slots=True)
class Counted:
    """Something counted in a log.

    Attributes
    ----------
    what : str
        What it is, in a few words.
    count : int
        How many.
    first_line : int or None
        The line of the first.
    """

    what: str
    count: int
    first_line: int | None


@dataclass(frozen=True, slots=True)
class LogAccount:
    """What became of one log.

    Attributes
    ----------
    source_file : str
        Its name.
    total : int
        How many lines it has.
    lines : tuple of Counted
        What became of them, each line once.
    repairs : tuple of Counted
        What was mended.
    """

    source_file: str
    total: int
    lines: tuple[Counted, ...]
    repairs: tuple[Counted, ...]


def log_account_rows(logs: Iterable[LogAccount]) -> list[list[str | int]]:
    """The rows of the accounts of the logs, header first.

    Parameters
    ----------
    logs : iterable of LogAccount
        In the order of the study.

    Returns
    -------
    list of list
        For each log a row for all lines, a row for each of their fates, a row for each repair.

    Raises
    ------
    FaultError
        If the fates of a log's lines do not add up to its lines.
    """
    rows: list[list[str | int]] = [list(COLUMNS)]
    for log in logs:
        name, told = log.source_file, sum(fate.count for fate in log.lines)
        if told != log.total:
            raise FaultError(
                f"the account of {name} does not balance: it has {log.total} lines, and "
                f"{told} are told of"
            )
        every = Counted(ALL_LINES, log.total, 1 if log.total else None)
        rows += [_row(name, "lines", counted) for counted in (every, *log.lines)]
        rows += [_row(name, "repairs", counted) for counted in log.repairs]
    return rows


def _row(name: str, unit: str, counted: Counted) -> list[str | int]:
    """One row."""
    first = "" if counted.first_line is None else counted.first_line
    return [name, unit, counted.what, counted.count, first]


def write_log_accounts(logs: Iterable[LogAccount], folder: Path) -> None:
    """Write ``log_accounts.csv`` into a folder."""
    _, *rows = log_account_rows(logs)
    write_csv(folder / LOG_ACCOUNTS, list(COLUMNS), rows)
