"""Rows to files: Parquet, CSV or both, a row group at a time."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from pathlib import Path
from types import TracebackType

import pyarrow as pa
import pyarrow.parquet as pq
from pyarrow import csv as arrow_csv

from etl.cells import safe, safe_array
from etl.tables import Column, TableDesign, read_schema, schema_note, written_schema

#: Cells (rows times columns) collected before a row group is written: enough for good compression,
#: little enough for a laptop. It does not depend on workers, so that the bytes do not either.
CELLS_A_GROUP = 4_000_000
_COMPRESSION = "zstd"


class CsvTable:
    """Writes one table as CSV, with cells and headers that no spreadsheet runs as formulas.

    Parameters
    ----------
    path : Path
        The file.
    columns : tuple of Column
        The table's columns.
    """

    def __init__(self, path: Path, columns: tuple[Column, ...]) -> None:
        self._schema = pa.schema(
            [
                pa.field(safe(f.name), pa.string() if pa.types.is_dictionary(f.type) else f.type)
                for f in read_schema(columns)
            ]
        )
        self._writer = arrow_csv.CSVWriter(path, self._schema)

    def write(self, table: pa.Table) -> None:
        """Add rows, whose texts are codes."""
        columns = [_safe_column(column) for column in table.columns]
        safe_table = pa.Table.from_arrays(columns, names=self._schema.names)
        self._writer.write_table(safe_table.cast(self._schema))

    def close(self) -> None:
        """Finish the file."""
        self._writer.close()


def _safe_column(column: pa.ChunkedArray) -> pa.ChunkedArray:
    """A column as it may stand in a CSV file."""
    if not pa.types.is_dictionary(column.type):
        return column
    chunks, before, after = [], None, None
    for chunk in column.chunks:
        # Batches share their texts: those of the one before are looked at once.
        if before is None or not chunk.dictionary.equals(before):
            before, after = chunk.dictionary, safe_array(chunk.dictionary)
        same = after is before
        chunks.append(
            chunk if same else pa.DictionaryArray.from_arrays(chunk.indices, after, safe=False)
        )
    return pa.chunked_array(chunks, column.type)


class TableWriter:
    """Writes one table, group by group."""

    def __init__(
        self, folder: Path, name: str, columns: tuple[Column, ...], formats: Collection[str]
    ) -> None:
        self._schema = written_schema(columns)
        self._note = schema_note(columns)
        self._parquet = (
            pq.ParquetWriter(
                folder / f"{name}.parquet",
                self._schema,
                store_schema=False,
                compression=_COMPRESSION,
                write_statistics=True,
            )
            if "parquet" in formats
            else None
        )
        self._csv = CsvTable(folder / f"{name}.csv", columns) if "csv" in formats else None
        self._batches: list[pa.RecordBatch] = []
        self._waiting = 0
        self.rows = 0

    def add(self, batch: pa.RecordBatch) -> None:
        """Take over some rows."""
        self._batches.append(batch)
        self._waiting += batch.num_rows
        self.rows += batch.num_rows
        if self._waiting * len(self._schema) >= CELLS_A_GROUP:
            self._write()

    def _write(self) -> None:
        if not self._batches:
            return
        table = pa.Table.from_batches(self._batches, self._schema)
        self._batches, self._waiting = [], 0
        if self._parquet is not None:
            self._parquet.write_table(table, row_group_size=len(table) or None)
        if self._csv is not None:
            self._csv.write(table)

    def close(self) -> None:
        """Write what is waiting and finish the files."""
        self._write()
        if self._parquet is not None:
            self._parquet.add_key_value_metadata(self._note)
            self._parquet.close()
        if self._csv is not None:
            self._csv.close()

    def abandon(self) -> None:
        """Close the files without finishing the table."""
        self._batches = []
        if self._parquet is not None:
            self._parquet.close()
        if self._csv is not None:
            self._csv.close()


class TableWriters:
    """Writes all tables of a build side by side.

    Parameters
    ----------
    folder : Path
        Where the files go.
    design : TableDesign
        The study's tables.
    formats : mapping of str to collection of str
        For each table, the formats in which it is written.
    """

    def __init__(
        self, folder: Path, design: TableDesign, formats: Mapping[str, Collection[str]]
    ) -> None:
        self._writers = {
            name: TableWriter(folder, name, design.columns(name), wanted)
            for name, wanted in formats.items()
        }

    def __enter__(self) -> TableWriters:
        return self

    def add(self, batches: Mapping[str, pa.RecordBatch]) -> None:
        """Take over the rows of one reader."""
        for name, batch in batches.items():
            self._writers[name].add(batch)

    @property
    def rows(self) -> dict[str, int]:
        """How many rows each table has so far."""
        return {name: writer.rows for name, writer in self._writers.items()}

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        for writer in self._writers.values():
            if kind is None:
                writer.close()
            else:
                writer.abandon()
