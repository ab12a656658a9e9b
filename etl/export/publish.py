"""The output folder: written beside its place, moved into place at the end, all or nothing."""

from __future__ import annotations

import contextlib
import glob
import hashlib
import json
import shutil
import tempfile
from collections.abc import Iterator, Mapping, Sequence, Set
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from etl.errors import DataError, Findings

#: The file by which an output folder is known as one of ours.
RECORD = "run.json"
PROGRAM = "trialwright"
#: The folder within the output folder that can be sent away whole.
BUNDLE = "handoff"
_ASIDE = "old"


#: What programs leave by themselves in any folder that somebody looked into or ran a script in, and
#: that holds nobody's work. What may hold some stays out of this: a workspace of R (.RData), plots
#: (Rplots.pdf), what editors keep of texts that were not saved (.Rproj.user, .ipynb_checkpoints).
_LITTER = frozenset({".DS_Store", "Thumbs.db", "desktop.ini", ".Rhistory"})
#: Where Python keeps compiled scripts, and the ending of these.
_COMPILED = ("__pycache__", ".pyc")


def record_of(folder: Path) -> dict[str, Any] | None:
    """The run record of a folder; None where it is not one of ours."""
    try:
        record = json.loads((folder / RECORD).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return record if isinstance(record, dict) and record.get("program") == PROGRAM else None


def is_ours(folder: Path) -> bool:
    """Whether a folder was written by this program."""
    return record_of(folder) is not None


def check_target(target: Path, shown: str) -> None:
    """Refuse to replace anything that this program did not write.

    Raises
    ------
    DataError
        If the target is a file, or a folder that holds anything but an earlier build as it was
        written, or one that cannot be read.
    """
    findings = Findings()
    try:
        _judge_target(target, shown, findings)
    except OSError as why:
        raise cannot_write(shown, why) from why
    if findings.failed:
        raise DataError(findings)


def _judge_target(target: Path, shown: str, findings: Findings) -> None:
    """Find what speaks against replacing a folder."""
    if target.exists() and not target.is_dir():
        findings.error(
            "the output folder is a file",
            path=shown,
            fix="name a folder, by [output] folder or --into",
        )
    elif target.is_dir():
        there = any(not _is_litter(path) for path in target.iterdir())
        record = record_of(target)
        if there and record is None:
            findings.error(
                "the output folder holds something else than an earlier build",
                path=shown,
                expected=f"a new or empty folder, or one that {PROGRAM} wrote (it has a {RECORD})",
                fix="name another folder, by [output] folder or --into, or empty this one yourself",
            )
        elif record is not None:
            _refuse_to_lose(target, shown, record, findings)


def _refuse_to_lose(
    target: Path, shown: str, record: Mapping[str, Any], findings: Findings
) -> None:
    """Find what people have put or changed in an earlier build, which would go with it."""
    known = {RECORD, *_texts(record.get("files"))}
    fix = "move {} elsewhere, or name another folder, by [output] folder or --into"
    if strange := sorted(_strange(target, "", known)):
        findings.error(
            "the output folder holds files that no build wrote, and a build replaces the "
            "folder as a whole",
            path=shown,
            found=_first_of(strange),
            expected="nothing but an earlier build",
            fix=fix.format("these files"),
        )
    # Every file, not scripts and pages only: a table that a spreadsheet saved again may have a day
    # of coding by hand in it, or ids that lost their zeros by accident: neither may go, or stay,
    # unseen. Size and time of a file prove nothing, and reading an earlier build takes seconds a
    # gigabyte, far less than making it.
    digests = record.get("sha256")
    digests = digests if isinstance(digests, dict) else {}
    if changed := sorted(
        name
        for name, digest in digests.items()
        if (target / name).is_file() and digest_of(target / name) != digest
    ):
        findings.error(
            "files of the output folder were changed since the build that wrote them, and a build "
            "replaces the folder as a whole",
            path=shown,
            found=_first_of(changed),
            expected="an earlier build as it was written",
            fix="undo the changes or delete these files where they are nobody's work; else "
            + fix.format("them"),
        )


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


@dataclass(frozen=True, slots=True)
class Workshop:
    """Where a build works, beside the place where its output will appear.

    Attributes
    ----------
    fresh : Path
        The folder that will be published.
    kept : Path
        A folder for what is put aside meanwhile.
    """

    fresh: Path
    kept: Path


@contextlib.contextmanager
def published(target: Path, shown: str) -> Iterator[Workshop]:
    """Give folders to work in; when all went well, move the result to its place.

    Parameters
    ----------
    target : Path
        Where the output is to appear. An earlier build there is replaced as a whole.
    shown : str
        Its name for messages.

    Yields
    ------
    Workshop
        Folders beside the target, gone at the end.

    Raises
    ------
    DataError
        If the target may not be replaced or its parent cannot be written.
    """
    # A link is followed, so that the tables land where it points.
    target = target.resolve()
    # Beside the target, so that the last step is a renaming on one file system.
    beside = next(folder for folder in target.parents if folder.is_dir())
    try:
        _bring_back(target, beside)
        check_target(target, shown)
        work = Path(tempfile.mkdtemp(prefix=f".{target.name}.", dir=beside))
    except OSError as why:
        raise cannot_write(shown, why) from why
    try:
        shop = Workshop(work / "new", work / "kept")
        shop.fresh.mkdir()
        shop.kept.mkdir()
        yield shop
        check_target(target, shown)
        target.parent.mkdir(parents=True, exist_ok=True)
        _swap(shop.fresh, target, work / _ASIDE)
    except OSError as why:
        # Inputs that cannot be read are findings long before this; what is left is the output.
        raise cannot_write(shown, why) from why
    finally:
        # An earlier build that could not be put back is worth more than a tidy folder.
        if target.exists() or not (work / _ASIDE).exists():
            shutil.rmtree(work, ignore_errors=True)


def _bring_back(target: Path, beside: Path) -> None:
    """Put an earlier build back that a killed run had just moved aside."""
    for aside in sorted(beside.glob(f".{glob.escape(target.name)}.*/{_ASIDE}")):
        if not target.exists() and is_ours(aside):
            target.parent.mkdir(parents=True, exist_ok=True)
            aside.replace(target)
            shutil.rmtree(aside.parent, ignore_errors=True)


def cannot_write(shown: str, why: OSError) -> DataError:
    """What is said when the output cannot be put in its place."""
    findings = Findings()
    findings.error(
        f"the output folder cannot be written ({why.strerror or type(why).__name__})",
        path=shown,
        fix="close programs that have files of it open, or name another folder in which you may "
        "write, by [output] folder or --into",
    )
    return DataError(findings)


def _swap(fresh: Path, target: Path, aside: Path) -> None:
    """Put the fresh folder in the target's place; put the old one back if that fails."""
    there = target.exists()
    if there:
        target.replace(aside)
    try:
        fresh.replace(target)
    except BaseException:  # an interruption too
        if there and not target.exists():
            aside.replace(target)
        raise
