"""Which files are the logs of a study, and what lies beside them or is named like them."""

from __future__ import annotations

import glob
import re
import unicodedata
from pathlib import Path

from etl.errors import Findings
from etl.export.earlier import is_ours
from etl.parsers import counted_file, is_log
from etl.pseudonyms import FileKind, Pseudonyms
from etl.session.datasets import (
    tell_of_datasets,
    tell_of_lost_recordings,
    tell_of_other_recordings,
)
from etl.session.listing import first_few
from etl.session.pseudonym_key import is_key_file, key_path
from etl.study import Study
from etl.trials.facts import shown_path

#: How files end that may hold a log.
_LOG_ENDINGS = frozenset({".txt", ".csv", ".tsv", ".log", ".asc", ".dat", ".tab"})
#: How many files a message lists.
_LISTED = 10


def find_logs(
    study: Study, findings: Findings, pseudonyms: Pseudonyms | None = None
) -> tuple[tuple[Path, str], ...]:
    """The logs that the study's patterns name, each once, in the order of their names.

    Digits in names count as numbers: ``P01_2`` comes before ``P01_10``. The order decides how a
    trial goes on from one log to the next, and which of two recordings is the first.

    Parameters
    ----------
    study : Study
        As loaded.
    findings : Findings
        Where patterns that find nothing, and files that are named like logs and are none, are
        recorded.
    pseudonyms : Pseudonyms, optional
        What gives other names to logs, where the study asks for it.

    Returns
    -------
    tuple of (Path, str)
        The logs and their names for messages.
    """
    found: dict[tuple[int, int, str], tuple[str, Path]] = {}
    for number, pattern in enumerate(study.logs.files):
        # The folder's own name may hold a bracket, which only glob.escape tells from a pattern.
        full = str(Path(glob.escape(str(study.folder))) / pattern)
        paths = [Path(path) for path in glob.glob(full, recursive=True)]  # noqa: PTH207
        files = [
            path
            for path in paths
            if is_log(study.logs.kind, path)
            and not any(is_ours(up) for up in path.parents[:2])
            and not is_key_file(study, path)
        ]
        _tell_of_what_is_no_file(study, paths, pattern, pseudonyms, findings)
        if study.logs.kind == "bids":
            tell_of_lost_recordings(study, pattern, findings)
            others = set(paths) - set(files)
            named = (number, pattern)
            if tell_of_other_recordings(study, named, (others, files), pseudonyms, findings):
                continue
        if not files:
            findings.error(
                "no log has a name like this",
                path=study.shown,
                line=study.line_of("logs", "files", number),
                where="logs.files",
                found=pattern,
                expected="a pattern relative to the study file that finds the logs",
                fix="correct the pattern; * stands for any part of a name, ** for any folders",
            )
        for path in files:
            called = counted_file(study.logs, path).absolute()
            found.setdefault(_identity(path), (shown_path(study, called), path))
    if study.logs.kind == "bids":
        tell_of_datasets(study, [path for _, path in found.values()], findings)
    else:
        _note_unread(study, [path for _, path in found.values()], pseudonyms, findings)
    in_order = sorted(found.values(), key=lambda log: _in_natural_order(log[0]))
    return tuple((path, _shown(shown, "log", pseudonyms)) for shown, path in in_order)


def _shown(name: str, kind: FileKind, pseudonyms: Pseudonyms | None) -> str:
    """A file that was found, in messages: where readers have pseudonyms, its name may name one."""
    return name if pseudonyms is None else pseudonyms.of_file(name, kind)


def _tell_of_what_is_no_file(
    study: Study,
    paths: list[Path],
    pattern: str,
    pseudonyms: Pseudonyms | None,
    findings: Findings,
) -> None:
    """Tell of folders and broken links that are named like logs."""
    for path in sorted(path for path in paths if not path.is_file()):
        shown = _shown(shown_path(study, path.absolute()), "file", pseudonyms)
        if path.is_dir():
            # A pattern for whatever lies in folders finds the folders too.
            if "." in pattern.rsplit("/", 1)[-1].replace("**", ""):
                findings.warning(
                    "a folder is named like a log, and is no log",
                    path=shown,
                    fix="if logs lie in it, add their names to [logs] files",
                )
        else:
            findings.error(
                "the log is a link that leads to no file",
                path=shown,
                fix="copy the file itself to this place, or remove the link",
            )


def _note_unread(
    study: Study, logs: list[Path], pseudonyms: Pseudonyms | None, findings: Findings
) -> None:
    """Warn of files among the logs that may be logs too, and that no pattern names."""
    named = {study.path.absolute(), key_path(study)} | {path.absolute() for path in logs}
    tables = (study.participants, study.items, study.trials)
    names = [table.table for table in tables if table is not None]
    names += [study.regions.file]
    if study.screening is not None:
        rules = (study.screening.trials, study.screening.participants)
        names += [own.notes for own in rules if own is not None and own.notes is not None]
    named |= {(study.folder / name.split("#")[0]).absolute() for name in names if name}
    endings = _LOG_ENDINGS | {_ending(path) for path in logs}
    unread = sorted(
        _shown(shown_path(study, path.absolute()), "file", pseudonyms)
        for folder in {path.parent for path in logs}
        for path in folder.iterdir()
        if _ending(path) in endings
        and not path.name.startswith(".")
        and path.is_file()
        and path.absolute() not in named
    )
    if unread:
        one = len(unread) == 1
        findings.warning(
            f"{'a file lies' if one else f'{len(unread):,} files lie'} among the logs and "
            f"{'is' if one else 'are'} not read",
            path=study.shown,
            line=study.line_of("logs", "files"),
            where="logs.files",
            found=first_few(unread, _LISTED),
            fix="if it is a log, add a pattern for its name; else move it to another folder"
            if one
            else "if they are logs, add a pattern for their names; else move them elsewhere",
        )


def _ending(path: Path) -> str:
    """How a file's name ends, letter case aside; what is compressed ends as what is in it."""
    return Path(path.name.casefold().removesuffix(".gz")).suffix


def _identity(path: Path) -> tuple[int, int, str]:
    """What makes two paths one log: where disks ignore case, two patterns may spell one name."""
    status = path.stat()
    return status.st_dev, status.st_ino, unicodedata.normalize("NFC", path.name).casefold()


def _in_natural_order(shown: str) -> tuple[list[str | int], str]:
    """A key that sorts names with their digits as numbers."""
    parts = re.split(r"([0-9]+)", shown)
    # Every second part is digits, so that text is never compared with a number.
    return [int(part) if place % 2 else part for place, part in enumerate(parts)], shown
