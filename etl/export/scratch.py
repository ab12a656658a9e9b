"""A folder for what is put aside by a job that writes nothing, gone at its end."""

from __future__ import annotations

import contextlib
import tempfile
from collections.abc import Iterator
from functools import partial
from pathlib import Path

from etl.errors import DataError, Findings
from etl.export.swapping import clear
from etl.export.tidying import despite_interruption
from etl.export.unwritable import is_full, reason_of, room_at


@contextlib.contextmanager
def scratch() -> Iterator[Path]:
    """Give a folder among the temporary files of the system.

    Yields
    ------
    Path
        The folder, gone at the end.

    Raises
    ------
    DataError
        If there is no room, or no place where one may write.
    """
    try:
        folder = Path(tempfile.mkdtemp(prefix="trialwright-"))
    except OSError as why:
        raise _refusal(why) from why
    try:
        yield folder
    except OSError as why:
        named = why.filename
        if is_full(why) or (isinstance(named, str) and Path(named).is_relative_to(folder)):
            raise _refusal(why) from why
        raise
    finally:
        despite_interruption(partial(clear, folder))


def _refusal(why: OSError) -> DataError:
    """What is said where nothing can be put aside."""
    findings = Findings()
    room = ""
    with contextlib.suppress(OSError):  # where there is no such folder at all
        place = Path(tempfile.gettempdir())
        room = f" on the disk of {place}, where {room_at(place)},"
    findings.error(
        f"temporary files cannot be written ({reason_of(why)})",
        fix=f"make room{room} or have the variable TMPDIR (on Windows TEMP) name another folder",
    )
    return DataError(findings)
