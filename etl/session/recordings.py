"""Where a trial's rows begin anew: trials recorded twice, and damage that looks like it.

A trial may be recorded more than once, and a log may be damaged in ways that look alike. Another
recording is only taken for one where the rows say so; where they contradict each other, nothing is
guessed and the place is named.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Flags = NDArray[np.bool_]

#: From how many recordings on, of fewer rows each than this, a trial's rows are taken for mixed up
#: with those of others: no trial is begun that often for a single fixation (our choice).
_MIXED_RECORDINGS, _MIXED_ROWS = 3, 2

#: What can be wrong where a trial's rows do not follow each other.
Fault = Literal["comes twice", "falls back", "alternates"]


@dataclass(frozen=True, slots=True)
class Rows:
    """The rows of readers, sorted by trial, in the order of the logs within each trial.

    Attributes
    ----------
    row : (n,) int64 array
        Row in the readers' logs; those of one log stand together, in the order of the logs.
    trial : (n,) int64 array
        Index of the trial; non-decreasing.
    file : (n,) integer array
        Which log the row is from; a log that holds several readers is another for each.
    onset_ms : (n,) float64 array, milliseconds
        NaN throughout where the logs have no onsets.
    duration_ms : (n,) float64 array, milliseconds
        How long the fixation lasted.
    number : (n,) float64 array
        The fixation's number; NaN throughout where the logs do not number them.
    recording : (n,) int32 array
        Which recording the row belongs to, where the log says; -1 where it does not.
    """

    row: NDArray[np.int64]
    trial: NDArray[np.int64]
    file: NDArray[np.integer]
    onset_ms: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    number: NDArray[np.float64]
    recording: NDArray[np.int32]

    def take(self, rows: NDArray[np.int64]) -> Rows:
        """Some of the rows."""
        return Rows(
            self.row[rows],
            self.trial[rows],
            self.file[rows],
            self.onset_ms[rows],
            self.duration_ms[rows],
            self.number[rows],
            self.recording[rows],
        )

    def begins(self) -> Flags:
        """Whether each row is the first of its trial."""
        begins = np.ones(len(self.row), dtype=bool)
        begins[1:] = self.trial[1:] != self.trial[:-1]
        return begins

    def apart(self) -> Flags:
        """For each row but the first, whether it does not stand right below the one before it."""
        return np.asarray(self.row[1:] != self.row[:-1] + 1)


@dataclass(frozen=True, slots=True)
class Recordings:
    """Where recordings begin, and where rows contradict each other.

    Attributes
    ----------
    starts : (n,) bool array
        Whether a second or later recording of a trial begins at the row.
    faults : dict of int to str
        The first place of each trial at which something is wrong, and what.
    """

    starts: Flags
    faults: dict[int, Fault]


def find_recordings(rows: Rows) -> Recordings:
    """Find where trials are recorded a second time.

    Parameters
    ----------
    rows : Rows
        The rows, sorted by trial.

    Returns
    -------
    Recordings

    Notes
    -----
    By numbers, where the logs have them: another recording begins where the number falls to that
    of the trial's first row or below it, or, where numbers run on over the whole log, where other
    trials stand between. Rows of any order whose numbers in a trial are a run without a gap and
    without a repeat are one recording.

    By onsets otherwise: another recording begins where other trials stand between and time has
    gone on since (or has begun anew), and where time falls back to the trial's first onset. A
    trial goes on in the next log only where its rows are the last of the one and the first of the
    other.

    Where a log itself says where recordings begin, nothing is inferred for its rows.

    Examples
    --------
    >>> numbers = np.array([1.0, 2.0, 1.0, 2.0])
    >>> nowhere = np.full(4, np.nan)
    >>> one = np.zeros(4, dtype=np.int64)
    >>> zeros = one.astype(np.int32)
    >>> rows = Rows(np.arange(4), one, zeros, nowhere, nowhere, numbers, zeros - 1)
    >>> find_recordings(rows).starts
    array([False, False,  True, False])
    """
    begins = rows.begins()
    if len(rows.row) and (rows.recording >= 0).all():
        starts = np.zeros(len(rows.row), dtype=bool)
        changes = rows.recording[1:] != rows.recording[:-1]
        starts[1:] = ~begins[1:] & (changes | (rows.file[1:] != rows.file[:-1]))
        return Recordings(starts, {})
    numbered = len(rows.row) > 0 and not np.isnan(rows.number[0])
    starts, faults = (_by_number if numbered else _by_onset)(rows, begins)
    _add_mixed(rows, starts, faults)
    return Recordings(starts, faults)


def _by_onset(rows: Rows, begins: Flags) -> tuple[Flags, dict[int, Fault]]:
    """Recordings by onsets and by what lies between."""
    onset = rows.onset_ms
    starts = np.zeros(len(onset), dtype=bool)
    inner = ~begins[1:]
    falls = onset[1:] < onset[:-1]
    apart = rows.apart()
    other_file = rows.file[1:] != rows.file[:-1]
    first = onset[begins][np.cumsum(begins) - 1]
    starts[1:] = inner & (apart | (falls & (other_file | (onset[1:] <= first[1:]))))
    faults: dict[int, Fault] = {}
    doubtful = np.flatnonzero(inner & apart & ~falls & ~other_file) + 1
    if doubtful.size:
        by_row = np.empty(len(onset))
        by_row[rows.row] = onset
        # The trial goes on where it was, though the clock of the log has gone on in between.
        back = doubtful[by_row[rows.row[doubtful] - 1] > onset[doubtful]]
        # In a log that is mixed up so, rows of the other trial look like a second recording.
        for at in doubtful[np.isin(rows.file[doubtful], rows.file[back])].tolist():
            faults.setdefault(at, "alternates")
    return starts, faults


def _by_number(rows: Rows, begins: Flags) -> tuple[Flags, dict[int, Fault]]:
    """Recordings by the numbers of fixations."""
    number = rows.number
    starts = np.zeros(len(number), dtype=bool)
    faults: dict[int, Fault] = {}
    inner = ~begins[1:]
    doubtful = inner & (rows.apart() | (number[1:] <= number[:-1]))
    if not doubtful.any():
        return starts, faults
    ascends, counts_on = _numbers_run_on(rows)
    trial = np.cumsum(begins) - 1
    steps = np.diff(number[np.lexsort((number, trial))])
    # A run of numbers without gap and repeat is put in order, however its rows are shuffled.
    broken = np.zeros(int(trial[-1]) + 1, dtype=bool)
    broken[trial[1:][inner & (steps != 1)]] = True
    runs_on = np.where(broken[trial], ascends, counts_on)
    unsound = broken.copy()
    unsound[trial[runs_on]] = True
    twice = np.zeros(len(unsound), dtype=bool)
    twice[trial[1:][inner & (steps == 0)]] = True
    firsts = np.flatnonzero(begins)
    for at in (np.flatnonzero(doubtful & unsound[trial[1:]]) + 1).tolist():
        own = int(trial[at])
        first = int(firsts[own])
        if twice[own]:
            verdict = _verdict_on_repeat(rows, first, at, runs_on, starts)
        else:
            verdict = _verdict_on_single(rows, first, at, runs_on)
        if verdict == "restart":
            starts[at] = True
        elif verdict is not None:
            faults.setdefault(at, verdict)
    return starts, faults


def _numbers_run_on(rows: Rows) -> tuple[Flags, Flags]:
    """Whether the numbers of each row's log ascend over its trials, of which it has several.

    And whether they do so without a gap where one trial follows another.
    """
    count = len(rows.row)
    number, trial, file = np.empty(count), np.empty(count, np.int64), np.empty(count, np.int64)
    number[rows.row], trial[rows.row], file[rows.row] = rows.number, rows.trial, rows.file
    same = file[1:] == file[:-1]
    part = np.concatenate([[0], np.cumsum(~same)])
    ascends = np.zeros(int(part[-1]) + 1, dtype=bool)
    change = same & (trial[1:] != trial[:-1])
    ascends[part[1:][change]] = True
    ascends[part[1:][same & (number[1:] <= number[:-1])]] = False
    counts_on = ascends.copy()
    counts_on[part[1:][change & (number[1:] != number[:-1] + 1)]] = False
    return ascends[part][rows.row], counts_on[part][rows.row]


def _verdict_on_single(
    rows: Rows, first: int, at: int, runs_on: Flags
) -> Fault | Literal["restart"] | None:
    """What a row that is apart or falls back means in a trial in which no number comes twice."""
    number, before = rows.number[at], rows.number[at - 1]
    if rows.row[at] == rows.row[at - 1] + 1:
        # Rows of one block can only be sorted; but a log that begins below the last begins anew.
        other_file = rows.file[at] != rows.file[at - 1]
        return "restart" if other_file and number < min(before, rows.number[first]) else None
    if runs_on[at] or runs_on[at - 1]:
        return "restart"
    return None if number == before + 1 else "alternates"


def _verdict_on_repeat(
    rows: Rows, first: int, at: int, runs_on: Flags, starts: Flags
) -> Fault | Literal["restart"] | None:
    """The same in a trial in which a number comes twice."""
    number, before = rows.number[at], rows.number[at - 1]
    apart = rows.row[at] != rows.row[at - 1] + 1
    if number == before + 1:
        return "restart" if runs_on[at] or runs_on[at - 1] else None
    # The same number right below is a row that is there twice, or the other eye, unless the clock
    # says that the fixation above was over.
    over = rows.onset_ms[at] >= rows.onset_ms[at - 1] + rows.duration_ms[at - 1]
    if number <= rows.number[first] and (apart or number < before or over):
        return "restart"
    if apart and (runs_on[at] or runs_on[at - 1]):
        return "restart"
    began = np.flatnonzero(starts[first:at])
    current = rows.number[first + (int(began[-1]) if began.size else 0) : at]
    if (current == number).any():
        return "comes twice"
    return "alternates" if apart else "falls back"


def _add_mixed(rows: Rows, starts: Flags, faults: dict[int, Fault]) -> None:
    """Add the trials that begin again and again for a single row."""
    if not starts.any():
        return
    begins = rows.begins()
    trial = np.cumsum(begins) - 1
    recordings = 1 + np.bincount(trial[starts], minlength=int(trial[-1]) + 1)
    count = np.bincount(trial)
    mixed = (recordings >= _MIXED_RECORDINGS) & (count < _MIXED_ROWS * recordings)
    first_start = np.flatnonzero(starts & mixed[trial])
    apart = rows.apart()
    for at in first_start.tolist():
        faults.setdefault(at, "alternates" if apart[at - 1] else "falls back")


def first_faults(rows: Rows, recordings: Recordings) -> dict[int, Fault]:
    """The first fault of each trial, by place.

    Parameters
    ----------
    rows : Rows
        As given to :func:`find_recordings`.
    recordings : Recordings
        What it found.

    Returns
    -------
    dict of int to str
        In the order of places.
    """
    told: set[int] = set()
    first: dict[int, Fault] = {}
    for at in sorted(recordings.faults):
        trial = int(rows.trial[at])
        if trial not in told:
            told.add(trial)
            first[at] = recordings.faults[at]
    return first
