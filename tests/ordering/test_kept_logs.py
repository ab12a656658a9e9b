"""Canonical fixations put aside on disk and read back."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.session.kept_logs import Aside, Shelf, batches_of, kept_log
from etl.session.kept_store import KeptStore

NUMBERS = ("onset_ms", "number", "duration_ms", "x_px", "y_px")
READERS = ("P01", "P02", "Zoë", "P\n4")


@st.composite
def logs(draw: st.DrawFn) -> CanonicalLog:
    """A log of several readers, with or without sessions and labels, and with missing values."""
    rows = draw(st.integers(1, 12))

    def numbers() -> np.ndarray:
        return np.array(draw(st.lists(st.floats(width=64), min_size=rows, max_size=rows)))

    def coded(values: tuple[str, ...], least: int) -> Coded:
        codes = draw(st.lists(st.integers(least, len(values) - 1), min_size=rows, max_size=rows))
        return Coded(np.array(codes, dtype=np.int32), values)

    ids = {"participant": coded(READERS, 0), "trial": coded(("1", "2", "10"), 0)}
    if draw(st.booleans()):
        ids["session"] = coded(("a", ""), 0)
    label = coded(("verb", "…"), -1) if draw(st.booleans()) else None
    lines = np.arange(2, rows + 2, dtype=np.int32)
    return CanonicalLog(
        ids, {}, *(numbers() for _ in NUMBERS), label, lines, lines % 3 == 0, lines - 2
    )


def aside_in(folder: Path, room: int = 0, *, keep: bool = False) -> Aside:
    """A place for fixations, with a shelf of so many bytes."""
    return Aside(KeptStore(folder / "earlier", folder), keep, Shelf(room))


def put(aside: Aside, name: str, log: CanonicalLog) -> dict[str, int]:
    """Put a log aside; the batch of each reader."""
    batches, numbers, _ = batches_of(log)
    aside.put(name, None, batches)
    return numbers


def texts(coded: Coded | None) -> list[str] | None:
    """The texts of a column, None for a column that is not there."""
    return None if coded is None else [coded.text(row) for row in range(len(coded.codes))]


def assert_same(found: CanonicalLog, expected: CanonicalLog) -> None:
    """Both logs hold the same fixations, in the same order."""
    assert found.source_line.tolist() == expected.source_line.tolist()
    assert found.blink.tolist() == expected.blink.tolist()
    for name in NUMBERS:
        assert np.array_equal(getattr(found, name), getattr(expected, name), equal_nan=True)
    for name, coded in expected.ids.items():
        if name == "participant":  # known by whoever asks for a reader's fixations
            continue
        assert texts(found.ids[name]) == texts(coded)
    assert texts(found.label) == texts(expected.label)


def of_reader(log: CanonicalLog, reader: str) -> CanonicalLog:
    """The rows of one reader."""
    own = [row for row, name in enumerate(texts(log.ids["participant"]) or []) if name == reader]
    return log.take(np.array(own, dtype=np.int64))


#: A shelf with room, one without, and one that takes small logs only.
ROOMS = st.sampled_from([0, 300, 1_000_000])


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(logs(), ROOMS, st.booleans())
def test_each_reader_comes_back(tmp_path: Path, log: CanonicalLog, room: int, keep: bool) -> None:
    """Every reader's fixations are read back bit for bit, in the order of the log."""
    path = tmp_path / "kept.log"
    path.unlink(missing_ok=True)
    aside = aside_in(tmp_path, room, keep=keep)
    batches = put(aside, path.name, log)
    assert set(batches) == set(texts(log.ids["participant"]) or [])
    assert path.exists() or (room > 0 and not keep)
    assert path.exists() or not keep
    for reader, batch in batches.items():
        found, file = kept_log([(path.name, batch)], aside)
        assert_same(found, of_reader(log, reader))
        assert file.tolist() == [0] * len(found)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(logs(), ROOMS)
def test_several_logs_of_a_reader_are_joined(tmp_path: Path, log: CanonicalLog, room: int) -> None:
    """A reader whose fixations are in several logs has them one log after the other."""
    aside = aside_in(tmp_path, room)
    rows = np.arange(len(log))
    halves = [log.take(rows[: len(log) // 2]), log.take(rows[len(log) // 2 :])]
    parts: dict[str, list[tuple[str, int]]] = {}
    for number, half in enumerate(half for half in halves if len(half)):
        for reader, batch in put(aside, f"{number}.log", half).items():
            parts.setdefault(reader, []).append((f"{number}.log", batch))
    for reader, own in parts.items():
        found, file = kept_log(own, aside)
        assert_same(found, of_reader(log, reader))
        assert file.tolist() == sorted(file.tolist())


@pytest.mark.parametrize("order", [("P01", "P02"), ("P02", "P01")], ids=["as is", "the other way"])
def test_order_of_values_makes_no_difference(tmp_path: Path, order: tuple[str, str]) -> None:
    """Logs that code the same texts differently are joined by their texts."""
    nowhere, aside = np.full(2, np.nan), aside_in(tmp_path)
    parts = []
    for number, trials in enumerate((("1", "2"), ("2", "3"))):
        codes = np.array([0, 1], dtype=np.int32)
        participant = Coded(np.array([order.index("P02")] * 2, dtype=np.int32), order)
        ids = {"participant": participant, "trial": Coded(codes, trials)}
        lines = np.array([2, 3], dtype=np.int32)
        log = CanonicalLog(
            ids, {}, nowhere, nowhere, np.ones(2), nowhere, nowhere, None, lines, lines > 0, lines
        )
        parts.append((f"{number}.log", put(aside, f"{number}.log", log)))
    found, file = kept_log([(name, batches["P02"]) for name, batches in parts], aside)
    assert texts(found.ids["trial"]) == ["1", "2", "2", "3"]
    assert file.tolist() == [0, 0, 1, 1]


def test_shelf_takes_no_more_than_it_has_room_for() -> None:
    """What does not fit goes to the disk, and leaves room for what is smaller."""
    shelf = Shelf(100)
    batch = pa.RecordBatch.from_pydict({"x": pa.array(np.zeros(10))})
    assert batch.nbytes == 80
    assert shelf.put("a", [batch])
    assert not shelf.put("b", [batch])
    assert shelf.put("c", [batch.slice(0, 2)])
    assert shelf.get("b") is None
    held = shelf.get("a")
    assert held is not None
    assert held[0] is batch
