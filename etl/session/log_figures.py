"""What one log is like in figures, by which it is compared with the other logs of the study."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.parsers import CanonicalLog

#: From which share of a log's fixations to which its positions are said to span: the outermost
#: twentieth at each end is left to blinks and glances (our choice).
SPAN = (0.05, 0.95)
#: With fewer steps from onset to onset in a log, a trial begun anew could pass for another unit
#: (our choice).
FEWEST_STEPS = 20


@dataclass(frozen=True, slots=True)
class Spread:
    """Where the fixations of a log lie on one axis.

    Attributes
    ----------
    low_px, middle_px, high_px : float, pixels
        The positions below which 5 %, half and 95 % of the fixations lie; NaN where none has one.
    """

    low_px: float
    middle_px: float
    high_px: float

    @property
    def extent_px(self) -> float:
        """How far it is from the low to the high end, in pixels."""
        return self.high_px - self.low_px

    @classmethod
    def of(cls, positions_px: NDArray[np.float64]) -> Spread:
        """The spread of some positions.

        Parameters
        ----------
        positions_px : (n,) float64 array, pixels
            On one axis; those that are NaN are left aside.

        Returns
        -------
        Spread
            Of positions that occur; nothing is interpolated.

        Examples
        --------
        >>> Spread.of(np.arange(101.0))
        Spread(low_px=5.0, middle_px=50.0, high_px=95.0)
        """
        known = np.sort(positions_px[~np.isnan(positions_px)])
        if not known.size:
            return cls(float("nan"), float("nan"), float("nan"))
        last = len(known) - 1
        low, middle, high = (float(known[round(q * last)]) for q in (SPAN[0], 0.5, SPAN[1]))
        return cls(low, middle, high)


@dataclass(frozen=True, slots=True)
class LogFigures:
    """A log in figures.

    Attributes
    ----------
    readers, trials, fixations : int
        How many it holds.
    placed : int
        How many of its fixations have a position from left to right.
    median_ms : float, milliseconds
        The middle duration of its fixations.
    step_ratio : float
        The middle of how many durations it is from one onset to the next in a trial: a little
        above 1 where both are in one unit. NaN where the log has no onsets, or few steps.
    x, y : Spread
        Where its fixations lie.
    """

    readers: int
    trials: int
    fixations: int
    placed: int
    median_ms: float
    step_ratio: float
    x: Spread
    y: Spread


def figures_of(log: CanonicalLog, readers: int, trials: int) -> LogFigures:
    """Count and measure one log.

    Parameters
    ----------
    log : CanonicalLog
        Its fixations, at least one.
    readers, trials : int
        How many it holds.

    Returns
    -------
    LogFigures
    """
    return LogFigures(
        readers,
        trials,
        len(log),
        int((~np.isnan(log.x_px)).sum()),
        float(np.median(log.duration_ms)),
        _step_ratio(log),
        Spread.of(log.x_px),
        Spread.of(log.y_px),
    )


def _step_ratio(log: CanonicalLog) -> float:
    """How many durations it is from an onset to the next, in the middle over a log."""
    steps = steps_of(log)
    return float(np.median(steps)) if len(steps) >= FEWEST_STEPS else float("nan")


def steps_of(log: CanonicalLog) -> NDArray[np.float64]:
    """How many durations it is from an onset to the next.

    Parameters
    ----------
    log : CanonicalLog
        Fixations, at least one.

    Returns
    -------
    (m,) float64 array
        For each fixation of which the next is of the same trial and begins later.
    """
    same = np.ones(max(len(log) - 1, 0), dtype=bool)
    for name, column in log.ids.items():
        if name != "item":
            same &= column.codes[1:] == column.codes[:-1]
    steps = np.diff(log.onset_ms) / log.duration_ms[:-1]
    # A step back is a row out of order, of which the ordering of fixations has its own to say.
    return np.asarray(steps[same & (steps > 0)], dtype=np.float64)
