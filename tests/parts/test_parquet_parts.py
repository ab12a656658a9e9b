"""Parquet files made of parts against readers from outside: pyarrow and duckdb."""

from __future__ import annotations

import random
import tempfile
from pathlib import Path

import duckdb
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.export.parquet_footer import Footer, _varint
from etl.export.parquet_parts import ParquetParts

TEXTS = ["early", "late", "größer", "", "日本"]


def rows(count: int, seed: int) -> pa.Table:
    """Rows of every type that the tables have, some missing."""
    source = random.Random(seed)

    def some(value: object) -> object:
        return None if source.random() < 0.2 else value

    return pa.table(
        {
            "reader": pa.array(
                [source.choice(TEXTS) for _ in range(count)], pa.string()
            ).dictionary_encode(),
            "number": pa.array([some(source.gauss(0, 1e6)) for _ in range(count)], pa.float64()),
            "flag": pa.array([some(source.randint(0, 1)) for _ in range(count)], pa.int8()),
            "whole": pa.array([some(source.randint(-(2**62), 2**62)) for _ in range(count)]).cast(
                pa.int64()
            ),
        }
    )


def plain(table: pa.Table) -> pa.Table:
    """The same with texts as texts, as they are read back."""
    return table.set_column(0, "reader", table.column("reader").cast(pa.string()))


def part_of(table: pa.Table, **options: object) -> bytes:
    """A Parquet file in memory."""
    sink = pa.BufferOutputStream()
    pq.write_table(table, sink, store_schema=False, compression="zstd", **options)
    return bytes(sink.getvalue().to_pybytes())


@pytest.mark.parametrize(
    "options",
    [
        {},
        {"row_group_size": 7},
        {"write_page_index": True},
        {"write_statistics": ["reader"]},
        {"use_dictionary": False, "data_page_version": "2.0"},
    ],
    ids=str,
)
def test_parts_read_as_the_rows_that_went_in(tmp_path: Path, options: dict[str, object]) -> None:
    """Pyarrow and duckdb give back the rows of all parts in order, whatever the parts hold."""
    tables = [rows(count, seed) for seed, count in enumerate((0, 40, 1, 0, 300, 17))]
    path = tmp_path / "whole.parquet"
    whole = ParquetParts(path)
    for table in tables:
        whole.add(part_of(table, **options))
    whole.close({"note": "größer"})
    expected = pa.concat_tables(plain(table) for table in tables)
    with pq.ParquetFile(path) as file:
        assert file.metadata.num_rows == len(expected) == whole.rows
        assert file.metadata.metadata[b"note"] == "größer".encode()
        assert file.read().equals(expected)
        groups = [file.read_row_group(g) for g in range(file.num_row_groups)]
    assert pa.concat_tables(groups).equals(expected)
    found = duckdb.sql(f"select * from '{path}'").fetchall()  # noqa: S608
    assert found == [tuple(row.values()) for row in expected.to_pylist()]
    if "write_statistics" in options:
        found = duckdb.sql(f"select count(*) from '{path}' where reader = 'late'").fetchall()  # noqa: S608
        assert found == [(sum(row["reader"] == "late" for row in expected.to_pylist()),)]


def test_file_of_one_part_is_that_part(tmp_path: Path) -> None:
    """Byte for byte but for the metadata, which pyarrow writes the same."""
    table = rows(50, 3)
    sink = pa.BufferOutputStream()
    with pq.ParquetWriter(sink, table.schema, store_schema=False, compression="zstd") as writer:
        writer.write_table(table)
        writer.add_key_value_metadata({"note": "some"})
    whole = ParquetParts(tmp_path / "one.parquet")
    whole.add(part_of(table))
    whole.close({"note": "some"})
    assert (tmp_path / "one.parquet").read_bytes() == sink.getvalue().to_pybytes()


def test_nothing_is_no_file(tmp_path: Path) -> None:
    """Without a part there is no schema."""
    whole = ParquetParts(tmp_path / "none.parquet")
    with pytest.raises(ValueError, match="one part at least"):
        whole.close({})
    whole.abandon()


#: Worked values of the protocol's specification (Apache Thrift, thrift-compact-protocol.md; from
#: memory): 50399 as a varint is DF 89 03.
@pytest.mark.parametrize(
    ("value", "data"), [(0, "00"), (1, "01"), (127, "7f"), (128, "8001"), (50399, "df8903")]
)
def test_numbers_as_the_specification_has_them(value: int, data: str) -> None:
    """Of variable length, the lowest seven bits first."""
    assert _varint(value) == bytes.fromhex(data)


def test_half_a_footer_is_an_error() -> None:
    """Never another footer without a word."""
    part = part_of(rows(20, 1))
    length = int.from_bytes(part[-8:-4], "little")
    footer = part[-8 - length : -8]
    assert Footer(footer).rows == 20
    for cut in range(1, length):
        with pytest.raises(ValueError, match=r"no end|no type"):
            Footer(footer[:-cut])


@given(st.lists(st.integers(0, 60), min_size=1, max_size=40), st.integers(1, 30))
@settings(max_examples=25, deadline=None)
def test_any_number_of_parts(counts: list[int], group: int) -> None:
    """More than fifteen row groups too, whose number is written in another way."""
    tables = [rows(count, seed) for seed, count in enumerate(counts)]
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "whole.parquet"
        whole = ParquetParts(path)
        for table in tables:
            whole.add(part_of(table, row_group_size=group))
        whole.close({})
        with pq.ParquetFile(path) as file:
            found = file.read()
            assert file.metadata.num_row_groups == sum(-(-count // group) for count in counts)
    expected = pa.concat_tables(plain(table) for table in tables)
    assert found.equals(expected)
