"""The work on the readers of a study in groups of any size, and its answers made comparable."""

from __future__ import annotations

import tempfile
from collections.abc import Sequence
from dataclasses import dataclass, fields, is_dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa

import etl
from etl.errors import Findings
from etl.session.bench import Bench
from etl.session.crew import Room, silent
from etl.session.examining import examine
from etl.session.joined_readers import group_of
from etl.session.kept_logs import Aside
from etl.session.reader import ReaderTables
from etl.session.work import ReaderTask


@dataclass(frozen=True)
class Readers:
    """The readers of a study, ready to be worked on."""

    bench: Bench
    tasks: tuple[ReaderTask, ...]
    aside: Aside

    def worked(self, cuts: Sequence[int]) -> list[ReaderTables]:
        """What is told of each reader, with the own rows; groups end at the cuts."""
        ends = sorted({0, *(cut for cut in cuts if 0 < cut < len(self.tasks)), len(self.tasks)})
        done: list[ReaderTables] = []
        for start, stop in pairwise(ends):
            group = group_of(self.tasks[start:stop], self.aside)
            done += self.bench.tables(group).one_by_one()
        return done


def readers_of(study_file: Path) -> Readers | None:
    """The readers of a study, as far as its logs and facts can be read."""
    study = etl.load_study(study_file)
    findings = Findings()
    # One process puts all fixations on a shelf in memory; the folder is not needed any more.
    with tempfile.TemporaryDirectory() as folder, Room(Path(folder), 1, silent) as room:
        examined = examine(study, room, findings)
    if examined is None:
        return None
    design, library, options, aside = examined[1].bench()
    return Readers(Bench(design, library, options), tuple(examined[1].tasks), aside)


def rows_of(batch: pa.RecordBatch) -> pa.RecordBatch:
    """Rows with texts in place of codes: what batches say, however they are coded."""
    columns = [
        column.dictionary_decode() if pa.types.is_dictionary(column.type) else column
        for column in batch.columns
    ]
    return pa.RecordBatch.from_arrays(columns, names=batch.schema.names)


def different(one: ReaderTables, other: ReaderTables) -> list[str]:
    """What two answers about a reader do not agree in."""
    tables = [
        name
        for name in {*one.batches, *other.batches}
        if name not in one.batches
        or name not in other.batches
        or not rows_of(one.batches[name]).equals(rows_of(other.batches[name]))
    ]
    told = [
        field.name
        for field in fields(one)
        if field.name != "batches"
        and plain(getattr(one, field.name)) != plain(getattr(other, field.name))
    ]
    return sorted(tables) + told


def plain(told: Any) -> Any:
    """Anything that is told, down to lists and numbers that can be compared; NaN is a word."""
    if isinstance(told, np.ndarray):
        return [str(told.dtype), plain(told.tolist())]
    if is_dataclass(told):
        return {field.name: plain(getattr(told, field.name)) for field in fields(told)}
    if isinstance(told, dict):
        # The order of what is told is part of it.
        return [(key, plain(own)) for key, own in told.items()]
    if isinstance(told, list | tuple):
        return [plain(own) for own in told]
    return "NaN" if isinstance(told, float) and np.isnan(told) else told
