"""Logs that are tables: delimited text with one fixation a row."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from etl.errors import Findings
from etl.files import Cells, cells_of, header_of, read_text
from etl.files.blocks import beginning_of
from etl.files.decoding import text_of
from etl.files.surveying import BIG_BYTES, BLOCK_BYTES, may_be_big
from etl.files.units import own_names
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.header_units import check_units, own_reading, without_unit_rows
from etl.parsers.line_order import in_line_order
from etl.parsers.log_rows import LogRows, RowReading
from etl.parsers.table_blocks import BlockLog, begin_blocks


@dataclass(frozen=True, slots=True)
class TableReader:
    """Reads one table log after another by the study's description.

    Attributes
    ----------
    reading : RowReading
        How rows become fixations.
    big_bytes, block_bytes : int
        From which size on a log is read in blocks, and how long these are.
    """

    reading: RowReading
    big_bytes: int = BIG_BYTES
    block_bytes: int = BLOCK_BYTES

    #: Nothing but the log itself says what is in it.
    reads_one_file = True

    def header(self, path: Path) -> tuple[str, ...]:
        """The columns of a log; empty where it cannot be read, which is told when it is read."""
        logs = self.reading.logs
        if may_be_big(path, self.big_bytes):
            text = text_of(beginning_of(path), path.name, Findings(), encoding=logs.encoding)
        else:
            text = read_text(path, path.name, Findings(), encoding=logs.encoding)
        if text is None:
            return ()
        needed = self.reading.needed()
        return header_of(text, logs.delimiter, needed=needed, remarks=logs.comment)

    def read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log.

        Parameters
        ----------
        path : Path
            The file, plain or gzipped.
        shown : str
            Its name for messages.
        findings : Findings
            Where problems are recorded, each with its line.

        Returns
        -------
        CanonicalLog and LogNote, or None
            None where a problem was recorded.
        """
        return in_line_order(lambda own: self._read(path, shown, own), findings)

    def is_big(self, path: Path) -> bool:
        """Whether a log is to be read in blocks.

        Parameters
        ----------
        path : Path
            The log.

        Returns
        -------
        bool
            Never for gaze samples: those of a trial belong together, and all tell of the rate.
        """
        return self.reading.logs.samples is None and may_be_big(path, self.big_bytes)

    def begin(self, path: Path, shown: str, findings: Findings) -> BlockLog | None:
        """Find out what must be known of a big log before its blocks are read.

        Parameters
        ----------
        path : Path
            The file, plain or gzipped.
        shown : str
            Its name for messages.
        findings : Findings
            Where problems are recorded.

        Returns
        -------
        BlockLog or None
            None where a problem was recorded.

        Raises
        ------
        WholeNeededError
            If something is the matter that is told from the whole log.
        ChangedError
            If the log changes.
        """
        return begin_blocks(self.reading, path, shown, findings, self.block_bytes)

    def _read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log; what is wrong is recorded as it is found."""
        logs = self.reading.logs
        named = self.reading.named(path, shown, findings)
        text = read_text(path, shown, findings, encoding=logs.encoding, tell_guess=False)
        if text is None or findings.failed:
            return None
        cells = cells_of(
            text,
            findings,
            delimiter=logs.delimiter,
            needed=self.reading.needed(),
            wary=True,
            remarks=logs.comment,
        )
        if cells is None:
            return None
        check_units(self.reading, cells.header, (shown, cells.header_line), findings)
        cells = without_unit_rows(self.reading, cells, findings)
        if not len(cells):
            findings.error(
                "the log has a header but no fixation",
                path=shown,
                line=cells.header_line,
                fix="remove the file from the folder, or copy it again",
            )
            return None
        note = _note_of(cells)
        columns = {name: cells.column(name) for name in cells.table.column_names}
        # Facts and [logs.where] go by the names of the study, which may leave a unit out.
        own = own_names(self.reading.needed(), cells.header)
        columns |= {asked: columns[name] for asked, name in own.items()}
        rows = LogRows(columns, cells.lines)
        reading = own_reading(self.reading, cells.header)
        log = reading.canonical(rows, named, note, findings)
        return None if log is None else (log, note)


def _note_of(cells: Cells) -> LogNote:
    """What is told about a log before its rows are understood."""
    note = LogNote(
        cells.shown,
        cells.text.sha256,
        cells.text.encoding,
        cells.delimiter,
        columns=cells.header,
        account=cells.account,
        ends_open=cells.ends_open,
    )
    if cells.comments:
        note.counts["comment lines below the header"] = cells.comments
    if cells.comments_like_rows:
        note.counts["comment lines like rows"] = cells.comments_like_rows
    note.account.move("rows", "fixations", len(cells), int(cells.lines[0]))
    return note
