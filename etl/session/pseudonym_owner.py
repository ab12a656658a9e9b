"""Files that their owner alone may read."""

from __future__ import annotations

import os
import stat
from pathlib import Path

from etl.errors import Findings

#: Who else than the owner may do anything with the file.
_OTHERS = stat.S_IRWXG | stat.S_IRWXO
_OWNER_ONLY = stat.S_IRUSR | stat.S_IWUSR


def is_open(path: Path) -> bool:
    """Whether others than its owner may do anything with a file, on POSIX systems.

    Parameters
    ----------
    path : Path
        A file.

    Returns
    -------
    bool
    """
    return os.name == "posix" and bool(path.stat().st_mode & _OTHERS)


def keep_to_owner(path: Path, findings: Findings, *, narrow: bool) -> None:
    """Warn where others may read the key to the pseudonyms.

    Parameters
    ----------
    path : Path
        The file.
    findings : Findings
        Where it is recorded.
    narrow : bool
        Whether to take that from them, where one may.
    """
    if not is_open(path):
        return
    mode, said = stat.S_IMODE(path.stat().st_mode), ""
    fix = "find out who may have read it; with the key every pseudonym can be told"
    if narrow:
        try:
            path.chmod(mode & ~_OTHERS)
            said = "; that is taken from them now"
        except OSError:  # it is somebody else's, who may share it on purpose
            said = ", and you may not take that from them"
            fix = "ask the owner of the file who may read it; with the key every pseudonym can be "
            fix += "told"
    findings.warning(
        f"others on this computer could read the key to the pseudonyms{said}",
        path=path.name,
        expected="a file that its owner alone may read",
        fix=fix,
    )


def write_for_owner(path: Path, content: bytes) -> None:
    """Write a file that its owner alone may read, from its first byte on.

    Parameters
    ----------
    path : Path
        The file. One that is there is replaced as a whole, and stays its owner's.
    content : bytes
        What it is to hold.

    Raises
    ------
    OSError
        If it cannot be written, or would become somebody else's; what was there is there still.
    """
    beside = path.with_name(f".{path.name}.new")
    beside.unlink(missing_ok=True)
    try:
        made = os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_EXCL, _OWNER_ONLY)
        with os.fdopen(made, "wb") as file:
            _keep_owner(file.fileno(), path)
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        beside.replace(path)
    except BaseException:  # an interruption too
        beside.unlink(missing_ok=True)
        raise


def _keep_owner(descriptor: int, path: Path) -> None:
    """Let a file that takes another's place be that one's owner's, or fail."""
    if os.name != "posix" or not path.exists():
        return
    old, new = path.stat(), os.fstat(descriptor)
    if old.st_uid != new.st_uid:
        os.fchown(descriptor, old.st_uid, old.st_gid)
