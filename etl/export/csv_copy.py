"""A published Parquet table as CSV, for whom the study's own formats are not enough."""

from __future__ import annotations

from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from etl.export.writers import CsvTable
from etl.tables import Column


def write_csv_copy(parquet: Path, into: Path, columns: tuple[Column, ...]) -> None:
    """Write a table once more, as CSV.

    One row group is in memory at a time. The bytes are those that a build writes where the study
    asks for CSV.

    Parameters
    ----------
    parquet : Path
        The table as published.
    into : Path
        The CSV file.
    columns : tuple of Column
        The table's columns.
    """
    # The writer looks at each distinct text once, so it wants texts as codes.
    coded = [column.name for column in columns if column.type in ("text", "category")]
    with pq.ParquetFile(parquet, read_dictionary=coded) as file:
        table = CsvTable(into, columns)
        for group in range(file.num_row_groups):
            table.write(_as_codes(file.read_row_group(group), coded))
        table.close()


def _as_codes(table: pa.Table, names: list[str]) -> pa.Table:
    """Texts as codes, where a reader gave them back as texts all the same."""
    for name in names:
        place = table.schema.get_field_index(name)
        column = table.column(place)
        if not pa.types.is_dictionary(column.type):
            table = table.set_column(place, name, column.dictionary_encode())
    return table
