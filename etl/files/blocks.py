"""Big text files in blocks: cut at line ends, so that none is ever held whole in memory.

A file is surveyed once from its beginning to its end: its digest, its encoding, where blocks begin
and with which line. The text of a block is read a second time, and is held against the survey, so
that what is digested is what is understood.
"""

from __future__ import annotations

import gzip
import hashlib
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from etl.files.pieces import HashedFile, decoded_wide, first_of, unpacked
from etl.files.steady import ChangedError, Sight, steady
from etl.files.text_encodings import PROBE_BYTES
from etl.files.text_faults import plain_name, with_plain_line_ends

MARK: Final = b"\xef\xbb\xbf"


@dataclass(frozen=True, slots=True)
class Block:
    """Consecutive whole lines of a file.

    Attributes
    ----------
    start, stop : int
        Where they stand in the unpacked bytes; of wide encodings, in the text in UTF-8.
    first : int
        The number of the first line, from 1.
    height : int
        How many lines there are.
    digest : bytes
        Of these bytes.
    """

    start: int
    stop: int
    first: int
    height: int
    digest: bytes


@dataclass(frozen=True, slots=True)
class Survey:
    """What was found out about a whole file before its blocks are read.

    Attributes
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    sight : Sight
        In which state it is.
    sha256 : str
        Digest of the file as it lies on the disk, in hex.
    encoding : str
        The encoding it is read with.
    packed : bool
        Whether it is gzipped.
    wide : bool
        Whether the encoding has line ends of more than one byte.
    blocks : tuple of Block
        In the order of the file.
    ends_open : bool
        Whether the last line has no line end.
    marked : bool
        Whether a byte-order mark stands anywhere but at the beginning.
    """

    path: Path
    shown: str
    sight: Sight
    sha256: str
    encoding: str
    packed: bool
    wide: bool
    blocks: tuple[Block, ...]
    ends_open: bool = False
    marked: bool = False

    @property
    def alone(self) -> bool:
        """Whether each block can be read without those before it."""
        return not (self.packed or self.wide)


def texts(made: Survey) -> Iterator[tuple[Block, bytes]]:
    """All blocks of a file, one after the other.

    Parameters
    ----------
    made : Survey
        From :func:`survey`.

    Yields
    ------
    block : Block
        Which one.
    text : bytes
        In UTF-8, without the byte-order mark at the file's beginning, every line end a line feed.

    Raises
    ------
    ChangedError
        If the file is not the one that was surveyed.
    OSError
        If it cannot be read.
    """
    for block, raw in raw_blocks(made):
        yield block, _text(made, block, raw)


def beginning_of(path: Path, most: int = 2 * 1024 * 1024) -> bytes:
    """The first bytes of a text file, unpacked where it is gzipped, up to a line end.

    Parameters
    ----------
    path : Path
        The file.
    most : int
        About how many bytes.

    Returns
    -------
    bytes
        Empty where it cannot be read, which is told by whoever reads it all.
    """
    try:
        with path.open("rb") as file:
            packed = file.read(2) == b"\x1f\x8b"
            file.seek(0)
            chunks = unpacked(HashedFile(file), packed=packed)
            begun = b"".join(first_of(chunks, most))
    except (OSError, EOFError, zlib.error):
        return b""
    if b"\x00" in begun[:PROBE_BYTES]:
        return begun[: len(begun) // 4 * 4]  # letters of two or four bytes
    return begun[: begun.rfind(b"\n") + 1] or begun


def text_at(made: Survey, place: int) -> bytes:
    """The text of one block, without reading those before it.

    Parameters
    ----------
    made : Survey
        Of a file whose blocks can be read alone.
    place : int
        Which block, from 0.

    Returns
    -------
    bytes
        As from :func:`texts`.

    Raises
    ------
    ChangedError
        If the file is not the one that was surveyed.
    OSError
        If it cannot be read.
    """
    block = made.blocks[place]
    with steady(made.path, made.sight) as (file, _):
        file.seek(block.start)
        raw = file.read(block.stop - block.start)
    _hold(block, raw)
    return _text(made, block, raw)


def raw_blocks(made: Survey) -> Iterator[tuple[Block, bytes]]:
    """All blocks as they are cut."""
    with steady(made.path, made.sight) as (file, _):
        chunks = unpacked(HashedFile(file), packed=made.packed)
        if made.wide:
            chunks = decoded_wide(chunks, made.encoding)
        held = bytearray()
        for block in made.blocks:
            length = block.stop - block.start
            while len(held) < length:
                try:
                    chunk = next(chunks, b"")
                except (EOFError, gzip.BadGzipFile, zlib.error):
                    chunk = b""  # it could be unpacked when it was surveyed
                if not chunk:
                    raise ChangedError
                held += chunk
            raw = bytes(held[:length])
            del held[:length]
            _hold(block, raw)
            yield block, raw


def _hold(block: Block, raw: bytes) -> None:
    """Hold the bytes of a block against those that were surveyed."""
    if digest_of(raw) != block.digest:
        raise ChangedError


def digest_of(raw: bytes) -> bytes:
    """The digest of a block."""
    return hashlib.sha256(raw).digest()


def _text(made: Survey, block: Block, raw: bytes) -> bytes:
    """The text of a block whose bytes are known to be valid."""
    if made.wide:
        text = raw
    elif plain_name(made.encoding) in ("utf8", "utf8sig"):
        text = raw.removeprefix(MARK) if block.start == 0 else raw
    elif raw.isascii():
        text = raw
    else:
        text = raw.decode(made.encoding).encode("utf-8")
    return with_plain_line_ends(text) if b"\r" in text else text
