"""Names and folders of the open standard (BIDS): which files belong together."""

from __future__ import annotations

import os
import posixpath
import re
from dataclasses import dataclass
from pathlib import Path

from etl.pseudonyms import Pseudonyms

#: A gaze recording, and the events that were found in it.
RECORDING, RECORDING_EVENTS = "_physio.tsv.gz", "_physioevents.tsv.gz"
_NAME = re.compile(
    r"(?P<pairs>(?:[a-zA-Z0-9]+-[a-zA-Z0-9+]+_)*)(?P<suffix>[a-zA-Z0-9]+)(?P<extension>\.[a-z.]+)"
)


@dataclass(frozen=True, slots=True)
class BidsName:
    """The name of a file, taken apart.

    Attributes
    ----------
    entities : dict of str to str
        Labels by the short names of their entities (``sub``, ``ses``, ``task``, ``run``, …), in
        the order of the name.
    suffix : str
        What kind of data it is, such as ``physio``.
    extension : str
        From the first point on.

    References
    ----------
    BIDS 1.11, Common principles, "Filenames" and "Entities".

    Examples
    --------
    >>> name = BidsName.of("sub-P01_task-read_recording-eye1_physio.tsv.gz")
    >>> name.entities["sub"], name.suffix, name.extension
    ('P01', 'physio', '.tsv.gz')
    """

    entities: dict[str, str]
    suffix: str
    extension: str

    @classmethod
    def of(cls, name: str) -> BidsName | None:
        """Take a name apart; None for a name that the standard does not have."""
        found = _NAME.fullmatch(name)
        if found is None:
            return None
        pairs = [pair.split("-", 1) for pair in found["pairs"].split("_")[:-1]]
        entities = {key: label for key, label in pairs}  # noqa: C416  (lists, not pairs)
        if len(entities) < len(pairs):
            return None
        return cls(entities, found["suffix"], found["extension"])

    def applies_to(self, other: BidsName) -> bool:
        """Whether every entity of this name is one of the other's, with the same label."""
        return self.entities.items() <= other.entities.items()


def subject_folder(path: Path) -> Path | None:
    """The folder ``sub-<label>`` that a file lies in.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    Path or None
        None where it lies in none.
    """
    return next((folder for folder in path.parents if folder.name.startswith("sub-")), None)


def folders_above(path: Path) -> list[Path]:
    """The folders whose files may describe a file: from the dataset's own to the file's.

    Parameters
    ----------
    path : Path
        The file. One that lies in no folder ``sub-<label>`` is described in its own folder only.

    Returns
    -------
    list of Path

    References
    ----------
    BIDS 1.11, Common principles, "The inheritance principle".
    """
    subject = subject_folder(path)
    if subject is None:
        return [path.parent]
    above = [folder for folder in path.parents if folder.is_relative_to(subject)]
    return [subject.parent, *reversed(above)]


def described_by(path: Path, suffix: str, extension: str) -> list[list[Path]]:
    """The files of one kind that apply to a file, folder by folder.

    Parameters
    ----------
    path : Path
        The file they apply to.
    suffix, extension : str
        The kind.

    Returns
    -------
    list of list of Path
        A list for each folder that has any, the dataset's own first. The standard allows one in
        a folder; where there are several, nothing says which is meant.

    References
    ----------
    BIDS 1.11, Common principles, "The inheritance principle".
    """
    name = BidsName.of(path.name)
    found = []
    for folder in folders_above(path) if name is not None else ():
        own = []
        for other in sorted(folder.glob(f"*{suffix}{extension}")):
            parsed = BidsName.of(other.name)
            if (
                parsed is not None
                and (parsed.suffix, parsed.extension) == (suffix, extension)
                and name is not None
                and parsed.applies_to(name)
            ):
                own.append(other)
        if own:
            found.append(own)
    return found


def events_beside(path: Path) -> Path:
    """Where the events of a recording are, if there are any.

    Parameters
    ----------
    path : Path
        The recording, ``…_physio.tsv.gz``.

    Returns
    -------
    Path
        ``…_physioevents.tsv.gz`` in the same folder.
    """
    return path.with_name(path.name.removesuffix(RECORDING) + RECORDING_EVENTS)


def same_run(path: Path) -> list[Path]:
    """The recordings of one run: those whose names differ in the entity ``recording`` only.

    Parameters
    ----------
    path : Path
        One of them.

    Returns
    -------
    list of Path
        In the order of their names, ``path`` among them.
    """

    def run(of: Path) -> dict[str, str] | None:
        name = BidsName.of(of.name)
        return (
            None if name is None else {k: v for k, v in name.entities.items() if k != "recording"}
        )

    own = run(path)
    others = sorted(path.parent.glob(f"*{RECORDING}"))
    return [path] if own is None else [other for other in others if run(other) == own]


@dataclass(frozen=True, slots=True)
class Place:
    """Where a log is, and how its neighbours are called in messages.

    Attributes
    ----------
    path : Path
        The log.
    shown : str
        Its name in messages; its own name, or that of a file in the same folder.
    pseudonyms : Pseudonyms or None
        What gives other names to files, where the study asks for it.

    Examples
    --------
    >>> place = Place(Path("data/sub-1/beh/sub-1_physio.tsv.gz"), "sub-1/beh/sub-1_physio.tsv.gz")
    >>> place.of(Path("data/physio.json"))
    'physio.json'
    """

    path: Path
    shown: str
    pseudonyms: Pseudonyms | None = None

    def of(self, other: Path) -> str:
        """The name of another file in messages."""
        if self.pseudonyms is not None:
            # Their own names tell of whom they are.
            return self.pseudonyms.of_file(other.absolute())
        way = Path(os.path.relpath(other, self.path.parent)).as_posix()
        return posixpath.normpath(posixpath.join(posixpath.dirname(self.shown), way))
