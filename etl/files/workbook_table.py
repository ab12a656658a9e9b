"""From the cells of a sheet to a table: where it begins, its columns, and what it hides."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files.workbook_archive import Range, SheetMarks
from etl.files.workbook_values import ShownCell

_REMARK = "#"
_BLANK = ShownCell("")
_UNCALCULATED = "a formula without a stored result"
#: How many rows a message lists.
_MOST_LISTED = 5

Row = tuple[int, Mapping[int, ShownCell]]


@dataclass(frozen=True, slots=True)
class SheetCells:
    """The cells of a sheet.

    Attributes
    ----------
    rows : sequence of (int, mapping of int to ShownCell)
        The number of each row that holds anything, and its cells by the number of their column;
        both from 1.
    marks : SheetMarks
        What is hidden, merged or not calculated.
    """

    rows: Sequence[Row]
    marks: SheetMarks


@dataclass(frozen=True, slots=True)
class SheetTable:
    """A table in a sheet.

    Attributes
    ----------
    header : tuple of str
        The names of the columns from the sheet's first on, trimmed; empty where there is none.
    header_line : int
        The row of the header.
    columns : pa.Table
        The columns that have a name, as text.
    lines : (n,) int32 array
        The row of the sheet in which each row of the table stands.
    """

    header: tuple[str, ...]
    header_line: int
    columns: pa.Table
    lines: NDArray[np.int32]


def table_in(sheet: SheetCells, shown: str, findings: Findings) -> SheetTable | None:
    """Find the table of a sheet.

    Parameters
    ----------
    sheet : SheetCells
        The cells. The first row that holds anything is the header; rows whose first cell begins
        with # are remarks, and they and blank rows are left out, as in a text file.
    shown : str
        The workbook's name for messages.
    findings : Findings
        Where it is recorded what keeps the table from being read, what is read although it is
        hidden, and what is shown otherwise than it is held.

    Returns
    -------
    SheetTable or None
        None where a problem was recorded.
    """
    rows = [*_with_formulas(sheet)]
    top = next((place for place, (_, cells) in enumerate(rows) if not _is_remark(cells)), None)
    if top is None:
        findings.error(
            "the sheet holds no table",
            path=shown,
            expected="a header, and below it a row for each row of the table",
            fix="fill the sheet, or name another one after a hash in the study file",
        )
        return None
    before = findings.count("error")
    found = _Table(rows[top], rows[top + 1 :], sheet.marks, (shown, findings))
    found.check()
    return found.table() if findings.count("error") == before else None


def _with_formulas(sheet: SheetCells) -> Iterator[Row]:
    """The rows that hold anything but blanks, formulas without a result among them."""
    lacking: dict[int, dict[int, ShownCell]] = {}
    for row, column in sheet.marks.uncalculated:
        lacking.setdefault(row, {})[column] = ShownCell("", wrong=_UNCALCULATED)
    known = dict(sheet.rows)
    for row in sorted(known.keys() | lacking.keys()):
        cells = {**known.get(row, {}), **lacking.get(row, {})}
        filled = {place: cell for place, cell in cells.items() if cell.text.strip() or cell.wrong}
        if filled:
            yield row, dict(sorted(filled.items()))


def _is_remark(cells: Mapping[int, ShownCell], first: int | None = None) -> bool:
    """Whether a row is a remark: its first cell, or the one in a column, begins with #."""
    column = next(iter(cells)) if first is None else first
    return cells.get(column, _BLANK).text.lstrip().startswith(_REMARK)


@dataclass(slots=True)
class _Odd:
    """Cells of a column that are shown otherwise than they are held: how many, and the first."""

    count: int
    line: int
    first: ShownCell


class _Table:
    """A table in the making: its header, its rows, and all that is to be said of them."""

    def __init__(
        self, top: Row, below: Sequence[Row], marks: SheetMarks, manner: tuple[str, Findings]
    ) -> None:
        """Take the header, the rows below it, and the file's name with the list of findings."""
        self.line, head = top
        self.head = head
        self.marks = marks
        self.shown, self.findings = manner
        self.names = {
            place: unicodedata.normalize("NFC", cell.text.strip()) for place, cell in head.items()
        }
        first = next(iter(head))
        self.rows = [row for row in below if not _is_remark(row[1], first)]
        self.remarks = [row for row in below if _is_remark(row[1], first)]
        self.header = tuple(self.names.get(place, "") for place in range(1, max(head) + 1))

    def check(self) -> None:
        """Record everything that is wrong, doubtful or worth knowing."""
        for place, cell in self.head.items():
            if cell.wrong:
                self._tell_wrong(cell, self.line, place)
        self._tell_equal_names()
        for corners in sorted(self.marks.merged):
            self._check_merged(corners)
        for line, cells in self.rows:
            for place, cell in cells.items():
                if cell.wrong:
                    self._tell_wrong(cell, line, place)
                elif place not in self.names:
                    self.findings.error(
                        "a value stands in a column without a name",
                        path=self.shown,
                        line=line,
                        where=f"column {column_letters(place)}",
                        found=cell.text,
                        expected=f"a name for the column in row {self.line}",
                        fix="name the column, or move the remark to another sheet",
                    )
        self._tell_of_remarks()
        self._tell_of_hidden()
        self._tell_of_formats()

    def table(self) -> SheetTable:
        """The table, of which nothing wrong was found."""
        columns = {
            name: pa.array([cells.get(place, _BLANK).text for _, cells in self.rows], pa.string())
            for place, name in self.names.items()
        }
        lines = np.array([line for line, _ in self.rows], dtype=np.int32)
        return SheetTable(self.header, self.line, pa.table(columns), lines)

    def _tell_wrong(self, cell: ShownCell, line: int, place: int) -> None:
        """Record a cell that holds no value that could be relied on."""
        name = f"{column_letters(place)}{line}"
        uncalculated = cell.wrong == _UNCALCULATED
        self.findings.error(
            "the result of the formula is not stored in the workbook"
            if uncalculated
            else "the cell shows an error in place of a value",
            path=self.shown,
            line=line,
            where=self._where(place),
            found=None if uncalculated else cell.wrong,
            expected=f"a value in cell {name}",
            fix="open the workbook in the spreadsheet program and save it there: it then "
            "calculates the formulas and stores what they give"
            if uncalculated
            else "correct the cell, or clear it where there is no value",
        )

    def _tell_equal_names(self) -> None:
        """Record every name that stands over two columns."""
        seen: dict[str, int] = {}
        for place, name in self.names.items():
            if name and name in seen:
                first, second = (column_letters(at) for at in (seen[name], place))
                self.findings.error(
                    "two columns have the same name",
                    path=self.shown,
                    line=self.line,
                    where="header",
                    found=name,
                    expected=f"a name of its own for each of columns {first} and {second}",
                    fix="rename one of them in the file's header",
                )
            seen.setdefault(name, place)

    def _where(self, place: int) -> str:
        """A column, for messages."""
        name = self.names.get(place, "")
        return f'column "{name}"' if name else f"column {column_letters(place)}"

    def _check_merged(self, corners: Range) -> None:
        """Record a range of merged cells that holds something and touches the table."""
        top, left, bottom, right = corners
        if bottom < self.line or (top, left) == (bottom, right):
            return
        held = [
            (line, place, cell)
            for line, cells in ((self.line, self.head), *self.rows)
            if top <= line <= bottom
            for place, cell in cells.items()
            if left <= place <= right
        ]
        if held:
            line, place, cell = held[0]
            spelled = f"{column_letters(left)}{top}:{column_letters(right)}{bottom}"
            self.findings.error(
                "merged cells hold one value, and which of their rows and columns it is for "
                "cannot be told",
                path=self.shown,
                line=line,
                where=self._where(place),
                found=f"{cell.text} in {spelled}",
                expected="a value in each cell",
                fix="unmerge the cells and fill each one in; begin a title above the header with #",
            )

    def _tell_of_remarks(self) -> None:
        """Warn of rows that are left out as remarks and fill several cells."""
        alike = [line for line, cells in self.remarks if len(cells) > 1]
        if alike:
            self.findings.warning(
                f"{len(alike):,} rows begin with # and fill more than one cell"
                if len(alike) > 1
                else "a row begins with # and fills more than one cell",
                path=self.shown,
                line=alike[0],
                expected="remarks, which are not read",
                fix="if this is a row of the table, begin it with something else",
            )

    def _tell_of_hidden(self) -> None:
        """Warn of rows and columns that were read although the lab may not see them."""
        rows = [line for line, _ in self.rows if line in self.marks.hidden_rows]
        if rows:
            more = ", …" if len(rows) > _MOST_LISTED else ""
            self.findings.warning(
                f"{len(rows):,} hidden rows were read"
                if len(rows) > 1
                else "a hidden row was read",
                path=self.shown,
                line=rows[0],
                found=f"row{'s' if len(rows) > 1 else ''} "
                + ", ".join(str(line) for line in rows[:_MOST_LISTED])
                + more,
                fix="show them and check; what is no part of the table must be deleted, since "
                "hiding and filtering leave nothing out",
            )
        hidden = [
            name
            for place, name in self.names.items()
            if any(first <= place <= last for first, last in self.marks.hidden_columns)
        ]
        if hidden:
            self.findings.warning(
                f"{len(hidden):,} hidden columns were read"
                if len(hidden) > 1
                else "a hidden column was read",
                path=self.shown,
                line=self.line,
                found=", ".join(hidden),
                fix="show them and check",
            )

    def _tell_of_formats(self) -> None:
        """Say where cells show less than they hold, and where a number format is not understood."""
        less: dict[int, _Odd] = {}
        strange: dict[int, _Odd] = {}
        for line, cells in self.rows:
            for place, cell in cells.items():
                if cell.held:
                    less.setdefault(place, _Odd(0, line, cell)).count += 1
                if cell.strange:
                    strange.setdefault(place, _Odd(0, line, cell)).count += 1
        for place, odd in sorted(less.items()):
            self.findings.note(
                f"{odd.count:,} cells show less than they hold, and were read as shown"
                if odd.count > 1
                else "a cell shows less than it holds, and was read as shown",
                path=self.shown,
                line=odd.line,
                where=self._where(place),
                found=f"{odd.first.held} shown as {odd.first.text}",
                fix="to have all of it read, give the column a number format that shows it",
            )
        for place, odd in sorted(strange.items()):
            self.findings.warning(
                f"{odd.count:,} cells have a number format that is not understood, and were read "
                "without it"
                if odd.count > 1
                else "a cell has a number format that is not understood, and was read without it",
                path=self.shown,
                line=odd.line,
                where=self._where(place),
                found=f"{odd.first.strange}, read as {odd.first.text}",
                fix="give the column a plain number format, such as General or 0.00",
            )


def column_letters(place: int) -> str:
    """The letters by which spreadsheets name a column.

    Examples
    --------
    >>> column_letters(1), column_letters(26), column_letters(27), column_letters(703)
    ('A', 'Z', 'AA', 'AAA')
    """
    letters = ""
    while place:
        place, letter = divmod(place - 1, 26)
        letters = chr(ord("A") + letter) + letters
    return letters
