"""Tables of facts that the lab keeps beside the logs: trial list, readers, items."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from pathlib import Path

from etl.errors import Findings
from etl.files import read_cells


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
    columns : tuple of str
        The facts it holds, keys included, by canonical name where they have one.
    rows : dict of tuple of str to tuple of str
        Key values to the whole row, in the order of ``columns``.
    lines : dict of tuple of str to int
        Key values to the line in the file.
    """

    shown: str
    sha256: str
    keys: tuple[str, ...]
    columns: tuple[str, ...]
    rows: dict[tuple[str, ...], tuple[str, ...]]
    lines: dict[tuple[str, ...], int]
    _place: dict[str, int] = field(default_factory=dict)

    def value(self, key: tuple[str, ...], name: str) -> str:
        """One fact of the row with these key values."""
        return self.rows[key][self._place[name]]

    def values(self, name: str) -> list[str]:
        """One column, in the order of the file."""
        place = self._place[name]
        return [row[place] for row in self.rows.values()]


def read_fact_table(
    path: Path,
    shown: str,
    keys: tuple[str, ...],
    synonyms: Mapping[str, str],
    missing: Collection[str],
    findings: Findings,
) -> FactTable | None:
    """Read a table of facts and index it by its keys.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    keys : tuple of str
        The columns that identify a row; two rows with the same values are an error.
    synonyms : mapping of str to str
        The logs' own header for a canonical name. A lab often uses its header in every file, so
        a table without a column ``participant`` is read by that header.
    missing : collection of str
        Cells that stand for no value; kept as an empty text.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    FactTable or None
        None where a problem was recorded.
    """
    before = findings.count("error")
    cells = read_cells(path, shown, findings)
    if cells is None:
        return None
    canonical = {header: name for name, header in synonyms.items() if name not in cells.header}
    columns = tuple(canonical.get(name, name) for name in cells.header)
    for name in keys:
        if name not in columns:
            listed = [n for n in cells.header if n]
            near = get_close_matches(name, listed, n=1)
            header = synonyms.get(name)
            also = f' (or "{header}", as in the logs)' if header and header != name else ""
            findings.error(
                f'there is no column "{name}"',
                path=shown,
                line=cells.header_line,
                found=", ".join(listed),
                expected=f'a column "{name}"{also} to join the table by',
                fix=(f'did you mean "{near[0]}"? Rename' if near else "rename")
                + " the column, or correct the keys in the study file",
            )
    if findings.count("error") > before:
        return None
    absent = frozenset(mark.strip() for mark in missing) | {""}
    texts = [
        _composed(cells.texts(name), absent) if name else [""] * len(cells) for name in cells.header
    ]
    place = {name: i for i, name in enumerate(columns)}
    rows: dict[tuple[str, ...], tuple[str, ...]] = {}
    lines: dict[tuple[str, ...], int] = {}
    for line, row in zip(cells.lines.tolist(), zip(*texts, strict=True), strict=True):
        key = tuple(row[place[name]] for name in keys)
        for name, text in zip(keys, key, strict=True):
            if not text:
                findings.error(
                    f"the {name} is missing",
                    path=shown,
                    line=line,
                    where=f'column "{cells.header[place[name]]}"',
                    expected="a value to join the row by",
                    fix="fill in the cell, or remove the row",
                )
        if key in rows and all(key):
            findings.error(
                f"two rows have the same {' and '.join(keys)}",
                path=shown,
                line=line,
                found=", ".join(f"{name} {text}" for name, text in zip(keys, key, strict=True)),
                expected=f"one row for each; line {lines[key]} holds the other",
                fix="remove one of the two rows"
                + (", or add a column to [trials] keys" if len(keys) > 1 else ""),
            )
        rows.setdefault(key, row)
        lines.setdefault(key, line)
    if not rows:
        findings.error(
            "the table has a header but no row",
            path=shown,
            line=cells.header_line,
            fix="fill the table, or take it out of the study file",
        )
    if findings.count("error") > before:
        return None
    return FactTable(shown, cells.text.sha256, keys, columns, rows, lines, place)


def _composed(texts: list[str], absent: Collection[str]) -> list[str]:
    """Cells in Unicode NFC, missing marks as empty texts."""
    distinct = {
        text: "" if text in absent else unicodedata.normalize("NFC", text) for text in set(texts)
    }
    return [distinct[text] for text in texts]
