"""From a study file to a :class:`Study`, or to the list of all that is wrong with it."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import Any

from pydantic import PrivateAttr

from etl.errors import Findings, StudyError
from etl.study.examine import examine
from etl.study.models import StudyFile
from etl.study.place_rules import in_degrees
from etl.study.positions import KeyPath, nearest_line
from etl.study.rule import Problem
from etl.study.syntax import decode, parse, read_bytes
from etl.study.wording import dotted

#: Where the study file names a file or a folder, besides the logs: the tables around it, its key.
_FILE_KEYS = (
    (("participants",), "table"),
    (("items",), "table"),
    (("trials",), "table"),
    (("regions",), "file"),
    (("lines",), "corrections"),
    (("screening", "trials"), "notes"),
    (("screening", "participants"), "notes"),
    (("output",), "folder"),
)


@dataclass(frozen=True, slots=True)
class Source:
    """Where a study was read from.

    Attributes
    ----------
    path : Path
        The study file, absolute.
    shown : str
        Its name in messages, as the user gave it.
    lines : mapping of tuple to int
        The line of each key, from 1.
    sha256 : str
        Digest of what was read, in hex; empty for a study made in memory.
    """

    path: Path
    shown: str
    lines: Mapping[KeyPath, int] = field(default_factory=dict)
    sha256: str = ""


class Study(StudyFile):
    """A study file that was read and found sound.

    Its keys are attributes, as in the file: ``study.logs.columns.onset.unit``. It can be pickled,
    for workers of any kind.

    Examples
    --------
    >>> study = Study.model_validate(
    ...     {
    ...         "logs": {"files": ["*.tsv"], "columns": {"onset": "t_start"}},
    ...         "regions": {"file": "boxes.csv", "kind": "boxes"},
    ...     }
    ... )
    >>> study.logs.columns.onset.unit
    'ms'
    """

    _source: Source = PrivateAttr()

    def model_post_init(self, context: Any) -> None:
        """Keep where the study came from; one made in memory counts as study.toml beside us."""
        known = isinstance(context, Source)
        self._source = context if known else Source(Path("study.toml").absolute(), "study.toml")

    @property
    def path(self) -> Path:
        """The study file, as an absolute path."""
        return self._source.path

    @property
    def folder(self) -> Path:
        """The folder that holds the study file; names of files in it are relative to this."""
        return self._source.path.parent

    @property
    def shown(self) -> str:
        """The name of the study file in messages, as the user gave it."""
        return self._source.shown

    @property
    def sha256(self) -> str:
        """Digest of the study file as it was read, in hex; empty for a study made in memory."""
        return self._source.sha256

    def line_of(self, *path: str | int) -> int | None:
        """The line of a key in the study file.

        Parameters
        ----------
        *path : str or int
            Keys from the outermost table inwards, and places in arrays from 0.

        Returns
        -------
        int or None
            From 1. Where the key is not in the file, the line of the nearest table around it;
            None where that is not there either.
        """
        return nearest_line(self._source.lines, path)

    def understood(self) -> dict[str, Any]:
        """The study as understood: every key with its value, defaults filled in.

        Returns
        -------
        dict
            Plain values that JSON can hold; null for what the study does without. A file that is
            named by its place on this machine is named relative to the study file where it lies
            below it, and by its name alone elsewhere: the record says nothing about the machine.
        """
        whole: dict[str, Any] = self.model_dump(mode="json")
        whole["logs"]["files"] = [self._portable(name) for name in whole["logs"]["files"]]
        for tables, key in _FILE_KEYS:
            inner: Any = whole
            for table in tables:
                inner = None if inner is None else inner[table]
            if inner is not None and inner[key] is not None:
                inner[key] = self._portable(inner[key])
        return whole

    def _portable(self, name: str) -> str:
        """A file's name without the place of a folder on this machine."""
        if not (PurePosixPath(name).is_absolute() or PureWindowsPath(name).is_absolute()):
            return name
        path = Path(name)
        if path.is_relative_to(self.folder):
            return path.relative_to(self.folder).as_posix()
        return f"…/{PurePosixPath(name).name}"


def load_study(path: str | Path, *, known_outcomes: Collection[str] | None = None) -> Study:
    """Read a study file.

    Parameters
    ----------
    path : str or Path
        The study file: TOML, UTF-8, with or without a byte-order mark.
    known_outcomes : collection of str, optional
        The names of all measures, with or without the groups. Where given, an outcome of another
        name is refused, and so is a factor or covariate that is called like a measure.

    Returns
    -------
    Study
        With every default filled in.

    Raises
    ------
    StudyError
        If the file cannot be read, is no TOML, or breaks any rule: all problems at once, in the
        order of the file, each with its line.

    Examples
    --------
    >>> load_study("no_such_study.toml")
    Traceback (most recent call last):
        ...
    etl.errors.StudyError: no_such_study.toml: there is no such file; expected a study file
        fix: correct the name, or change to the folder that holds it
    1 problem; nothing was written
    """
    shown = str(path)
    findings = Findings()
    raw = read_bytes(Path(path), shown, findings)
    text = None if raw is None else decode(raw, shown, findings)
    parsed = None if text is None else parse(text, shown, findings)
    if raw is None or parsed is None:
        raise StudyError(findings)
    data, lines = parsed
    _refuse_variants(data, lines, shown)
    source = Source(Path(path).absolute(), shown, lines, hashlib.sha256(raw).hexdigest())
    examined = examine(data, known_outcomes)
    if examined.problems:
        raise StudyError(_in_file_order(examined.problems, source))
    if in_degrees(examined.draft):
        # Absent means the centre where positions are angles; the record should say so.
        data["screen"].setdefault("origin", "centre")
    return Study.model_validate(data, context=source)


def _refuse_variants(data: Mapping[str, Any], lines: Mapping[KeyPath, int], shown: str) -> None:
    """Refuse a variants file in the place of a study file."""
    tables = ("screening", "regions", "measures", "lines")
    named = [(key,) for key in ("variants", "comparisons") if key in data]
    listed = [path for key in tables for path in _alternatives(data.get(key), (key,))]
    of_variants = [*named, *listed]
    if "logs" in data or not of_variants:
        return
    findings = Findings()
    findings.error(
        "this is a variants file",
        path=shown,
        line=nearest_line(lines, of_variants[0]),
        where=dotted(of_variants[0]),
        expected="a study file",
        fix="name the study file first, then the variants file",
    )
    raise StudyError(findings)


def _alternatives(value: Any, path: KeyPath) -> Iterator[KeyPath]:
    """Keys with lists that are not all of texts: no decision of a study has such a value."""
    if isinstance(value, Mapping):
        for key, inner in value.items():
            yield from _alternatives(inner, (*path, key))
    elif isinstance(value, list) and not all(isinstance(one, str) for one in value):
        yield path


def _in_file_order(problems: list[Problem], source: Source) -> Findings:
    """Problems as findings, by line; what has no line belongs at the end of the file."""
    placed = [(nearest_line(source.lines, problem.path), problem) for problem in problems]
    placed.sort(key=lambda pair: (pair[0] is None, pair[0] or 0))
    findings = Findings()
    for line, problem in placed:
        findings.error(
            problem.problem,
            path=source.shown,
            line=line,
            where=dotted(problem.path),
            found=problem.found,
            expected=problem.expected,
            fix=problem.fix,
        )
    return findings
