"""Parquet files made of parts against readers from outside: pyarrow and duckdb."""

from __future__ import annotations

import random
from pathlib import Path

import duckdb
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.export.parquet_parts import ParquetParts
from etl.export.thrift_compact import List, Struct, read_struct, written

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
    plain = [
        pa.table(
            {
                n: c.cast(pa.string()) if n == "reader" else c
                for n, c in zip(t.column_names, t.columns, strict=True)
            }
        )
        for t in tables
    ]
    expected = pa.concat_tables(plain)
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
#: memory): 50399 as a varint is DF 89 03; zigzag takes 0, -1, 1, -2, 2 to 0, 1, 2, 3, 4.
WORKED = [(0, b"\x00"), (-1, b"\x01"), (1, b"\x02"), (-2, b"\x03"), (2, b"\x04")]


@pytest.mark.parametrize(("value", "data"), WORKED)
def test_whole_numbers_as_the_specification_has_them(value: int, data: bytes) -> None:
    """Field 1 of type i64 (code 6), then the end of the struct."""
    assert written(Struct({1: (6, value)})) == b"\x16" + data + b"\x00"
    assert read_struct(b"\x16" + data + b"\x00")[1] == value


def test_length_as_the_specification_has_it() -> None:
    """A text of 50399 bytes begins with its length as DF 89 03."""
    data = written(Struct({1: (8, b"a" * 50399)}))
    assert data[:4] == b"\x18\xdf\x89\x03"


values = st.one_of(
    st.tuples(st.sampled_from([4, 5, 6]), st.integers(-(2**63), 2**63 - 1)),
    st.tuples(st.just(8), st.binary(max_size=300)),
    st.tuples(st.just(3), st.binary(min_size=1, max_size=1)),
    st.tuples(st.just(7), st.binary(min_size=8, max_size=8)),
    st.booleans().map(lambda b: (1 if b else 2, b)),
    st.lists(st.integers(0, 2**40), max_size=40).map(lambda items: (9, List(6, items))),
    st.lists(st.sampled_from([1, 2]), max_size=20).map(lambda items: (9, List(2, items))),
)
fields = st.dictionaries(st.integers(1, 400), values, max_size=12)
structs = st.recursive(
    fields,
    lambda inner: st.dictionaries(
        st.integers(1, 40), inner.map(lambda f: (12, Struct(dict(f)))), max_size=4
    ),
    max_leaves=10,
)


@given(structs)
def test_what_is_written_reads_the_same(made: dict[int, tuple[int, object]]) -> None:
    """Any struct; a half of it is an error, never another struct without a word."""
    struct = Struct(dict(made))
    data = written(struct)
    assert read_struct(data) == Struct(dict(sorted(made.items())))
    if len(data) > 1:
        with pytest.raises(ValueError, match=r"no end|no type"):
            read_struct(data[:-1])
