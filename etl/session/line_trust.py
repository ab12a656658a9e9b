"""How far the lines of trials can be trusted, for what is told of them."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.report import LineTrust

if TYPE_CHECKING:
    from etl.session.lines import ReaderLines


def trust_of(lines: ReaderLines | None, trial: NDArray[np.int64]) -> LineTrust | None:
    """How far each trial can be trusted.

    Parameters
    ----------
    lines : ReaderLines or None
        How lines were told; None where texts have no lines to tell apart.
    trial : (n,) int64 array
        The trial of each fixation.

    Returns
    -------
    LineTrust or None
    """
    if lines is None:
        return None
    count = len(lines.sure)
    some = np.bincount(trial[lines.by_hand], minlength=count) > 0
    # Some corrections say nothing about the rest of a trial.
    left = np.bincount(trial[(lines.line >= 0) & ~lines.by_hand], minlength=count) > 0
    by_hand = some & ~left
    return LineTrust(lines.trial_confidence, lines.sure, by_hand)
