"""A seeded simulator of reading studies in which the truth is known.

It writes the sample studies of this project (``python -m tests.simulator``), and studies of other
sizes, effects and log dialects for the tests.
"""

from tests.simulator.bulk import BulkStudy, write_bulk_study
from tests.simulator.layout import Grid, Layout, Word, lay_out
from tests.simulator.orchard import ORCHARD_EFFECTS, orchard_spec, write_orchard
from tests.simulator.passages import passages_spec, write_passages
from tests.simulator.spec import (
    Effects,
    Habits,
    Mess,
    PlannedReader,
    PlannedTrial,
    SimulatedFixation,
    SimulatedReader,
    SimulatedStudy,
    SimulatedTrial,
    StudySpec,
    true_orders,
)
from tests.simulator.study import simulate_study
from tests.simulator.writing import Column, Dialect, LogFile, logs_by_reader, write_study

__all__ = [
    "ORCHARD_EFFECTS",
    "BulkStudy",
    "Column",
    "Dialect",
    "Effects",
    "Grid",
    "Habits",
    "Layout",
    "LogFile",
    "Mess",
    "PlannedReader",
    "PlannedTrial",
    "SimulatedFixation",
    "SimulatedReader",
    "SimulatedStudy",
    "SimulatedTrial",
    "StudySpec",
    "Word",
    "lay_out",
    "logs_by_reader",
    "orchard_spec",
    "passages_spec",
    "simulate_study",
    "true_orders",
    "write_bulk_study",
    "write_orchard",
    "write_passages",
    "write_study",
]
