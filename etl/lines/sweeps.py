"""Lines told from return sweeps: the steps back to where lines begin."""

from __future__ import annotations

import numpy as np

from etl.lines.clusters import exact_clusters
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.runs import first_of_runs, runs_to_nearest
from etl.lines.settings import MethodSettings


@line_method
def segment(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Begin a new line with each of the longest steps back, one fewer than there are lines.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order; y is not looked at.
    passage : Passage
        The text.
    settings : MethodSettings
        Nothing of them is used.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0. Of equally long steps the earlier ones count. Fewer steps
        than that leave the last lines without a fixation.

    Notes
    -----
    No vertical drift can mislead it. It presumes that each line is read once, in order: after one
    return to an earlier line, or one long step back within a line taken for a return sweep, all
    that follows is a line off. O(n log n).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``segment``.

    Examples
    --------
    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> segment(np.array([50.0, 300.0, 250.0, 40.0, 200.0]), np.zeros(5), passage,
    ...         MethodSettings()).tolist()
    [0, 0, 0, 1, 1]
    """
    del settings  # all methods are called alike
    back = np.argsort(np.diff(x_px), kind="stable")[: passage.line_y_px.size - 1]
    begins = np.zeros(y_px.size, dtype=np.int32)
    begins[back + 1] = 1
    return np.cumsum(begins, dtype=np.int32)


@line_method
def split(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Take stretches between return sweeps to the line nearest to their mean.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    passage : Passage
        The text.
    settings : MethodSettings
        Nothing of them is used.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.

    Notes
    -----
    Steps across are divided into two clusters, of which the one that goes farther back is that of
    the return sweeps; the clusters are the best there are, see
    :func:`etl.lines.clusters.exact_clusters`. Where all steps are equal there is no return sweep.
    Unlike ``segment`` it allows for lines read again; it fails where a whole line has drifted, and
    where a step back to an earlier line is not taken for a return sweep. O(n²).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``split``.

    Examples
    --------
    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> split(np.array([50.0, 200.0, 350.0, 40.0, 200.0]),
    ...       np.array([110.0, 120.0, 135.0, 170.0, 160.0]), passage, MethodSettings()).tolist()
    [0, 0, 0, 1, 1]
    """
    del settings  # all methods are called alike
    steps_px = np.diff(x_px)
    returns = np.zeros(steps_px.size, dtype=np.bool_)
    if steps_px.size and steps_px.min() < steps_px.max():
        returns = exact_clusters(steps_px, 2) == 0
    return runs_to_nearest(y_px, first_of_runs(returns), passage)
