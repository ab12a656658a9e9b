"""Columns held small say the same as columns of codes; look-ups by keys are those of a loop."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.files import Coded, group_rows, place_rows
from etl.files import coded as codes_of_files
from etl.files import packed as packing
from etl.files.packed import Packed, PackedColumns, RowTexts

WORDS = st.sampled_from(["", "NA", "a", "b", " a ", "e\u0301", "\u00e9", "7", "07", "x y"])
#: Keys of two columns, some of which are missing.
PAIRS = st.lists(st.tuples(st.integers(-1, 4), st.integers(-1, 3)), max_size=30)


def columns(rows: list[tuple[int, int]], sign: str) -> list[Coded]:
    """Two key columns; -1 is missing."""
    cells = [[f"{sign}{v}" if v >= 0 else "" for v in own] for own in zip(*rows, strict=True)]
    return [Coded.of(pa.array(own or [], pa.string()), {""}) for own in cells or [[], []]]


@given(st.lists(WORDS, max_size=40), st.sampled_from([0, 2, 100]))
def test_packed_columns_hold_what_coded_ones_do(cells: list[str], few: int) -> None:
    """Trimmed, composed, with missing marks; whether texts are held one by one or not."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(packing, "_FEW_TEXTS", few)
        array = pa.array(cells, pa.string())
        expected, packed = Coded.of(array, {"", "NA"}), Packed.of_cells(array, {"", "NA"})
        rows = range(len(cells))
        assert [packed.text(row) for row in rows] == [expected.text(row) for row in rows]
        assert [packed.coded().text(row) for row in rows] == [expected.text(row) for row in rows]
        assert len(set(packed.values())) == len(packed.values())
        assert set(packed.values()) == set(expected.values)
        chosen = np.array([*reversed(rows), -1], dtype=np.int64)
        taken = packed.take(chosen)
        assert [taken.text(at) for at in range(len(chosen))] == [
            *(expected.text(row) for row in reversed(rows)),
            "",
        ]


def test_many_texts_lie_in_one_piece() -> None:
    """Also where some of them stand for nothing, and rows come again."""
    cells = [str(number) for number in range(20_000)] * 2
    packed = Packed.of_cells(pa.array(cells, pa.string()), {"", "3", "19999"})
    assert isinstance(packed._texts, pa.Array)  # noqa: SLF001 - that it is held so
    assert [packed.text(row) for row in (2, 3, 4, 19_999, 20_004)] == ["2", "", "4", "", "4"]
    assert packed.codes.dtype == np.int16


@pytest.mark.parametrize(("count", "size"), [(2, 1), (127, 1), (128, 2), (32_767, 2), (32_768, 4)])
def test_codes_are_as_small_as_can_be(count: int, size: int) -> None:
    """A code takes one, two or four bytes, and the largest one is still itself."""
    codes = packing.narrow(np.array([-1, count - 1]), count)
    assert codes.itemsize == size
    assert codes.tolist() == [-1, count - 1]


def test_released_columns_keep_their_names() -> None:
    """Their rows are gone."""
    known = PackedColumns({"cue": Packed(np.array([0, 1]), ("early", "late"))})
    known.release()
    assert list(known) == ["cue"]
    assert len(known["cue"]) == 0


@given(st.lists(st.sampled_from(["", "yawned", "late"]), max_size=20), st.randoms())
def test_texts_of_rows_are_those_of_a_list(texts: list[str], source: object) -> None:
    """Set one by one or many at once, in any order of rows."""
    one, many = RowTexts(len(texts)), RowTexts(len(texts))
    for row, text in enumerate(texts):
        one[row] = text
    many.put(np.arange(len(texts)), ["late", "", "yawned"], np.array(
        [["late", "", "yawned"].index(text) for text in texts], dtype=np.int64))  # fmt: skip
    order = list(range(len(texts)))
    source.shuffle(order)  # type: ignore[attr-defined]
    for made in (one, many):
        assert list(made) == texts
        assert made.some().tolist() == [bool(text) for text in texts]
        other = made.ordered(np.array(order, dtype=np.int64))
        assert list(other) == [texts[row] for row in order]
        assert other.texts_of(0, 2) == tuple(texts[row] for row in order[:2])
        assert list(made.ordered(None)) == texts


@given(PAIRS, PAIRS, st.sampled_from([(4, 1 << 62), (0, 1 << 62), (4, 6), (0, 6)]))
def test_rows_are_placed_as_by_a_loop(
    wanted: list[tuple[int, int]], table: list[tuple[int, int]], bounds: tuple[int, int]
) -> None:
    """With a place for each key and by sorting; with keys that are numbered anew."""
    table = list(dict.fromkeys(table))
    known = {key: row for row, key in enumerate(table) if min(key) >= 0}
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(codes_of_files, "_ROOMY", bounds[0])
        patch.setattr(codes_of_files, "_MOST_KEYS", bounds[1])
        found = place_rows(columns(wanted, "k"), columns(table, "k"))
    assert found.tolist() == [known.get(key, -1) for key in wanted]


@given(PAIRS, st.sampled_from([(4, 1 << 62), (0, 1 << 62), (4, 6), (0, 6)]))
def test_rows_are_grouped_as_by_a_loop(
    rows: list[tuple[int, int]], bounds: tuple[int, int]
) -> None:
    """The first row of each group, and each row's group."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(codes_of_files, "_ROOMY", bounds[0])
        patch.setattr(codes_of_files, "_MOST_KEYS", bounds[1])
        first, group = group_rows(columns(rows, "k"))
    assert [rows.index(key) for key in rows] == first[group].tolist()
    assert sorted(first.tolist()) == sorted({rows.index(key) for key in rows})
