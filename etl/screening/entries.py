"""What a row of the ledger is, and what it is made from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.screening.screen import FixationScreening, Recorded, Verdict

LEVELS = ("fixation", "trial", "participant", "value")
LEFT_OUT = "left out"
SET_MISSING = "set missing"


class Entry(NamedTuple):
    """One row of the ledger; -1 where a place does not apply.

    Attributes
    ----------
    level : str
        One of ``LEVELS``.
    trial, region, fixation : int
        Index of the trial, code of the region, number of the fixation in its trial.
    rule, limit, observed, action, also : str
        As the ledger shows them.
    row : int
        The fixation whose place in the log is named.
    reader : int
        The place of the reader among those of the group.
    """

    level: str
    trial: int
    region: int
    fixation: int
    rule: str
    limit: str
    observed: str
    action: str
    also: str
    row: int
    reader: int = 0


def in_order(entries: Sequence[Entry]) -> list[Entry]:
    """Rows by reader, trial (those on the reader last), level, fixation and region.

    Parameters
    ----------
    entries : sequence of Entry
        In any order, which stays for rows about the same thing.

    Returns
    -------
    list of Entry
    """
    level = {name: place for place, name in enumerate(LEVELS)}
    trial = np.array([entry.trial for entry in entries], dtype=np.int64)
    order = np.lexsort(
        (
            np.array([entry.region for entry in entries]),
            np.array([entry.fixation for entry in entries]),
            np.array([level[entry.level] for entry in entries]),
            trial,
            trial < 0,
            np.array([entry.reader for entry in entries]),
        )
    )
    return [entries[place] for place in order.tolist()]


@dataclass(frozen=True, slots=True)
class Screened:
    """Everything that screening found out about one or more readers.

    Attributes
    ----------
    recorded : Recorded
        The fixations as they were.
    number : (n,) int64 array
        Number of each fixation in its trial.
    fixations : FixationScreening
        After the rules for fixations.
    trials, readers : Verdict
        What the rules for trials and readers say.
    before : (trials,) int8 array
        Code of ``skip`` for trials that are no part of the study, else -1.
    reader : (trials,) int64 array
        The reader of each trial, from 0; non-decreasing.
    """

    recorded: Recorded
    number: NDArray[np.int64]
    fixations: FixationScreening
    trials: Verdict
    readers: Verdict
    before: NDArray[np.int8]
    reader: NDArray[np.int64]

    def trial_codes(self) -> NDArray[np.int8]:
        """What left each trial out: ``skip``, a rule for trials, a rule for readers; -1 kept."""
        codes = np.where(self.before >= 0, self.before, self.trials.left_out)
        return np.where(codes >= 0, codes, self.readers.left_out[self.reader]).astype(np.int8)

    def fixation_codes(self) -> NDArray[np.int8]:
        """What left each fixation out; those of a trial or reader left out are charged to that."""
        own = self.fixations.left_out
        of_trial = self.trial_codes()
        if (of_trial < 0).all():
            return own
        return np.where(own >= 0, own, of_trial[self.recorded.trial]).astype(np.int8)
