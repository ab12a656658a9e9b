"""The rows of one block of a log, and what they tell of things that hold for the whole log."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files.delimited import columns_of
from etl.files.header_faults import header_is_usable
from etl.files.headers import Header, find_header
from etl.files.line_account import head_account
from etl.files.loose_quotes import split_loosely
from etl.files.pieces import WholeNeededError
from etl.files.plain import plain_rows
from etl.files.quoted import split_quoted
from etl.files.repeats import repeated_headers, without_marks
from etl.files.rows import Rows, Uneven
from etl.files.stray_quotes import cells_open, stray_marks
from etl.files.tally import FileAccount, Tally
from etl.files.units import own_names


@dataclass(frozen=True, slots=True)
class Manner:
    """How all blocks of a log are split into rows.

    Attributes
    ----------
    header : Header
        The header of the log.
    wanted : tuple of str
        The columns that are kept.
    shown : str
        The log's name for messages.
    loose : bool
        Whether quote marks inside cells may be not doubled: see
        :func:`etl.files.loose_quotes.split_loosely`.
    """

    header: Header
    wanted: tuple[str, ...]
    shown: str = ""
    loose: bool = False


@dataclass(slots=True)
class BlockCells:
    """The rows of a block, unless they are ``refused``, or the block is ``crooked``.

    Attributes
    ----------
    table : pa.Table
        The columns that were asked for, as text.
    lines : (n,) int32 array
        The line on which each row begins.
    account : FileAccount
        What became of every line of the block below the log's header.
    below_headers : tuple of int
        The rows, from 0, that come first below a header.
    remarks, alike : Tally
        Remarks, and those of them that have as many fields as the header.
    stray : Tally
        Rows with quote marks in a cell without quotes, of note where some cell has quotes.
    quotes : bool
        Whether some cell begins with a quote mark.
    marks_within : list of int
        Lines that have a byte-order mark elsewhere than at their beginning.
    strange_marks : list of int
        Lines that begin with one and are no headers.
    uneven : Uneven or None
        Rows that are not as wide as the header, as the standard of quoted cells has it.
    refused : bool
        Whether they cannot be read otherwise, either.
    crooked : bool
        Whether quote marks are not as the standard has them, and the log is not split loosely.
    bent : bool
        Whether that is so, and the log is split loosely.
    count : int
        How many rows there are, repeated headers included.
    other_headers : Findings
        Headers that differ from the log's.
    """

    table: pa.Table | None = None
    lines: NDArray[np.int32] = field(default_factory=lambda: np.zeros(0, dtype=np.int32))
    account: FileAccount = field(default_factory=FileAccount)
    below_headers: tuple[int, ...] = ()
    remarks: Tally = field(default_factory=Tally)
    alike: Tally = field(default_factory=Tally)
    stray: Tally = field(default_factory=Tally)
    quotes: bool = False
    marks_within: list[int] = field(default_factory=list)
    strange_marks: list[int] = field(default_factory=list)
    uneven: Uneven | None = None
    refused: bool = False
    crooked: bool = False
    bent: bool = False
    count: int = 0
    other_headers: Findings = field(default_factory=Findings)


def header_of_blocks(
    beginning: bytes,
    delimiter: str | None,
    needed: Sequence[str],
    remarks: Sequence[str],
    shown: str,
    findings: Findings,
) -> tuple[Manner, FileAccount] | None:
    """Find the header of a log in its first blocks.

    Parameters
    ----------
    beginning : bytes
        The text of the log's first blocks.
    delimiter : str or None
        Found out where it is None.
    needed : sequence of str
        The columns that are read.
    remarks : sequence of str
        What a line begins with that is a remark.
    shown : str
        The log's name for messages.
    findings : Findings
        Where it is recorded why the header cannot be used.

    Returns
    -------
    Manner and FileAccount, or None
        How the log is split, and the account of the lines down to the header; None where a problem
        was recorded.
    """
    data, _ = without_marks(beginning)
    header = find_header(data, delimiter, needed, remarks)
    if not header_is_usable(header, data, shown, findings, needed):
        return None
    asked = own_names(needed, header.names).values()
    wanted = tuple(name for name in dict.fromkeys(asked) if name)
    account = FileAccount(header.first - 1)
    head_account(account, header, data)
    return Manner(replace(header, start=0, body=0), wanted, shown), account


def cells_of_block(text: bytes, first: int, manner: Manner, *, below: bool) -> BlockCells:
    """Split a block of a log into rows.

    Parameters
    ----------
    text : bytes
        The block: whole lines in UTF-8, line feeds.
    first : int
        The number of its first line. Lines down to the header are stepped over.
    manner : Manner
        How the log is split.
    below : bool
        Whether the first row stands right below a header of the log.

    Returns
    -------
    BlockCells

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    """
    cells = BlockCells()
    data, marks = without_marks(text)
    cells.marks_within = [first - 1 + number for number in marks.within]
    body, begin = data, first
    while begin < manner.header.first and body:
        body = body[body.find(b"\n") + 1 :] if b"\n" in body else b""
        begin += 1
    header = replace(manner.header, first=max(begin, manner.header.first))
    rows = _rows(body, header, manner, cells)
    if rows is None:
        return cells
    cells.count = len(rows.lines)
    own = cells.other_headers
    repeated = repeated_headers(rows, manner.header, body, manner.shown, own, first=header.first)
    if repeated is None:
        return cells
    _count(rows, manner.header.height, rows.lines[repeated], cells)
    if marks.beginning:
        aside = {*rows.aside.blank, *rows.aside.remarks, *rows.lines[repeated].tolist()}
        numbers = [first - 1 + number for number in marks.beginning]
        cells.strange_marks = [
            number for number in numbers if number not in aside and number >= manner.header.first
        ]
        cells.account.repaired("byte-order marks within the file", len(numbers), numbers[0])
    begins = [0] if below else []
    # Each header that is taken out moves what is below it up by one.
    begins += (repeated - np.arange(len(repeated))).tolist()
    if len(repeated):
        rows = rows.without(repeated)
    cells.table, cells.lines = rows.table, rows.lines
    cells.below_headers = tuple(dict.fromkeys(begins))
    return cells


def _rows(body: bytes, header: Header, manner: Manner, cells: BlockCells) -> Rows | None:
    """The rows of a block; None where they are uneven, or quote marks are not as they should."""
    if b'"' not in body:
        plain = plain_rows(body, header, manner.wanted)
        if isinstance(plain, Rows):
            return plain
        if not plain.rows:
            raise WholeNeededError
        cells.uneven, cells.refused = plain, True
        return None
    text = body.decode("utf-8")
    places = [header.names.index(name) for name in manner.wanted]
    split = split_quoted(text, header, places, "", Findings())
    straight = split is not None and not split.spanning
    if split is not None and straight and not split.uneven and not manner.loose:
        cells.quotes = cells_open(text, header.separator)
        stray = stray_marks(body, text, header, split)
        if stray:
            cells.stray = Tally(len(stray), stray[0])
        return columns_of(split, text, manner.wanted)
    if not manner.loose:
        cells.crooked = True
        return None
    # Should another block not do even so, what counts is how the standard splits this one.
    cells.bent = split is None or not straight
    if split is not None and split.uneven:
        cells.uneven = Uneven.of(split.uneven, len(split.rows) + len(split.uneven))
    loose = split_loosely(text, header, places, wary=True)
    if loose is not None:
        return columns_of(loose, text, manner.wanted)
    if cells.bent or cells.uneven is None:
        raise WholeNeededError
    cells.refused = True
    return None


def _count(rows: Rows, height: int, repeated: NDArray[np.int32], cells: BlockCells) -> None:
    """Count what became of the lines of a block below the log's header."""
    account = cells.account
    account.total = rows.height
    aside = rows.aside
    for fate, numbers in (("blank lines", aside.blank), ("remarks", aside.remarks)):
        account.line(fate, len(numbers), numbers[0] if numbers else None)
    if len(repeated):
        account.line("repeated headers", len(repeated) * height, int(repeated[0]))
    own = np.setdiff1d(rows.lines, repeated) if len(repeated) else rows.lines
    account.line("rows", len(own), int(own[0]) if len(own) else None)
    counted = sum(tally.count for tally in account.lines.values())
    account.line("further lines of rows", account.total - counted)
    account.repaired("quote marks that were not doubled", rows.mended.count, rows.mended.first_line)
    account.repaired("quote marks in cells without quotes", rows.stray.count, rows.stray.first_line)
    for tally, numbers in ((cells.remarks, aside.remarks), (cells.alike, aside.alike)):
        if numbers:
            tally.add(len(numbers), numbers[0])
