"""Which fixations a blink touches, where blinks have lines of their own."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import number_of, truth_of


@dataclass(frozen=True, slots=True)
class Moments:
    """Events of a log: fixations or blinks.

    Attributes
    ----------
    lines : (n,) int64 array
        The line of each, ascending.
    trial : (n,) int64 array
        The trial in which each stands.
    eye : (n,) int32 array
        Whose it is; -1 where nothing is said.
    onset_ms, end_ms : (n,) float64 array, milliseconds
        NaN where it is not said.
    """

    lines: NDArray[np.int64]
    trial: NDArray[np.int64]
    eye: NDArray[np.int32]
    onset_ms: NDArray[np.float64]
    end_ms: NDArray[np.float64]

    def __len__(self) -> int:
        return len(self.lines)

    def take(self, rows: NDArray[np.integer] | NDArray[np.bool_]) -> Moments:
        """Some of them."""
        return Moments(
            self.lines[rows],
            self.trial[rows],
            self.eye[rows],
            self.onset_ms[rows],
            self.end_ms[rows],
        )


def touched_by_blinks(fixations: Moments, blinks: Moments) -> NDArray[np.bool_]:
    """Find the fixations that a blink touches.

    Parameters
    ----------
    fixations : Moments of length n
        The fixations of a log.
    blinks : Moments
        Its blinks, each of one trial.

    Returns
    -------
    (n,) bool array

    Notes
    -----
    A blink touches fixations of its own trial and eye only; one of which no eye is said, those of
    all eyes. It touches the fixations that it overlaps by more than a point of time; if it overlaps
    none, and where times are not said, it touches the fixation before it and the one after it.

    Examples
    --------
    >>> def moments(lines, onsets, ends):
    ...     one = np.zeros(len(lines), dtype=np.int64)
    ...     times = np.array(onsets, dtype=float), np.array(ends, dtype=float)
    ...     return Moments(np.array(lines), one, one.astype(np.int32), *times)
    >>> fixations = moments([1, 2, 4], [0, 300, 600], [250, 500, 900])
    >>> touched_by_blinks(fixations, moments([3], [510], [590])).tolist()
    [False, True, True]
    """
    touched = np.zeros(len(fixations), dtype=bool)
    for eye in np.unique(fixations.eye).tolist():
        rows = np.flatnonzero(fixations.eye == eye)
        own = fixations.take(rows)
        theirs = blinks.take((blinks.eye == eye) | (blinks.eye < 0)) if eye >= 0 else blinks
        timed = ~np.isnan(theirs.onset_ms) & ~np.isnan(theirs.end_ms)
        timed &= not np.isnan(own.onset_ms + own.end_ms).any()
        touched[rows] = _by_time(own, theirs.take(timed)) | _by_line(own, theirs.take(~timed))
    return touched


def _by_time(fixations: Moments, blinks: Moments) -> NDArray[np.bool_]:
    """Those that blinks touch by their times."""
    order = np.lexsort((fixations.onset_ms, fixations.trial))
    own = fixations.take(order)
    over = _count_below((own.trial, own.end_ms), (blinks.trial, blinks.onset_ms), ties=True)
    begun = _count_below((own.trial, own.onset_ms), (blinks.trial, blinks.end_ms), ties=False)
    touched = np.zeros(len(fixations), dtype=bool)
    touched[order] = _marked(own.trial, blinks.trial, over, begun)
    return touched


def _by_line(fixations: Moments, blinks: Moments) -> NDArray[np.bool_]:
    """Those that blinks touch by the order of their lines."""
    above = np.searchsorted(fixations.lines, blinks.lines)
    return _marked(fixations.trial, blinks.trial, above, above)


def _count_below(
    events: tuple[NDArray[np.int64], NDArray[np.float64]],
    asked: tuple[NDArray[np.int64], NDArray[np.float64]],
    *,
    ties: bool,
) -> NDArray[np.int64]:
    """How many events lie before each of those asked about, by trial and time."""
    count = len(events[0])
    asks = np.concatenate([np.zeros(count, dtype=np.int8), np.ones(len(asked[0]), dtype=np.int8)])
    trial = np.concatenate([events[0], asked[0]])
    time_ms = np.concatenate([events[1], asked[1]])
    order = np.lexsort((asks if ties else -asks, time_ms, trial))
    below = np.cumsum(asks[order] == 0)
    found = np.zeros(len(order), dtype=np.int64)
    found[order] = below
    return found[count:]


def _marked(
    trial: NDArray[np.int64],
    own: NDArray[np.int64],
    first: NDArray[np.int64],
    stop: NDArray[np.int64],
) -> NDArray[np.bool_]:
    """The fixations from the first up to the last of each blink, or its two neighbours."""
    between = stop <= first
    first, stop = np.where(between, first - 1, first), np.where(between, first + 1, stop)
    first = np.maximum(first, np.searchsorted(trial, own))
    stop = np.minimum(stop, np.searchsorted(trial, own, side="right"))
    some = stop > first
    steps = np.zeros(len(trial) + 1, dtype=np.int64)
    np.add.at(steps, first[some], 1)
    np.add.at(steps, stop[some], -1)
    return np.asarray(np.cumsum(steps)[:-1] > 0)


def touches(text: str) -> bool | None:
    """Whether a cell of a fixation says that there was a blink.

    Parameters
    ----------
    text : str
        A number, or a word for yes or no.

    Returns
    -------
    bool or None
        None where it does not say.

    Examples
    --------
    >>> [touches(text) for text in ("0", "0,5", "yes", "perhaps")]
    [False, True, True, None]
    """
    truth = truth_of(text)
    if truth is not None:
        return truth
    number = number_of(text.replace(",", "."))
    return None if number is None else number != 0


def tell_blink(text: str, line: int, header: str, shown: str, findings: Findings) -> None:
    """Record a cell that does not say whether a blink touches the fixation.

    Parameters
    ----------
    text : str
        The cell.
    line : int
        Where it is found first.
    header : str
        Its column.
    shown : str
        The log's name.
    findings : Findings
        Where it is recorded.
    """
    findings.error(
        "this does not say whether a blink touches the fixation",
        path=shown,
        line=line,
        where=f'column "{header}"',
        found=text,
        expected="a number (0 for no blink), or a word for yes or no",
        fix="correct the cells, or take blink out of [logs.columns]",
    )
