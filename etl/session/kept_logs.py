"""Canonical fixations on disk between the reading of logs and the work on readers.

Each log is read once, by whichever worker, and put aside sorted by reader; so a reader whose
fixations are spread over several logs, or a log that holds many readers, costs no second reading,
and memory holds one log or one reader at a time. Where one process does all the work, a shelf in
memory takes what fits on it; only the rest goes to the disk.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from pathlib import Path

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.files import Coded
from etl.parsers import CanonicalLog

_PLAIN = (
    *("onset_ms", "number", "duration_ms", "x_px", "y_px", "source_line", "blink"),
    "recording",
)


#: What a shelf holds at most: enough for a study of some hundred thousand fixations.
ROOM_BYTES = 64 * 1024 * 1024


class Shelf:
    """Batches that are kept in memory, up to a limit; workers of their own share an empty one.

    Parameters
    ----------
    room_bytes : int
        How much it may hold.
    """

    def __init__(self, room_bytes: int = 0) -> None:
        self._room = room_bytes
        self._held: dict[Path, list[pa.RecordBatch]] = {}

    def put(self, path: Path, batches: list[pa.RecordBatch]) -> bool:
        """Hold the batches of a log, if there is room for them."""
        self._room += sum(batch.nbytes for batch in self._held.pop(path, ()))
        size = sum(batch.nbytes for batch in batches)
        if size > self._room:
            return False
        self._room -= size
        self._held[path] = batches
        return True

    def get(self, path: Path, number: int) -> pa.RecordBatch | None:
        """A batch that is held; None for one on the disk."""
        return self._held[path][number] if path in self._held else None


def keep_log(log: CanonicalLog, path: Path, shelf: Shelf) -> tuple[dict[str, int], dict[str, int]]:
    """Put a log's fixations aside, one batch a reader.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.
    path : Path
        The file to write, where the shelf has no room.
    shelf : Shelf
        Takes them, if it has.

    Returns
    -------
    two dicts of str to int
        For each reader, the number of the batch that holds the fixations, and how many these are.
    """
    if not len(log):
        # A recording of the eye that does not count: nobody will ask for it.
        return {}, {}
    participant = log.ids["participant"]
    # What is known about trials is gathered apart; only which trial it is must stay with each row.
    coded = {name: column for name, column in log.ids.items() if name != "item"}
    if log.label is not None:
        coded["label"] = log.label
    columns = {name: pa.array(column.codes) for name, column in coded.items()}
    columns |= {name: pa.array(getattr(log, name)) for name in _PLAIN}
    values = json.dumps({name: column.values for name, column in coded.items()})
    batch = pa.RecordBatch.from_pydict(columns, metadata={"values": values})
    present, starts = np.zeros(1, dtype=np.int64), np.zeros(1, dtype=np.int64)
    if len(participant.values) > 1:
        order = np.argsort(participant.codes, kind="stable")
        batch = batch.take(pa.array(order))
        present, starts = np.unique(participant.codes[order], return_index=True)
    stops = np.append(starts[1:], len(log))
    batches = [
        batch.slice(start, stop - start)
        for start, stop in zip(starts.tolist(), stops.tolist(), strict=True)
    ]
    if not shelf.put(path, batches):
        with pa.OSFile(str(path), "wb") as sink, pa.ipc.new_file(sink, batch.schema) as writer:
            for own in batches:
                writer.write_batch(own)
    readers = [participant.values[code] for code in present.tolist()]
    counts = {name: own.num_rows for name, own in zip(readers, batches, strict=True)}
    return {name: number for number, name in enumerate(readers)}, counts


def kept_columns(path: Path, count: int, name: str, shelf: Shelf) -> Iterator[pa.Array]:
    """One column of what was put aside of a log, batch by batch.

    Parameters
    ----------
    path : Path
        Where it was put.
    count : int
        How many batches there are.
    name : str
        The column.
    shelf : Shelf
        May hold them.

    Yields
    ------
    pa.Array
        One a reader.
    """
    if shelf.get(path, 0) is None:
        with pa.OSFile(str(path), "rb") as source:
            own = [pa.ipc.open_file(source).schema.get_field_index(name)]
            only = pa.ipc.IpcReadOptions(included_fields=own)
            reader = pa.ipc.open_file(source, options=only)
            for number in range(count):
                yield reader.get_batch(number).column(0)
        return
    for number in range(count):
        batch = shelf.get(path, number)
        if batch is not None:
            yield batch.column(name)


def kept_log(
    parts: Sequence[tuple[Path, int]], shelf: Shelf
) -> tuple[CanonicalLog, NDArray[np.int32]]:
    """Take back the fixations of one reader.

    Parameters
    ----------
    parts : sequence of (Path, int)
        File and batch, in the order of the logs.
    shelf : Shelf
        May hold them.

    Returns
    -------
    CanonicalLog and (n,) int32 array
        The fixations, and which part each is from.
    """
    logs = [_one(path, batch, shelf) for path, batch in parts]
    file = np.repeat(np.arange(len(logs), dtype=np.int32), [len(log) for log in logs])
    return (logs[0] if len(logs) == 1 else _joined(logs)), file


def _one(path: Path, number: int, shelf: Shelf) -> CanonicalLog:
    """One reader's fixations of one log."""
    batch = shelf.get(path, number)
    if batch is None:
        with pa.OSFile(str(path), "rb") as source, pa.ipc.open_file(source) as reader:
            batch = reader.get_batch(number)
    values = json.loads(batch.schema.metadata[b"values"])
    arrays = {
        name: column.to_numpy(zero_copy_only=False)
        for name, column in zip(batch.schema.names, batch.columns, strict=True)
    }
    ids = {name: Coded(arrays[name], tuple(texts)) for name, texts in values.items()}
    label = ids.pop("label", None)
    return CanonicalLog(
        ids=ids,
        facts={},
        label=label,
        **{name: arrays[name] for name in _PLAIN},
    )


def _joined(logs: Sequence[CanonicalLog]) -> CanonicalLog:
    """Several logs of one reader as one."""
    first = logs[0]
    label = None
    if first.label is not None:
        label = Coded.joined([log.label for log in logs if log.label is not None])
    return CanonicalLog(
        ids={name: Coded.joined([log.ids[name] for log in logs]) for name in first.ids},
        facts={},
        label=label,
        **{n: np.concatenate([getattr(log, n) for log in logs]) for n in _PLAIN},
    )
