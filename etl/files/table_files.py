"""Tables that a lab keeps beside its logs: delimited text, or a sheet of a workbook."""

from __future__ import annotations

import re
from pathlib import Path

from etl.errors import Findings
from etl.files.decoding import read_text
from etl.files.delimited import Cells, header_of, read_cells
from etl.files.workbook import (
    COMPOUND_SIGNATURE,
    SAVE_AS,
    ZIP_SIGNATURE,
    kind_of_archive,
    read_workbook,
)

#: The name of a workbook, and after a hash that of a sheet in it.
_WITH_SHEET = re.compile(r"(?P<file>.+?\.xlsx)#(?P<sheet>.*)", re.IGNORECASE | re.DOTALL)
_WORKBOOK = ".xlsx"


def file_and_sheet(named: Path) -> tuple[Path, str | None]:
    """Split what a study file names into a file and the name of a sheet in it.

    Parameters
    ----------
    named : Path
        A file; after the name of a workbook (``.xlsx``) a hash and the name of a sheet may follow.

    Returns
    -------
    file : Path
        The file itself.
    sheet : str or None
        None where no sheet is named.

    Examples
    --------
    >>> file, sheet = file_and_sheet(Path("lists.xlsx#Trials"))
    >>> file.name, sheet
    ('lists.xlsx', 'Trials')
    >>> file_and_sheet(Path("list#2.csv"))[1] is None
    True
    """
    found = _WITH_SHEET.fullmatch(named.name)
    return (named, None) if found is None else (named.with_name(found["file"]), found["sheet"])


def read_table(named: Path, shown: str, findings: Findings) -> Cells | None:
    """Read a table: delimited text, plain or gzipped, or a sheet of a workbook.

    Parameters
    ----------
    named : Path
        The file, with the name of a sheet after a hash where that is meant.
    shown : str
        Its name for messages.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    Cells or None
        None where a problem was recorded.
    """
    file, sheet = file_and_sheet(named)
    if file.suffix.lower() == _WORKBOOK:
        return read_workbook(file, sheet, shown, findings)
    if _is_unread_workbook(file, shown, findings):
        return None
    return read_cells(file, shown, findings)


def header_of_table(named: Path) -> tuple[str, ...]:
    """The column names of a table, whatever it lies in.

    Parameters
    ----------
    named : Path
        The file, with the name of a sheet after a hash where that is meant.

    Returns
    -------
    tuple of str
        Empty where the file cannot be read, which is told when it is read.
    """
    if file_and_sheet(named)[0].suffix.lower() == _WORKBOOK:
        cells = read_table(named, named.name, Findings())
        return () if cells is None else cells.header
    text = read_text(named, named.name, Findings())
    return () if text is None else header_of(text)


def _is_unread_workbook(file: Path, shown: str, findings: Findings) -> bool:
    """Whether a file is a workbook that its name does not say or that is not read; says so."""
    try:
        with file.open("rb") as source:
            stored = source.read(len(COMPOUND_SIGNATURE))
            if stored.startswith(ZIP_SIGNATURE):
                stored += source.read()
    except OSError:
        return False  # told by who reads the file as text
    if stored.startswith(COMPOUND_SIGNATURE):
        problem = "this is a workbook of the older format .xls, or one protected by a password"
        fix = SAVE_AS + "; without a password"
    elif not stored.startswith(ZIP_SIGNATURE):
        return False
    else:
        kind = kind_of_archive(stored)
        if kind == "other":
            return False
        own = kind == "workbook"
        problem = "this is a spreadsheet workbook" + ("" if own else " in the OpenDocument format")
        ending = file.suffix.lower()
        renamed = f"rename it to {file.stem}{_WORKBOOK}, here and in the study file"
        fix = SAVE_AS if not own or ending in (".xlsm", ".xlsb", ".xls") else renamed
    findings.error(
        problem,
        path=shown,
        expected="delimited text, or a workbook whose name ends in .xlsx",
        fix=fix,
    )
    return True
