"""Big table logs in blocks: each is read by itself, and a log is what its blocks are together.

What holds for a whole log (its header, its decimal sign, how it quotes cells) is decided from what
all blocks tell of it; where that is not as was taken for granted at first, the blocks concerned are
read again. What is found, counted and told is what it would be if the log were held whole.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Final

from etl.errors import Findings
from etl.files import Cells, FileAccount, RawText
from etl.files.block_cells import BlockCells, Manner, cells_of_block, header_of_blocks
from etl.files.blocks import Survey, text_at, texts
from etl.files.surveying import BLOCK_BYTES, survey
from etl.files.units import own_names
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.header_units import check_units, own_reading, without_unit_rows
from etl.parsers.log_rows import LogRows, RowReading
from etl.parsers.parts import Part, Step

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: How much of a log is looked at for its header, in bytes of text, if it has as much.
_BEGINNING: Final = 1024 * 1024


@dataclass(frozen=True, slots=True)
class BlockLog:
    """A log that is read in blocks; can be pickled.

    Attributes
    ----------
    survey : Survey
        What is known of the file.
    manner : Manner
        How it is split into rows.
    named : dict of str to str
        What the file's name says.
    head : FileAccount
        The account of the lines down to the header.
    """

    survey: Survey
    manner: Manner
    named: dict[str, str]
    head: FileAccount

    def loosely(self) -> BlockLog:
        """The same log, of which cells are split loosely."""
        return replace(self, manner=replace(self.manner, loose=True))


@dataclass(frozen=True, slots=True)
class Reading:
    """How one block is to be read.

    Attributes
    ----------
    place : int
        Which block, from 0.
    below : bool
        Whether its first row stands right below a header.
    decimal : str
        The decimal sign; empty where the block itself tells.
    """

    place: int
    below: bool = False
    decimal: str = ""


@dataclass(slots=True)
class BlockAnswer:
    """What a block holds, and what it tells of the log.

    Attributes
    ----------
    reading : Reading
        How it was read.
    part : Part
        What is found in it.
    note : LogNote
        What is counted in it.
    log : CanonicalLog or None
        Its fixations; None where it has none, or they cannot be used.
    cells : BlockCells
        What is told of its lines, without the cells themselves.
    rows : int
        How many rows it has, rows of units aside.
    ends_below : bool
        Whether the next block begins right below a header.
    """

    reading: Reading
    part: Part
    note: LogNote
    cells: BlockCells
    log: CanonicalLog | None = None
    rows: int = 0
    ends_below: bool = False


def begin_blocks(
    reading: RowReading,
    path: Path,
    shown: str,
    findings: Findings,
    block_bytes: int = BLOCK_BYTES,
) -> BlockLog | None:
    """Find out what must be known of a log before its blocks are read.

    Parameters
    ----------
    reading : RowReading
        How the study's logs are read.
    path : Path
        The log, plain or gzipped.
    shown : str
        Its name for messages.
    findings : Findings
        Where problems are recorded.
    block_bytes : int
        How long blocks are at least.

    Returns
    -------
    BlockLog or None
        None where a problem was recorded.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    ChangedError
        If the file changes.
    """
    logs = reading.logs
    named = reading.named(path, shown, findings)
    made = survey(path, shown, findings, encoding=logs.encoding, block_bytes=block_bytes)
    if made is None or findings.failed:
        return None
    pieces: list[bytes] = []
    length = 0
    for _, piece in texts(made):
        pieces.append(piece)
        length += len(piece)
        if length >= _BEGINNING:
            break
    found = header_of_blocks(
        b"".join(pieces), logs.delimiter, reading.needed(), logs.comment, shown, findings
    )
    if found is None:
        return None
    return BlockLog(made, found[0], named, found[1])


def texts_of(log: BlockLog, places: frozenset[int]) -> Iterator[tuple[int, bytes]]:
    """The texts of some blocks of a log, in order.

    Parameters
    ----------
    log : BlockLog
        The log.
    places : frozenset of int
        Which blocks.

    Yields
    ------
    place : int
        Which block.
    text : bytes
        Its lines.

    Raises
    ------
    ChangedError
        If the file is not the one any more that was surveyed.
    """
    made = log.survey
    if made.alone:
        for place in sorted(places):
            yield place, text_at(made, place)
        return
    for place, (_, text) in enumerate(texts(made)):
        if place in places:
            yield place, text


def read_block(log: BlockLog, reading: RowReading, how: Reading, text: bytes) -> BlockAnswer:
    """Read one block of a log.

    Parameters
    ----------
    log : BlockLog
        The log.
    reading : RowReading
        How the study's logs are read.
    how : Reading
        How the block is to be read.
    text : bytes
        Its text.

    Returns
    -------
    BlockAnswer

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    """
    block, manner = log.survey.blocks[how.place], log.manner
    found = cells_of_block(text, block.first, manner, below=how.below)
    part = Part(how.decimal)
    note = LogNote(manner.shown, account=found.account)
    answer = BlockAnswer(how, part, note, found)
    part.at(Step.HEADERS).extend(found.other_headers)
    if found.table is None:
        return answer
    table, found.table = found.table, None
    every = Cells(
        manner.shown,
        manner.header.names,
        manner.header.line,
        table,
        found.lines,
        manner.header.separator,
        RawText(manner.shown, b"", log.survey.sha256, log.survey.encoding),
        found.account,
        below_headers=found.below_headers,
    )
    cells = without_unit_rows(reading, every, part.at(Step.UNITS))
    answer.ends_below = _ends_below(found, cells.lines)
    answer.rows = len(cells)
    found.lines = found.lines[:0]
    if not len(cells):
        return answer
    note.account.move("rows", "fixations", len(cells), int(cells.lines[0]))
    columns = {name: cells.column(name) for name in cells.table.column_names}
    own = own_names(reading.needed(), cells.header)
    columns |= {asked: columns[name] for asked, name in own.items()}
    own_way = own_reading(reading, cells.header)
    rows = LogRows(columns, cells.lines)
    answer.log = own_way.canonical(rows, log.named, note, part.at(Step.ASKED), part)
    return answer


def _ends_below(found: BlockCells, left: NDArray[np.int32]) -> bool:
    """Whether no row is left below the last header that stands in or right above a block."""
    if not found.below_headers:
        return False
    start = found.below_headers[-1]
    return start >= len(found.lines) or not bool((left >= found.lines[start]).any())


def head_findings(log: BlockLog, reading: RowReading) -> Findings:
    """What is wrong with the units that a log's header names.

    Parameters
    ----------
    log : BlockLog
        The log.
    reading : RowReading
        How the study's logs are read.

    Returns
    -------
    Findings
    """
    findings = Findings()
    header = log.manner.header
    check_units(reading, header.names, (log.manner.shown, header.line), findings)
    return findings
