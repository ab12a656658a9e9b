"""Independent readers get the same values from every table, from Parquet and from CSV."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import duckdb
import pandas as pd
import pyarrow as pa
import pyarrow.csv as arrow_csv
import pyarrow.parquet as pq
import pytest

from tests.end_to_end.building import TABLES, Sample, build
from tests.end_to_end.odd_study import odd_study

Columns = dict[str, list[Any]]


@pytest.fixture(scope="module")
def folders(orchard: Sample, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """A large study, and a small one with awkward texts."""
    root = tmp_path_factory.mktemp("odd")
    return {"orchard": orchard.result.folder, "odd": build(odd_study(root)).folder}


def plain(type_: pa.DataType) -> pa.DataType:
    """The type of a column's values, levels as text."""
    return type_.value_type if pa.types.is_dictionary(type_) else type_


def arrow_parquet(folder: Path, table: str) -> Columns:
    """Parquet by pyarrow."""
    return pq.read_table(folder / f"{table}.parquet").to_pydict()


def pandas_parquet(folder: Path, table: str) -> Columns:
    """Parquet by pandas."""
    return of_frame(pd.read_parquet(folder / f"{table}.parquet"))


def duckdb_parquet(folder: Path, table: str) -> Columns:
    """Parquet by duckdb."""
    path = (folder / f"{table}.parquet").as_posix()
    with duckdb.connect() as connection:
        found = connection.execute("select * from read_parquet($1)", [path])
        return of_rows([column[0] for column in found.description], found.fetchall())


def arrow_text(folder: Path, table: str) -> Columns:
    """CSV by pyarrow, told only the types of the columns."""
    schema = pq.read_schema(folder / f"{table}.parquet")
    options = arrow_csv.ConvertOptions(
        column_types={field.name: plain(field.type) for field in schema},
        null_values=[""],
        strings_can_be_null=True,
    )
    return arrow_csv.read_csv(folder / f"{table}.csv", convert_options=options).to_pydict()


def pandas_text(folder: Path, table: str) -> Columns:
    """CSV by pandas, cells as text, then numbers by Python.

    How exactly pandas itself reads decimals differs between its versions.
    """
    schema = pq.read_schema(folder / f"{table}.parquet")
    frame = pd.read_csv(
        folder / f"{table}.csv", dtype=str, keep_default_na=False, na_values=[""], encoding="utf-8"
    )
    number = {pa.int64(): int, pa.int8(): int, pa.float64(): float}
    turns = {field.name: number.get(plain(field.type), str) for field in schema}
    return {
        name: [None if value is None else turns[name](value) for value in values]
        for name, values in of_frame(frame).items()
    }


def duckdb_text(folder: Path, table: str) -> Columns:
    """CSV by duckdb, told the types of the columns."""
    names = {pa.int64(): "BIGINT", pa.int8(): "TINYINT", pa.float64(): "DOUBLE"}
    schema = pq.read_schema(folder / f"{table}.parquet")
    types = {field.name: names.get(plain(field.type), "VARCHAR") for field in schema}
    path = (folder / f"{table}.csv").as_posix()
    with duckdb.connect() as connection:
        found = connection.read_csv(path, header=True, na_values="", dtype=types)
        return of_rows(found.columns, found.fetchall())


def of_frame(frame: pd.DataFrame) -> Columns:
    """A frame as lists, whatever is missing as None."""
    return {
        name: [None if gap else value for value, gap in zip(column, column.isna(), strict=True)]
        for name, column in frame.items()
    }


def of_rows(names: list[str], rows: list[tuple[Any, ...]]) -> Columns:
    """Rows as lists, column by column."""
    return dict(zip(names, map(list, zip(*rows, strict=True)), strict=True))


OTHERS = [pandas_parquet, duckdb_parquet, arrow_text, pandas_text, duckdb_text]


@pytest.mark.parametrize("table", TABLES)
@pytest.mark.parametrize("read", OTHERS, ids=lambda read: read.__name__)
@pytest.mark.parametrize("study", ["orchard", "odd"])
def test_reader_gets_the_same_values(
    folders: dict[str, Path], study: str, read: Callable[[Path, str], Columns], table: str
) -> None:
    """Columns and cells are the same whoever reads them from whichever file."""
    first = arrow_parquet(folders[study], table)
    assert read(folders[study], table) == first
    assert len(first["participant"]) > 0


def test_numbers_have_their_exact_value_in_text(tmp_path: Path) -> None:
    """A sum of long decimals, which needs all digits, comes back from CSV bit for bit."""
    study_file = odd_study(tmp_path)
    log = tmp_path / "log.csv"
    text = log.read_text(encoding="utf-8").replace('.125"', '.123456789012"')
    log.write_text(text, encoding="utf-8", newline="\n")
    folder = build(study_file).folder
    times_ms = arrow_parquet(folder, "trials")["reading_time"]
    assert any(round(value, 6) != value for value in times_ms)
    assert duckdb_text(folder, "trials")["reading_time"] == times_ms


def test_categories_come_in_their_order(orchard: Sample) -> None:
    """Pandas gets the levels of a factor in the study's order, and regions as levels too."""
    frame = orchard.result.outcomes
    assert list(frame["fit"].cat.categories) == ["fitting", "odd"]
    assert list(frame["group"].cat.categories) == ["volunteer", "visitor"]
    assert list(frame["measure"].cat.categories) == sorted(frame["measure"].unique())
    assert set(frame["region"].cat.categories) == set(frame["region"].unique())


def test_regions_of_one_order_come_in_reading_order(passages: Sample) -> None:
    """Where the regions follow each other in the same order in every text, so do the levels."""
    levels = list(passages.result.fixations["region"].cat.categories)
    assert levels == [f"w{number}" for number in range(1, len(levels) + 1)]


def test_ids_come_back_plain(orchard: Sample) -> None:
    """Ids are texts or whole numbers for pandas, no categories with all values of the study."""
    frame = orchard.result.outcomes
    assert pd.api.types.is_integer_dtype(frame["trial"].dtype)
    for name in ("participant", "item"):
        assert not isinstance(frame[name].dtype, pd.CategoricalDtype)
        assert pd.api.types.is_string_dtype(frame[name].dtype)


def test_result_gives_the_tables_that_were_written(orchard: Sample) -> None:
    """The frames of a build are what pandas reads from its files."""
    for table in TABLES:
        read = pd.read_parquet(orchard.result.folder / f"{table}.parquet")
        pd.testing.assert_frame_equal(orchard.result.table(table), read)


def test_result_has_no_other_table(orchard: Sample) -> None:
    """A misspelt table is answered with the names of the tables."""
    with pytest.raises(KeyError, match="the tables are outcomes, outcomes_wide, trials"):
        orchard.result.table("outcome")
