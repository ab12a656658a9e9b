"""Looks for what must not be there in every file of a folder, however it is packed."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from dataclasses import replace
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from tests.simulator.dialects import RecordedStudy


def texts_of(path: Path) -> Iterator[str]:
    """All that can be read in a file: its bytes as text; of Parquet also every value."""
    yield path.read_bytes().decode("utf-8", errors="replace")
    if path.suffix == ".json":
        # Letters may be written as escapes.
        yield json.dumps(json.loads(path.read_text(encoding="utf-8")), ensure_ascii=False)
    if path.suffix == ".parquet":
        with pq.ParquetFile(path) as file:
            yield str(file.metadata.metadata)
            yield str(file.schema_arrow)
            table = file.read()
            dictionaries = file.read_row_groups([], columns=None).schema
            yield str(dictionaries)
        for name in table.column_names:
            column = table.column(name)
            yield "\n".join(map(str, pa.compute.unique(column).to_pylist()))


def found_in(folder: Path, sought: Iterable[str]) -> dict[str, list[str]]:
    """Which of some texts are in which files of a folder, names of files included."""
    sought = list(sought)
    found = {}
    for path in sorted(folder.rglob("*")):
        name = path.relative_to(folder).as_posix()
        texts = [name, *(texts_of(path) if path.is_file() else ())]
        there = [text for text in sought if any(text.lower() in one.lower() for one in texts)]
        if there:
            found[name] = there
    return found


def with_ids(study: RecordedStudy, ids: Iterable[str]) -> RecordedStudy:
    """A recorded study whose readers have other ids."""
    given = dict(zip([one.participant for one in study.readers], ids, strict=True))
    return replace(
        study,
        readers=tuple(replace(one, participant=given[one.participant]) for one in study.readers),
        trials=tuple(replace(one, participant=given[one.participant]) for one in study.trials),
    )


def ask_for_pseudonyms(study_file: Path) -> Path:
    """Let a study ask for pseudonyms; gives its study file."""
    text = study_file.read_text(encoding="utf-8")
    if "[output]" in text:
        text = text.replace("[output]", "[output]\npseudonyms = true", 1)
    else:
        text += "\n[output]\npseudonyms = true\n"
    study_file.write_text(text, encoding="utf-8", newline="\n")
    return study_file
