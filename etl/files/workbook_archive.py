"""The parts of a workbook's archive: its sheets, and what the values of a sheet do not tell.

A workbook is a ZIP archive of XML parts. Values and number formats are read by openpyxl; which
rows and columns are hidden, which cells are merged and which formulas have no stored result is
read from the sheet's own part here.

References
----------
ECMA-376-1:2016 (Office Open XML), sections 12.3 (parts of a workbook) and 18.3.1 (worksheets);
ECMA-376-2:2021 (Open Packaging Conventions), relationships.
"""

from __future__ import annotations

import io
import posixpath
import re
import zipfile
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Final
from xml.etree import ElementTree as ET

#: The most rows and columns that a sheet can have (common to spreadsheet programs, no source).
MOST_ROWS: Final = 1_048_576
MOST_COLUMNS: Final = 16_384
#: The largest workbook that is read, unpacked, in bytes: more than two million cells. What claims
#: to be larger is no table of a study, and may be made to fill the memory.
MOST_BYTES: Final = 100_000_000
#: The most places for cells, up to the last filled one of each row, that a table may take.
MOST_PLACES: Final = 50_000_000

_CELL = re.compile(r"([A-Z]{1,3})([1-9][0-9]{0,6})")
#: The kinds of parts that hold what several sheets share: texts, and number formats.
_WITH_SHEETS = frozenset({"sharedStrings", "styles"})
_TRUE = frozenset({"1", "true"})


class DamagedWorkbookError(ValueError):
    """A workbook's parts contradict its format."""


@dataclass(frozen=True, slots=True)
class Sheet:
    """A sheet that a workbook lists.

    Attributes
    ----------
    name : str
        Its name on the tab.
    part : str
        The name of its part in the archive.
    visible : bool
        Whether its tab is shown.
    has_cells : bool
        False for a sheet that is a chart.
    """

    name: str
    part: str
    visible: bool
    has_cells: bool


Range = tuple[int, int, int, int]


@dataclass(slots=True)
class SheetMarks:
    """What a sheet says beside its values; rows and columns count from 1.

    Attributes
    ----------
    hidden_rows : set of int
        Rows that are not shown, by hand or by a filter.
    hidden_columns : list of (int, int)
        First and last column of each run of columns that are not shown.
    merged : list of (int, int, int, int)
        First row, first column, last row and last column of each range of merged cells.
    uncalculated : set of (int, int)
        Row and column of the formulas without a stored result.
    """

    hidden_rows: set[int] = field(default_factory=set)
    hidden_columns: list[tuple[int, int]] = field(default_factory=list)
    merged: list[Range] = field(default_factory=list)
    uncalculated: set[tuple[int, int]] = field(default_factory=set)


def unpacked_bytes(archive: zipfile.ZipFile) -> int:
    """How large the parts of an archive are; reading them gives no more than they say.

    Parameters
    ----------
    archive : ZipFile
        The workbook.

    Returns
    -------
    int, bytes
    """
    return sum(part.file_size for part in archive.infolist())


def sheets_of(archive: zipfile.ZipFile) -> tuple[list[Sheet], bool]:
    """The sheets of a workbook in the order of their tabs.

    Parameters
    ----------
    archive : ZipFile
        The workbook.

    Returns
    -------
    sheets : list of Sheet
        Charts among them.
    strict : bool
        Whether it is written in the strict variant of the format, which openpyxl does not read.

    Raises
    ------
    DamagedWorkbookError
        If the archive holds no workbook.
    """
    main = _main_part(archive)
    root = ET.fromstring(archive.read(main))  # noqa: S314  # expat bounds entities
    parts = _relations(archive, main)
    sheets = []
    for element in root.iter():
        if _local(element.tag) != "sheet":
            continue
        own = next((v for name, v in element.attrib.items() if _local(name) == "id"), "")
        kind, part = parts.get(own, ("", ""))
        if kind not in ("worksheet", "chartsheet", "dialogsheet"):
            continue
        visible = element.get("state", "visible") == "visible"
        sheets.append(Sheet(element.get("name", ""), part, visible, kind == "worksheet"))
    return sheets, "purl.oclc.org" in root.tag


def with_one_sheet(archive: zipfile.ZipFile, sheet: Sheet) -> bytes:
    """The workbook with one of its sheets only, and with what is needed to show its cells.

    Charts, pictures, links to other workbooks, other sheets and the properties of the document have
    no part in a table; where one of them is odd, the table can be read all the same.

    Parameters
    ----------
    archive : ZipFile
        The workbook.
    sheet : Sheet
        The sheet that is kept.

    Returns
    -------
    bytes
        An archive, not compressed.
    """
    main = _main_part(archive)
    needed = {"[Content_Types].xml", _relations_of(""), main, _relations_of(main), sheet.part}
    # Some programs name a list of texts that they leave out where no cell holds a text.
    there = set(archive.namelist())
    related = {part for kind, part in _relations(archive, main).values() if kind in _WITH_SHEETS}
    needed |= related & there
    lean = io.BytesIO()
    with zipfile.ZipFile(lean, "w") as out:
        for name in sorted(needed):
            out.writestr(name, archive.read(name))
    return lean.getvalue()


def marks_of_sheet(archive: zipfile.ZipFile, part: str) -> SheetMarks:
    """Read what a sheet says beside its values.

    Parameters
    ----------
    archive : ZipFile
        The workbook.
    part : str
        The sheet's part.

    Returns
    -------
    SheetMarks

    Raises
    ------
    DamagedWorkbookError
        If rows or cells are not in order, lie beyond the largest sheet, or are far apart.
    """
    marks = SheetMarks()
    last, places = 0, 0
    for element in _elements(archive, part):
        kind = _local(element.tag)
        if kind == "row":
            last, width = _row(element, last, marks)
            places += width
            if places > MOST_PLACES:
                raise DamagedWorkbookError("its cells are too far apart for a table")
            element.clear()
        elif kind == "col" and element.get("hidden") in _TRUE:
            marks.hidden_columns.append((int(element.get("min", 0)), int(element.get("max", 0))))
        elif kind == "mergeCell":
            marks.merged.append(_range(element.get("ref", "")))
    return marks


def holds_values(archive: zipfile.ZipFile, part: str) -> bool:
    """Whether any cell of a sheet holds something.

    Parameters
    ----------
    archive : ZipFile
        The workbook.
    part : str
        The sheet's part.

    Returns
    -------
    bool
    """
    for element in _elements(archive, part):
        kind = _local(element.tag)
        if kind in ("v", "is", "f") and "".join(element.itertext()).strip():
            return True
        if kind == "row":
            element.clear()
    return False


def column_number(letters: str) -> int:
    """The number of a column, from 1.

    Parameters
    ----------
    letters : str
        Capital letters.

    Returns
    -------
    int

    Examples
    --------
    >>> column_number("A"), column_number("AB")
    (1, 28)
    """
    number = 0
    for letter in letters:
        number = number * 26 + ord(letter) - ord("A") + 1
    return number


def _row(element: ET.Element, last: int, marks: SheetMarks) -> tuple[int, int]:
    """Read one row, which must come after the last; gives its number and that of its last cell."""
    number = int(element.get("r", last + 1))
    if not last < number <= MOST_ROWS:
        raise DamagedWorkbookError(f"row {number} stands after row {last}")
    if element.get("hidden") in _TRUE:
        marks.hidden_rows.add(number)
    column = 0
    for cell in element:
        before, column = column, column + 1
        if "r" in cell.attrib:
            row, column = _place(cell.attrib["r"])
            if row != number:
                raise DamagedWorkbookError(f"cell {cell.attrib['r']} stands in row {number}")
        if not before < column <= MOST_COLUMNS:
            raise DamagedWorkbookError(f"a cell of row {number} is out of its place")
        if _lacks_result(cell):
            marks.uncalculated.add((number, column))
    return number, column


def _lacks_result(cell: ET.Element) -> bool:
    """Whether a cell holds a formula whose result is not stored beside it."""
    formula, result = False, ""
    for part in cell:
        kind = _local(part.tag)
        formula = formula or kind == "f"
        result += "".join(part.itertext()) if kind in ("v", "is") else ""
    # A formula that gives an empty text stores it as text without letters.
    return formula and not result and cell.get("t") != "str"


def _place(reference: str) -> tuple[int, int]:
    """Row and column of a reference such as B7."""
    found = _CELL.fullmatch(reference.replace("$", ""))
    if found is None:
        raise DamagedWorkbookError(f"{reference!r} is no cell")
    return int(found[2]), column_number(found[1])


def _range(reference: str) -> Range:
    """The corners of a reference such as B3:B6."""
    first, _, last = reference.partition(":")
    return *_place(first), *_place(last or first)


def _elements(archive: zipfile.ZipFile, part: str) -> Iterator[ET.Element]:
    """The elements of a part, each when it is complete."""
    with archive.open(part) as source:
        for _, element in ET.iterparse(source):  # noqa: S314  # expat bounds entities
            yield element


def _main_part(archive: zipfile.ZipFile) -> str:
    """The name of the part that lists the sheets."""
    for kind, part in _relations(archive, "").values():
        if kind == "officeDocument":
            return part
    raise DamagedWorkbookError("the archive holds no workbook")


def _relations_of(part: str) -> str:
    """The name of the part that says what another one is related to."""
    folder, name = posixpath.split(part)
    return posixpath.join(folder, "_rels", f"{name}.rels")


def _relations(archive: zipfile.ZipFile, part: str) -> dict[str, tuple[str, str]]:
    """What a part is related to: by identifier, the kind and the name of the other part."""
    folder = posixpath.dirname(part)
    root = ET.fromstring(archive.read(_relations_of(part)))  # noqa: S314  # expat bounds entities
    relations = {}
    for element in root:
        target = element.get("Target", "")
        whole = target if target.startswith("/") else posixpath.join("/", folder, target)
        kind = element.get("Type", "").rpartition("/")[2]
        relations[element.get("Id", "")] = kind, posixpath.normpath(whole).lstrip("/")
    return relations


def _local(name: str) -> str:
    """The name of an element or attribute without its namespace."""
    return name.rpartition("}")[2]
