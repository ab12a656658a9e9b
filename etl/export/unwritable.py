"""Why an output folder cannot be written, and what to do."""

from __future__ import annotations

import errno
import os
import shutil
from pathlib import Path

from etl.errors import DataError, Findings

NAME_ANOTHER = "name another folder, by [output] folder or --into"
_FULL = {errno.ENOSPC, getattr(errno, "EDQUOT", errno.ENOSPC)}
_GONE = {errno.ENOENT, errno.ENOTDIR, errno.EEXIST}
_NOT_MOVABLE = {errno.EBUSY, errno.EXDEV}


def cannot_write(shown: str, why: OSError, place: Path) -> DataError:
    """What is said when the output cannot be put in its place.

    Parameters
    ----------
    shown : str
        The name of the output folder for messages.
    why : OSError
        What the system said.
    place : Path
        The output folder.

    Returns
    -------
    DataError
        To be raised.
    """
    findings = Findings()
    findings.error(
        f"the output folder cannot be written ({reason_of(why)})",
        path=shown,
        fix=_way_out(why.errno, place),
    )
    return DataError(findings)


def reason_of(why: OSError) -> str:
    """What the system said, in its own words.

    Parameters
    ----------
    why : OSError
        Some libraries put a sentence of their own in place of the system's.

    Returns
    -------
    str
    """
    return os.strerror(why.errno) if why.errno else why.strerror or type(why).__name__


def is_full(why: OSError) -> bool:
    """Whether there was no room on a disk, or no more than the user may take.

    Parameters
    ----------
    why : OSError
        What the system said.

    Returns
    -------
    bool
    """
    return why.errno in _FULL


def _way_out(number: int | None, place: Path) -> str:
    """What to do about an error of the system."""
    if number in _FULL:
        return (
            f"make room on its disk, where {room_at(place)}: a new build needs room beside the "
            f"earlier one, and for the fixations of all logs; or {NAME_ANOTHER}"
        )
    if number in _GONE:
        return (
            "the folder that is to hold it was moved or removed, or is a file: see that it is "
            f"there, and build again; or {NAME_ANOTHER}"
        )
    if number in _NOT_MOVABLE:
        return (
            "a folder in use, or one that is a disk or share of its own, cannot be replaced: name "
            "a folder within it, by [output] folder or --into"
        )
    return (
        "see that you may write in it and in the folder that holds it, close programs that have "
        "files of it open, or name another folder in which you may write, by [output] folder or "
        "--into"
    )


def room_at(place: Path) -> str:
    """How much room there is where a folder is to lie, in words.

    Parameters
    ----------
    place : Path
        It need not be there.

    Returns
    -------
    str
    """
    for folder in (place, *place.parents):
        try:
            free = shutil.disk_usage(folder).free
        except OSError:
            continue
        return f"{free / 1e6:,.1f} MB are free"
    return "little is free"
