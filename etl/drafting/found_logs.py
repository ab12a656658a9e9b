"""Which logs are meant by what was named on the command line, and the patterns that find them."""

from __future__ import annotations

import glob
import os
import re
import unicodedata
from collections.abc import Iterable, Sequence
from pathlib import Path, PurePosixPath

from etl.errors import Findings

#: Files that operating systems put into folders by themselves.
_LEFT_BY_SYSTEMS = {"thumbs.db", "desktop.ini"}
#: What recordings of the open standard are called, and what may lie beside a log.
RECORDING = "_physio.tsv.gz"
_NO_LOGS = {".toml", ".json", ".md", ".pdf", ".png", ".jpg", ".docx", ".xlsx", ".py", ".r"}


def find_named(
    names: Iterable[str | os.PathLike[str]], findings: Findings
) -> tuple[list[Path], set[Path]]:
    """The logs that are meant: files, patterns with ``*``, and folders with the files in them.

    Parameters
    ----------
    names : iterable of path
        As given on the command line.
    findings : Findings
        Where it is recorded what names no log.

    Returns
    -------
    list of Path
        Each once, in the order of their names with digits as numbers.
    set of Path
        Those that only a folder stands for, which may hold other files too.
    """
    found: dict[Path, Path] = {}
    named: set[Path] = set()
    for given in names:
        name = os.fspath(given)
        path = Path(name)
        if path.is_dir():
            files = _in_folder(path)
            if not files:
                findings.error(
                    "there is no log in this folder",
                    path=name,
                    expected="a folder with logs in it",
                    fix="name the folder that holds the logs, or the logs themselves",
                )
        elif path.exists() or not glob.has_magic(name):
            files = [path]
        else:
            globbed = sorted(glob.glob(name, recursive=True))  # noqa: PTH207
            files = [Path(one) for one in globbed if Path(one).is_file()]
            if not files:
                findings.error(
                    "no file has a name like this",
                    path=name,
                    fix="correct the pattern, or change to the folder from which it is meant; "
                    "* stands for any part of a name",
                )
        for file in files:
            found.setdefault(file.resolve(), file)
        if not path.is_dir():
            named |= {file.resolve() for file in files}
    paths = sorted(found.values(), key=lambda path: natural_order(path.as_posix()))
    return paths, {path for path in paths if path.resolve() not in named}


def natural_order(name: str) -> tuple[list[str | int], str]:
    """A key that sorts names with their digits as numbers.

    Examples
    --------
    >>> sorted(["P10.tsv", "P9.tsv"], key=natural_order)
    ['P9.tsv', 'P10.tsv']
    """
    parts = re.split(r"([0-9]+)", name)
    # Every second part is digits, so that text is never compared with a number.
    return [int(part) if place % 2 else part for place, part in enumerate(parts)], name


def _in_folder(folder: Path) -> list[Path]:
    """The files of a folder that may be logs; those of the open standard lie further below."""
    recordings = sorted(folder.rglob(f"*{RECORDING}"))
    if recordings:
        return recordings
    return [
        path
        for path in sorted(folder.iterdir())
        if path.is_file()
        and not path.name.startswith((".", "~"))
        and path.name.casefold() not in _LEFT_BY_SYSTEMS
        and path.suffix.casefold() not in _NO_LOGS
    ]


def patterns_for(logs: Sequence[Path], folder: Path) -> tuple[list[str], bool]:
    """Patterns, relative to a folder, that find exactly these logs.

    Parameters
    ----------
    logs : sequence of Path
        The logs.
    folder : Path
        Where the study file goes.

    Returns
    -------
    list of str
        With forward slashes.
    bool
        Whether any of them is a pattern; otherwise every log is named.

    Notes
    -----
    All files of a kind in a folder become ``folder/*.tsv``; where such a pattern would find more,
    what their names begin with is added, and where it still does, each log is named.
    """
    wanted = {_identity(path) for path in logs}
    groups: dict[tuple[Path, str], list[Path]] = {}
    for path in logs:
        groups.setdefault((path.absolute().parent, _ending(path.name)), []).append(path)
    over_folders = _over_folders(list(groups.items()), folder, wanted)
    if over_folders:
        return over_folders, True
    patterns: list[str] = []
    by_pattern = False
    for (parent, ending), own in groups.items():
        start = common_start([path.name.removesuffix(ending) for path in own])
        start = glob.escape(start.rstrip("0123456789"))
        # A pattern for names without an ending would find the study file itself.
        several = len(own) > 1 and ending
        candidates = [f"*{ending}", f"{start}*{ending}"] if several else []
        base = _relative(parent, folder)
        for candidate in candidates:
            if _finds(parent, candidate) <= wanted:
                patterns.append(_joined(base, candidate))
                by_pattern = True
                break
        else:
            patterns += [_joined(base, glob.escape(path.name)) for path in own]
    return patterns, by_pattern


def common_start(names: Sequence[str]) -> str:
    """What all names begin with.

    Examples
    --------
    >>> common_start(["P01_a", "P02_a"])
    'P0'
    """
    shortest = min(names, key=len)
    same = (all(name[place] == sign for name in names) for place, sign in enumerate(shortest))
    return shortest[: next((place for place, one in enumerate(same) if not one), len(shortest))]


def _over_folders(
    groups: list[tuple[tuple[Path, str], list[Path]]], folder: Path, wanted: set[str]
) -> list[str]:
    """One pattern for each ending, where the logs lie in many folders of one folder."""
    parents = {parent for (parent, _), _ in groups}
    if len(parents) < 2:
        return []
    above = Path(os.path.commonpath([str(parent) for parent in parents]))
    depths = {len(parent.relative_to(above).parts) for parent in parents}
    endings = dict.fromkeys(ending for (_, ending), _ in groups)
    between = "/".join("*" * depths.pop()) if len(depths) == 1 else "**"
    patterns = []
    for ending in endings:
        pattern = f"{between}/*{ending}" if between else f"*{ending}"
        if not _finds(above, pattern) <= wanted:
            return []
        patterns.append(_joined(_relative(above, folder), pattern))
    return patterns


def _finds(folder: Path, pattern: str) -> set[str]:
    """The files that a pattern finds, as a study would find them."""
    found = glob.glob(str(Path(glob.escape(str(folder))) / pattern), recursive=True)  # noqa: PTH207
    return {_identity(Path(path)) for path in found if Path(path).is_file()}


def _identity(path: Path) -> str:
    """What makes two paths one file."""
    return unicodedata.normalize("NFC", str(path.resolve()))


def _ending(name: str) -> str:
    """What a file's name ends in: its kind, and how it is packed."""
    if name.endswith(RECORDING):
        return RECORDING
    suffixes = PurePosixPath(name).suffixes
    if suffixes[-1:] == [".gz"]:
        return "".join(suffixes[-2:])
    return suffixes[-1] if suffixes else ""


def _relative(parent: Path, folder: Path) -> str:
    """A folder as seen from that of the study file, with forward slashes."""
    try:
        relative = Path(os.path.relpath(parent, folder.absolute()))
    except ValueError:  # on another drive
        relative = parent
    return glob.escape(relative.as_posix()) if relative != Path() else ""


def _joined(base: str, name: str) -> str:
    """A folder and a name in it."""
    return f"{base}/{name}" if base else name
