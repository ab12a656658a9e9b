"""What a statistician should know of a binary outcome before the first fit.

Counts come in, facts go out: nothing here opens a file, and nothing is fitted.
"""

from etl.readiness.counts import Conditions, OutcomeCounts, UnitCells
from etl.readiness.judging import outcome_readiness
from etl.readiness.separation import separation_of

__all__ = ["Conditions", "OutcomeCounts", "UnitCells", "outcome_readiness", "separation_of"]
