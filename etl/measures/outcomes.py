"""What the kernels give back: one array of values and one of reasons for every measure."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt


@dataclass(frozen=True, slots=True, eq=False)
class Measured:
    """One measure over all cells (or over all trials). The arrays are read-only.

    Several measures share one array of reasons; copy before changing anything.

    Attributes
    ----------
    values : (cells,) float64 array
        Binary outcomes as 0 and 1, counts, or milliseconds; NaN is a missing value.
    reasons : (cells,) uint8 array
        Why the value is missing, as an index into ``REASONS``; 0 where there is a value.
    """

    values: npt.NDArray[np.float64]
    reasons: npt.NDArray[np.uint8]


@dataclass(frozen=True, slots=True, eq=False)
class RegressiveSaccades:
    """Every saccade to a region of lower order, in time order.

    Attributes
    ----------
    launch, landing : (m,) int64 arrays
        The fixations before and after it, as indices into the fixations handed in, from 0. With
        ``outside="ignore"`` there may be fixations outside every region between them.
    ends_first_pass : (m,) bool array
        Whether it ends the first pass on the region it leaves.
    """

    launch: npt.NDArray[np.int64]
    landing: npt.NDArray[np.int64]
    ends_first_pass: npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Outcomes:
    """Everything that the kernels found out about a batch of trials.

    Attributes
    ----------
    cell_offsets : (trials + 1,) int64 array
        The cell of trial t and region k (from 1) is ``cell_offsets[t] + k - 1``.
    regions : dict of str to Measured
        Every measure of a region, in the order of the catalogue, each over all cells.
    trials : dict of str to Measured
        Every measure of a trial, in the order of the catalogue, each over all trials.
    visit : (n,) int32 array
        For each fixation, which visit to its region it belongs to, from 1; 0 outside.
    first_pass : (n,) bool array
        For each fixation, whether it belongs to its region's first pass.
    regressions : RegressiveSaccades
        The saccades to a lower order.
    """

    cell_offsets: npt.NDArray[np.int64]
    regions: dict[str, Measured]
    trials: dict[str, Measured]
    visit: npt.NDArray[np.int32]
    first_pass: npt.NDArray[np.bool_]
    regressions: RegressiveSaccades
