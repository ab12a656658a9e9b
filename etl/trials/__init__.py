"""Which trials there are, and what is known about each: facts joined from logs and tables."""

from etl.trials.fact_tables import FactTable, read_fact_table
from etl.trials.facts import FactBook, KnownTrials, gather_facts
from etl.trials.seen import IDS, SeenTrials

__all__ = [
    "IDS",
    "FactBook",
    "FactTable",
    "KnownTrials",
    "SeenTrials",
    "gather_facts",
    "read_fact_table",
]
