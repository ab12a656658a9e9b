"""Runs of fixations between long steps, each taken to a line as a whole."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from etl.lines.nearest import nearest_line
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.settings import MethodSettings

Flags = NDArray[np.bool_]
Numbers = NDArray[np.int64]


def first_of_runs(ends: Flags) -> Numbers:
    """Find where runs begin.

    Parameters
    ----------
    ends : (n - 1,) boolean array
        Whether the step from a fixation to the next one ends a run.

    Returns
    -------
    (r,) int64 array
        The first fixation of each run, from 0.

    Examples
    --------
    >>> first_of_runs(np.array([False, True, False])).tolist()
    [0, 2]
    """
    return np.append(0, np.flatnonzero(ends) + 1)


def long_steps(x_px: Positions, y_px: Positions, most_x_px: float, most_y_px: float) -> Flags:
    """Find steps that go too far, across or up and down.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    most_x_px, most_y_px : float
        The most that a step may go, either way.

    Returns
    -------
    (n - 1,) boolean array
        Whether the step to the next fixation goes farther.
    """
    return (np.abs(np.diff(x_px)) > most_x_px) | (np.abs(np.diff(y_px)) > most_y_px)


def runs_to_nearest(y_px: Positions, first: Numbers, passage: Passage) -> Lines:
    """Take each run to the line nearest to the mean of its fixations.

    Parameters
    ----------
    y_px : (n,) float64 array
        The fixations in time order.
    first : (r,) int64 array
        The first fixation of each run.
    passage : Passage
        The text.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.
    """
    sizes = np.diff(np.append(first, y_px.size))
    # From the first line: sums of small numbers do not depend on where the text stands.
    top_px = passage.line_y_px[0]
    mean_px = np.add.reduceat(y_px - top_px, first) / sizes
    return np.repeat(nearest_line(mean_px, passage.line_y_px - top_px), sizes)


@line_method
def chain(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Take runs of near fixations to the line nearest to their mean.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    passage : Passage
        The text.
    settings : MethodSettings
        ``chain``: steps of more than 192 px across or 32 px up or down end a run.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.

    Notes
    -----
    Evens out noise within a run; fails like ``attach`` where a whole run has drifted by more than
    half the distance between lines. O(n + r log m).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``chain``.

    Examples
    --------
    The second fixation alone is nearer to the lower line; the run's mean, 119, is not.

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> x_px, y_px = np.array([50.0, 200.0, 350.0]), np.array([112.0, 135.0, 110.0])
    >>> chain(x_px, y_px, passage, MethodSettings()).tolist()
    [0, 0, 0]
    """
    limits = settings.chain
    first = first_of_runs(long_steps(x_px, y_px, limits.x_px, limits.y_px))
    return runs_to_nearest(y_px, first, passage)
