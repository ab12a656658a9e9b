"""A folder put in the place of another in one step, and safe from a power cut before that."""

from __future__ import annotations

import contextlib
import ctypes
import errno
import os
import shutil
import stat
import sys
import time
from collections.abc import Callable
from pathlib import Path

#: Of ``renameat2`` on Linux and ``renamex_np`` on macOS: the two change places. Both are 2.
_SWAP = 2
#: Paths are as seen from the working folder.
_AT_FDCWD = -100
#: What is said where kernel or file system cannot do it.
_CANNOT = {errno.ENOSYS, errno.EINVAL, errno.ENOTSUP, errno.EOPNOTSUPP, errno.EXDEV}
#: How long a folder is tried to be removed: a worker of a killed build may write for a moment yet.
_PATIENCE_S = 3.0
_PAUSE_S = 0.05


def exchange(one: Path, other: Path) -> bool:
    """Let two folders change places in one step.

    Parameters
    ----------
    one, other : Path
        Folders on one file system.

    Returns
    -------
    bool
        False where system or file system cannot do it; nothing was done then.

    Raises
    ------
    OSError
        If it may not be done.
    """
    call = _exchanging()
    if call is None:
        return False
    ctypes.set_errno(0)
    if call(os.fsencode(one), os.fsencode(other)) == 0:
        return True
    number = ctypes.get_errno()
    if number in _CANNOT:
        return False
    raise OSError(number, os.strerror(number), str(one), None, str(other))


def _exchanging() -> Callable[[bytes, bytes], int] | None:
    """The system's call for two folders to change places, if it has one."""
    if sys.platform not in ("linux", "darwin"):
        return None
    try:
        library = ctypes.CDLL(None, use_errno=True)
        call = library.renameat2 if sys.platform == "linux" else library.renamex_np
    except (OSError, AttributeError):
        return None
    path, number = ctypes.c_char_p, ctypes.c_int
    call.restype = number
    if sys.platform == "linux":
        call.argtypes = [number, path, number, path, ctypes.c_uint]
        return lambda one, other: int(call(_AT_FDCWD, one, _AT_FDCWD, other, _SWAP))
    call.argtypes = [path, path, ctypes.c_uint]
    return lambda one, other: int(call(one, other, _SWAP))


def replace_folder(fresh: Path, target: Path, aside: Path, keep: Callable[[Path], None]) -> None:
    """Put a folder in another's place.

    Parameters
    ----------
    fresh : Path
        The new folder. Where the two could change places, the old one is there afterwards.
    target : Path
        The place, in which there may be nothing.
    aside : Path
        Where the old folder goes otherwise.
    keep : callable
        Raises if the old folder, now out of reach of people, may not be removed: all is put back
        then.

    Raises
    ------
    OSError
        If the system refuses; the old folder is in its place then.
    """
    if not target.exists():
        fresh.replace(target)
        return
    if exchange(fresh, target):
        try:
            keep(fresh)
        except BaseException:  # an interruption too
            exchange(fresh, target)
            raise
        return
    target.replace(aside)
    try:
        keep(aside)
        fresh.replace(target)
    except BaseException:  # an interruption too
        if not target.exists():
            aside.replace(target)
        raise


def to_disk(folder: Path) -> None:
    """Wait until everything in a folder is on the disk, so that a power cut leaves no empty file.

    Parameters
    ----------
    folder : Path
        Folders in it included.

    Raises
    ------
    OSError
        If the disk is full or broken, which some file systems notice only now.
    """
    for path in sorted(folder.rglob("*")):
        if path.is_dir():
            names_to_disk(path)
        else:
            _sync(path, os.O_RDWR if os.name == "nt" else os.O_RDONLY)
    names_to_disk(folder)


def names_to_disk(folder: Path) -> None:
    """Wait until the names in a folder are on the disk, where the system can say so.

    Parameters
    ----------
    folder : Path
        The folder.
    """
    if os.name == "nt":
        return  # folders cannot be opened there; NTFS keeps a journal of names
    try:
        _sync(folder, os.O_RDONLY)
    except OSError as why:
        if why.errno not in (errno.EINVAL, errno.ENOTSUP, errno.EBADF):
            raise


def _sync(path: Path, how: int) -> None:
    """Wait until one file is on the disk."""
    descriptor = os.open(path, how)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def clear(folder: Path) -> None:
    """Remove a folder of ours with all that is in it, as far as that is possible.

    Parameters
    ----------
    folder : Path
        The folder.
    """
    until = time.monotonic() + _PATIENCE_S
    while True:
        shutil.rmtree(folder, ignore_errors=True)
        if not folder.exists() or time.monotonic() > until:
            return
        # An earlier build may have been made read-only.
        for path in (folder, *folder.rglob("*")):
            with contextlib.suppress(OSError):
                if path.is_dir() and not path.is_symlink():
                    path.chmod(stat.S_IRWXU)
                elif os.name == "nt":
                    path.chmod(stat.S_IREAD | stat.S_IWRITE)
        time.sleep(_PAUSE_S)
