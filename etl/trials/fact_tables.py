"""Tables of facts that the lab keeps beside the logs: trial list, readers, items."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, replace
from difflib import get_close_matches
from pathlib import Path
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Cells, Coded, group_rows, marks_of, place_rows, read_table
from etl.files.packed import Packed, PackedColumns
from etl.pseudonyms import Pseudonyms
from etl.trials.labels import without_prefix


@dataclass(frozen=True, slots=True)
class FactTable:
    """A table of facts, looked up by its keys.

    Attributes
    ----------
    shown : str
        The file as the user would name it.
    sha256 : str
        Digest of the file.
    keys : tuple of str
        What joins it to the trials, by canonical name (``participant``) or fact.
    columns : PackedColumns
        The facts it holds, keys included, by canonical name where they have one.
    lines : (rows,) int32 array
        The line of each row in the file.
    """

    shown: str
    sha256: str
    keys: tuple[str, ...]
    columns: PackedColumns
    lines: NDArray[np.int32]

    def find(self, known: Mapping[str, Coded]) -> NDArray[np.int64]:
        """The row for each trial, by what is known of the trials; -1 where there is none."""
        length = len(known[next(iter(known))])
        wanted = [known.get(key, Coded.absent(length)) for key in self.keys]
        return place_rows(wanted, [self.columns[key] for key in self.keys])

    def only(self, names: Collection[str]) -> FactTable:
        """The table with its keys and some other columns: what else it holds is let go."""
        kept = [n for n in self.columns if n in names or n in self.keys]
        return replace(self, columns=PackedColumns({n: self.columns.packed(n) for n in kept}))

    def under(self, pseudonyms: Pseudonyms | None) -> FactTable:
        """The table with pseudonyms in place of readers' ids."""
        if pseudonyms is None or "participant" not in self.columns:
            return self
        readers = Packed.of(pseudonyms.readers_of(self.columns["participant"]))
        columns = {name: self.columns.packed(name) for name in self.columns}
        return replace(self, columns=PackedColumns({**columns, "participant": readers}))

    def text(self, name: str, row: int) -> str:
        """The text of one cell, empty where it is missing."""
        return self.columns.packed(name).text(row)

    def spelled(self, row: int) -> str:
        """The key of a row, for messages."""
        return ", ".join(f"{key} {self.text(key, row)}" for key in self.keys)


def read_fact_table(
    path: Path,
    shown: str,
    keys: tuple[str, ...],
    synonyms: Mapping[str, str],
    missing: Collection[str],
    findings: Findings,
    prefixes: Mapping[str, str] = MappingProxyType({}),
) -> FactTable | None:
    """Read a table of facts.

    Parameters
    ----------
    path : Path
        The file: delimited text, or a workbook, its sheet after a hash.
    shown : str
        Its name for messages.
    keys : tuple of str
        The columns that identify a row; two rows with the same values are an error.
    synonyms : mapping of str to str
        The logs' own header for a canonical name. A lab often uses its header in every file, so
        a table without a column ``participant`` is read by that header.
    missing : collection of str
        Cells that stand for no value.
    findings : Findings
        Where problems are recorded.
    prefixes : mapping of str to str
        What may stand before the ids of a column, by canonical name; it is left out.

    Returns
    -------
    FactTable or None
        None where a problem was recorded.
    """
    before = findings.count("error")
    cells = read_table(path, shown, findings)
    if cells is None:
        return None
    canonical = {header: name for name, header in synonyms.items() if name not in cells.header}
    names = {canonical.get(header, header): header for header in cells.header if header}
    for name in keys:
        if name not in names:
            _tell_missing_column(name, cells, synonyms, findings)
    if findings.count("error") > before:
        return None
    if not len(cells):
        findings.error(
            "the table has a header but no row",
            path=shown,
            line=cells.header_line,
            fix="fill the table, or take it out of the study file",
        )
        return None
    absent = marks_of(missing)
    sha256, lines, rest = cells.text.sha256, cells.lines, cells.table
    del cells  # and with them the text, which is as large as all columns together
    columns = {}
    for name, header in names.items():
        packed = Packed.of_cells(rest.column(header).combine_chunks(), absent)
        rest = rest.drop_columns([header])
        if prefixes.get(name):
            packed = Packed.of(without_prefix(packed.coded(), prefixes[name]))
        columns[name] = packed
    table = FactTable(shown, sha256, keys, PackedColumns(columns), lines)
    _check_keys(table, names, findings)
    return None if findings.count("error") > before else table


def _tell_missing_column(
    name: str, cells: Cells, synonyms: Mapping[str, str], findings: Findings
) -> None:
    """Record that a table lacks a column it is to be joined by."""
    listed = [header for header in cells.header if header]
    near = get_close_matches(name, listed, n=1)
    header = synonyms.get(name)
    also = f' (or "{header}", as in the logs)' if header and header != name else ""
    findings.error(
        f'there is no column "{name}"',
        path=cells.shown,
        line=cells.header_line,
        found=", ".join(listed),
        expected=f'a column "{name}"{also} to join the table by',
        fix=(f'did you mean "{near[0]}"? Rename' if near else "rename")
        + " the column, or correct the keys in the study file",
    )


def _check_keys(table: FactTable, headers: Mapping[str, str], findings: Findings) -> None:
    """Every row needs its key, and no two may have the same."""
    keys = [table.columns[name] for name in table.keys]
    complete = np.ones(len(table.lines), dtype=bool)
    problems: list[tuple[int, str | None]] = []
    for name, column in zip(table.keys, keys, strict=True):
        complete &= column.codes >= 0
        problems += [(row, name) for row in np.flatnonzero(column.codes < 0).tolist()]
    first, group = group_rows(keys)
    again = np.flatnonzero(complete & (first[group] != np.arange(len(group))))
    problems += [(row, None) for row in again.tolist()]
    for row, lacking in sorted(problems, key=lambda problem: problem[0]):
        if lacking is not None:
            findings.error(
                f"the {lacking} is missing",
                path=table.shown,
                line=int(table.lines[row]),
                where=f'column "{headers[lacking]}"',
                expected="a value to join the row by",
                fix="fill in the cell, or remove the row",
            )
            continue
        findings.error(
            f"two rows have the same {' and '.join(table.keys)}",
            path=table.shown,
            line=int(table.lines[row]),
            found=table.spelled(row),
            expected=f"one row for each; line {table.lines[first[group[row]]]} holds the other",
            fix="remove one of the two rows"
            + (", or add a column to [trials] keys" if len(keys) > 1 else ""),
        )
