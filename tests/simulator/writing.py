"""Simulated studies as files: fixation logs in many dialects, and the tables around them.

Every byte is decided here and none by the platform: encodings and line ends are spelled out, and a
compressed log carries neither a name nor a time.
"""

from __future__ import annotations

import csv
import gzip
import io
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from tests.simulator.spec import SimulatedFixation, SimulatedStudy, SimulatedTrial

#: Where a fixation was written: log file (relative, with /) and line, by reader, trial, fixation.
Places = dict[tuple[str, int, int], tuple[str, int]]


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a log: its header, what stands in it, and in which unit.

    ``fact`` is one of participant, trial, item, fixation, onset, end, duration, x, y, blink, eye.
    Times are in ``"ms"`` (whole numbers) or ``"s"`` (three decimals).
    """

    header: str
    fact: str
    unit: str = "ms"


@dataclass(frozen=True, slots=True)
class Dialect:
    """How one log is written.

    ``encoding`` is a Python codec; ``utf-16-le`` with ``mark`` starts with a byte-order mark.
    ``banner`` holds lines that stand above the header, as they are. With ``both_eyes`` each
    fixation has a second row for the left eye.
    """

    delimiter: str = "\t"
    decimal: str = "."
    encoding: str = "utf-8"
    mark: bool = False
    newline: str = "\n"
    banner: tuple[str, ...] = ()
    both_eyes: bool = False
    compressed: bool = False


@dataclass(frozen=True, slots=True)
class LogFile:
    """A log: its name relative to the study, the trials in it, and its dialect."""

    name: str
    trials: tuple[SimulatedTrial, ...]
    dialect: Dialect = Dialect()


def logs_by_reader(
    study: SimulatedStudy, dialects: Mapping[str, tuple[str, Dialect]]
) -> list[LogFile]:
    """One log a reader, with the file endings and dialects given for some of them.

    Parameters
    ----------
    study : SimulatedStudy
        What was read.
    dialects : mapping of str to (str, Dialect)
        Participant to file ending and dialect; the others get plain ``.tsv`` files.
    """
    files = []
    for reader in study.readers:
        who = reader.plan.participant
        ending, dialect = dialects.get(who, (".tsv", Dialect()))
        own = tuple(trial for trial in study.trials if trial.plan.participant == who)
        files.append(LogFile(f"logs/{who}{ending}", own, dialect))
    return files


def write_study(
    study: SimulatedStudy,
    folder: Path,
    *,
    columns: Sequence[Column],
    logs: Iterable[LogFile] | None = None,
    documents: Mapping[str, str] | None = None,
) -> Places:
    """Write a study: its logs and the documents beside them.

    Parameters
    ----------
    study : SimulatedStudy
        What was read.
    folder : Path
        Made where it is missing; files of the same names are replaced.
    columns : sequence of Column
        The columns of every log.
    logs : iterable of LogFile, optional
        Which trials go into which log; by default one plain log a reader.
    documents : mapping of str to str, optional
        Names to contents of further files, written in UTF-8 with their line ends as they are.

    Returns
    -------
    dict
        Reader, trial and fixation number to the log's name and the line, counted from 1, at which
        that fixation (of the right eye) stands.
    """
    places: Places = {}
    for log in logs_by_reader(study, {}) if logs is None else logs:
        content = log_text(log, columns, places)
        put(folder / log.name, packed(content, log.dialect))
    for name, text in (documents or {}).items():
        put(folder / name, text.encode("utf-8"))
    return places


def put(path: Path, content: bytes) -> None:
    """Write a file and the folders above it."""
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(content)


def packed(text: str, dialect: Dialect) -> bytes:
    """The text of a log as bytes."""
    content = text.replace("\n", dialect.newline).encode(dialect.encoding)
    if dialect.mark:
        content = "\ufeff".encode(dialect.encoding) + content
    if not dialect.compressed:
        return content
    buffer = io.BytesIO()
    with gzip.GzipFile(filename="", mode="wb", fileobj=buffer, mtime=0) as stream:
        stream.write(content)
    return buffer.getvalue()


def log_text(log: LogFile, columns: Sequence[Column], places: Places) -> str:
    """A log's text with plain line ends; the place of every fixation goes into ``places``."""
    lines = list(log.dialect.banner)
    lines.append(log.dialect.delimiter.join(column.header for column in columns))
    for trial in log.trials:
        if not trial.recorded:
            continue
        for fixation in trial.fixations:
            key = trial.plan.participant, trial.plan.trial, fixation.fixation
            lines.append(row(trial, fixation, "R", columns, log.dialect))
            places[key] = log.name, len(lines)
            if log.dialect.both_eyes:
                lines.append(row(trial, left_eye(fixation), "L", columns, log.dialect))
    return "\n".join(lines) + "\n"


def left_eye(fixation: SimulatedFixation) -> SimulatedFixation:
    """The same fixation by the left eye: a little later, a little to the left of the right eye."""
    return replace(
        fixation,
        onset_ms=fixation.onset_ms + 2,
        x_px=round(fixation.x_px - 5.3, 1),
        y_px=round(fixation.y_px + 1.6, 1),
    )


def row(
    trial: SimulatedTrial,
    fixation: SimulatedFixation,
    eye: str,
    columns: Sequence[Column],
    dialect: Dialect,
) -> str:
    """One line of a log."""
    facts = {
        "participant": lambda _: trial.plan.participant,
        "trial": lambda _: str(trial.plan.trial),
        "item": lambda _: trial.plan.item,
        "fixation": lambda _: str(fixation.fixation),
        "onset": lambda unit: time(fixation.onset_ms, unit),
        "end": lambda unit: time(fixation.end_ms, unit),
        "duration": lambda unit: time(fixation.duration_ms, unit),
        "x": lambda _: f"{fixation.x_px:.1f}",
        "y": lambda _: f"{fixation.y_px:.1f}",
        "blink": lambda _: str(int(fixation.blink)),
        "eye": lambda _: eye,
    }
    cells = []
    for column in columns:
        if column.fact not in facts:
            raise ValueError(f"no such fact in a simulated log: {column.fact}")
        cell = facts[column.fact](column.unit)
        numeric = column.fact in {"onset", "end", "duration", "x", "y"}
        cells.append(cell.replace(".", dialect.decimal) if numeric else cell)
    return dialect.delimiter.join(cells)


def time(milliseconds: int, unit: str) -> str:
    """A time in its unit, exact.

    Examples
    --------
    >>> time(61005, "ms"), time(61005, "s")
    ('61005', '61.005')
    """
    if unit == "ms":
        return str(milliseconds)
    return f"{milliseconds // 1000}.{milliseconds % 1000:03d}"


def table(header: Sequence[str], rows: Iterable[Sequence[object]], delimiter: str = ",") -> str:
    """A table as comma-separated text, quoted where needed, with plain line ends."""
    buffer = io.StringIO(newline="")
    writer = csv.writer(buffer, delimiter=delimiter, lineterminator="\n")
    writer.writerow(header)
    writer.writerows(rows)
    return buffer.getvalue()
