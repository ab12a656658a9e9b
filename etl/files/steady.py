"""Files that stay as they are while they are read: none is taken over in part."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO


class ChangedError(OSError):
    """A file is not the one any more that it was when its reading began."""


@dataclass(frozen=True, slots=True)
class Sight:
    """What tells one state of a file from another.

    Attributes
    ----------
    size : int
        In bytes.
    mtime_ns : int
        When it was last written to, in nanoseconds.
    identity : tuple of two int
        Disk and number of the file; zeros where the system has none.
    """

    size: int
    mtime_ns: int
    identity: tuple[int, int]

    @classmethod
    def of(cls, file: BinaryIO) -> Sight:
        """The state of an open file."""
        status = os.fstat(file.fileno())
        return cls(status.st_size, status.st_mtime_ns, (status.st_dev, status.st_ino))


@contextmanager
def steady(path: Path, expected: Sight | None = None) -> Iterator[tuple[BinaryIO, Sight]]:
    """Open a file for reading that must not change until it is closed.

    Parameters
    ----------
    path : Path
        The file.
    expected : Sight, optional
        What it was when it was read before.

    Yields
    ------
    file : binary file
        At its beginning.
    sight : Sight
        What it is.

    Raises
    ------
    ChangedError
        When it is opened and is not what was expected; or when it is closed, and was written to,
        cut or replaced since. What was read is of no use then.
    """
    with path.open("rb") as file:
        before = Sight.of(file)
        if expected is not None and before != expected:
            raise ChangedError
        yield file, before
        if Sight.of(file) != before:
            raise ChangedError
        # Another file that was put in its place leaves the open one as it was.
        try:
            now = path.stat()
        except FileNotFoundError:
            raise ChangedError from None
        if now.st_ino and now.st_ino != before.identity[1]:
            raise ChangedError


def read_steady(path: Path) -> bytes:
    """All bytes of a file.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    bytes

    Raises
    ------
    OSError
        If it cannot be read; :class:`ChangedError` if it changes on the way.
    """
    with steady(path) as (file, sight):
        stored = file.read()
        if sight.size and len(stored) != sight.size:  # a pipe has no size
            raise ChangedError
    return stored
