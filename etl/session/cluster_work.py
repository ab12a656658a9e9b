"""What a worker of a cluster does: look whether it can work for a build at all, and do tasks."""

from __future__ import annotations

import asyncio
import os
import pickle
import platform
import socket
import sys
import threading
from collections.abc import Mapping
from dataclasses import dataclass
from importlib import metadata
from pathlib import Path
from typing import Any, Final

from etl.errors import FaultError
from etl.session.content_digest import LIBRARIES, program_digest
from etl.session.crew import do_task

#: The file by which a worker knows the folder in which a build works.
MARK: Final = "cluster.mark"
#: How long a file system may take to answer a worker that looks.
_LOOK_S: Final = 60.0
#: Builds of which a worker remembers that it can work for them.
_BUILDS_KNOWN: Final = 16
#: The name of the digest of everything among the versions.
DIGEST: Final = "everything"


@dataclass(frozen=True, slots=True)
class Site:
    """What a worker must have in order to work for a build.

    Attributes
    ----------
    folder : Path
        Where the build works.
    token : str
        What the mark in that folder holds; each build has its own.
    files : tuple of (Path, int)
        Files of the study and their sizes in bytes; -1 for a folder.
    program : mapping of str to str
        From :func:`versions`, where the build was started.
    """

    folder: Path
    token: str
    files: tuple[tuple[Path, int], ...]
    program: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class Unfit:
    """Why a worker cannot work for a build; the fields are those of a finding."""

    worker: str
    problem: str
    found: str
    expected: str
    fix: str


@dataclass(frozen=True, slots=True)
class Raised:
    """An error of a task, which travels as an answer.

    A cluster would write the task into its log otherwise, and ids of readers with it.
    """

    error: Exception


def versions() -> dict[str, str]:
    """What decides about the bytes of a table in this process.

    Returns
    -------
    dict of str to str
        Versions by name.
    """
    try:
        own = metadata.version("trialwright")
    except metadata.PackageNotFoundError:  # a checkout that was not installed
        own = "not installed"
    return {
        "trialwright": own,
        "Python": sys.version.replace("\n", " "),
        "system": f"{sys.platform}, {platform.machine()}",
        **{name: metadata.version(name) for name in LIBRARIES},
        DIGEST: program_digest(),
    }


def look(site: Site) -> Unfit | None:
    """See whether this process can work for a build.

    Parameters
    ----------
    site : Site
        What it must have.

    Returns
    -------
    Unfit or None
        Why not; None where it can.
    """
    return _other_program(site.program) or _unseen(site)


def _other_program(wanted: Mapping[str, str]) -> Unfit | None:
    """What of the program is another here."""
    here = versions()
    other = [name for name in wanted if here.get(name) != wanted[name]]
    if not other:
        return None
    told = [name for name in other if name != DIGEST]
    return Unfit(
        _myself(),
        "the worker runs another version, and could write other bytes",
        "; ".join(f"{name} {here.get(name)}" for name in told)
        or "other files of trialwright under the same version",
        "; ".join(f"{name} {wanted[name]}" for name in told) or "those of this computer",
        "install the same versions here and on every worker, and start the workers again",
    )


def _unseen(site: Site) -> Unfit | None:
    """What of the files this process does not see."""
    path = site.folder / MARK
    wanted = "a file system that all workers share, at the same path as here"
    fix = "put study and output where every worker has them under the same path, and start workers "
    fix += "under an account that may read and write there"
    try:
        if path.read_text(encoding="ascii") != site.token:
            return Unfit(_myself(), "the worker sees another file here", str(path), wanted, fix)
        for path, size in site.files:
            status = path.stat()
            if size != (-1 if path.is_dir() else status.st_size):
                problem = "the worker sees another file of this name"
                return Unfit(_myself(), problem, str(path), wanted, fix)
            if size >= 0:
                path.open("rb").close()
    except OSError as why:
        problem = f"the worker cannot read a file of this build ({_because(why)})"
        return Unfit(_myself(), problem, str(path), wanted, fix)
    path = site.folder / f"{MARK}.{socket.gethostname()}.{os.getpid()}.{threading.get_ident()}"
    try:
        path.touch()
        path.unlink()
    except OSError as why:
        problem = f"the worker cannot write where the build works ({_because(why)})"
        return Unfit(_myself(), problem, str(site.folder), wanted, fix)
    return None


def _because(why: OSError) -> str:
    return why.strerror or type(why).__name__


def _myself() -> str:
    return f"worker on {socket.gethostname()}, process {os.getpid()}"


async def looked(site: bytes) -> Unfit | None:
    """Look without stopping a worker's other business, and not for ever.

    Parameters
    ----------
    site : bytes
        A pickled :class:`Site`.

    Returns
    -------
    Unfit or None
        As :func:`look` gives it.
    """
    own: Site = pickle.loads(site)  # noqa: S301  (from the client, as is all that a worker does)
    try:
        return await asyncio.wait_for(asyncio.to_thread(look, own), _LOOK_S)
    except TimeoutError:
        return Unfit(
            _myself(),
            f"the file system did not answer the worker within {_LOOK_S:.0f} s",
            str(own.folder),
            "a file system that all workers share",
            "see whether it is mounted there, or leave this worker out",
        )


#: Whatever the number of threads of a worker, tasks share what is made ready for them.
_ONE_AT_A_TIME: Final = threading.Lock()
_fit: dict[str, None] = {}


def work(site: bytes, stage: Path, task: bytes) -> Any:
    """Do one task in a worker of a cluster, which looks first where the build is new to it.

    Parameters
    ----------
    site : bytes
        A pickled :class:`Site`.
    stage : Path
        From :class:`etl.session.crew.StageFiles`.
    task : bytes
        The pickled task: the scheduler passes it on without looking into it.

    Returns
    -------
    object
        The answer, or :class:`Unfit`, or :class:`Raised`.
    """
    with _ONE_AT_A_TIME:
        own: Site = pickle.loads(site)  # noqa: S301  (as above)
        if own.token not in _fit:
            unfit = look(own)
            if unfit is not None:
                return unfit
            while len(_fit) >= _BUILDS_KNOWN:
                del _fit[next(iter(_fit))]
            _fit[own.token] = None
        try:
            return do_task(stage, pickle.loads(task))  # noqa: S301  (as above)
        except Exception as error:
            return Raised(_portable(error))


def _portable(error: Exception) -> Exception:
    """An error that can travel."""
    try:
        pickle.loads(pickle.dumps(error))  # noqa: S301  (what was just written)
    except Exception:
        return FaultError(f"{type(error).__name__}: {error}")
    return error
