"""The fixations of readers in the order in which they were made."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class OrderedFixations:
    """All fixations of one or more readers, sorted by trial and time.

    Attributes
    ----------
    rows : (n,) int64 array
        Row of each fixation in the log.
    trial : (n,) int64 array
        Index into the readers' trials; non-decreasing.
    number : (n,) int64 array
        Number of the fixation in its trial, from 1.
    repeated : (n,) bool array
        Whether it belongs to a recording of a trial that is not the one used.
    overlapping : (n,) bool array
        Whether the fixation before it reaches into it by no more than is tolerated.
    moved : (n,) bool array
        Whether another row stood here, where rows did not stand in the order of their numbers.
    gap : (n,) bool array
        Whether a number is left out before it.
    """

    rows: NDArray[np.int64]
    trial: NDArray[np.int64]
    number: NDArray[np.int64]
    repeated: NDArray[np.bool_]
    overlapping: NDArray[np.bool_]
    moved: NDArray[np.bool_]
    gap: NDArray[np.bool_]

    @classmethod
    def joined(cls, parts: Sequence[OrderedFixations], trials: Sequence[int]) -> OrderedFixations:
        """The fixations of several readers, one below the other.

        Parameters
        ----------
        parts : sequence of OrderedFixations
            Of each reader alone; at least one.
        trials : sequence of int
            Where the trials of each begin among those of all.

        Returns
        -------
        OrderedFixations
        """
        starts = np.cumsum([0, *(len(part.rows) for part in parts)])
        return cls(
            np.concatenate([p.rows + start for p, start in zip(parts, starts[:-1], strict=True)]),
            np.concatenate([p.trial + first for p, first in zip(parts, trials, strict=True)]),
            np.concatenate([part.number for part in parts]),
            np.concatenate([part.repeated for part in parts]),
            np.concatenate([part.overlapping for part in parts]),
            np.concatenate([part.moved for part in parts]),
            np.concatenate([part.gap for part in parts]),
        )


def by_log(file: NDArray[np.int32], line: NDArray[np.int32]) -> dict[int, tuple[int, int]]:
    """For each log, how many of some rows are from it, and the first line of these.

    Parameters
    ----------
    file, line : (k,) int32 arrays
        The log of each row, by its place among the study's, and the line in it.

    Returns
    -------
    dict of int to (int, int)
        By log.
    """
    return {
        own: (int((file == own).sum()), int(line[file == own].min()))
        for own in np.unique(file).tolist()
    }
