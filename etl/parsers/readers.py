"""Which reader reads the logs of a study, by their kind."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final, Protocol

from etl.errors import Findings
from etl.files.surveying import BIG_BYTES, BLOCK_BYTES
from etl.parsers.bids_log import BidsReader, is_recording, lines_of
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.event_log import EventReader
from etl.parsers.eyes import EyeChoice
from etl.parsers.log_rows import RowReading
from etl.parsers.table_log import TableReader
from etl.pseudonyms import Pseudonyms

if TYPE_CHECKING:
    from etl.study.models import Logs, Screen


#: From which size on a table is read in blocks, and how long these are, in bytes of text.
SIZES: Final = (BIG_BYTES, BLOCK_BYTES)


class LogReader(Protocol):
    """Reads one log after another; can be pickled, for workers of any kind."""

    @property
    def reads_one_file(self) -> bool:
        """Whether nothing but the log itself says what is in it."""
        ...

    def header(self, path: Path) -> tuple[str, ...]:
        """What a log can say about trials by name; empty where it cannot be read."""
        ...

    def read(
        self, path: Path, shown: str, findings: Findings
    ) -> tuple[CanonicalLog, LogNote] | None:
        """Read one log; None where a problem was recorded."""
        ...


def reader_for(
    logs: Logs,
    screen: Screen | None,
    facts: tuple[str, ...] = (),
    eyes: EyeChoice | None = None,
    pseudonyms: Pseudonyms | None = None,
) -> LogReader:
    """The reader for a study's logs.

    Parameters
    ----------
    logs : Logs
        The study's ``[logs]``.
    screen : Screen or None
        The study's ``[screen]``.
    facts : tuple of str
        Headers of facts about trials that are taken from the logs.
    eyes : EyeChoice, optional
        Which eye counts for each reader, where both were recorded.
    pseudonyms : Pseudonyms, optional
        What gives pseudonyms in place of readers' ids, where the study asks for them.

    Returns
    -------
    LogReader
        Reads a log of that kind.
    """
    eyes = eyes or EyeChoice.of(logs, pseudonyms=pseudonyms)
    reading = RowReading(logs, screen, facts, eyes, pseudonyms)
    if logs.kind == "bids":
        return BidsReader(reading)
    return EventReader(reading) if logs.kind == "events" else TableReader(reading, *SIZES)


def is_log(kind: str, path: Path) -> bool:
    """Whether a file that the study's patterns find is a log of its own.

    Parameters
    ----------
    kind : {"table", "events", "bids"}
        The kind of the study's logs.
    path : Path
        The file.

    Returns
    -------
    bool
        False for what belongs to a log, such as its sidecar.
    """
    return path.is_file() and (kind != "bids" or is_recording(path))


def counted_file(logs: Logs, path: Path) -> Path:
    """The file whose lines are those of a log's fixations, by which the log is called.

    Parameters
    ----------
    logs : Logs
        The study's ``[logs]``.
    path : Path
        The log.

    Returns
    -------
    Path
        The log itself, but for recordings that keep their fixations in a file beside them.
    """
    return path if logs.kind != "bids" else lines_of(path, from_samples=logs.samples is not None)
