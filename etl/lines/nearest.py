"""A position to the nearest line, and rows of fixations to lines from the top."""

from __future__ import annotations

import numpy as np

from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.settings import MethodSettings


def nearest_line(y_px: Positions, line_y_px: Positions) -> Lines:
    """Find the line nearest to each position.

    Parameters
    ----------
    y_px : (n,) float64 array
        Positions, y down.
    line_y_px : (m,) float64 array
        The middles of the lines, from the top.

    Returns
    -------
    (n,) int32 array
        The line of each position, from 0; halfway between two lines the upper one.

    Examples
    --------
    >>> nearest_line(np.array([90.0, 130.0, 131.0]), np.array([100.0, 160.0])).tolist()
    [0, 0, 1]
    """
    halfway_px = (line_y_px[1:] + line_y_px[:-1]) / 2
    return np.searchsorted(halfway_px, y_px, side="left").astype(np.int32)


def lines_in_order(y_px: Positions, line_y_px: Positions) -> Lines:
    """Give rows of fixations lines of their own, from the top.

    Parameters
    ----------
    y_px : (k,) float64 array
        The height of each row; at most as many rows as lines.
    line_y_px : (m,) float64 array
        The middles of the lines, from the top.

    Returns
    -------
    (k,) int32 array
        The line of each row, from 0: a lower row has a later line. As many rows as lines have them
        all, in order. Fewer rows leave out those lines with which their distances from their lines
        add up to the least, where the papers, which presume a row for each line, say nothing.

    Notes
    -----
    Dynamic programming over rows, each step over all lines: O(k m).

    Examples
    --------
    Two rows on three lines, of which the second was not read:

    >>> lines_in_order(np.array([230.0, 110.0]), np.array([100.0, 160.0, 220.0])).tolist()
    [2, 0]
    """
    order = np.argsort(y_px, kind="stable")
    rows, spare = y_px.size, line_y_px.size - y_px.size
    line = np.arange(rows)
    if spare:
        # Row r can be on lines r … r + spare: how many lines were left out above it is what varies.
        left_out = line[:, np.newaxis] + np.arange(spare + 1)
        off_px = np.abs(y_px[order][:, np.newaxis] - line_y_px[left_out])
        total_px = np.zeros(spare + 1)
        best = np.zeros((rows, spare + 1), dtype=np.int64)
        for row in range(rows):
            so_far = np.minimum.accumulate(total_px)
            first = np.where(total_px == so_far, np.arange(spare + 1), 0)
            best[row] = np.maximum.accumulate(first)
            total_px = so_far + off_px[row]
        skipped = int(total_px.argmin())
        for row in range(rows - 1, -1, -1):
            line[row] += skipped
            skipped = int(best[row, skipped])
    out = np.empty(rows, dtype=np.int32)
    out[order] = line
    return out


@line_method
def attach(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Take each fixation to the nearest line.

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
        The line of each fixation, from 0; halfway between two lines the upper one.

    Notes
    -----
    Fails wherever drift takes a fixation beyond half the distance between lines. O(n log m).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``attach``.

    Examples
    --------
    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> attach(np.zeros(3), np.array([99.0, 128.0, 135.0]), passage, MethodSettings()).tolist()
    [0, 0, 1]
    """
    del x_px, settings  # all methods are called alike
    return nearest_line(y_px, passage.line_y_px)
