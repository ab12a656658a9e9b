"""Return sweeps, and the fixations on which one that fell short came down."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError


class Sweeps(NamedTuple):
    """Which fixations are where a return sweep came down.

    Attributes
    ----------
    return_sweep : (n,) bool array
        The saccade to this fixation is a return sweep.
    undersweep : (n,) bool array
        It is one that fell short and was corrected; only where ``return_sweep`` is.
    """

    return_sweep: NDArray[np.bool_]
    undersweep: NDArray[np.bool_]


def label_sweeps(
    line: NDArray[np.int32],
    x_px: NDArray[np.float64],
    trial: NDArray[np.int64],
    *,
    right_to_left: bool,
) -> Sweeps:
    """Label the fixations on which return sweeps come down.

    Parameters
    ----------
    line : (n,) int array
        The line of each fixation, from 1 (top), in time order within a recording; 0 and below for
        fixations on no line, or on one that is not known.
    x_px : (n,) float64 array, pixels
        Where each fixation is, to the right; NaN where not known.
    trial : (n,) int array
        Which recording of a trial each fixation is of. No saccade goes from one to another, so that
        a trial that was recorded twice needs two numbers.
    right_to_left : bool
        Whether the text is read from right to left.

    Returns
    -------
    Sweeps
        Two arrays of length n.

    Raises
    ------
    FaultError
        If the arrays are not as long as each other.

    Notes
    -----
    A return sweep goes from a line to a later one (the next or one further down) and against the
    direction of reading; the fixation on which it comes down is labelled. That fixation is an
    undersweep where the saccade after it stays on the line and goes further against the direction
    of reading: the sweep stopped short of the line's beginning and is being corrected. A step down
    in the direction of reading, or straight down, is no return sweep, nor is one to an earlier
    line. Of two corrections in a row only the first fixation is an undersweep, for the second was
    not come to by a return sweep.

    Fixations on no line are stepped over: what lies in the middle of a sweep, or far off the text,
    does not make two saccades of one. They have no labels themselves. A fixation on a line whose x
    is not known is not stepped over, and no saccade to or from it is a sweep.

    The labels are about what was recorded, whatever is left out or merged later.

    References
    ----------
    Return sweeps: Rayner (1998), Psychological Bulletin 124, 372-422,
    doi:10.1037/0033-2909.124.3.372. Undersweeps and corrective saccades: Parker, Slattery & Kirkby
    (2019), Vision Research 155, 35-43, doi:10.1016/j.visres.2018.12.007. Both from memory; that
    other lines than the next count, and the stepping over, are ours.

    Examples
    --------
    The sweep to the second line comes down at 120 and is corrected to 60; the one to the third
    comes down at 50 and reading goes on:

    >>> line = np.array([1, 1, 2, 2, 2, 3, 3], dtype=np.int32)
    >>> x_px = np.array([60.0, 400.0, 120.0, 60.0, 390.0, 50.0, 180.0])
    >>> sweeps = label_sweeps(line, x_px, np.zeros(7, dtype=np.int64), right_to_left=False)
    >>> np.flatnonzero(sweeps.return_sweep).tolist(), np.flatnonzero(sweeps.undersweep).tolist()
    ([2, 5], [2])
    """
    if not line.shape == x_px.shape == trial.shape or line.ndim != 1:
        raise FaultError("fixations: line, x_px and trial must be as long as each other")
    rows = np.flatnonzero(line > 0)
    step_px, down = np.diff(x_px[rows]), np.diff(line[rows])
    back = (step_px > 0 if right_to_left else step_px < 0) & (np.diff(trial[rows]) == 0)
    swept = back & (down > 0)
    corrected = swept[:-1] & back[1:] & (down[1:] == 0)
    return_sweep, undersweep = np.zeros((2, len(line)), dtype=np.bool_)
    return_sweep[rows[1:][swept]] = True
    undersweep[rows[1:-1][corrected]] = True
    return Sweeps(return_sweep, undersweep)
