"""Which trials there are, and what is known about each: facts joined from logs and tables."""

from etl.trials.fact_tables import FactTable, read_fact_table
from etl.trials.facts import FactBook, Facts, KnownTrial, SeenTrial, gather_facts

__all__ = [
    "FactBook",
    "FactTable",
    "Facts",
    "KnownTrial",
    "SeenTrial",
    "gather_facts",
    "read_fact_table",
]
