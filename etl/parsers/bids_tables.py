"""Tables of the open standard (BIDS) that have no header: their columns stand in a sidecar."""

from __future__ import annotations

import csv
from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray
from pyarrow import csv as arrow_csv

from etl.errors import Findings
from etl.files import NumberReading, RawText, numbers_in, read_text

#: The longest piece of text, in bytes, that pyarrow's reader is given; it takes 32-bit sizes.
_LARGEST_BLOCK = 1 << 30


@dataclass(frozen=True, slots=True)
class Headerless:
    """A tab-separated text without a header.

    Attributes
    ----------
    text : RawText
        The text, with its digest.
    columns : tuple of str
        The names of its columns, from the sidecar.
    rows : int
        How many rows there are; row i, from 0, is line i + 1.
    blank : int
        Blank lines below the rows.
    ends_open : bool
        Whether the last line has no line end, as where the file was cut short.

    References
    ----------
    BIDS 1.11, Common principles, "Compressed tabular files".
    """

    text: RawText
    columns: tuple[str, ...]
    rows: int
    blank: int
    ends_open: bool

    @property
    def lines(self) -> NDArray[np.int32]:
        """The line of each row, from 1."""
        return np.arange(1, self.rows + 1, dtype=np.int32)

    def cells(self, wanted: Sequence[str], findings: Findings) -> dict[str, pa.Array] | None:
        """Some columns as text cells; None where the rows do not have the columns."""
        table = self._read(wanted, pa.string(), ())
        if table is None:
            self._tell_uneven(findings)
            return None
        return {name: _whole(table.column(name)) for name in wanted}

    def numbers(
        self, wanted: Sequence[str], missing: Collection[str], findings: Findings
    ) -> dict[str, NDArray[np.float64]] | None:
        """Some columns as numbers, NaN where missing; None where a cell is no number."""
        table = self._read(wanted, pa.float64(), missing)
        if table is not None:
            fast = {name: _whole(table.column(name)) for name in wanted}
            values = {name: one.to_numpy(zero_copy_only=False) for name, one in fast.items()}
            # Words for infinite and for no number are numbers to the reader, and to nobody else.
            if all(
                int(np.isfinite(values[name]).sum()) == len(one) - one.null_count
                for name, one in fast.items()
            ):
                return values
        cells = self.cells(wanted, findings)
        if cells is None:
            return None
        reading = NumberReading(self.text.shown, self.lines, missing, ".")
        slow = {
            name: numbers_in(cell, name, reading, findings, expected="a number or n/a")
            for name, cell in cells.items()
        }
        sound = {name: one for name, one in slow.items() if one is not None}
        return sound if len(sound) == len(slow) else None

    def _read(
        self, wanted: Sequence[str], kind: pa.DataType, missing: Collection[str]
    ) -> pa.Table | None:
        """Split the text; None where it cannot be split, or a cell is of another kind."""
        data = self.text.data
        if data.startswith(b"\n") or b"\n\n" in data:
            # The reader takes a blank line for a row of cells without a value.
            return None
        try:
            table = arrow_csv.read_csv(
                pa.BufferReader(data),
                read_options=arrow_csv.ReadOptions(
                    use_threads=False,
                    column_names=list(self.columns),
                    block_size=min(max(len(data) + 1, 1 << 16), _LARGEST_BLOCK),
                ),
                parse_options=arrow_csv.ParseOptions(
                    delimiter="\t",
                    quote_char='"' if b'"' in data else False,
                    ignore_empty_lines=False,
                ),
                convert_options=arrow_csv.ConvertOptions(
                    include_columns=list(wanted),
                    column_types=dict.fromkeys(wanted, kind),
                    null_values=sorted(missing),
                    strings_can_be_null=False,
                ),
            )
        except pa.ArrowInvalid:
            return None
        return table if table.num_rows == self.rows else None

    def _tell_uneven(self, findings: Findings) -> None:
        """Record the rows that do not have as many fields as the sidecar names columns."""
        width, before = len(self.columns), findings.count("error")
        for number, line in enumerate(self.text.data.decode("utf-8").split("\n")[: self.rows], 1):
            fields = line.count("\t") + 1 if '"' not in line else _fields(line)
            if fields != width or not line:
                findings.error(
                    "the row has another number of fields than the sidecar names",
                    path=self.text.shown,
                    line=number,
                    found=f"{fields} field{'' if fields == 1 else 's'}" if line else "",
                    expected=f"{width} fields separated by tabs: {', '.join(self.columns)}",
                    fix="complete the row, or correct Columns in the sidecar",
                )
        if findings.count("error") == before:
            findings.error(
                "the rows cannot be told apart",
                path=self.text.shown,
                expected="quote marks in pairs, within one line",
                fix="look for a cell that begins with a quote mark and does not end with one",
            )


def read_headerless(
    path: Path, shown: str, columns: tuple[str, ...], findings: Findings
) -> Headerless | None:
    """Read a table that has no header.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    columns : tuple of str
        The names of its columns.
    findings : Findings
        Where it is recorded that the file cannot be read, or begins with its header.

    Returns
    -------
    Headerless or None
        None where a problem was recorded.
    """
    text = read_utf8(path, shown, findings)
    if text is None:
        return None
    data = text.data.rstrip(b"\n")
    rows = data.count(b"\n") + 1
    first = data[: len(data) if rows == 1 else data.index(b"\n")].decode("utf-8").split("\t")
    if tuple(cell.strip() for cell in first) == columns:
        findings.error(
            "the file begins with a header",
            path=shown,
            line=1,
            found=", ".join(first),
            expected="rows only: in the standard, the names of the columns stand in the sidecar",
            fix="remove the first line",
        )
        return None
    blank = text.data.count(b"\n") - rows
    kept = RawText(text.shown, data + b"\n", text.sha256, text.encoding)
    return Headerless(kept, columns, rows, max(blank, 0), not text.data.endswith(b"\n"))


def read_utf8(path: Path, shown: str, findings: Findings) -> RawText | None:
    """Read a text that the standard wants in UTF-8.

    Parameters
    ----------
    path : Path
        The file, plain or gzipped.
    shown : str
        Its name for messages.
    findings : Findings
        Where it is recorded what is wrong with it.

    Returns
    -------
    RawText or None
        None where a problem was recorded.
    """
    own = Findings()
    text = read_text(path, shown, own, encoding="utf-8")
    for finding in own:
        # The encoding is the standard's, and nothing that a study file states.
        if "[logs] encoding" in finding.fix + finding.expected:
            way_out = "save the file as UTF-8, as the standard has it"
            finding = replace(finding, expected="UTF-8", fix=way_out)
        findings.add(finding)
    return text


def _whole(column: pa.ChunkedArray) -> pa.Array:
    """A column in one piece."""
    return column.chunk(0) if column.num_chunks == 1 else column.combine_chunks()


def _fields(line: str) -> int:
    """How many fields a line with quote marks has."""
    try:
        return len(next(csv.reader([line], delimiter="\t", strict=True), []))
    except csv.Error:
        return 0
