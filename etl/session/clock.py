"""What the clock of the logs says over the borders of fixations and trials."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.parsers.time_checks import DIFFERENCE_DIGITS

Place = Callable[[int], tuple[str, int]]

#: A pause between two fixations of a trial from which on a time is doubted (our choice: nobody
#: closes the eyes for a minute while reading).
LONG_GAP_MS = 60_000.0
#: A clock is taken to run on from trial to trial where so many trials in a row begin later than
#: the one before (our choice).
_TRIALS_IN_A_ROW = 3


def tell_long_gaps(
    log: CanonicalLog,
    rows: NDArray[np.int64],
    begins: NDArray[np.bool_],
    place: Place,
    findings: Findings,
) -> None:
    """Warn of pauses within a trial that are too long to be ones.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one reader.
    rows : (n,) int64 array
        Row of each fixation, in time order trial by trial.
    begins : (n,) bool array
        Whether a fixation is the first of a recording, or of a trial found wrong already.
    place : callable
        From a row to its file and line.
    findings : Findings
        Where each such pause is recorded.
    """
    onset = log.onset_ms[rows]
    gap = np.where(begins[1:], 0.0, onset[1:] - (onset[:-1] + log.duration_ms[rows[:-1]]))
    for at in (np.flatnonzero(gap >= LONG_GAP_MS) + 1).tolist():
        shown, line = place(int(rows[at]))
        before = place(int(rows[at - 1]))
        findings.warning(
            f"nothing is fixated for {gap[at - 1] / 1000:,.0f} s within a trial",
            path=shown,
            line=line,
            expected=f"an onset soon after the fixation in {before[0]}:{before[1]}",
            fix="check the two onsets; if the trial was begun again, tell the two apart by a "
            "session or a trial number",
        )


def tell_overlapping_trials(
    log: CanonicalLog,
    file: NDArray[np.integer],
    trial: NDArray[np.int64],
    place: Place,
    tolerated_ms: float,
    findings: Findings,
) -> None:
    """Record fixations that reach into the next trial of a log whose clock runs on.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one reader, in the order of the logs.
    file : (n,) integer array
        Which log each is from; a log that holds several readers is another for each.
    trial : (n,) int64 array
        Which trial.
    place : callable
        From a row to its file and line.
    tolerated_ms : float, milliseconds
        How much is taken for rounding.
    findings : Findings
        Where each such fixation is recorded.
    """
    onset, count = log.onset_ms, len(log)
    if count < 2 or np.isnan(onset[0]):
        return
    change = np.flatnonzero((trial[1:] != trial[:-1]) & (file[1:] == file[:-1])) + 1
    over = np.round(
        onset[change - 1] + log.duration_ms[change - 1] - onset[change],
        DIFFERENCE_DIGITS,
    )
    late = over > tolerated_ms
    if not late.any():
        return
    of_file = file[change]
    for own in np.unique(of_file[late]).tolist():
        at = change[of_file == own]
        if len(at) < _TRIALS_IN_A_ROW or not _runs_on(onset, at):
            continue
        mine = late & (of_file == own)
        for row, by_ms in zip(change[mine].tolist(), over[mine].tolist(), strict=True):
            shown, line = place(row - 1)
            after = place(row)
            findings.error(
                "the fixation is not over when the next trial's first one begins",
                path=shown,
                line=line,
                found=f"{by_ms:g} ms too late",
                expected=f"an end before the onset in {after[0]}:{after[1]}",
                fix="check that onset and duration are the right columns with the right "
                "units, and the two cells",
            )


def _runs_on(onset: NDArray[np.float64], change: Sequence[int] | NDArray[np.int64]) -> bool:
    """Whether no trial of a log begins before the last fixation of the one above it."""
    rows = np.asarray(change)
    return bool((onset[rows] >= onset[rows - 1]).all())
