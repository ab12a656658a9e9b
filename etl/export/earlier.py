"""What stands in the place of the output, and whether it may be replaced."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping, Sequence, Set
from pathlib import Path
from typing import Any

from etl.errors import DataError, Findings
from etl.export.unwritable import NAME_ANOTHER, cannot_write

#: The file by which an output folder is known as one of ours.
RECORD = "run.json"
PROGRAM = "trialwright"
#: The folder within the output folder that can be sent away whole.
BUNDLE = "handoff"


#: What programs leave by themselves in any folder that somebody looked into or ran a script in, and
#: that holds nobody's work. What may hold some stays out of this: a workspace of R (.RData), plots
#: (Rplots.pdf), what editors keep of texts that were not saved (.Rproj.user, .ipynb_checkpoints).
_LITTER = frozenset({".DS_Store", "Thumbs.db", "desktop.ini", ".Rhistory"})
#: Where Python keeps compiled scripts, and the ending of these.
_COMPILED = ("__pycache__", ".pyc")


def record_of(folder: Path) -> dict[str, Any] | None:
    """The run record of a folder; None where it is not one of ours."""
    try:
        return _readable_record(folder)
    except OSError:
        return None


def _readable_record(folder: Path) -> dict[str, Any] | None:
    """The run record of a folder, if it has one; an error of the system where it cannot be read."""
    path = folder / RECORD
    try:
        record = json.loads(path.read_text(encoding="utf-8")) if path.is_file() else None
    except ValueError:
        return None
    return record if isinstance(record, dict) and record.get("program") == PROGRAM else None


def is_ours(folder: Path) -> bool:
    """Whether a folder was written by this program."""
    return record_of(folder) is not None


class Keeper:
    """Sees to it that nothing is replaced but an earlier build as it was written.

    An earlier build is read whole when it is checked first. When it is checked again, only files
    are read whose size, times or place on the disk are others than they were then: no program can
    write to a file without changing the time of its last change, which no program can set.

    Parameters
    ----------
    shown : str
        The name of the output folder for messages.
    """

    def __init__(self, shown: str) -> None:
        self._shown = shown
        self._seen: dict[str, tuple[str, tuple[int, ...]]] = {}

    def check(self, folder: Path) -> None:
        """Refuse to replace anything that this program did not write.

        Parameters
        ----------
        folder : Path
            The output folder, or what stood in its place if it has just been moved away.

        Raises
        ------
        DataError
            If it is a file, or a folder that holds anything but an earlier build as it was
            written, or one that cannot be read.
        """
        findings = Findings()
        try:
            self._judge(folder, findings)
        except OSError as why:
            raise cannot_write(self._shown, why, folder) from why
        if findings.failed:
            raise DataError(findings)

    def _judge(self, folder: Path, findings: Findings) -> None:
        """Find what speaks against replacing a folder."""
        if folder.exists() and not folder.is_dir():
            findings.error(
                "the output folder is a file",
                path=self._shown,
                fix="name a folder, by [output] folder or --into",
            )
        elif folder.is_dir():
            there = any(not _is_litter(path) for path in folder.iterdir())
            record = _readable_record(folder)
            if there and record is None:
                findings.error(
                    "the output folder holds something else than an earlier build",
                    path=self._shown,
                    expected="a new or empty folder, or one that "
                    f"{PROGRAM} wrote (it has a {RECORD})",
                    fix=f"{NAME_ANOTHER}, or empty this one yourself",
                )
            elif record is not None:
                self._refuse_to_lose(folder, record, findings)

    def _refuse_to_lose(self, folder: Path, record: Mapping[str, Any], findings: Findings) -> None:
        """Find what people have put or changed in an earlier build, which would go with it."""
        known = {RECORD, *_texts(record.get("files"))}
        fix = f"move {{}} elsewhere, or {NAME_ANOTHER}"
        if strange := sorted(_strange(folder, "", known)):
            findings.error(
                "the output folder holds files that no build wrote, and a build replaces the "
                "folder as a whole",
                path=self._shown,
                found=_first_of(strange),
                expected="nothing but an earlier build",
                fix=fix.format("these files"),
            )
        # Every file, not scripts and pages only: a table that a spreadsheet saved again may have a
        # day of coding by hand in it, or ids that lost their zeros by accident: neither may go, or
        # stay, unseen.
        digests = record.get("sha256")
        digests = digests if isinstance(digests, dict) else {}
        changed = [
            name
            for name, digest in sorted(digests.items())
            if (folder / name).is_file() and not self._is_as_written(folder / name, name, digest)
        ]
        if changed:
            findings.error(
                "files of the output folder were changed since the build that wrote them, and a "
                "build replaces the folder as a whole",
                path=self._shown,
                found=_first_of(changed),
                expected="an earlier build as it was written",
                fix="undo the changes or delete these files where they are nobody's work; else "
                + fix.format("them"),
            )

    def _is_as_written(self, path: Path, name: str, digest: str) -> bool:
        """Whether a file is as its build wrote it; read unless it was and has not changed."""
        # Looked at before it is read: what changes meanwhile is seen the next time.
        now = (digest, _stamp(path))
        if self._seen.get(name) == now:
            return True
        self._seen.pop(name, None)
        if digest_of(path) != digest:
            return False
        self._seen[name] = now
        return True


def check_target(target: Path, shown: str) -> None:
    """Refuse to replace anything that this program did not write.

    Parameters
    ----------
    target : Path
        The output folder.
    shown : str
        Its name for messages.

    Raises
    ------
    DataError
        If it holds anything but an earlier build as it was written.
    """
    Keeper(shown).check(target)


def _stamp(path: Path) -> tuple[int, ...]:
    """What changes with a file: size, times, and where it lies on the disk.

    ``st_ctime_ns`` is the time of the last change on POSIX, and that of making on Windows.
    """
    now = path.stat()
    return (now.st_size, now.st_mtime_ns, now.st_ctime_ns, now.st_ino, now.st_dev)


def _texts(found: object) -> list[str]:
    """The texts of a list, as far as it is one."""
    return [name for name in found if isinstance(name, str)] if isinstance(found, list) else []


def _strange(folder: Path, before: str, known: Set[str]) -> Iterator[str]:
    """What no build wrote, by its path within the output folder; a folder only as a whole."""
    for path in folder.iterdir():
        name = f"{before}{path.name}"
        if _is_litter(path) and name not in known:
            continue
        if path.is_dir() and not path.is_symlink():
            if any(one.startswith(f"{name}/") for one in known):
                yield from _strange(path, f"{name}/", known)
            else:
                yield name
        elif name not in known:
            yield name


def _is_litter(path: Path) -> bool:
    """Whether a program left it there, and it holds nobody's work."""
    if path.is_symlink():
        return False
    folder, ending = _COMPILED
    if path.is_dir():
        return path.name == folder and all(
            one.suffix == ending and one.is_file() for one in path.iterdir()
        )
    return path.name in _LITTER


def _first_of(names: Sequence[str]) -> str:
    """Some names, and how many more there are."""
    return ", ".join(names[:5]) + (f" and {len(names) - 5} more" if len(names) > 5 else "")


def digest_of(path: Path) -> str:
    """The SHA-256 of a file, as it stands in the record."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()
