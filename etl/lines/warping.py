"""Fixations and words held against each other as two sequences, one warped to fit the other."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.settings import MethodSettings


def warping_path(distances: NDArray[np.float64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Find the way through two sequences, from both beginnings to both ends, of the least length.

    Parameters
    ----------
    distances : (n, w) float64 array
        How far each member of one sequence is from each of the other; at least one of each.

    Returns
    -------
    first, second : (p,) int64 arrays
        The pairs on the way, in order: from each to the next, one sequence or both go on by one.
        The distances of all pairs add up to the least; of equally long ways that which goes on in
        both, then in the first, as seen from the end.

    Notes
    -----
    Dynamic time warping. The cells that are equally far from the beginning are computed together:
    n + w steps, each of whole arrays; O(n w).

    References
    ----------
    Sakoe & Chiba (1978). IEEE Transactions on Acoustics, Speech, and Signal Processing, 26(1),
    43-49. doi:10.1109/TASSP.1978.1163055 (cited from memory).

    Examples
    --------
    >>> first, second = warping_path(np.abs(np.array([[1.0], [2.0], [9.0]]) - [1.0, 9.0]))
    >>> list(zip(first.tolist(), second.tolist()))
    [(0, 0), (1, 0), (2, 1)]
    """
    n, w = distances.shape
    padded = np.full((n + 1, w + 1), np.inf)
    padded[1:, 1:] = distances
    cost = padded.ravel()
    table = np.full((n + 1, w + 1), np.inf)
    total = table.ravel()
    total[0] = 0.0
    # Cell (i, j) of the table is number i (w + 1) + j; where i + j = d that is i w + d.
    for d in range(2, n + w + 1):
        low, stop = max(1, d - w), min(n, d - 1) + 1
        here = total[low * w + d : stop * w + d : w]
        above = total[(low - 1) * w + d - 1 : (stop - 1) * w + d - 1 : w]
        left = total[low * w + d - 1 : stop * w + d - 1 : w]
        aslant = total[(low - 1) * w + d - 2 : (stop - 1) * w + d - 2 : w]
        np.minimum(above, left, out=here)
        np.minimum(here, aslant, out=here)
        here += cost[low * w + d : stop * w + d : w]
    return _traced_back(table)


def _traced_back(table: NDArray[np.float64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """The way that led to the last cell of the table."""
    i, j = table.shape[0] - 1, table.shape[1] - 1
    pairs = []
    while i and j:
        pairs.append((i - 1, j - 1))
        aslant, above, left = table[i - 1, j - 1], table[i - 1, j], table[i, j - 1]
        if aslant <= above and aslant <= left:
            i, j = i - 1, j - 1
        elif above <= left:
            i -= 1
        else:
            j -= 1
    first, second = np.array(pairs[::-1], dtype=np.int64).T
    return first, second


@line_method
def warp(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
    """Hold fixations against the words in reading order, and take each to the line of its words.

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
        The line of most of the words that a fixation is paired with, from 0; of equally many the
        upper one.

    Notes
    -----
    Each fixation is paired with one or more words and each word with one or more fixations, both in
    order, so that the distances between them add up to the least: dynamic time warping. Hardly any
    drift can mislead it, as return sweeps bind lines together; since the order of words is the only
    one it knows, fixations that return to an earlier line stay on the later one. O(n w).

    References
    ----------
    Carr et al. (2022), doi:10.3758/s13428-021-01554-0, ``warp``.

    Examples
    --------
    All fixations are nearest to the second line, but the eyes return to where lines begin once.

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 250.0, 50.0, 250.0]),
    ...                   np.array([0, 0, 1, 1], np.int32), 60.0, 400.0)
    >>> warp(np.array([50.0, 250.0, 50.0, 250.0]), np.array([140.0, 140.0, 200.0, 200.0]),
    ...      passage, MethodSettings()).tolist()
    [0, 0, 1, 1]
    """
    del settings  # all methods are called alike
    across, down = (
        of[:, np.newaxis] - words
        for of, words in ((x_px, passage.word_x_px), (y_px, passage.word_y_px))
    )
    fixation, word = warping_path(np.hypot(across, down))
    lines = passage.line_y_px.size
    votes = np.bincount(fixation * lines + passage.word_line[word], minlength=x_px.size * lines)
    most: Lines = votes.reshape(-1, lines).argmax(axis=1).astype(np.int32)
    return most
