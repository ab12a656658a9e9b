"""The rules of screening: their names, their order, and the limits a study sets."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Final

#: Before screening: trials that are no part of the study, recordings that are not used.
BEFORE: Final = ("skip", "repeated")
FIXATION_RULES: Final = (
    "outside_text_time",
    "off_screen",
    "first",
    "last",
    "blink",
    # Before merging: what is no reading of its place is joined to no other fixation.
    "undersweep",
    "merge",
    "under_ms",
    "over_ms",
)
TRIAL_RULES: Final = (
    "notes",
    "fewest_fixations",
    # Before the rules that look at regions: where lines are not sure, regions are not.
    "line_confidence_under",
    "outside_share_over",
    "duration_ms",
    "blink_in_first_pass_of",
    "no_first_pass_on",
    "answer_wrong",
)
READER_RULES: Final = (
    "participant_notes",
    "correct_share_under",
    "lost_trials_share_over",
    "fewest_trials_per_cell",
)
VALUE_RULES: Final = ("outlier_sd",)
#: Everything that can leave a fixation out, in order of application; a code counts from 0 here.
LEFT_OUT_BY: Final = (*BEFORE, *FIXATION_RULES, *TRIAL_RULES, *READER_RULES)
CODE: Final = {name: code for code, name in enumerate(LEFT_OUT_BY)}
#: Why a value that ``outlier_sd`` sets aside is missing.
OUTLIER: Final = "outlier"


def key_of(rule: str) -> tuple[str, ...]:
    """The key of the study file that a rule belongs to.

    Examples
    --------
    >>> key_of("under_ms"), key_of("participant_notes")
    (('screening', 'fixations', 'under_ms'), ('screening', 'participants', 'notes'))
    """
    for part, rules in (
        ("fixations", FIXATION_RULES),
        ("trials", TRIAL_RULES),
        ("participants", READER_RULES),
        ("values", VALUE_RULES),
    ):
        if rule in rules:
            return ("screening", part, "notes" if rule == "participant_notes" else rule)
    return ("trials", rule)


@dataclass(frozen=True, slots=True)
class Limits:
    """The limits that a study sets; a rule that is off has one that nothing can reach.

    Attributes
    ----------
    used : tuple of str
        The rules that are on, in order of application, with ``skip`` and ``repeated`` where the
        study can use them.
    shown : dict of str to str
        Each limit as the ledger shows it.
    screen_px : tuple of float
        Width and height of the screen.
    first, last : int
        How many fixations at either end of a recording.
    merge_under_ms, merge_within_px : float
        Below which duration, and how near.
    under_ms, over_ms : float
        Durations out of range.
    fewest_fixations : int
        Kept fixations that a trial needs.
    line_confidence_under : float
        How sure the lines of a trial must be, from 0 to 1.
    outside_share_over : float
        Share of kept fixations outside every region.
    duration_ms : tuple of float
        Least and longest duration of a trial.
    blink_regions, first_pass_regions : tuple of str
        Regions named in ``blink_in_first_pass_of`` and ``no_first_pass_on``.
    correct_share_under, lost_trials_share_over : float
        Shares of a reader's trials.
    fewest_trials_per_cell : int
        Kept trials that each combination of factors needs.
    outlier_sd : float
        Standard deviations from the mean.
    """

    used: tuple[str, ...] = ()
    shown: Mapping[str, str] = field(default_factory=dict)
    screen_px: tuple[float, float] = (math.inf, math.inf)
    first: int = 0
    last: int = 0
    merge_under_ms: float = 0.0
    merge_within_px: float = 0.0
    under_ms: float = 0.0
    over_ms: float = math.inf
    fewest_fixations: int = 0
    line_confidence_under: float = -math.inf
    outside_share_over: float = math.inf
    duration_ms: tuple[float, float] = (-math.inf, math.inf)
    blink_regions: tuple[str, ...] = ()
    first_pass_regions: tuple[str, ...] = ()
    correct_share_under: float = -math.inf
    lost_trials_share_over: float = math.inf
    fewest_trials_per_cell: int = 0
    outlier_sd: float = math.inf

    def on(self, rule: str) -> bool:
        """Whether a rule is used."""
        return rule in self.used
