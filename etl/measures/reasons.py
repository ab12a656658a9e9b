"""Why a value is missing: the reasons, their codes and their meanings.

A value of 0 says that the reader had the chance and did not; where there was no chance the value is
missing and one of these reasons stands beside it. Where two could apply, the structural one (a text
has no region before its first) comes first, then ``not_reached``, then the other.
"""

from __future__ import annotations

from typing import Final

import numpy as np

#: The reasons by code; code 0, the empty reason, stands where there is a value.
REASONS: Final = (
    "",
    "no_earlier_region",
    "no_later_region",
    "not_reached",
    "not_passed",
    "skipped",
    "never_fixated",
    "refixated",
    "no_saccade",
)

#: The codes of the reasons, as the kernels write them.
NO_EARLIER_REGION: Final = np.uint8(1)
NO_LATER_REGION: Final = np.uint8(2)
NOT_REACHED: Final = np.uint8(3)
NOT_PASSED: Final = np.uint8(4)
SKIPPED: Final = np.uint8(5)
NEVER_FIXATED: Final = np.uint8(6)
REFIXATED: Final = np.uint8(7)
NO_SACCADE: Final = np.uint8(8)

#: What each reason means, for the codebook and the printed catalogue.
REASON_MEANINGS: Final = {
    "no_earlier_region": "the first region of a text has none before it to go back to",
    "no_later_region": "the last region of a text has none after it to come back from",
    "not_reached": "the eyes never got as far as this region, nor beyond it",
    "not_passed": "the eyes got as far as this region but never beyond it to come back from",
    "skipped": "the eyes went beyond this region before they ever fixated it: it has no first pass",
    "never_fixated": "the eyes went beyond this region and never fixated it",
    "refixated": "the first pass has more than one fixation",
    "no_saccade": "the trial has fewer than two fixations inside regions",
}

#: The reasons that ``no_opportunity = "zero"`` turns into a 0 in binary and count outcomes.
NO_OPPORTUNITY: Final = ("not_reached", "not_passed", "skipped", "never_fixated")
