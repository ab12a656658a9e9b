"""The beginning of each log: as much of it as tells how it is written."""

from __future__ import annotations

import gzip
import zlib
from dataclasses import dataclass
from pathlib import Path

from etl.errors import Findings
from etl.files.decoding import RawText, read_text, text_of

#: How much of all logs together is looked at, and of each at least and at most, in bytes. The
#: numbers are our choice: enough rows for every trial of one reader, seconds for hundreds of logs.
_ALL_BYTES = 48_000_000
_LEAST_BYTES = 100_000
_MOST_BYTES = 4_000_000
_LINE_ENDS = {
    "utf-16": (b"\n\x00", 2),
    "utf-16-le": (b"\n\x00", 2),
    "utf-16-be": (b"\x00\n", 2),
    "utf-32": (b"\n\x00\x00\x00", 4),
}
_GZIP = b"\x1f\x8b"


@dataclass(frozen=True, slots=True)
class Head:
    """The beginning of a log.

    Attributes
    ----------
    path : Path
        The log.
    shown : str
        Its name for messages.
    text : RawText
        What was read of it, whole lines only.
    whole : bool
        Whether that is all of it.
    """

    path: Path
    shown: str
    text: RawText
    whole: bool

    def lines(self) -> list[str]:
        """The lines."""
        return self.text.data.decode("utf-8").removesuffix("\n").split("\n")


def share_of_each(logs: int) -> int:
    """How many bytes are looked at of each of so many logs.

    Examples
    --------
    >>> share_of_each(1), share_of_each(48), share_of_each(4000)
    (4000000, 1000000, 100000)
    """
    return max(_LEAST_BYTES, min(_MOST_BYTES, _ALL_BYTES // max(logs, 1)))


def read_head(path: Path, shown: str, most_bytes: int, findings: Findings) -> Head | None:
    """Read the beginning of a log, plain or gzipped.

    Parameters
    ----------
    path : Path
        The log.
    shown : str
        Its name for messages.
    most_bytes : int
        How much to read of it.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Head or None
        None where a problem was recorded.
    """
    try:
        with path.open("rb") as file:
            stored = file.read(most_bytes + 1)
    except OSError:
        stored = b""
    data = _begun(stored, most_bytes)
    if data is None:
        # Short or faulty: read as a build reads it, which also says what is wrong.
        text = read_text(path, shown, findings)
        return None if text is None else Head(path, shown, text, whole=True)
    text = text_of(_whole_lines(data), shown, findings)
    return None if text is None else Head(path, shown, text, whole=False)


def _begun(stored: bytes, most_bytes: int) -> bytes | None:
    """The beginning of a text of which there is more; None where there is no more, or a fault."""
    if not stored.startswith(_GZIP):
        return stored[:most_bytes] if len(stored) > most_bytes else None
    try:
        data = zlib.decompressobj(wbits=31).decompress(stored, most_bytes + 1)
    except (zlib.error, gzip.BadGzipFile):
        return None
    return data[:most_bytes] if len(data) > most_bytes else None


def _whole_lines(data: bytes) -> bytes:
    """The text up to its last line end, so that neither a row nor a letter is cut."""
    end, width = b"\n", 1
    probe = data[:4096]
    if probe[:4] == b"\xff\xfe\x00\x00":
        end, width = _LINE_ENDS["utf-32"]
    elif probe[:2] == b"\xff\xfe" or probe[1::2].count(0) > len(probe) // 4:
        end, width = _LINE_ENDS["utf-16"]
    elif probe[:2] == b"\xfe\xff" or probe[0::2].count(0) > len(probe) // 4:
        end, width = _LINE_ENDS["utf-16-be"]
    data = data[: len(data) - len(data) % width]
    at = data.rfind(end)
    while at >= 0 and at % width:
        at = data.rfind(end, 0, at)
    if at < 0 and width == 1:
        at = data.rfind(b"\r")
    if at >= 0:
        return data[: at + width]
    # One line without an end: cut where no letter of UTF-8 can be halved.
    while data and width == 1 and data[-1] >= 0x80:
        data = data[:-1]
    return data
