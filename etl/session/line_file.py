"""Writes the lines of a trial into a table that people correct by hand."""

from __future__ import annotations

import math
import os
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from etl.cells import csv_text, plain
from etl.errors import DataError, Findings
from etl.files import Cells, number_of, read_cells
from etl.report.trace_input import TracedFixation, TracedTrial
from etl.report.trace_lines import line_middles
from etl.session.line_corrections import headers_of
from etl.session.lines import NO_READING
from etl.session.pseudonym_key import open_key
from etl.study import Study

#: Separators of fields by the ending of a file's name.
_DELIMITERS: Final = {".csv": ",", ".tsv": "\t"}
#: What is only to be looked at: columns that nobody reads back.
TO_LOOK_AT: Final = ("line_told", "confidence", "x_px", "y_px", "word")
_WHAT_TO_DO: Final = (
    "Change the column line where it is wrong; 0 is no line. Rows that stay count as set by hand, "
    "also those you do not change: delete the rows of trials that you did not look at."
)
#: Fixations left out by these are shown to no method, and no line would bring them back.
_NOT_ASKED: Final = frozenset({*NO_READING, "repeated"})


def write_lines(traced: TracedTrial, path: Path, study: Study) -> str:
    """Write the lines of a trial's fixations into a table, to be corrected by hand.

    Parameters
    ----------
    traced : TracedTrial
        From :func:`etl.trace`.
    path : Path
        The table (``.csv`` or ``.tsv``). One that is there keeps all its rows as they are; only
        fixations that it does not have are added, in its own columns.
    study : Study
        The study of the trial.

    Returns
    -------
    str
        What was written and what to do with it, in words.

    Raises
    ------
    DataError
        If the text has one line only, or the table cannot be read or written.

    Notes
    -----
    The columns ``participant``, ``session`` where readers came more than once, ``trial``,
    ``fixation`` and ``line`` are what ``[lines] corrections`` reads. The others, ``line_told`` (the
    line without what was set by hand), ``confidence``, ``x_px``, ``y_px`` and ``word``, are to be
    looked at; they are ignored when the table is read. UTF-8, with a byte-order mark where there
    is more than ASCII, by which spreadsheet programs know it. Texts that a spreadsheet would run
    have an apostrophe in front (:func:`etl.cells.safe`), which is taken off when they are read.
    """
    findings = Findings()
    fixations = [f for f in traced.fixations if f.left_out_by not in _NOT_ASKED]
    if len(line_middles(traced)) < 2:
        findings.error(
            "there are no lines to correct",
            found=traced.heading,
            expected="a trial of the study on a text of several lines",
            fix="name another trial, or leave --lines out",
        )
    elif path.suffix.lower() not in _DELIMITERS:
        findings.error(
            "the kind of table is not known",
            found=path.name,
            expected="a name that ends in .csv or .tsv",
            fix="name the file so",
        )
    known = None
    if not findings.failed and path.exists():
        known = _known(traced, path, study, findings)
    if findings.failed:
        raise DataError(findings)
    sheet = known or _new(traced, path)
    added = [f for f in fixations if f.number not in sheet.there]
    if added or known is None:
        _save(path, sheet.text + sheet.rows(traced, added), findings)
    return _told(traced, (path, study), len(added), len(fixations) - len(added))


@dataclass(frozen=True, slots=True)
class _Sheet:
    """A table to which rows are added.

    Attributes
    ----------
    text : str
        What it holds already, with its header.
    header : tuple of str
        Our name for each of its columns.
    delimiter : str
        Between fields.
    there : frozenset of int
        The fixations of the trial that it has.
    """

    text: str
    header: tuple[str, ...]
    delimiter: str
    there: frozenset[int] = frozenset()

    def rows(self, traced: TracedTrial, fixations: list[TracedFixation]) -> str:
        """Rows for fixations, in the table's own columns."""
        return csv_text(
            ([_row(traced, f).get(name, "") for name in self.header] for f in fixations),
            self.delimiter,
        )


def _new(traced: TracedTrial, path: Path) -> _Sheet:
    """A table that is not there yet."""
    session = ("session",) if traced.session else ()
    header = ("participant", *session, "trial", "fixation", "line", *TO_LOOK_AT)
    delimiter = _DELIMITERS[path.suffix.lower()]
    return _Sheet(csv_text([header], delimiter), header, delimiter)


def _known(traced: TracedTrial, path: Path, study: Study, findings: Findings) -> _Sheet | None:
    """A table that is there; None where it cannot be added to."""
    cells = read_cells(path, str(path), findings)
    headers = None if cells is None else headers_of(cells, study, findings)
    if cells is None or headers is None:
        return None
    if traced.session and "session" not in headers:
        findings.error(
            'there is no column "session"',
            path=cells.shown,
            line=cells.header_line,
            found=", ".join(cells.header),
            expected="a column session, since readers came more than once",
            fix="add the column, or name another file",
        )
        return None
    names = {header: name for name, header in headers.items()}
    text = cells.text.data.decode("utf-8")
    return _Sheet(
        text if text.endswith("\n") else text + "\n",
        tuple(names.get(header, header) for header in cells.header),
        cells.delimiter,
        _there(traced, cells, headers, study),
    )


def _there(
    traced: TracedTrial, cells: Cells, headers: dict[str, str], study: Study
) -> frozenset[int]:
    """The fixations of a trial that a table has; it may name the reader by id or by pseudonym."""
    held = open_key(study, Findings())
    own = {name: getattr(traced, name) for name in ("participant", "session", "trial")}
    columns = {
        name: [plain(text) for text in cells.texts(headers[name])]
        for name in own
        if name in headers
    }
    if held is not None:
        columns["participant"] = [held.pseudonyms.of_either(t) for t in columns["participant"]]
    numbers = [number_of(text) for text in cells.texts(headers["fixation"])]
    return frozenset(
        int(number)
        for row, number in enumerate(numbers)
        if number is not None and all(columns[name][row] == own[name] for name in columns)
    )


def _row(traced: TracedTrial, fixation: TracedFixation) -> dict[str, str]:
    """What is written of a fixation."""

    def spelled(value: float, digits: int) -> str:
        return "" if math.isnan(value) else f"{value:.{digits}f}"

    told = fixation.line if fixation.line_told is None else fixation.line_told
    return {
        "participant": traced.participant,
        "session": traced.session,
        "trial": traced.trial,
        "fixation": str(fixation.number),
        "line": str(fixation.line),
        "line_told": str(told),
        "confidence": spelled(_downwards(fixation.line_confidence), 3),
        "x_px": spelled(fixation.x_px, 1),
        "y_px": spelled(fixation.y_px, 1),
        "word": _word(traced, fixation),
    }


def _downwards(confidence: float) -> float:
    """A confidence cut to three digits: never rounded up to certainty."""
    return confidence if math.isnan(confidence) else math.floor(1000 * confidence + 1e-9) / 1000


def _word(traced: TracedTrial, fixation: TracedFixation) -> str:
    """What stands on the line where the fixation is: the word, else the name of its region."""
    for word in traced.words:
        if word.line == fixation.line and word.left_px <= fixation.x_px < word.right_px:
            return word.text
    return traced.region(fixation.region_order) if fixation.region_order else ""


def _save(path: Path, text: str, findings: Findings) -> None:
    """Write the table; it is there as a whole or as it was."""
    beside = path.with_name(f".{path.name}.new")
    try:
        beside.write_text(text, encoding="utf-8" if text.isascii() else "utf-8-sig", newline="\n")
        beside.replace(path)
    except OSError as why:
        beside.unlink(missing_ok=True)
        findings.error(
            f"the table cannot be written ({why.strerror or type(why).__name__})",
            path=str(path),
            fix="name a file in a folder that is there and in which you may write, and close it in "
            "other programs",
        )
        raise DataError(findings) from why


def _told(traced: TracedTrial, where: tuple[Path, Study], added: int, there: int) -> str:
    """What was written, and what to do with it."""
    path, study = where
    rows = "1 fixation" if added == 1 else f"{added} fixations"
    lines = [f"Written to {path}: {rows} of {traced.heading}."]
    if there:
        verb = "was" if there == 1 else "were"
        lines.append(f"{there} {verb} there already and stay as they are.")
    lines.append(_WHAT_TO_DO)
    name = _relative(path, study.folder)
    given = study.lines.corrections if study.lines is not None else None
    if given is not None and (study.folder / given).resolve() == path.resolve():
        lines.append("The study file names this table already: build again when you are done.")
    else:
        lines.append(f'Then let the study file read it:\n\n[lines]\ncorrections = "{name}"')
    return "\n".join(lines)


def _relative(path: Path, folder: Path) -> str:
    """A path as the study file would name it."""
    try:
        return Path(os.path.relpath(path.resolve(), folder.resolve())).as_posix()
    except ValueError:  # on another drive
        return path.resolve().as_posix()
