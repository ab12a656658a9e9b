"""Logs written into a folder and read by the description of a study."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.parsers import CanonicalLog, LogReader, reader_for
from etl.parsers.canonical import LogNote
from etl.study import Study

COLUMNS: Mapping[str, Any] = {
    "participant": "reader",
    "trial": "trial",
    "onset": "start",
    "duration": "dur",
    "x": "gx",
    "y": "gy",
}
HEADER = "reader\ttrial\tstart\tdur\tgx\tgy\n"


def reader_of(
    logs: Mapping[str, Any] | None = None,
    columns: Mapping[str, Any] | None = None,
    screen: Mapping[str, Any] | None = None,
    facts: tuple[str, ...] = (),
) -> LogReader:
    """A reader of logs; a column of None is not in the log."""
    named = {k: v for k, v in {**COLUMNS, **(columns or {})}.items() if v is not None}
    study = Study.model_validate(
        {
            "logs": {"files": ["*.tsv"], "columns": named, **(logs or {})},
            "regions": {"file": "regions.csv", "kind": "boxes"},
            **({"screen": screen} if screen else {}),
        }
    )
    return reader_for(study.logs, study.screen, facts)


def read(
    path: Path, content: str | bytes, reader: LogReader | None = None
) -> tuple[CanonicalLog, LogNote]:
    """Read a log in which nothing is wrong."""
    path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    findings = Findings()
    found = (reader or reader_of()).read(path, path.name, findings)
    assert found is not None, findings.text()
    return found


def refusal(path: Path, content: str, reader: LogReader | None = None) -> str:
    """What is said of a log in which something is wrong."""
    path.write_bytes(content.encode("utf-8"))
    findings = Findings()
    assert (reader or reader_of()).read(path, path.name, findings) is None
    return findings.text()


def texts(log: CanonicalLog, name: str) -> list[str]:
    """An identifier of every row."""
    return [log.ids[name].text(row) for row in range(len(log))]
