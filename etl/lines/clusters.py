"""The best division of numbers into clusters, and fixations clustered by their height."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from etl.lines.nearest import lines_in_order
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.settings import MethodSettings

#: How many values are taken together: memory is this times the number of values, whatever that is.
_BLOCK = 256


def exact_clusters(values: Positions, count: int) -> Lines:
    """Divide numbers into clusters so that squared distances from cluster means are least.

    Parameters
    ----------
    values : (n,) float64 array
        The numbers, at least one.
    count : int
        How many clusters, at least 1. There are fewer where there are fewer different numbers.

    Returns
    -------
    (n,) int32 array
        The cluster of each number, from 0, from the lowest numbers to the highest. Equal numbers
        are in one cluster.

    Notes
    -----
    In one dimension the best clusters are stretches of the sorted numbers, so that dynamic
    programming finds the least sum of squares of all divisions. k-means with restarts, which the
    papers use, looks for the same one and finds it or not, depending on where it starts; here
    nothing is drawn. O(n² k) operations in whole arrays, O(n) memory for a given number of
    clusters.

    References
    ----------
    The dynamic program: Wang & Song (2011). Ckmeans.1d.dp. The R Journal, 3(2), 29-33.
    doi:10.32614/RJ-2011-015 (cited from memory).

    Examples
    --------
    >>> exact_clusters(np.array([12.0, 1.0, 2.0, 11.0, 30.0]), 3).tolist()
    [1, 0, 0, 1, 2]
    """
    distinct, which, times = np.unique(values, return_inverse=True, return_counts=True)
    count = min(count, distinct.size)
    # From the mean: differences of sums of squares of numbers far from 0 would lose digits.
    from_mean = distinct - np.average(distinct, weights=times)
    begins = _cluster_begins(from_mean, times.astype(np.float64), count)
    return (np.searchsorted(begins, which, side="right") - 1).astype(np.int32)


def _cluster_begins(values: Positions, weights: Positions, count: int) -> NDArray[np.int64]:
    """The first of the sorted values in each cluster of the best division."""
    size = values.size
    weight, total, square = (
        np.concatenate([[0.0], np.cumsum(weights * values**power)]) for power in (0, 1, 2)
    )
    # least[k, j]: the least sum of squares of the first j values in k + 1 clusters; the last of
    # these begins with value begin[k, j].
    least = np.full((count, size + 1), np.inf)
    begin = np.zeros((count, size + 1), dtype=np.int64)
    for start in range(1, size + 1, _BLOCK):
        stop = min(start + _BLOCK, size + 1)
        block = np.arange(start, stop)[:, np.newaxis]
        before = np.arange(stop - 1)
        within = np.full((stop - start, stop - 1), np.inf)
        at, since = np.nonzero(before < block)
        until = at + start
        sums = total[until] - total[since]
        spread = square[until] - square[since] - sums**2 / (weight[until] - weight[since])
        within[at, since] = np.maximum(spread, 0.0)
        least[0, start:stop] = within[:, 0]
        for cluster_number in range(1, count):
            tried = within + least[cluster_number - 1, : stop - 1]
            best = tried.argmin(axis=1)
            begin[cluster_number, start:stop] = best
            least[cluster_number, start:stop] = tried[np.arange(stop - start), best]
    begins = np.zeros(count, dtype=np.int64)
    end = size
    for cluster_number in range(count - 1, 0, -1):
        end = begins[cluster_number] = begin[cluster_number, end]
    return begins


@line_method
def cluster(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Cluster fixations by their height, as many clusters as lines.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order; x is not looked at.
    passage : Passage
        The text.
    settings : MethodSettings
        Nothing of them is used.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0: the highest cluster is on the first line, and so on. With
        fewer different heights than lines see :func:`etl.lines.nearest.lines_in_order`.

    Notes
    -----
    Does not look at where lines are, so that an offset or a stretch of all fixations does no harm;
    fails where noise or slope blurs neighbouring lines, and where a line was hardly read.
    The clusters are the best there are, see :func:`exact_clusters`; O(n² m).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``cluster``.

    Examples
    --------
    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> cluster(np.zeros(4), np.array([140.0, 144.0, 201.0, 205.0]), passage,
    ...         MethodSettings()).tolist()
    [0, 0, 1, 1]
    """
    del x_px, settings  # all methods are called alike
    top_px = passage.line_y_px[0]
    own = exact_clusters(y_px - top_px, passage.line_y_px.size)
    mean_px = np.bincount(own, y_px - top_px) / np.bincount(own)
    return lines_in_order(mean_px, passage.line_y_px - top_px)[own]
