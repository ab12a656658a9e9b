"""Visits, first passes and saccades of many trials at once.

Two facts carry everything here, so that no loop over trials or regions is needed:

* Regions are numbered through over all trials (*cells*: trial after trial, region after region).
  Every cell of a later trial is higher than every cell of an earlier one, so a plain running
  maximum over all fixations is the furthest region so far *of the own trial*, and a step to a lower
  cell never crosses from one trial into the next.
* The first pass on region k starts at the fixation on k before which nothing as far as k was
  fixated: it sets a new record. The eyes go past k at the first later fixation on a higher region:
  the next record of the trial. So k's way up to going past is the stretch between two records,
  during which k itself is the furthest region so far.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from etl.measures.sequences import Sequences


@dataclass(frozen=True, slots=True, eq=False)
class Passes:
    """How the eyes moved through the regions; ``m`` fixations inside regions, ``v`` visits.

    Attributes
    ----------
    inside : (m,) int64 array
        The fixations inside regions, as indices into all fixations.
    trial : (m,) int64 array
        Their trials.
    duration_ms : (m,) float64 array, milliseconds
        Their durations.
    cell : (m,) int64 array
        Their regions, numbered through over all trials.
    furthest : (m,) int64 array
        The furthest cell of the trial so far, this fixation included.
    first_pass : (m,) bool array
        Whether each belongs to its region's first pass.
    visit_start : (v,) int64 array
        The fixation that starts each visit, as an index into the ``m``.
    visit_length : (v,) int64 array
        How many fixations each visit has.
    visit_cell : (v,) int64 array
        The visited cell.
    visit_is_first_pass : (v,) bool array
        Whether the visit is the first pass on its region.
    landing_visit : (r,) int64 array
        The visits that a saccade to a lower order starts.
    progression_trial : (p,) int64 array
        The trial of every saccade to a higher order.
    """

    inside: npt.NDArray[np.int64]
    trial: npt.NDArray[np.int64]
    duration_ms: npt.NDArray[np.float64]
    cell: npt.NDArray[np.int64]
    furthest: npt.NDArray[np.int64]
    first_pass: npt.NDArray[np.bool_]
    visit_start: npt.NDArray[np.int64]
    visit_length: npt.NDArray[np.int64]
    visit_cell: npt.NDArray[np.int64]
    visit_is_first_pass: npt.NDArray[np.bool_]
    landing_visit: npt.NDArray[np.int64]
    progression_trial: npt.NDArray[np.int64]


def find_passes(
    sequences: Sequences, cell_offsets: npt.NDArray[np.int64], *, interrupt: bool
) -> Passes:
    """Find the visits, the first passes and the saccades between regions.

    Parameters
    ----------
    sequences : Sequences
        The fixations, already checked.
    cell_offsets : (trials + 1,) int64 array
        The first cell of each trial, and the number of all cells.
    interrupt : bool
        Whether a fixation outside every region ends the visit in progress and breaks the step
        across it. Otherwise fixations outside are as good as absent.

    Returns
    -------
    Passes
        In time order throughout.

    Examples
    --------
    Regions 1, 2, 1, 3 of a text of three: region 1 is visited twice, its second visit is no first
    pass, and one saccade goes back.

    >>> passes = find_passes(
    ...     Sequences(np.zeros(4, np.int64), np.array([1, 2, 1, 3], np.int32),
    ...               np.array([200.0, 180.0, 210.0, 250.0]), np.array([3], np.int32)),
    ...     np.array([0, 3]), interrupt=False)
    >>> passes.furthest.tolist(), passes.first_pass.tolist(), passes.landing_visit.tolist()
    ([0, 1, 1, 2], [True, True, False, True], [2])
    """
    trial = sequences.trial.astype(np.int64, copy=False)
    order = sequences.region_order
    duration_ms = sequences.duration_ms.astype(np.float64, copy=False)
    inside = np.flatnonzero(order)
    whole = inside.size == order.size
    if not whole:
        trial, order, duration_ms = trial[inside], order[inside], duration_ms[inside]
    cell = cell_offsets[trial]
    cell += order
    cell -= 1
    furthest = np.maximum.accumulate(cell)

    starts = np.ones(cell.size, np.bool_)
    np.not_equal(cell[1:], cell[:-1], out=starts[1:])
    if interrupt and not whole:
        starts[1:] |= np.diff(inside) > 1
    visit_start = np.flatnonzero(starts)
    visit_cell = cell[visit_start]
    visit_length = np.diff(visit_start, append=cell.size)
    # A record is a fixation on a cell above the furthest before it; each one starts a visit.
    visit_furthest = furthest[visit_start]
    visit_is_first_pass = np.ones(visit_cell.size, np.bool_)
    np.greater(visit_furthest[1:], visit_furthest[:-1], out=visit_is_first_pass[1:])

    visit_trial = trial[visit_start]
    back = visit_cell[1:] < visit_cell[:-1]
    onward = (visit_cell[1:] > visit_cell[:-1]) & (visit_trial[1:] == visit_trial[:-1])
    if interrupt and not whole:
        unbroken = inside[visit_start[1:]] - inside[visit_start[1:] - 1] == 1
        back &= unbroken
        onward &= unbroken
    return Passes(
        inside=inside,
        trial=trial,
        duration_ms=duration_ms,
        cell=cell,
        furthest=furthest,
        first_pass=np.repeat(visit_is_first_pass, visit_length),
        visit_start=visit_start,
        visit_length=visit_length,
        visit_cell=visit_cell,
        visit_is_first_pass=visit_is_first_pass,
        landing_visit=np.flatnonzero(back) + 1,
        progression_trial=visit_trial[1:][onward],
    )


def number_visits(passes: Passes, has_first_pass: npt.NDArray[np.bool_]) -> npt.NDArray[np.int32]:
    """Number the visits to each region in time order.

    A first pass is always visit 1, so only the other visits have to be sorted by region.

    Parameters
    ----------
    passes : Passes
        The visits.
    has_first_pass : (cells,) bool array
        Whether each region has a first pass.

    Returns
    -------
    (v,) int32 array
        The number of each visit among the visits to its region, from 1.
    """
    number = np.ones(passes.visit_cell.size, np.int32)
    later = np.flatnonzero(~passes.visit_is_first_pass)
    by_cell = np.argsort(passes.visit_cell[later], kind="stable")
    later = later[by_cell]
    cell = passes.visit_cell[later]
    place = np.arange(cell.size, dtype=np.int64)
    group_start = np.zeros(cell.size, np.int64)
    np.multiply(place[1:], cell[1:] != cell[:-1], out=group_start[1:])
    np.maximum.accumulate(group_start, out=group_start)
    number[later] += (place - group_start).astype(np.int32)
    number[later] += has_first_pass[cell]
    return number
