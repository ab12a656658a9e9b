"""Canonical fixations on disk between the reading of logs and the work on readers.

Each log is read once, by whichever worker, and put aside sorted by reader; so a reader whose
fixations are spread over several logs, or a log that holds many readers, costs no second reading,
and memory holds one log or one reader at a time. Where one process does all the work, a shelf in
memory takes what fits on it; only the rest goes to the disk.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
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
        """Hold the batches of a log, if there is room for them."""
        self._room += sum(batch.nbytes for batch in self._held.pop(name, ()))
        size = sum(batch.nbytes for batch in batches)
        if size > self._room:
            return False
        self._room -= size
        self._held[name] = batches
        return True

    def get(self, name: str) -> list[pa.RecordBatch] | None:
        """The batches of a log that is held; None for one on the disk."""
        return self._held.get(name)


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
            with pa.ipc.new_file(sink, batches[0].schema.remove_metadata()) as writer:
                for own in batches:
                    bare = own.replace_schema_metadata(None)
                    writer.write_batch(bare, custom_metadata=own.schema.metadata)
            body = sink.getvalue()
        self.store.put(name, head, body)

    def get(self, name: str, number: int) -> pa.RecordBatch:
        """A batch that was put aside."""
        (batch,) = self._batches(name, (number,))
        return batch

    def column(self, name: str, count: int, of: str) -> Iterator[pa.Array]:
        """One column of what was put aside, batch by batch.

        Parameters
        ----------
        name : str
            The entry.
        count : int
            How many batches it has.
        of : str
            The column.

        Yields
        ------
        pa.Array
            One a reader.
        """
        for batch in self._batches(name, range(count)):
            yield batch.column(of)

    def _batches(self, name: str, numbers: Iterable[int]) -> Iterator[pa.RecordBatch]:
        """Batches of one entry, which is opened once."""
        held = self.shelf.get(name)
        if held is not None:
            yield from (held[number] for number in numbers)
            return
        with pa.ipc.open_file(body_of(self.store.where(name))) as reader:
            for number in numbers:
                batch, texts = reader.get_batch_with_custom_metadata(number)
                yield batch.replace_schema_metadata(texts)


def batches_of(
    log: CanonicalLog,
) -> tuple[list[pa.RecordBatch], dict[str, int], dict[str, int]]:
    """A log's fixations, one batch a reader.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.

    Returns
    -------
    list of pa.RecordBatch and two dicts of str to int
        The batches; for each reader the number of the batch, and how many fixations it has.
    """
    if not len(log):
        # A recording of the eye that does not count: nobody will ask for it.
        return [], {}, {}
    participant = log.ids["participant"]
    # What is known about trials is gathered apart; only which trial it is must stay with each row.
    coded = {n: own for n, own in log.ids.items() if n not in ("item", "participant")}
    if log.label is not None:
        coded["label"] = log.label
    columns = {name: pa.array(own.codes) for name, own in coded.items()}
    columns |= {name: pa.array(getattr(log, name)) for name in _PLAIN}
    batch = pa.RecordBatch.from_pydict(columns)
    if len(participant.values) == 1:
        texts = json.dumps({name: own.values for name, own in coded.items()})
        reader = participant.values[0]
        return [batch.replace_schema_metadata({"values": texts})], {reader: 0}, {reader: len(log)}
    order = np.argsort(participant.codes, kind="stable")
    batch = batch.take(pa.array(order))
    present, starts = np.unique(participant.codes[order], return_index=True)
    stops = np.append(starts[1:], len(log))
    batches = [
        _own_texts(batch.slice(start, stop - start), coded)
        for start, stop in zip(starts.tolist(), stops.tolist(), strict=True)
    ]
    readers = [participant.values[code] for code in present.tolist()]
    numbers = {reader: number for number, reader in enumerate(readers)}
    return batches, numbers, dict(zip(readers, (stops - starts).tolist(), strict=True))


def _own_texts(batch: pa.RecordBatch, coded: Mapping[str, Coded]) -> pa.RecordBatch:
    """The fixations of one reader with texts of that reader only: others may be very many."""
    own = {}
    for name, column in coded.items():
        place = batch.schema.get_field_index(name)
        codes = batch.column(place).to_numpy()
        found, places = np.unique(codes[codes >= 0], return_inverse=True)
        anew = np.full(len(codes), -1, dtype=np.int32)
        anew[codes >= 0] = places
        own[name] = [column.values[code] for code in found.tolist()]
        batch = batch.set_column(place, batch.schema.field(place), pa.array(anew))
    return batch.replace_schema_metadata({"values": json.dumps(own)})


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
