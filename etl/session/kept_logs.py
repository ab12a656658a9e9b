"""Canonical fixations on disk between the reading of logs and the work on readers.

Each log is read once, by whichever worker, and put aside sorted by reader; so a reader whose
fixations are spread over several logs, or a log that holds many readers, costs no second reading,
and memory holds one log or one reader at a time. Where one process does all the work, a shelf in
memory takes what fits on it; only the rest goes to the disk.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.files import Coded
from etl.parsers import CanonicalLog
from etl.session.kept_store import KeptStore, body_of

_PLAIN = (
    *("onset_ms", "number", "duration_ms", "x_px", "y_px", "source_line", "blink"),
    "recording",
)


#: What a shelf holds at most: enough for a study of some hundred thousand fixations.
ROOM_BYTES = 64 * 1024 * 1024


class Shelf:
    """Batches that are kept in memory, up to a limit.

    Parameters
    ----------
    room_bytes : int
        How much it may hold.
    """

    def __init__(self, room_bytes: int = 0) -> None:
        self._room = room_bytes
        self._held: dict[str, list[pa.RecordBatch]] = {}

    def put(self, name: str, batches: list[pa.RecordBatch]) -> bool:
        """Hold the batches of a log, if there is room for them, in place of those it had."""
        self._room += sum(batch.nbytes for batch in self._held.pop(name, ()))
        size = sum(batch.nbytes for batch in batches)
        if size > self._room:
            return False
        self._room -= size
        self._held[name] = batches
        return True

    def get(self, name: str, number: int) -> pa.RecordBatch | None:
        """A batch that is held; None for one on the disk."""
        return self._held[name][number] if name in self._held else None


@dataclass(frozen=True, slots=True)
class Aside:
    """Where fixations are put aside.

    Attributes
    ----------
    store : KeptStore
        The files.
    keep : bool
        Whether the files are to serve later builds too.
    shelf : Shelf
        Where one process does all the work, and no later build is to be served, takes what fits.
    """

    store: KeptStore
    keep: bool
    shelf: Shelf

    def put(self, name: str, head: object, batches: list[pa.RecordBatch]) -> None:
        """Put the batches of a log aside."""
        if not self.keep and self.shelf.put(name, batches):
            return
        body = None
        if batches:
            sink = pa.BufferOutputStream()
            with pa.ipc.new_file(sink, batches[0].schema) as writer:
                for own in batches:
                    writer.write_batch(own)
            body = sink.getvalue()
        self.store.put(name, head, body)

    def get(self, name: str, number: int) -> pa.RecordBatch:
        """A batch that was put aside."""
        held = self.shelf.get(name, number)
        if held is not None:
            return held
        with pa.ipc.open_file(body_of(self.store.where(name))) as reader:
            return reader.get_batch(number)


def batches_of(log: CanonicalLog) -> tuple[list[pa.RecordBatch], list[str]]:
    """A log's fixations, one batch a reader.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.

    Returns
    -------
    list of pa.RecordBatch and list of str
        The batches, and the reader of each.
    """
    if not len(log):
        # A recording of the eye that does not count: nobody will ask for it.
        return [], []
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
    return batches, [participant.values[code] for code in present.tolist()]


def arrays_of(log: CanonicalLog) -> dict[str, object]:
    """What of a log is put aside.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.

    Returns
    -------
    dict of str to object
        For a digest of it.
    """
    return {"ids": log.ids, "label": log.label, **{name: getattr(log, name) for name in _PLAIN}}


def kept_log(
    parts: Sequence[tuple[str, int]], aside: Aside
) -> tuple[CanonicalLog, NDArray[np.int32]]:
    """Take back the fixations of one reader.

    Parameters
    ----------
    parts : sequence of (str, int)
        Entry and batch, in the order of the logs.
    aside : Aside
        Where they are.

    Returns
    -------
    CanonicalLog and (n,) int32 array
        The fixations, and which part each is from.
    """
    logs = [_one(aside.get(name, batch)) for name, batch in parts]
    file = np.repeat(np.arange(len(logs), dtype=np.int32), [len(log) for log in logs])
    return (logs[0] if len(logs) == 1 else _joined(logs)), file


def _one(batch: pa.RecordBatch) -> CanonicalLog:
    """One reader's fixations of one log."""
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
