"""The small orchard study as tables: delimited text with a fixation a row, in many dialects."""

from __future__ import annotations

import gzip
import io
import json
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import groupby
from pathlib import Path
from typing import Literal

import openpyxl

from tests.simulator.dialects.recorded import (
    SESSIONS,
    Fixated,
    ReadTrial,
    RecordedStudy,
    in_unit,
)
from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.writing import put, table

#: The screen that the study file describes.
WIDTH_PX, HEIGHT_PX, WIDTH_CM, DISTANCE_CM = 1920, 1080, 53.0, 65.0
#: What stands in the column of words, which no study needs: a separator and quotes among them.
WORDS = ("pear", '"', "so, ripe", "trees; old", 'the "sour" one', "a|b", "plain")
#: The same without a separator or a quote mark.
PLAIN_WORDS = ("pear", "ripe", "trees", "old", "sour", "plain")
#: Numbers of the fixations of an aborted start of a trial.
_ABORTED = 3

Quoting = Literal["none", "all", "undoubled"]
Layout = Literal["reader", "trial", "one", "straddling", "restarted", "sessions"]
Eyes = Literal["counts", "rows", "columns"]


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a table: its header, what stands in it, and its unit.

    ``fact`` is participant, session, trial, item, number, onset, end, duration, x, y, label, eye,
    blink, a fact about the trial or its reader, word (needed by nobody), or one of the numbers
    with ``:L`` or ``:R`` for the eye whose it is.
    """

    header: str
    fact: str
    unit: str = ""


COLUMNS = (
    Column("reader", "participant"),
    Column("trial_no", "trial"),
    Column("sentence", "item"),
    Column("start", "onset", "ms"),
    Column("dur", "duration", "ms"),
    Column("gx", "x", "px"),
    Column("gy", "y", "px"),
    Column("lids", "blink"),
)
WORD = Column("word", "word")
#: The facts of a trial and its reader as columns of the log.
FACTS = tuple(
    Column(name, name)
    for name in ("cue", "fit", "answer_ok", "text_on", "text_off", "group", "age")
)


@dataclass(frozen=True, slots=True)
class TableDialect:
    """How the tables of a study are written.

    ``encoding`` is a Python codec, ``mark`` a byte-order mark before it, ``state_encoding``
    whether the study file states it. With ``aligned`` the cells stand below each other, blanks
    between them. ``banner`` holds lines above the header; ``remarks`` puts one among the rows
    every so many, ``repeat_header`` the header. ``unneeded`` is a number of further columns.
    ``layout`` says which rows share a file, ``eyes`` whose rows or columns there are. With
    ``workbooks`` the tables beside the logs are spreadsheets.
    """

    columns: tuple[Column, ...] = COLUMNS
    delimiter: str = "\t"
    decimal: str = "."
    encoding: str = "utf-8"
    mark: bool = False
    state_encoding: bool = False
    newline: str = "\n"
    quoting: Quoting = "none"
    aligned: bool = False
    banner: tuple[str, ...] = ()
    remarks: int = 0
    repeat_header: int = 0
    missing: str = "."
    unneeded: int = 0
    layout: Layout = "reader"
    eyes: Eyes = "counts"
    eye_from_table: bool = False
    name_says: str = ""
    ending: str = ".tsv"
    compressed: bool = False
    workbooks: bool = False
    screen: Mapping[str, str] | None = None
    study: Callable[[str], StudyFile] = StudyFile


@dataclass(frozen=True, slots=True)
class Row:
    """A row of a log: a fixation by one eye, or by both."""

    trial: ReadTrial
    fixation: Fixated
    eye: str
    other: Fixated


@dataclass(frozen=True, slots=True)
class Cell:
    """A cell, and whether it is a number that takes the decimal sign."""

    text: str
    number: bool = False


def write_tables(study: RecordedStudy, folder: Path, dialect: TableDialect) -> Path:
    """Write a study whose logs are tables.

    Parameters
    ----------
    study : RecordedStudy
        What was recorded.
    folder : Path
        Made where it is missing.
    dialect : TableDialect
        How.

    Returns
    -------
    Path
        The study file.
    """
    for name, rows in logs_of(study, dialect).items():
        text = table_text(study, rows, dialect)
        ending = dialect.ending + (".gz" if dialect.compressed else "")
        put(folder / "logs" / f"{name}{ending}", packed(text, dialect))
    units = [column.unit for column in dialect.columns if column.fact.startswith("onset")]
    put_documents(
        study,
        folder,
        unit=units[0] if units else "ms",
        sessions=dialect.layout == "sessions",
        workbooks=dialect.workbooks,
    )
    content = dialect.study(logs_table(study, dialect))
    if dialect.screen:
        content = replace(content, screen=dialect.screen)
    path = folder / "study.toml"
    put(path, content.text().encode("utf-8"))
    return path


def put_documents(
    study: RecordedStudy,
    folder: Path,
    *,
    unit: str = "ms",
    sessions: bool = False,
    workbooks: bool = False,
) -> None:
    """Write the tables and region definitions that stand beside the logs."""
    facts = {
        "trial_list": study.trial_rows(unit=unit, sessions=sessions),
        "participants": study.reader_rows(),
    }
    for name, (header, *rows) in facts.items():
        if workbooks:
            put_workbook(folder / f"{name}.xlsx", [header, *rows])
        else:
            put(folder / f"{name}.csv", table([str(h) for h in header], rows).encode("utf-8"))
    put(folder / "regions.csv", study.marked_text.encode("utf-8"))
    put(folder / "labels.csv", study.labels.encode("utf-8"))


def put_workbook(path: Path, rows: Sequence[Sequence[str | int]]) -> None:
    """Write a workbook of one sheet; what looks like a number is one."""
    book = openpyxl.Workbook()
    sheet = book.active
    for row in rows:
        sheet.append([int(c) if isinstance(c, str) and c.isdecimal() else c for c in row])
    path.parent.mkdir(parents=True, exist_ok=True)
    book.save(path)


def logs_table(study: RecordedStudy, dialect: TableDialect) -> str:
    """The tables ``[logs]`` and below of a study file."""
    ending = dialect.ending + (".gz" if dialect.compressed else "")
    lines = ["[logs]", f'files = ["logs/*{ending}"]']
    if dialect.name_says:
        lines.append(f"participant_from_name = '{dialect.name_says}'")
    if dialect.state_encoding:
        lines.append(f'encoding = "{dialect.encoding}"')
    if dialect.missing not in ("", ".", "NA"):
        lines.append(f'missing = ["{dialect.missing}"]')
    lines += ["", "[logs.columns]"]
    canonical = {"number": "fixation"}
    known = (
        *("participant", "session", "trial", "item", "number", "onset", "end", "duration"),
        *("x", "y", "label", "eye", "blink"),
    )
    for column in dialect.columns:
        if column.fact in known:
            lines.append(f"{canonical.get(column.fact, column.fact)} = {_in_toml(column)}")
    if dialect.eyes == "columns":
        for eye in "LR":
            lines += ["", f"[logs.eye.columns.{eye}]"]
            for column in dialect.columns:
                fact, _, own = column.fact.partition(":")
                if own == eye:
                    lines.append(f"{fact} = {_in_toml(column)}")
    if dialect.eyes != "counts":
        lines += ["", "[logs.eye]"]
        if dialect.eye_from_table:
            lines.append('column = "better_eye"')
        else:
            lines.append('use = "R"')
            left = [r.participant for r in study.readers if r.eye == "L"]
            lines.append("readers = { " + ", ".join(f'{who} = "L"' for who in left) + " }")
    return "\n".join(lines) + "\n"


def _in_toml(column: Column) -> str:
    """A column as the study file describes it."""
    header = json.dumps(column.header, ensure_ascii=False)
    return f'{{ column = {header}, unit = "{column.unit}" }}' if column.unit else header


def logs_of(study: RecordedStudy, dialect: TableDialect) -> dict[str, list[Row]]:
    """The rows of each log, by its name without an ending."""
    rows = [row for trial in study.trials for row in _rows_of(study, trial, dialect)]
    if dialect.layout == "one":
        return {"all": rows}
    if dialect.layout == "trial":
        keys = groupby(rows, lambda row: f"{row.trial.participant}_{row.trial.trial}")
        return {name: list(own) for name, own in keys}
    by_reader = {who: list(own) for who, own in groupby(rows, lambda r: r.trial.participant)}
    if dialect.layout == "sessions":
        return {
            f"{who}_{session}": [row for row in own if study.session_of(row.trial) == session]
            for who, own in by_reader.items()
            for session in SESSIONS
        }
    if dialect.layout != "straddling":
        return by_reader
    out = {}
    for who, own in by_reader.items():
        trial = study.of(who)[len(study.of(who)) // 2].trial
        middle = next(n for n, row in enumerate(own) if row.trial.trial == trial) + 3
        out[f"{who}_1"], out[f"{who}_2"] = own[:middle], own[middle:]
    return out


def _rows_of(study: RecordedStudy, trial: ReadTrial, dialect: TableDialect) -> list[Row]:
    """The rows of one trial."""
    eye = study.reader(trial.participant).eye
    other_eye = "L" if eye == "R" else "R"
    rows = []
    fixations = list(trial.fixations)
    if dialect.layout == "restarted" and trial.trial % 3 == 0:
        fixations = [*aborted(trial), *fixations]
    for f in fixations:
        other = f.by_other_eye()
        rows.append(Row(trial, f, eye, other))
        if dialect.eyes == "rows":
            rows.append(Row(trial, other, other_eye, f))
    return rows


def aborted(trial: ReadTrial) -> list[Fixated]:
    """The start of a trial that was broken off for a new calibration, before the real one."""
    first = trial.fixations[0]
    return [
        replace(f, onset_ms=first.onset_ms - 1500 + 400 * number, duration_ms=300, blink=False)
        for number, f in enumerate(trial.fixations[:_ABORTED])
    ]


def table_text(study: RecordedStudy, rows: Sequence[Row], dialect: TableDialect) -> str:
    """A log as text with plain line ends."""
    unneeded = [f"q{number}" for number in range(dialect.unneeded)]
    header = [*(column.header for column in dialect.columns), *unneeded]
    cells = [[_spelled(Cell(name), dialect, always=False) for name in header]]
    for row in rows:
        one = [_cell(study, row, column, dialect) for column in dialect.columns]
        one += [Cell("0")] * dialect.unneeded
        cells.append([_spelled(cell, dialect, always=dialect.quoting == "all") for cell in one])
    if dialect.aligned:
        widths = [max(map(len, column)) + 1 for column in zip(*cells, strict=True)]
        lines = ["".join(c.rjust(w) for c, w in zip(one, widths, strict=True)) for one in cells]
    else:
        lines = [dialect.delimiter.join(one) for one in cells]
    out = [*dialect.banner, lines[0]]
    for number, line in enumerate(lines[1:], start=1):
        out.append(line)
        if dialect.remarks and number % dialect.remarks == 0:
            out.append("# the reader looked up")
        if dialect.repeat_header and number % dialect.repeat_header == 0:
            out.append(lines[0])
    return "\n".join(out) + "\n"


def _spelled(cell: Cell, dialect: TableDialect, *, always: bool) -> str:
    """A cell as it stands in the file."""
    if cell.number:
        return cell.text.replace(".", dialect.decimal)
    if dialect.quoting == "undoubled":
        at_risk = '"' in cell.text or dialect.delimiter in cell.text
        return f'"{cell.text}"' if at_risk else cell.text
    if dialect.quoting == "all" and (always or dialect.delimiter in cell.text):
        doubled = cell.text.replace('"', '""')
        return f'"{doubled}"'
    return cell.text


def _cell(study: RecordedStudy, row: Row, column: Column, dialect: TableDialect) -> Cell:
    """What stands in one column of a row."""
    trial, reader = row.trial, study.reader(row.trial.participant)
    sessions = dialect.layout == "sessions"
    fact, _, eye = column.fact.partition(":")
    fixation = row.fixation if not eye or eye == row.eye else row.other
    if fact in ("onset", "end", "duration", "x", "y"):
        return _number(fixation, fact, column.unit, dialect)
    if fact == "word":
        words = WORDS if dialect.quoting != "none" else PLAIN_WORDS
        if dialect.quoting == "undoubled":
            words = tuple(word for word in words if '"' not in word or word == '"')
        return Cell(words[fixation.number % len(words)])
    facts = {
        "participant": trial.participant,
        "session": study.session_of(trial) if sessions else "",
        "trial": study.number_in_session(trial) if sessions else trial.trial,
        "item": trial.item,
        "number": fixation.number,
        "label": fixation.label,
        "eye": row.eye,
        "blink": int(fixation.blink),
        "cue": trial.cue,
        "fit": trial.fit,
        "answer_ok": trial.answer_ok,
        "text_on": in_unit(trial.text_on_ms, "ms"),
        "text_off": in_unit(trial.text_off_ms, "ms"),
        "group": reader.group,
        "age": reader.age,
    }
    return Cell(str(facts[fact]))


def _number(fixation: Fixated, fact: str, unit: str, dialect: TableDialect) -> Cell:
    """A number in its unit and on the screen's own axes."""
    if fact in ("x", "y"):
        if fixation.x_px is None or fixation.y_px is None:
            return Cell(dialect.missing)
        x, y = _on_axes(fixation.x_px, fixation.y_px, dialect.screen or {})
        value = x if fact == "x" else y
        if unit == "deg":
            cm = value * WIDTH_CM / WIDTH_PX
            return Cell(f"{math.degrees(math.atan2(cm, DISTANCE_CM)):.5f}", number=True)
        return Cell(f"{value:.1f}", number=True)
    times = {"onset": fixation.onset_ms, "end": fixation.end_ms, "duration": fixation.duration_ms}
    return Cell(in_unit(times[fact], unit), number=True)


def _on_axes(x_px: float, y_px: float, screen: Mapping[str, str]) -> tuple[float, float]:
    """A point from the top left corner, y downwards, on the axes of a screen."""
    origin, up = screen.get("origin", '"top-left"'), screen.get("y_axis") == '"up"'
    if origin == '"centre"':
        x_px, y_px = x_px - WIDTH_PX / 2, y_px - HEIGHT_PX / 2
    if origin == '"bottom-left"':
        y_px -= HEIGHT_PX
    return x_px, -y_px if up else y_px


def packed(text: str, dialect: TableDialect) -> bytes:
    """The text of a log as bytes."""
    content = text.replace("\n", dialect.newline).encode(dialect.encoding)
    if dialect.mark:
        content = "\ufeff".encode(dialect.encoding) + content
    return zipped(content) if dialect.compressed else content


def zipped(content: bytes) -> bytes:
    """Bytes as a gzip file that carries neither a name nor a time."""
    buffer = io.BytesIO()
    with gzip.GzipFile(filename="", mode="wb", fileobj=buffer, mtime=0) as stream:
        stream.write(content)
    return buffer.getvalue()
