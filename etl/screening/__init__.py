"""What is left out, by which rule, and the balance of it all."""

from etl.screening.rules import LEFT_OUT_BY, Limits
from etl.screening.screen import (
    FixationScreening,
    Recorded,
    TrialQuantities,
    Verdict,
    outlying,
    screen_fixations,
    screen_readers,
    screen_trials,
)

__all__ = [
    "LEFT_OUT_BY",
    "FixationScreening",
    "Limits",
    "Recorded",
    "TrialQuantities",
    "Verdict",
    "outlying",
    "screen_fixations",
    "screen_readers",
    "screen_trials",
]
