"""From the kept fixations of a reader to every outcome, as kernels over arrays.

The kernels know orders and durations, not pixels, names or files. All trials of a reader (or of
many readers) are computed at once; the catalogue says in plain words what each outcome is.
"""

from etl.measures.catalogue import GROUPS, MEASURES, SELECTABLE, TRIAL_MEASURES, select
from etl.measures.conventions import NoOpportunity, Outside
from etl.measures.kernels import compute
from etl.measures.measure import Measure
from etl.measures.outcomes import Measured, Outcomes, RegressiveSaccades
from etl.measures.reasons import REASON_MEANINGS, REASONS
from etl.measures.sequences import Sequences

__all__ = [
    "GROUPS",
    "MEASURES",
    "REASONS",
    "REASON_MEANINGS",
    "SELECTABLE",
    "TRIAL_MEASURES",
    "Measure",
    "Measured",
    "NoOpportunity",
    "Outcomes",
    "Outside",
    "RegressiveSaccades",
    "Sequences",
    "compute",
    "select",
]
