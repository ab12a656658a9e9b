"""Logs as damage sees them: lines, rows of cells, and what each cell means, whatever the kind."""

from __future__ import annotations

import csv
import gzip
import io
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

from tests.simulator.dialects.recorded import RecordedStudy
from tests.simulator.dialects.tables import zipped


@dataclass(frozen=True, slots=True)
class Link:
    """A symbolic link to another name in the same folder."""

    target: str


#: No two onsets of a trial are as far apart, and those of two trials always are.
_BETWEEN_TRIALS_MS = 2000


#: Every file of a study by its name; None for a folder without files.
Files = dict[str, bytes | Link | None]


@dataclass(frozen=True, slots=True)
class LogKind:
    """A kind of log, and the study that is written in it.

    Attributes
    ----------
    name : str
        What it is called in reports.
    write : callable
        Writes a study of this kind into a folder and gives the study file.
    log : str
        A regular expression for the names of logs.
    columns : mapping of str to int
        Where each thing stands in a row: participant, trial, item, number, onset, duration, end,
        x, y, label, blink.
    separator : str
        What separates cells.
    row : str
        A regular expression that lines with rows begin with.
    encoding : str
        A Python codec.
    header : int
        How many lines stand above the first row.
    quoted : bool
        Whether cells stand in quotes, quote marks inside them doubled.
    aligned : bool
        Whether runs of blanks separate cells.
    trial_start : str
        A regular expression for lines between rows that say that a trial begins.
    apart : bool
        Whether trials are told apart by the time between them alone.
    by_itself : bool
        Whether each such file is a log by itself, and none that belongs to one.
    """

    name: str
    write: Callable[[RecordedStudy, Path], Path]
    log: str
    columns: Mapping[str, int]
    separator: str = "\t"
    row: str = ""
    encoding: str = "utf-8"
    header: int = 1
    quoted: bool = False
    aligned: bool = False
    trial_start: str = ""
    apart: bool = False
    by_itself: bool = True

    def logs(self, files: Files) -> list[str]:
        """The names of the logs among the files."""
        return sorted(name for name in files if re.fullmatch(self.log, name))

    def read(self, name: str, files: Files) -> Log:
        """One log in lines."""
        return Log.of(self, unzipped(content_of(files, name)))

    def packed(self, name: str, content: bytes) -> bytes:
        """The content of a log as it lies on the disk."""
        return zipped(content) if name.endswith(".gz") else content


def content_of(files: Files, name: str) -> bytes:
    """The bytes of a file that is one."""
    content = files[name]
    assert isinstance(content, bytes), f"{name} is no file of its own"
    return content


def unzipped(content: bytes) -> bytes:
    """The bytes inside a gzip file, or the bytes as they are."""
    return gzip.decompress(content) if content.startswith(b"\x1f\x8b") else content


@dataclass(slots=True)
class Log:
    """The lines of a log, to be changed in place."""

    kind: LogKind
    lines: list[str]

    @classmethod
    def of(cls, kind: LogKind, content: bytes) -> Log:
        """Take a log's bytes apart; every line ends in a line feed."""
        return cls(kind, content.decode(kind.encoding).removesuffix("\n").split("\n"))

    def content(self) -> bytes:
        """The bytes of the log."""
        return ("\n".join(self.lines) + "\n").encode(self.kind.encoding)

    def rows(self) -> list[int]:
        """Which lines are rows of fixations (or samples)."""
        return [
            number
            for number, line in enumerate(self.lines)
            if number >= self.kind.header and re.match(self.kind.row, line)
        ]

    def cells(self, number: int) -> list[str]:
        """The cells of a line, without the quotes around them."""
        line = self.lines[number]
        if self.kind.quoted:
            return next(csv.reader([line]))
        return line.split() if self.kind.aligned else line.split(self.kind.separator)

    def put(self, number: int, cells: list[str]) -> None:
        """Write the cells of a line."""
        self.lines[number] = self.joined(cells)

    def joined(self, cells: list[str]) -> str:
        """Cells as a line; in a quoted log those that are no plain numbers stand in quotes."""
        if self.kind.aligned:
            return "".join(cell.rjust(max(len(cell), 8) + 1) for cell in cells)
        if not self.kind.quoted:
            return self.kind.separator.join(cells)
        buffer = io.StringIO()
        writer = csv.writer(buffer, lineterminator="", quoting=csv.QUOTE_ALL)
        writer.writerow(cells)
        return buffer.getvalue()

    def has(self, *facts: str) -> bool:
        """Whether the rows of this kind of log have all of these."""
        return all(fact in self.kind.columns for fact in facts)

    def cell(self, number: int, fact: str) -> str:
        """What a row says of something."""
        return self.cells(number)[self.kind.columns[fact]]

    def set(self, number: int, fact: str, text: str) -> None:
        """Let a row say something else."""
        cells = self.cells(number)
        cells[self.kind.columns[fact]] = text
        self.put(number, cells)

    def trial_blocks(self) -> list[list[int]]:
        """The rows of each trial, in the order of the log; one block where rows do not say."""
        blocks: list[list[int]] = []
        before: tuple[str, ...] | None = None
        last = -1
        keys = [fact for fact in ("participant", "trial") if fact in self.kind.columns]
        for number in self.rows():
            key = tuple(self.cell(number, fact) for fact in keys)
            begins = self._tell_apart(self.lines[last + 1 : number]) or self._far(last, number)
            if key != before or begins:
                blocks.append([])
            blocks[-1].append(number)
            before, last = key, number
        return blocks

    def _far(self, last: int, number: int) -> bool:
        """Whether so much time lies between two rows that they are of two trials."""
        if not self.kind.apart or last < 0:
            return False
        return int(self.cell(number, "onset")) - int(self.cell(last, "onset")) > _BETWEEN_TRIALS_MS

    def _tell_apart(self, lines: list[str]) -> bool:
        """Whether one of the lines between two rows says that a trial begins."""
        start = self.kind.trial_start
        return bool(start) and any(re.match(start, line) for line in lines)
