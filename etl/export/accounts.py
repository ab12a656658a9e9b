"""The accounts: for every reader, what was read and what became of it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Final, Literal

from etl.cells import write_csv
from etl.errors import FaultError
from etl.screening.ledger import Accounts

ACCOUNTS = "accounts.csv"
UNITS: Final[tuple[Literal["trials", "fixations"], ...]] = ("trials", "fixations")
EVERYBODY = "(all)"


def account_rows(
    readers: Mapping[str, Mapping[str, Accounts]], rules: Sequence[str]
) -> list[list[str | int]]:
    """The rows of the accounts, header first.

    Parameters
    ----------
    readers : mapping of str to mapping of str to Accounts
        For each reader, in order, the accounts of ``trials`` and ``fixations``.
    rules : sequence of str
        The rules that the study uses, in order of application.

    Returns
    -------
    list of list
        ``participant``, ``unit``, ``read``, a column for each rule, ``kept``; the last two rows are
        for everybody.

    Raises
    ------
    FaultError
        If a row does not balance.
    """
    total = {unit: Accounts() for unit in UNITS}
    rows: list[list[str | int]] = [["participant", "unit", "read", *rules, "kept"]]
    for reader, units in readers.items():
        for unit in UNITS:
            total[unit].add(units[unit])
            rows.append(_row(reader, unit, units[unit], rules))
    rows += [_row(EVERYBODY, unit, total[unit], rules) for unit in UNITS]
    return rows


def _row(reader: str, unit: str, own: Accounts, rules: Sequence[str]) -> list[str | int]:
    """One row, which must balance over the columns that there are."""
    left_out = [own.by_rule[rule] for rule in rules]
    if own.read != own.kept + sum(left_out):
        raise FaultError(f"the accounts of {unit} of {reader} do not balance")
    return [reader, unit, own.read, *left_out, own.kept]


def write_accounts(rows: Sequence[Sequence[str | int]], folder: Path) -> None:
    """Write ``accounts.csv`` into a folder."""
    header, *body = rows
    write_csv(folder / ACCOUNTS, [str(name) for name in header], body)


def account_text(rows: Sequence[Sequence[str | int]]) -> str:
    """The accounts of everybody in words, for messages."""
    header = rows[0]
    parts = []
    for row in rows[-len(UNITS) :]:
        named = dict(zip(header, row, strict=True))
        lost = ", ".join(f"{named[rule]:,} by {rule}" for rule in header[3:-1] if named[rule])
        parts.append(
            f"{named['unit']}: {named['read']:,} read, {named['kept']:,} kept"
            + (f"; left out {lost}" if lost else "")
        )
    return "; ".join(parts)
