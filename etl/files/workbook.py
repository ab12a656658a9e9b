"""Tables that lie in a spreadsheet workbook (.xlsx): one sheet into text cells."""

from __future__ import annotations

import hashlib
import io
import unicodedata
import warnings
import zipfile
import zlib
from collections.abc import Sequence
from difflib import get_close_matches
from functools import lru_cache
from pathlib import Path
from typing import Any, Final
from xml.etree import ElementTree as ET

from openpyxl import load_workbook

from etl.errors import Findings
from etl.files.decoding import RawText
from etl.files.delimited import Cells
from etl.files.steady import read_steady
from etl.files.text_faults import tell_unreadable
from etl.files.workbook_archive import (
    MOST_BYTES,
    DamagedWorkbookError,
    Sheet,
    SheetMarks,
    holds_values,
    marks_of_sheet,
    sheets_of,
    unpacked_bytes,
    with_one_sheet,
)
from etl.files.workbook_table import SheetCells, table_in
from etl.files.workbook_values import cell_as_shown

#: The first bytes of a ZIP archive with parts, and of the older compound file in which earlier
#: workbooks and encrypted ones lie (APPNOTE 4.3.7; [MS-CFB] 2.2).
ZIP_SIGNATURE: Final = b"PK\x03\x04"
COMPOUND_SIGNATURE: Final = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
#: The stream of a compound file that holds an encrypted workbook ([MS-OFFCRYPTO] 2.3.4).
_ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
_OPEN_TEXT = "application/vnd.oasis.opendocument"
SAVE_AS: Final = "open it in the spreadsheet program and save it as .xlsx, or as CSV in UTF-8"
#: What reading raises where bytes are missing or changed: from the archive, from its compression,
#: from the XML of its parts, and from values that the format does not allow.
_DAMAGE = (
    zipfile.BadZipFile,
    zlib.error,
    ET.ParseError,
    EOFError,
    OSError,
    NotImplementedError,
    RuntimeError,
    ValueError,
    TypeError,
    LookupError,
    ArithmeticError,
    AttributeError,
)


def read_workbook(path: Path, sheet: str | None, shown: str, findings: Findings) -> Cells | None:
    """Read a table from a sheet of a workbook.

    Parameters
    ----------
    path : Path
        The workbook.
    sheet : str or None
        The name of the sheet; None for the first one that is not hidden.
    shown : str
        Its name for messages.
    findings : Findings
        Where problems are recorded: what keeps the workbook from being read, cells that hold no
        value that could be relied on, and what is read although the lab may not see it.

    Returns
    -------
    Cells or None
        The cells as the sheet shows them, a line being a row of the sheet; None where a problem
        was recorded.
    """
    try:
        stored = read_steady(path)
    except OSError as why:
        tell_unreadable(path, shown, why, findings)
        return None
    if not _is_workbook(stored, shown, findings):
        return None
    before = findings.count("error")
    try:
        found = _cells_in(stored, sheet, (path.name, shown), findings)
    except _DAMAGE as why:
        findings.error(
            "the workbook cannot be read: it is damaged",
            path=shown,
            found=str(why) if isinstance(why, DamagedWorkbookError) else type(why).__name__,
            fix="copy it again from where it was made; if the spreadsheet program opens it, save "
            "it there anew",
        )
        return None
    if found is None or findings.count("error") > before:
        return None
    text = RawText(shown, b"", hashlib.sha256(stored).hexdigest(), "xlsx")
    table = table_in(found, shown, findings)
    if table is None or findings.count("error") > before:
        return None
    return Cells(shown, table.header, table.header_line, table.columns, table.lines, "", text)


def _is_workbook(stored: bytes, shown: str, findings: Findings) -> bool:
    """Whether bytes can be a workbook; says what else they are."""
    if stored.startswith(ZIP_SIGNATURE):
        return True
    if stored.startswith(COMPOUND_SIGNATURE) and _ENCRYPTED in stored:
        problem = "the workbook is protected by a password"
        fix = "save it without a password for opening it; protected sheets can be read"
    elif stored.startswith(COMPOUND_SIGNATURE):
        problem = "this is a workbook of the older format .xls, whatever its name says"
        fix = SAVE_AS
    elif not stored:
        problem, fix = "the file is empty", "copy it again from where it was made"
    else:
        problem = "this is no workbook, though its name ends in .xlsx"
        fix = (
            "if it is a text file, give it the ending .csv, here and in the study file; if not, "
            "copy it again"
        )
    findings.error(problem, path=shown, expected="a workbook (.xlsx)", fix=fix)
    return False


def kind_of_archive(stored: bytes) -> str:
    """What a ZIP archive is.

    Parameters
    ----------
    stored : bytes
        The archive.

    Returns
    -------
    {"workbook", "open document", "other"}
        ``"other"`` also where it cannot be opened.
    """
    try:
        with zipfile.ZipFile(io.BytesIO(stored)) as archive:
            names = set(archive.namelist())
            if "mimetype" in names and archive.getinfo("mimetype").file_size < len(_OPEN_TEXT) * 4:
                is_open = archive.read("mimetype").decode("ascii", "replace").startswith(_OPEN_TEXT)
                return "open document" if is_open else "other"
    except _DAMAGE:
        return "other"
    return "workbook" if any(name.startswith("xl/") for name in names) else "other"


def _cells_in(
    stored: bytes, wanted: str | None, names: tuple[str, str], findings: Findings
) -> SheetCells | None:
    """The cells of the sheet that is wanted; ``names``: the file's own, and that for messages."""
    shown = names[1]
    if kind_of_archive(stored) == "open document":
        findings.error(
            "this is an OpenDocument file, whatever its name says",
            path=shown,
            expected="a workbook (.xlsx)",
            fix=SAVE_AS,
        )
        return None
    with zipfile.ZipFile(io.BytesIO(stored)) as archive:
        size = unpacked_bytes(archive)
        if size > MOST_BYTES:
            findings.error(
                "the workbook is too large to be a table of a study",
                path=shown,
                found=f"{size / 1e6:,.0f} MB when unpacked",
                expected=f"at most {MOST_BYTES / 1e6:,.0f} MB",
                fix="keep the table in a workbook of its own, or save it as CSV in UTF-8",
            )
            return None
        sheets, strict = sheets_of(archive)
        if strict:
            findings.error(
                "the workbook is saved in the strict variant of its format",
                path=shown,
                fix="save it as an ordinary workbook (.xlsx), or as CSV in UTF-8",
            )
            return None
        sheet = _chosen(sheets, wanted, shown, findings)
        if sheet is None:
            return None
        marks = marks_of_sheet(archive, sheet.part)
        if wanted is None:
            others = [s for s in sheets if s is not sheet and s.has_cells]
            filled = [s.name for s in others if holds_values(archive, s.part)]
            _tell_others(sheet, filled, names, findings)
        lean = with_one_sheet(archive, sheet)
    return _read_values(lean, sheet, marks)


def _chosen(
    sheets: Sequence[Sheet], wanted: str | None, shown: str, findings: Findings
) -> Sheet | None:
    """The sheet of a name, or the first one that is not hidden."""
    named = ", ".join(f'"{sheet.name}"' for sheet in sheets if sheet.has_cells)
    if wanted is None:
        sheet = next((s for s in sheets if s.has_cells and s.visible), None)
        if sheet is None:
            findings.error(
                "the workbook has no sheet that is shown",
                path=shown,
                found=named or "none",
                expected="a sheet with a table",
                fix="show the sheet, or name it after a hash in the study file",
            )
        return sheet
    plain = _composed(wanted)
    sheet = next((s for s in sheets if _composed(s.name) == plain), None)
    if sheet is not None and sheet.has_cells:
        return sheet
    names = [s.name for s in sheets if s.has_cells]
    alike = {name.casefold(): name for name in names}
    near = get_close_matches(plain.casefold(), list(alike), n=1)
    findings.error(
        "the sheet is a chart" if sheet is not None else "the workbook has no sheet of this name",
        path=shown,
        found=wanted,
        expected=f"one of its sheets: {named}" if named else "a sheet with a table",
        fix=(f'did you mean "{alike[near[0]]}"? Correct' if near else "correct")
        + " the name after the hash in the study file",
    )
    return None


def _tell_others(
    sheet: Sheet, others: Sequence[str], names: tuple[str, str], findings: Findings
) -> None:
    """Say which sheet was read, where others hold something too."""
    if others:
        findings.note(
            f'the first sheet, "{sheet.name}", was read; '
            + ("another holds" if len(others) == 1 else "others hold")
            + " something too",
            path=names[1],
            found=", ".join(others),
            fix=f'to say which sheet is meant, write "{names[0]}#{sheet.name}" in the study file',
        )


def _read_values(stored: bytes, sheet: Sheet, marks: SheetMarks) -> SheetCells:
    """Every cell of a sheet as it is shown; blank ones are left out."""
    rows = []
    # Most cells of a table repeat others; 1, 1.0 and TRUE are equal but are shown otherwise.
    as_shown = lru_cache(maxsize=None, typed=True)(cell_as_shown)
    with warnings.catch_warnings():
        # What it cannot keep (fonts, extensions, rules of input) has no part in a table.
        warnings.filterwarnings("ignore", module=r"openpyxl\.")
        book = load_workbook(io.BytesIO(stored), read_only=True, data_only=True, keep_links=False)
        try:
            own: Any = book[sheet.name]
            # What a file says of its own size is often wrong; rows beyond it would be lost.
            own.reset_dimensions()
            for number, row in enumerate(own.iter_rows(), start=1):
                cells = {
                    place: as_shown(cell.value, cell.number_format, is_error=cell.data_type == "e")
                    for place, cell in enumerate(row, start=1)
                    if cell.value is not None
                }
                if cells:
                    rows.append((number, cells))
        finally:
            book.close()
    return SheetCells(rows, marks)


def _composed(name: str) -> str:
    """A name in the one form in which equal letters are equal."""
    return unicodedata.normalize("NFC", name)
