"""Where every line of a delimited file went."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from etl.files.headers import Header
from etl.files.rows import Rows
from etl.files.tally import FileAccount, Tally


def line_account(
    rows: Rows, header: Header, data: bytes, repeated: NDArray[np.int32]
) -> FileAccount:
    """What became of every line of a file, and how many rows were mended.

    Parameters
    ----------
    rows : Rows
        What was read, with the rows that repeat the header.
    header : Header
        The header.
    data : bytes
        The text.
    repeated : (m,) int32 array
        On which lines the header is repeated.

    Returns
    -------
    FileAccount
        Rows are counted as ``"rows"`` by their first line, what else they take as
        ``"further lines of rows"``.
    """
    account = FileAccount(header.first - 1 + rows.height)
    aside = rows.aside
    head_account(account, header, data, {"blank lines": aside.blank, "remarks": aside.remarks})
    if len(repeated):
        again = len(repeated) * header.height
        account.line("repeated headers", again, int(repeated[0]))
    alone = len(rows.lines) - len(repeated)
    if alone:
        own = np.setdiff1d(rows.lines, repeated) if len(repeated) else rows.lines
        account.line("rows", alone, int(own[0]))
    counted = sum(tally.count for tally in account.lines.values())
    account.line("further lines of rows", account.total - counted)
    account.repaired("quote marks that were not doubled", rows.mended.count, rows.mended.first_line)
    account.repaired("quote marks in cells without quotes", rows.stray.count, rows.stray.first_line)
    return account


def head_account(
    account: FileAccount,
    header: Header,
    data: bytes,
    below: Mapping[str, Sequence[int]] = MappingProxyType({}),
) -> None:
    """Count what became of the lines of a file down to its header.

    Parameters
    ----------
    account : FileAccount
        Where they are counted.
    header : Header
        The header.
    data : bytes
        The text.
    below : mapping of str to sequence of int, optional
        Blank lines and remarks below the header, which are counted with those above it.
    """
    blank, remarks = Tally(), Tally()
    banner = Tally()
    for number, line in enumerate(data[: header.start].split(b"\n")[: header.line - 1], start=1):
        content = line.decode("utf-8").strip()
        kind = remarks if content.startswith(header.remarks) else banner if content else blank
        kind.add(1, number)
    for kind, fate in ((blank, "blank lines"), (remarks, "remarks")):
        if numbers := below.get(fate):
            kind.add(len(numbers), numbers[0])
    account.line("banner above the header", banner.count, banner.first_line)
    account.line("blank lines", blank.count, blank.first_line)
    account.line("remarks", remarks.count, remarks.first_line)
    account.line("header", header.height, header.line)
