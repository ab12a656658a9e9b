"""What all kinds of definition file have in common: columns, keys, rows of one text, numbers."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches

from etl.errors import Findings
from etl.files import Cells
from etl.regions.geometry import Shape

#: The columns that each kind of definition file must have.
COLUMNS: Mapping[str, tuple[str, ...]] = {
    "marked_text": ("text",),
    "words": ("text",),
    "boxes": ("region", "order", "left", "top", "right", "bottom"),
    "wkt": ("region", "order", "wkt"),
    "labels": ("label", "region", "order"),
}


@dataclass(frozen=True, slots=True)
class Text:
    r"""One text and the names of its regions.

    Attributes
    ----------
    keys : dict of str to str
        The facts that say which trials show it, such as ``{"item": "3"}``.
    facts : dict of str to str
        Facts that only the definition file knows, handed on to its trials.
    regions : tuple of str
        Names of its regions in reading order; the order of the first is 1.
    region_texts : tuple of str
        Each region's own text; empty where the definition holds none.
    whole : str
        The whole text as shown, ``\n`` between lines; empty where the definition holds none.
    lines : int
        How many lines it has on the screen, blank ones between others included; 0 where the
        definition says nothing about places (labels).
    path : str
        The definition file, as the user would name it.
    line : int
        The line in that file where the text's definition begins.
    """

    keys: dict[str, str]
    facts: dict[str, str]
    regions: tuple[str, ...]
    region_texts: tuple[str, ...]
    whole: str
    lines: int
    path: str
    line: int


@dataclass(frozen=True, slots=True)
class TrialWords:
    """What a definition file has in common with the trials' other sources.

    Attributes
    ----------
    known : collection of str
        The facts that trials have without this file. A column of that name is a key.
    wanted : collection of str
        The facts that the study asks for. A column of the name of one that trials do not have is
        a fact that each text supplies.
    missing : frozenset of str
        Cells that stand for no value.
    """

    known: Collection[str]
    wanted: Collection[str]
    missing: frozenset[str] = frozenset({""})


@dataclass(frozen=True, slots=True)
class Draft:
    """A text as read: its shape, or the order that each label stands for."""

    text: Text
    shape: Shape | None = None
    labels: Mapping[str, int] | None = None


@dataclass(frozen=True, slots=True)
class Group:
    """The rows that define one text: its key values, their numbers from 0."""

    values: tuple[str, ...]
    rows: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Source:
    """A definition file whose columns have been understood.

    Attributes
    ----------
    cells : Cells
        The file's cells.
    keys : tuple of str
        The columns that say which trials show a text.
    supplied : dict of str to list of str
        The columns that add facts to trials, and their cells; empty where a cell has no value.
    unused : tuple of str
        The columns that nobody asked for.
    findings : Findings
        Where problems are recorded.
    missing : frozenset of str
        Cells that stand for no value.
    """

    cells: Cells
    keys: tuple[str, ...]
    supplied: Mapping[str, list[str]]
    unused: tuple[str, ...]
    findings: Findings
    missing: frozenset[str] = frozenset({""})

    def line(self, row: int) -> int:
        """The line of the file on which a row begins."""
        return int(self.cells.lines[row])

    def raw(self, name: str) -> list[str]:
        """A column's cells as they stand in the file."""
        return [str(cell) for cell in self.cells.column(name).to_pylist()]

    def error(
        self,
        problem: str,
        *,
        row: int | None,
        column: str = "",
        found: str | None = None,
        expected: str = "",
        fix: str = "",
        line_breaks: int = 0,
    ) -> None:
        """Record an error at a row, ``line_breaks`` lines below its first."""
        self.findings.error(
            problem,
            path=self.cells.shown,
            line=None if row is None else self.line(row) + line_breaks,
            where=f'column "{column}"' if column else "",
            found=found,
            expected=expected,
            fix=fix,
        )

    def name_of(self, values: Sequence[str]) -> str:
        """A text named by its key values."""
        pairs = [f"{key} {value}" for key, value in zip(self.keys, values, strict=True)]
        return ", ".join(pairs) or "text without keys"

    def way_out_of_twice(self, otherwise: str) -> str:
        """What to do where two definitions meet in one text."""
        if not self.unused:
            return otherwise
        listed = ", ".join(f'"{name}"' for name in self.unused)
        return (
            f"{otherwise}; if a further column tells the texts apart, name it in [trials] factors, "
            f"so that it serves as a key (columns not used: {listed})"
        )

    def groups(self) -> list[Group]:
        """The rows of each text, in order of first appearance. Rows need not be adjacent."""
        columns = [self.cells.texts(name) for name in self.keys]
        rows_of: dict[tuple[str, ...], list[int]] = {}
        for row in range(len(self.cells)):
            values = tuple(column[row] for column in columns)
            for name, value in zip(self.keys, values, strict=True):
                if not value:
                    self.error(
                        "a key is empty",
                        row=row,
                        column=name,
                        found="",
                        expected=f"the {name} of the trials that show this text",
                        fix="fill in the cell",
                    )
            rows_of.setdefault(values, []).append(row)
        return [Group(values, tuple(rows)) for values, rows in rows_of.items()]

    def facts_of(self, group: Group) -> dict[str, str]:
        """The facts that a text supplies; its rows must agree."""
        facts = {}
        for name, column in self.supplied.items():
            first = group.rows[0]
            facts[name] = column[first]
            for row in group.rows[1:]:
                if column[row] != column[first]:
                    self.error(
                        "a fact differs between the rows of one text",
                        row=row,
                        column=name,
                        found=column[row],
                        expected=f'"{column[first]}", as in line {self.line(first)} '
                        f"({self.name_of(group.values)})",
                        fix="write the same value in all rows of a text",
                    )
        return facts


def understand_columns(
    cells: Cells, kind: str, words: TrialWords, findings: Findings
) -> Source | None:
    """Find a definition file's own columns, its keys and the facts that it supplies.

    Parameters
    ----------
    cells : Cells
        The file.
    kind : str
        Kind of definition file.
    words : TrialWords
        Facts that the trials have already, facts that the study asks for, missing marks.
    findings : Findings
        Where a missing column, or a file without rows, is recorded.

    Returns
    -------
    Source or None
        None where something is missing.
    """
    own = COLUMNS[kind]
    missing = [name for name in own if name not in cells.header]
    for name in missing:
        spare = [other for other in cells.header if other and other not in own]
        near = get_close_matches(name, spare, n=1)
        findings.error(
            f'there is no column "{name}"',
            path=cells.shown,
            line=cells.header_line,
            found=", ".join(cells.header),
            expected=f'{", ".join(own)} (regions of kind "{kind}")',
            fix=f'rename column "{near[0]}" to "{name}"' if near else f'add a column "{name}"',
        )
    if missing:
        return None
    if not len(cells):
        findings.error(
            "the file defines no text",
            path=cells.shown,
            line=cells.header_line,
            expected="at least one row below the header",
            fix="add the texts, or name another file in regions.file",
        )
        return None
    others = [name for name in cells.header if name and name not in own]
    keys = tuple(name for name in others if name in words.known)
    supplies = tuple(name for name in others if name in words.wanted and name not in keys)
    unused = tuple(name for name in others if name not in keys and name not in supplies)
    supplied = {
        name: ["" if text in words.missing else text for text in cells.texts(name)]
        for name in supplies
    }
    return Source(cells, keys, supplied, unused, findings, words.missing)


def number_in(source: Source, row: int, column: str, cell: str, expected: str) -> float | None:
    """A finite number from a cell; None where a problem was recorded."""
    try:
        # Python's own grammar also takes digit groups with underscores, which no table means.
        value = math.nan if "_" in cell else float(cell)
    except ValueError:
        value = math.nan
    if math.isfinite(value):
        return value
    spelled = cell.lower().lstrip("+-")
    finite = spelled not in {"nan", "inf", "infinity"} and not math.isinf(value)
    source.error(
        ("this is no number" if cell else "the cell is empty")
        if finite
        else "this number is not finite",
        row=row,
        column=column,
        found=cell,
        expected=expected,
        fix="correct the cell; decimals are written with a point",
    )
    return None


def order_in(source: Source, row: int, cell: str) -> int | None:
    """An order from a cell; None where a problem was recorded."""
    value = number_in(source, row, "order", cell, "a whole number from 1")
    if value is None or value.is_integer():
        return None if value is None else int(value)
    source.error(
        "this order is no whole number",
        row=row,
        column="order",
        found=cell,
        expected="a whole number from 1",
        fix="number the regions of each text 1, 2, 3, … in reading order",
    )
    return None


def orders_run_through(
    source: Source, group: Group, names: Sequence[str], orders: Mapping[int, int]
) -> bool:
    """Check that the orders of a text's regions are 1, 2, … R, and say where they are not.

    Parameters
    ----------
    source : Source
        The file.
    group : Group
        The text.
    names : sequence of str
        The name of the region in each row of the file.
    orders : dict of int to int
        The order of each of the text's regions, by its row.

    Returns
    -------
    bool
        False where a problem was recorded.
    """
    first_with: dict[int, int] = {}
    repeated = False
    for row, order in orders.items():
        if order in first_with:
            repeated = True
            other = first_with[order]
            source.error(
                "two regions of a text have the same order",
                row=row,
                column="order",
                found=str(order),
                expected=f'an order other than that of "{names[other]}" in line '
                f"{source.line(other)} ({source.name_of(group.values)})",
                fix=source.way_out_of_twice("number the regions of each text 1, 2, 3, …"),
            )
        first_with.setdefault(order, row)
    if repeated:
        return False
    for position, order in enumerate(sorted(first_with), start=1):
        if order != position:
            source.error(
                "the orders of a text do not run from 1 without a gap",
                row=first_with[order],
                column="order",
                found=str(order),
                expected=f"{position} for the region that comes next "
                f"({source.name_of(group.values)})",
                fix="number the regions of each text 1, 2, 3, … in reading order",
            )
            return False
    return True
