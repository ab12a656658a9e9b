"""The bytes of a file piece by piece: unpacked, digested, and cut at line ends."""

from __future__ import annotations

import codecs
import gzip
import hashlib
from collections.abc import Iterable, Iterator
from typing import BinaryIO, Final, cast

from etl.files.text_faults import REVERSED_MARK

#: How much is read at once.
_CHUNK_BYTES: Final = 1024 * 1024


class WholeNeededError(Exception):
    """What is the matter with a file can only be told when it is read as a whole."""


class HashedFile:
    """An open file whose bytes are digested as they are read."""

    def __init__(self, file: BinaryIO) -> None:
        self._file = file
        self._digest = hashlib.sha256()

    def begins_with(self, signature: bytes) -> bool:
        """Whether the file begins so; nothing is taken from it."""
        found = self._file.read(len(signature)) == signature
        self._file.seek(0)
        return found

    def read(self, size: int = -1) -> bytes:
        """Read on."""
        chunk = self._file.read(size)
        self._digest.update(chunk)
        return chunk

    def finish(self) -> str:
        """The digest of the whole file."""
        while self.read(_CHUNK_BYTES):
            pass
        return self._digest.hexdigest()


def unpacked(source: HashedFile, *, packed: bool) -> Iterator[bytes]:
    """The bytes of a file, unpacked where they are packed."""
    file = gzip.GzipFile(fileobj=cast(BinaryIO, source), mode="rb") if packed else source
    while chunk := file.read(_CHUNK_BYTES):
        yield chunk


def first_of(chunks: Iterator[bytes], size: int) -> Iterator[bytes]:
    """The first chunks, which have so many bytes together."""
    while size > 0 and (chunk := next(chunks, b"")):
        size -= len(chunk)
        yield chunk


def begun_with(prefix: bytes, chunks: Iterator[bytes]) -> Iterator[bytes]:
    """The chunks of a file, of which the first ones were taken already."""
    if prefix:
        yield prefix
    yield from chunks


def decoded_wide(chunks: Iterable[bytes], encoding: str | None) -> Iterator[bytes]:
    """Text of a wide encoding in UTF-8; nothing may be wrong with it."""
    decoder = codecs.getincrementaldecoder(encoding or "utf-8")()
    begun = False

    def encoded(letters: str) -> bytes:
        if REVERSED_MARK in letters:
            raise WholeNeededError
        return letters.encode("utf-8")

    try:
        for chunk in chunks:
            letters = decoder.decode(chunk)
            if letters and not begun:
                letters, begun = letters.removeprefix("\ufeff"), True
            if letters:
                yield encoded(letters)
        rest = decoder.decode(b"", final=True)
        if rest:
            yield encoded(rest)
    except UnicodeError:
        raise WholeNeededError from None


def cut_at_line_ends(chunks: Iterable[bytes], block_bytes: int) -> Iterator[bytes]:
    """Bytes of text in pieces that end with the first line end at or beyond a length."""
    held = bytearray()
    sought = block_bytes - 1
    for chunk in chunks:
        held += chunk
        while len(held) > sought:
            stop = _after_line_end(held, sought)
            if stop is None:
                # All but the last byte, which may be half a line end, was looked at in vain.
                sought = max(sought, len(held) - 1)
                break
            yield bytes(held[:stop])
            del held[:stop]
            sought = block_bytes - 1
    if held:
        yield bytes(held)


def _after_line_end(held: bytearray, sought: int) -> int | None:
    """Where the first line end at or after a place is over; None where it is not known yet."""
    feed = held.find(b"\n", sought)
    back = held.find(b"\r", sought, feed if feed >= 0 else len(held))
    if back < 0:
        return feed + 1 if feed >= 0 else None
    if back + 1 == len(held):
        return None
    return back + (2 if held[back + 1] == ord("\n") else 1)
