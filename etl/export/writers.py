"""Parts to files: Parquet, CSV or both."""

from __future__ import annotations

import contextlib
from collections.abc import Collection, Mapping
from pathlib import Path
from types import TracebackType

from etl.export.parquet_parts import ParquetParts
from etl.export.parts import Part, PartMaker, csv_header
from etl.tables import Column, TableDesign, schema_note


class TableWriter:
    """Writes one table, part by part.

    Parameters
    ----------
    columns : tuple of Column
        Of the table.
    parquet, csv : Path or None
        The files; None where there is to be none.
    empty : Part
        A part without rows, which has the schema.
    """

    def __init__(
        self, columns: tuple[Column, ...], parquet: Path | None, csv: Path | None, empty: Part
    ) -> None:
        self._note = schema_note(columns)
        self._parquet = None if parquet is None else ParquetParts(parquet)
        self._csv = None if csv is None else csv.open("wb")
        if self._csv is not None:
            self._csv.write(csv_header(columns))
        self.rows = 0
        self.add(empty)

    def add(self, part: Part) -> None:
        """Take over some rows."""
        if self._parquet is not None and part.parquet is not None:
            self._parquet.add(part.parquet)
        if self._csv is not None and part.csv is not None:
            self._csv.write(part.csv)
        self.rows += part.rows

    def close(self) -> None:
        """Finish the files."""
        if self._parquet is not None:
            self._parquet.close(self._note)
        if self._csv is not None:
            self._csv.close()

    def abandon(self) -> None:
        """Close the files without finishing the table."""
        # What cannot be written any more is of no use either.
        for file in (self._parquet, self._csv):
            with contextlib.suppress(OSError):
                if isinstance(file, ParquetParts):
                    file.abandon()
                elif file is not None:
                    file.close()


class TableWriters:
    """Writes all tables of a build side by side.

    Parameters
    ----------
    folder : Path
        Where the files go.
    design : TableDesign
        The study's tables.
    formats : mapping of str to collection of str
        For each table, the formats in which it is written there.
    csv_apart : mapping of str to Path
        Tables that are written as CSV elsewhere, and where.
    """

    def __init__(
        self,
        folder: Path,
        design: TableDesign,
        formats: Mapping[str, Collection[str]],
        csv_apart: Mapping[str, Path] | None = None,
    ) -> None:
        apart = csv_apart or {}
        empty = PartMaker(design, formats).parts({})
        self._writers: dict[str, TableWriter] = {}
        with contextlib.ExitStack() as stack:
            stack.callback(self._abandon)
            for name, wanted in formats.items():
                self._writers[name] = TableWriter(
                    design.columns(name),
                    folder / f"{name}.parquet" if "parquet" in wanted else None,
                    folder / f"{name}.csv" if "csv" in wanted else apart.get(name),
                    empty[name],
                )
            stack.pop_all()

    def __enter__(self) -> TableWriters:
        return self

    def add(self, parts: Mapping[str, Part]) -> None:
        """Take over the rows of some readers."""
        for name, part in parts.items():
            self._writers[name].add(part)

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
        try:
            if kind is None:
                for writer in self._writers.values():
                    writer.close()
        finally:
            # Of a file that is closed already, nothing more is asked.
            self._abandon()

    def _abandon(self) -> None:
        """Close all files, however far they are."""
        for writer in self._writers.values():
            writer.abandon()
