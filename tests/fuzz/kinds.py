"""The kinds of log that are damaged, each with a small study of three readers of three texts."""

from __future__ import annotations

from functools import partial
from pathlib import Path

from tests.fuzz.logs import LogKind
from tests.simulator.dialects.bids import STANDARD, BidsDialect, write_bids
from tests.simulator.dialects.events import EVENT_DIALECTS, write_events
from tests.simulator.dialects.recorded import RecordedStudy
from tests.simulator.dialects.sampled import SampleDialect, on_grid, write_samples
from tests.simulator.dialects.table_dialects import NUMBERED, TABLE_DIALECTS, WORDY
from tests.simulator.dialects.tables import Column, TableDialect, write_tables

#: The time from one gaze sample to the next, so that a study of samples is small.
_INTERVAL_MS = 4


def _places(columns: tuple[Column, ...]) -> dict[str, int]:
    """Where each thing stands in a row."""
    return {column.fact: place for place, column in enumerate(columns)}


def _table(
    name: str, dialect: TableDialect, *, quoted: bool = False, aligned: bool = False
) -> LogKind:
    """A kind of log that is a table."""
    return LogKind(
        name,
        partial(write_tables, dialect=dialect),
        r"logs/P\d+\.\w+",
        _places(dialect.columns),
        dialect.delimiter,
        quoted=quoted,
        aligned=aligned,
    )


def _sampled(study: RecordedStudy, folder: Path) -> Path:
    """Write a study as samples of a table."""
    dialect = SampleDialect(interval_ms=_INTERVAL_MS)
    return write_samples(on_grid(study.placed(), _INTERVAL_MS), folder, dialect)


def _sampled_bids(study: RecordedStudy, folder: Path) -> Path:
    """Write a study as samples of the open standard."""
    dialect = BidsDialect(
        interval_ms=_INTERVAL_MS, from_samples=True, study=partial(STANDARD, blinks=False)
    )
    return write_bids(on_grid(study.placed(), _INTERVAL_MS), folder, dialect)


QUOTED = TableDialect(columns=WORDY, delimiter=",", quoting="all", ending=".csv")
NUMBERS = TableDialect(columns=NUMBERED, delimiter=";", decimal=",", ending=".csv")
LOOSE = TABLE_DIALECTS["a quote mark not doubled, tabs"]
_SAMPLE_PLACES = {"participant": 0, "trial": 1, "item": 2, "onset": 3, "x": 4, "y": 5, "blink": 6}

#: The kinds of log by name.
KINDS: dict[str, LogKind] = {
    kind.name: kind
    for kind in (
        _table("table", TABLE_DIALECTS["plain"]),
        _table("numbered", NUMBERS),
        _table("quoted", QUOTED, quoted=True),
        _table("loose quotes", LOOSE),
        _table("aligned", TABLE_DIALECTS["aligned by blanks"], aligned=True),
        _table("areas", TABLE_DIALECTS["areas"]),
        LogKind(
            "sentences",
            partial(write_events, dialect=EVENT_DIALECTS["events in sentences, a trial list"]),
            r"logs/P\d+\.txt",
            {"onset": 1, "end": 2, "x": 4, "y": 5},
            " ",
            row="fixated ",
            header=0,
            trial_start="trial ",
        ),
        LogKind(
            "fields",
            partial(write_events, dialect=EVENT_DIALECTS["events in fields, gzipped"]),
            r"logs/P\d+\.txt\.gz",
            {"onset": 0, "duration": 2, "x": 3, "y": 4},
            "|",
            row=r"\d+\|fix\|",
            header=0,
            trial_start=r"\d+\|go\|",
        ),
        LogKind(
            "bids",
            partial(write_bids, dialect=BidsDialect(study=STANDARD)),
            r"sub-P\d+/beh/.*_physioevents\.tsv\.gz",
            {"onset": 0, "duration": 1},
            row=r"\d+\t\d+\tfixation",
            header=0,
            apart=True,
            by_itself=False,
        ),
        LogKind("samples", _sampled, r"logs/P\d+\.tsv", _SAMPLE_PLACES),
        LogKind(
            "bids samples",
            _sampled_bids,
            r"sub-P\d+/beh/.*_physio\.tsv\.gz",
            {"onset": 0, "x": 1, "y": 2},
            header=0,
            apart=True,
        ),
    )
}
