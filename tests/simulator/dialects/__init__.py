"""One small study in every dialect of log that is read: what was recorded, and its writers."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from pathlib import Path

from tests.simulator.dialects.bids import BIDS_DIALECTS, write_bids
from tests.simulator.dialects.events import EVENT_DIALECTS, write_events
from tests.simulator.dialects.recorded import RecordedStudy, recorded_study
from tests.simulator.dialects.sampled import SAMPLE_DIALECTS, write_samples
from tests.simulator.dialects.table_dialects import TABLE_DIALECTS
from tests.simulator.dialects.tables import write_tables

#: Writes a study into a folder, and gives its study file.
Writer = Callable[[RecordedStudy, Path], Path]

#: A writer for every dialect, by its name.
DIALECTS: dict[str, Writer] = {
    **{name: partial(write_tables, dialect=one) for name, one in TABLE_DIALECTS.items()},
    **{name: partial(write_events, dialect=one) for name, one in EVENT_DIALECTS.items()},
    **{name: partial(write_bids, dialect=one) for name, one in BIDS_DIALECTS.items()},
    **{name: partial(write_samples, dialect=one) for name, one in SAMPLE_DIALECTS.items()},
}

__all__ = ["DIALECTS", "RecordedStudy", "Writer", "recorded_study"]
