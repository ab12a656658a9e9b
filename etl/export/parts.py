"""Rows of some readers as parts of files: encoded where they were computed."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass
from typing import Final

import pyarrow as pa
import pyarrow.parquet as pq
from pyarrow import csv as arrow_csv

from etl.cells import safe, safe_array
from etl.tables import Column, TableDesign, read_schema, written_schema

#: The most cells (rows times columns) of a row group: a reader with more has several.
CELLS_A_GROUP = 4_000_000
_COMPRESSION: Final = "zstd"
#: The columns for which a row group says between which values they lie: rows are sorted by them, so
#: that a query for some readers can pass over the rest. For all columns it took a third of writing.
_SORTED_BY: Final = ("participant", "session", "trial")


@dataclass(frozen=True, slots=True)
class Part:
    """Rows of one table as they will stand in its files.

    Attributes
    ----------
    rows : int
        How many.
    parquet : bytes or None
        A whole Parquet file of these rows; None where the table is not wanted as such.
    csv : bytes or None
        Lines of a CSV file without its header; None likewise.
    """

    rows: int
    parquet: bytes | None
    csv: bytes | None


class PartMaker:
    """Makes parts of all tables.

    Parameters
    ----------
    design : TableDesign
        The study's tables; which values ids have is of no account.
    formats : mapping of str to collection of str
        For each table, the formats in which it is wanted: ``parquet``, ``csv``.
    """

    def __init__(self, design: TableDesign, formats: Mapping[str, Collection[str]]) -> None:
        self._tables = {
            name: TableParts(design.columns(name), wanted) for name, wanted in formats.items()
        }

    def parts(self, batches: Mapping[str, pa.RecordBatch]) -> dict[str, Part]:
        """The rows of some readers as parts of every table.

        Parameters
        ----------
        batches : mapping of str to pa.RecordBatch
            Rows by table; a table that is not there has none.

        Returns
        -------
        dict of str to Part
            By table.
        """
        return {name: table.part(batches.get(name)) for name, table in self._tables.items()}


class TableParts:
    """Makes parts of one table.

    Parameters
    ----------
    columns : tuple of Column
        Of the table.
    formats : collection of str
        In which it is wanted: ``parquet``, ``csv``.
    """

    def __init__(self, columns: tuple[Column, ...], formats: Collection[str]) -> None:
        self._schema = written_schema(columns)
        self._statistics = [name for name in _SORTED_BY if name in self._schema.names]
        self._parquet = "parquet" in formats
        self._csv_schema = csv_schema(columns) if "csv" in formats else None

    def part(self, batch: pa.RecordBatch | None) -> Part:
        """The rows of a batch, if there is one, as a part.

        Parameters
        ----------
        batch : pa.RecordBatch or None
            With the schema of the table as it is written.

        Returns
        -------
        Part
        """
        # One without rows is left out: the CSV writer may put what lies in memory in its place.
        some = [batch] if batch is not None and batch.num_rows else []
        table = pa.Table.from_batches(some, self._schema)
        return Part(
            len(table),
            self._as_parquet(table) if self._parquet else None,
            None if self._csv_schema is None else _as_csv(table, self._csv_schema),
        )

    def _as_parquet(self, table: pa.Table) -> bytes:
        sink = pa.BufferOutputStream()
        with pq.ParquetWriter(
            sink,
            self._schema,
            store_schema=False,
            compression=_COMPRESSION,
            write_statistics=self._statistics,
        ) as writer:
            if len(table):
                writer.write_table(table, row_group_size=max(CELLS_A_GROUP // len(self._schema), 1))
        whole: bytes = sink.getvalue().to_pybytes()
        return whole


def csv_schema(columns: tuple[Column, ...]) -> pa.Schema:
    """The columns of a table as a CSV file has them: headers that no spreadsheet runs.

    Parameters
    ----------
    columns : tuple of Column
        Of one table.

    Returns
    -------
    pa.Schema
        Texts as plain text.
    """
    return pa.schema(
        [
            pa.field(safe(f.name), pa.string() if pa.types.is_dictionary(f.type) else f.type)
            for f in read_schema(columns)
        ]
    )


def csv_header(columns: tuple[Column, ...]) -> bytes:
    """The first line of a CSV file of a table.

    Parameters
    ----------
    columns : tuple of Column
        Of one table.

    Returns
    -------
    bytes
        With the end of the line.
    """
    sink = pa.BufferOutputStream()
    arrow_csv.write_csv(csv_schema(columns).empty_table(), sink)
    header: bytes = sink.getvalue().to_pybytes()
    return header


def _as_csv(table: pa.Table, schema: pa.Schema) -> bytes:
    """Rows as lines of a CSV file, with cells that no spreadsheet runs as formulas."""
    columns = [_safe_column(column) for column in table.columns]
    sink = pa.BufferOutputStream()
    arrow_csv.write_csv(
        pa.Table.from_arrays(columns, names=schema.names).cast(schema),
        sink,
        arrow_csv.WriteOptions(include_header=False),
    )
    lines: bytes = sink.getvalue().to_pybytes()
    return lines


def _safe_column(column: pa.ChunkedArray) -> pa.ChunkedArray:
    """A column as it may stand in a CSV file."""
    if not pa.types.is_dictionary(column.type):
        return column
    chunks = [
        pa.DictionaryArray.from_arrays(chunk.indices, safe_array(chunk.dictionary), safe=False)
        for chunk in column.chunks
    ]
    return pa.chunked_array(chunks, column.type)
