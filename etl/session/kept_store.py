"""What builds keep beside the output for the next one: parsed logs, and rows of groups of readers.

Every entry is named by a digest of all that it was made from: the content of the log, the study as
far as it matters, the program. So an entry is right or is not found; none is ever updated. Each
also bears a digest of itself, so that half a file counts as none.
"""

from __future__ import annotations

import contextlib
import hashlib
import importlib
import io
import os
import pickle
import shutil
import socket
from collections.abc import Iterable
from dataclasses import dataclass, is_dataclass
from pathlib import Path
from typing import Any, Final

import pyarrow as pa

_MAGIC: Final = b"trialwright kept 1\n"
_DIGEST_BYTES: Final = 32
_LENGTH_BYTES: Final = 8
_BEFORE: Final = len(_MAGIC) + _DIGEST_BYTES + _LENGTH_BYTES
_PIECE_BYTES: Final = 1 << 20
#: Arrow reads without copying what begins at a multiple of so many bytes.
_ALIGNED: Final = 64
#: Entries of logs, and of groups of readers.
LOG, GROUP = ".log", ".group"
#: The mark by which programs that make copies know a folder that can be made again (Cache Directory
#: Tagging Specification, https://bford.info/cachedir/).
_TAG_NAME, _TOLD_NAME = "CACHEDIR.TAG", "README.txt"
_TAG: Final = """\
Signature: 8a477f597d28d172789f06886806bc55
# Kept by trialwright so that the next build is quicker.
"""
_TOLD: Final = """\
Parsed fixations and rows of an earlier build, kept so that the next build is quicker.
It is safe to delete this folder: the next build then reads all logs again.
It holds what the logs hold. Treat it like the logs, and do not pass it on.
"""


@dataclass(frozen=True, slots=True)
class KeptStore:
    """Where entries are found, and where new ones go until the build is published.

    Attributes
    ----------
    earlier : Path
        Entries of earlier builds; need not be there.
    fresh : Path
        A folder for new ones.
    """

    earlier: Path
    fresh: Path

    def head(self, name: str) -> Any:
        """What an entry says that is there and whole.

        Parameters
        ----------
        name : str
            Of the entry.

        Returns
        -------
        object or None
            As it was put; None where there is no such entry, or not one that this program wrote.
        """
        path = self._found(name)
        # Whatever is wrong with an entry, it can be made again.
        with contextlib.suppress(OSError, pickle.UnpicklingError, AttributeError, ImportError):
            return None if path is None else head_of(path)
        return None

    def has(self, name: str) -> bool:
        """Whether an entry is there and whole.

        Parameters
        ----------
        name : str
            Of the entry.

        Returns
        -------
        bool
        """
        return self._found(name) is not None

    def _found(self, name: str) -> Path | None:
        """The file of an entry that is there and whole."""
        for folder in (self.fresh, self.earlier):
            with contextlib.suppress(OSError):
                if _is_whole(folder / name):
                    return folder / name
        return None

    def where(self, name: str) -> Path:
        """Where an entry is that this build has found or made.

        Parameters
        ----------
        name : str
            Of the entry.

        Returns
        -------
        Path
        """
        fresh = self.fresh / name
        return fresh if fresh.exists() else self.earlier / name

    def put(self, name: str, head: object, body: pa.Buffer | None = None) -> Path:
        """Make an entry.

        Parameters
        ----------
        name : str
            Of the entry.
        head : object
            Read back by :func:`head_of`.
        body : pa.Buffer or None
            Read back by :func:`body_of`.

        Returns
        -------
        Path
            The entry, which may have been there already.
        """
        path = self.fresh / name
        data = pickle.dumps(head, protocol=pickle.HIGHEST_PROTOCOL)
        data += bytes(-(len(data) + _BEFORE) % _ALIGNED)
        # Of the name too: an entry that lies under another's name is none.
        digest = hashlib.sha256(name.encode("utf-8"))
        digest.update(data)
        if body is not None:
            digest.update(body)
        # A cluster may have two workers at the same task, one of which it takes for lost.
        draft = self.fresh / f"{name}.{socket.gethostname()}.{os.getpid()}"
        with draft.open("wb") as file:
            file.write(_MAGIC + digest.digest() + len(data).to_bytes(_LENGTH_BYTES, "little"))
            file.write(data)
            if body is not None:
                file.write(body)
        draft.replace(path)
        return path

    def hold(self, names: Iterable[str]) -> None:
        """Take entries of earlier builds to the fresh ones, where no other build removes them.

        Parameters
        ----------
        names : iterable of str
            Entries that are there.

        Raises
        ------
        OSError
            If one is not there any more.
        """
        for name in names:
            if (self.fresh / name).exists():
                continue
            try:
                os.link(self.earlier / name, self.fresh / name)
            except OSError:  # another disk, or a file system without links
                shutil.copyfile(self.earlier / name, self.fresh / name)

    def settle(self, used: Iterable[str]) -> None:
        """Keep what a build has used, and nothing else.

        Where the folder cannot be written, nothing is kept: the build is none the worse.

        Parameters
        ----------
        used : iterable of str
            Names of entries.
        """
        wanted = set(used)
        with contextlib.suppress(OSError):
            self.earlier.mkdir(mode=0o700, parents=True, exist_ok=True)
            for name, text in ((_TAG_NAME, _TAG), (_TOLD_NAME, _TOLD)):
                if not (self.earlier / name).exists():
                    (self.earlier / name).write_text(text, encoding="utf-8", newline="\n")
            for path in list(self.earlier.iterdir()):
                if path.suffix in (LOG, GROUP) and path.name not in wanted:
                    path.unlink()
            for path in list(self.fresh.iterdir()):
                if path.name in wanted:
                    path.replace(self.earlier / path.name)


def forget(folder: Path) -> None:
    """Remove what builds kept in a folder, and the folder if nothing else is in it.

    Parameters
    ----------
    folder : Path
        Need not be there; where it cannot be written it stays.
    """
    with contextlib.suppress(OSError):
        for path in list(folder.iterdir()):
            if path.suffix in (LOG, GROUP) or path.name in (_TAG_NAME, _TOLD_NAME):
                path.unlink()
        folder.rmdir()


def _is_whole(path: Path) -> bool:
    """Whether an entry is what was written under that name."""
    digest = hashlib.sha256(path.name.encode("utf-8"))
    with path.open("rb") as file:
        before = file.read(_BEFORE)
        if len(before) < _BEFORE or not before.startswith(_MAGIC):
            return False
        while piece := file.read(_PIECE_BYTES):
            digest.update(piece)
    return digest.digest() == before[len(_MAGIC) : -_LENGTH_BYTES]


def head_of(path: Path) -> Any:
    """What an entry says.

    Parameters
    ----------
    path : Path
        From :meth:`KeptStore.where` or :meth:`KeptStore.put`.

    Returns
    -------
    object
        As it was put.

    Raises
    ------
    pickle.UnpicklingError
        If it names anything but values of this program: whoever can write the folder must not be
        able to have other code run.
    """
    with path.open("rb") as file:
        length = int.from_bytes(file.read(_BEFORE)[-_LENGTH_BYTES:], "little")
        return _Values(io.BytesIO(file.read(length))).load()


def body_of(path: Path) -> pa.Buffer:
    """The rest of an entry, which stays in the file.

    Parameters
    ----------
    path : Path
        From :meth:`KeptStore.where` or :meth:`KeptStore.put`.

    Returns
    -------
    pa.Buffer
        As it was put.
    """
    with pa.memory_map(str(path)) as file:
        whole = file.read_buffer()
    length = int.from_bytes(whole[_BEFORE - _LENGTH_BYTES : _BEFORE].to_pybytes(), "little")
    return whole.slice(_BEFORE + length)


class _Values(pickle.Unpickler):
    """Reads values of this program, and arrays, as Python's documentation of pickle advises."""

    _NUMPY: Final = {
        ("numpy", "dtype"),
        ("numpy", "ndarray"),
        ("numpy._core.multiarray", "_reconstruct"),
        ("numpy._core.multiarray", "scalar"),
        ("numpy._core.numeric", "_frombuffer"),
    }
    _OTHERS: Final = {
        ("collections", "Counter"),
        ("collections", "defaultdict"),
        ("collections", "deque"),
        ("builtins", "set"),
        ("builtins", "frozenset"),
        ("builtins", "bytearray"),
        ("copyreg", "_reconstructor"),
        ("builtins", "object"),
    }

    def find_class(self, module: str, name: str) -> Any:
        """A type that may be there."""
        if (module, name) in self._NUMPY | self._OTHERS or module == "pathlib":
            return getattr(importlib.import_module(module), name)
        if module.split(".", maxsplit=1)[0] == "etl":
            found = getattr(importlib.import_module(module), name)
            named = (
                isinstance(found, type) and issubclass(found, tuple) and hasattr(found, "_fields")
            )
            if is_dataclass(found) or named or found.__module__ == "etl.errors":
                return found
        raise pickle.UnpicklingError(f"a kept entry names {module}.{name}")
