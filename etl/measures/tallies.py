"""Plain sums over each region, before it is asked whether the reader had a chance at all.

Durations are added one by one in time order (``np.bincount``), never pairwise. Each sum in the
chain first pass <= right-bounded <= go-past, and right-bounded <= total, then adds what the one
before it adds, in the same order, and more in between; rounding a sum never turns an order around,
so the chain holds to the last bit for durations with fractions too.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from etl.measures.passes import Passes


@dataclass(frozen=True, slots=True, eq=False)
class Tally:
    """Sums over each cell (a region of a trial); 0 where there is nothing to add.

    Attributes
    ----------
    cell_offsets : (trials + 1,) int64 array
        The first cell of each trial, and the number of all cells.
    furthest : (trials,) int64 array
        The furthest cell of each trial; one below its first cell where no region was fixated.
    has_first_pass, first_pass_regression_out : (cells,) bool array
        Whether the region has a first pass, and whether a regressive saccade ends it.
    fixations, visits, regressions_out, regressions_in, first_pass_fixations : (cells,) int64 array
        Counts.
    first_fixation_ms, first_pass_ms, right_bounded_ms, go_past_ms, total_ms : (cells,) float64
        Durations in milliseconds.
    """

    cell_offsets: npt.NDArray[np.int64]
    furthest: npt.NDArray[np.int64]
    has_first_pass: npt.NDArray[np.bool_]
    first_pass_regression_out: npt.NDArray[np.bool_]
    fixations: npt.NDArray[np.int64]
    visits: npt.NDArray[np.int64]
    regressions_out: npt.NDArray[np.int64]
    regressions_in: npt.NDArray[np.int64]
    first_pass_fixations: npt.NDArray[np.int64]
    first_fixation_ms: npt.NDArray[np.float64]
    first_pass_ms: npt.NDArray[np.float64]
    right_bounded_ms: npt.NDArray[np.float64]
    go_past_ms: npt.NDArray[np.float64]
    total_ms: npt.NDArray[np.float64]

    def by_trial(self, by_cell: npt.NDArray[Any]) -> npt.NDArray[np.int64]:
        """Add up a count, or how often something holds, over the regions of each trial.

        Parameters
        ----------
        by_cell : (cells,) int64 or bool array
            What to add up.

        Returns
        -------
        (trials,) int64 array
            The sums; every trial has at least one region.
        """
        return _add_by_trial(by_cell, self.cell_offsets)


def take_tally(passes: Passes, cell_offsets: npt.NDArray[np.int64]) -> Tally:
    """Add up fixations, visits, saccades and durations over each cell.

    Parameters
    ----------
    passes : Passes
        The visits and first passes of all trials.
    cell_offsets : (trials + 1,) int64 array
        The first cell of each trial, and the number of all cells.

    Returns
    -------
    Tally
        The sums.
    """
    cells = int(cell_offsets[-1])
    cell, duration_ms = passes.cell, passes.duration_ms
    first = passes.visit_is_first_pass
    # A region has at most one first pass, so plain assignment reaches every cell once at most.
    entered = passes.visit_cell[first]
    has_first_pass = np.zeros(cells, np.bool_)
    has_first_pass[entered] = True
    first_pass_fixations = np.zeros(cells, np.int64)
    first_pass_fixations[entered] = passes.visit_length[first]
    first_fixation_ms = np.zeros(cells)
    first_fixation_ms[entered] = duration_ms[passes.visit_start[first]]
    launching = passes.landing_visit - 1
    left = passes.visit_cell[launching]
    first_pass_regression_out = np.zeros(cells, np.bool_)
    first_pass_regression_out[left[first[launching]]] = True
    fixations = np.bincount(cell, minlength=cells)
    return Tally(
        cell_offsets=cell_offsets,
        furthest=_furthest_cells(passes, fixations, cell_offsets),
        has_first_pass=has_first_pass,
        first_pass_regression_out=first_pass_regression_out,
        fixations=fixations,
        visits=np.bincount(passes.visit_cell, minlength=cells),
        regressions_out=np.bincount(left, minlength=cells),
        regressions_in=np.bincount(passes.visit_cell[passes.landing_visit], minlength=cells),
        first_pass_fixations=first_pass_fixations,
        first_fixation_ms=first_fixation_ms,
        first_pass_ms=add_up(cell, duration_ms * passes.first_pass, cells),
        # A region is the furthest so far from its first pass until the eyes go past it.
        right_bounded_ms=add_up(cell, duration_ms * (cell == passes.furthest), cells),
        go_past_ms=add_up(passes.furthest, duration_ms, cells),
        total_ms=add_up(cell, duration_ms, cells),
    )


def add_up(
    place: npt.NDArray[np.int64], duration_ms: npt.NDArray[np.float64], places: int
) -> npt.NDArray[np.float64]:
    """Add up durations by place, one by one in the order given.

    Parameters
    ----------
    place : (m,) int64 array
        Where each duration belongs, from 0.
    duration_ms : (m,) float64 array, milliseconds
        The durations.
    places : int
        How many places there are.

    Returns
    -------
    (places,) float64 array, milliseconds
        The sums; 0 where nothing belongs.

    Examples
    --------
    >>> add_up(np.array([0, 2, 0]), np.array([200.0, 180.0, 50.0]), 3).tolist()
    [250.0, 0.0, 180.0]
    """
    # Of nothing at all, bincount makes integers.
    return np.bincount(place, duration_ms, places).astype(np.float64, copy=False)


def _furthest_cells(
    passes: Passes, fixations: npt.NDArray[np.int64], cell_offsets: npt.NDArray[np.int64]
) -> npt.NDArray[np.int64]:
    """The furthest cell of each trial; one below its first cell where no region was fixated."""
    furthest = cell_offsets[:-1] - 1
    last = np.cumsum(_add_by_trial(fixations, cell_offsets)) - 1
    seen = last >= 0
    # A trial without a fixation finds the last one of an earlier trial, which lies below its cells.
    furthest[seen] = np.maximum(furthest[seen], passes.furthest[last[seen]])
    return furthest


def _add_by_trial(
    by_cell: npt.NDArray[Any], cell_offsets: npt.NDArray[np.int64]
) -> npt.NDArray[np.int64]:
    """The sums of a count over the cells of each trial."""
    sums: npt.NDArray[np.int64] = np.add.reduceat(by_cell, cell_offsets[:-1], dtype=np.int64)
    return sums
