"""One build at a time into a folder: a claim beside it, which vanishes with its process.

The claim is a small hidden file that is locked by the operating system for as long as the build
lives; a lock goes with its process however that ends, and holds on a file system that several
computers share. Whoever gets the lock knows that everything left beside the folder is of dead
builds. Where a file system has no locks, the file itself is the claim: one of this computer is
void when its process is gone, one of another computer stands until somebody deletes it.
"""

from __future__ import annotations

import contextlib
import json
import os
import socket
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

from etl.errors import DataError, Findings
from etl.export.tidying import despite_interruption
from etl.export.unwritable import NAME_ANOTHER

#: How long a lock is tried for that another process may hold just to look.
_PATIENCE_S = 0.3
_PAUSE_S = 0.02
_TRIES = 2
#: What this process has claimed, for file systems without locks.
_OURS: set[Path] = set()

if sys.platform == "win32":
    import msvcrt

    #: Locks are obstacles to readers there, so a byte is locked that the file does not have.
    _FAR = 1 << 30

    def _lock(descriptor: int) -> bool | None:
        """Lock an open file: True if got, False if another has it, None if there are no locks."""
        os.lseek(descriptor, _FAR, os.SEEK_SET)
        try:
            msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
        except PermissionError:
            return False
        except OSError:
            return None
        return True
else:
    import fcntl

    def _lock(descriptor: int) -> bool | None:
        """Lock an open file: True if got, False if another has it, None if there are no locks."""
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except (BlockingIOError, PermissionError):
            return False
        except OSError:
            return None
        return True


@dataclass(slots=True)
class _Held:
    """A claim of this process."""

    path: Path
    descriptor: int
    open: bool = True

    def release(self) -> None:
        """Remove the claim; on Windows a file can be removed only once it is closed."""
        _OURS.discard(self.path)
        if os.name == "nt":
            self._close()
        for _ in range(_TRIES):
            with contextlib.suppress(OSError):
                self.path.unlink(missing_ok=True)
                break
        self._close()

    def _close(self) -> None:
        """Close the file, once."""
        if self.open:
            self.open = False
            os.close(self.descriptor)


def claim_of(target: Path) -> Path:
    """The file by which a folder is claimed.

    Parameters
    ----------
    target : Path
        An output folder.

    Returns
    -------
    Path
        A hidden file beside it.
    """
    return target.parent / f".{target.name}.trialwright-lock"


@contextlib.contextmanager
def claimed(target: Path, shown: str) -> Iterator[None]:
    """Hold a folder for this build alone.

    Parameters
    ----------
    target : Path
        The output folder, links followed; the folder that is to hold it must be there.
    shown : str
        Its name for messages.

    Yields
    ------
    None

    Raises
    ------
    DataError
        If another build writes into it, or into a folder that holds it.
    OSError
        If no file can be made beside it.
    """
    refuse_within_claimed(target, shown)
    held = _take(target, shown)
    try:
        # Again: another build may have claimed a folder above between the first look and now.
        refuse_within_claimed(target, shown)
        yield
    finally:
        despite_interruption(held.release)


def refuse_within_claimed(target: Path, shown: str) -> None:
    """Refuse a folder within one that another build is about to replace.

    Parameters
    ----------
    target : Path
        The output folder, links followed.
    shown : str
        Its name for messages.

    Raises
    ------
    DataError
        If a folder that holds it is claimed.
    """
    for folder in target.parents:
        path = claim_of(folder)
        # The root of a disk holds everything, and nothing is beside it.
        if folder.name and path.is_file() and _is_held(path):
            raise _refusal(
                f'another build is writing into the folder "{folder.name}", which holds this one',
                shown,
                path,
            )


def _take(target: Path, shown: str) -> _Held:
    """Claim a folder, or say who has."""
    path = claim_of(target)
    until = time.monotonic() + _PATIENCE_S
    while True:
        held = _try(path)
        if held is not None:
            return held
        if time.monotonic() > until:
            raise _refusal("another build is writing into this folder", shown, path)
        time.sleep(_PAUSE_S)


def _try(path: Path) -> _Held | None:
    """Claim a folder if that is possible at this moment."""
    descriptor, made = _opened(path)
    got: bool | None = False
    try:
        got = _lock(descriptor)
        if got is None:
            got = made or _is_void(path)
            if got and not made:
                path.unlink(missing_ok=True)
                return None  # whoever makes it anew has it
        # Whoever had it before may have removed it after it was opened here.
        if got and _is_at(descriptor, path):
            _write_claim(descriptor)
            _OURS.add(path)
            return _Held(path, descriptor)
        got = False
    except BaseException:
        if got:
            with contextlib.suppress(OSError):
                path.unlink()
        got = False
        raise
    finally:
        if not got:
            os.close(descriptor)
    return None


def _opened(path: Path) -> tuple[int, bool]:
    """A claim opened, and whether it was made by that."""
    how = os.O_RDWR | getattr(os, "O_BINARY", 0)
    while True:
        with contextlib.suppress(FileExistsError):
            return os.open(path, how | os.O_CREAT | os.O_EXCL, 0o666), True
        with contextlib.suppress(FileNotFoundError):  # removed between the two
            return os.open(path, how), False


def _is_at(descriptor: int, path: Path) -> bool:
    """Whether an open file is still the one of that name."""
    try:
        return os.path.samestat(os.fstat(descriptor), path.stat())
    except FileNotFoundError:
        return False


def _is_held(path: Path) -> bool:
    """Whether a living build has a claim; nothing is changed."""
    try:
        descriptor = os.open(path, os.O_RDWR)
    except FileNotFoundError:
        return False
    except OSError:
        return True  # somebody else's, and Windows lets nobody open what is being removed
    try:
        got = _lock(descriptor)
    finally:
        os.close(descriptor)
    return not _is_void(path) if got is None else not got


def _write_claim(descriptor: int) -> None:
    """Write down who has a claim."""
    os.lseek(descriptor, 0, os.SEEK_SET)
    os.ftruncate(descriptor, 0)
    since = datetime.now().astimezone().isoformat(sep=" ", timespec="seconds")
    who = {"process": os.getpid(), "computer": socket.gethostname(), "since": since[:19]}
    os.write(descriptor, json.dumps(who).encode("utf-8"))


def _holder(path: Path) -> dict[str, Any]:
    """Who has a claim, as far as it can be told."""
    try:
        who = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return who if isinstance(who, dict) else {}


def _is_void(path: Path) -> bool:
    """Whether a claim that cannot be locked is of a process of this computer that has ended."""
    who = _holder(path)
    process = who.get("process")
    if who.get("computer") != socket.gethostname() or not isinstance(process, int):
        return False
    if process == os.getpid():
        return path not in _OURS
    if os.name == "nt":
        return False  # nothing there asks after a process without harm
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return True
    except OSError:
        return False
    return False


def _refusal(problem: str, shown: str, path: Path) -> DataError:
    """What is said where another build has a folder."""
    who = _holder(path)
    found = None
    if who:
        computer = who.get("computer")
        where = "" if computer == socket.gethostname() else f" on {computer}"
        found = f"process {who.get('process')}{where}, since {who.get('since')}"
    findings = Findings()
    findings.error(
        problem,
        path=shown,
        found=found,
        expected="one build at a time",
        fix=f"wait until that build has ended, or {NAME_ANOTHER}; where no build is running, "
        f"delete {path.name}",
    )
    return DataError(findings)
