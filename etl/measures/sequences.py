"""What the kernels take in: the fixations of many trials as flat arrays, and their check."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
import numpy.typing as npt

from etl.errors import FaultError


@dataclass(frozen=True, slots=True, eq=False)
class Sequences:
    """All kept fixations of all kept trials, trial after trial, each trial in time order.

    Attributes
    ----------
    trial : (n,) int64 array
        The trial of each fixation, from 0; never goes back. A trial may have no fixation.
    region_order : (n,) int32 array
        The order of the fixated region among the regions of the trial's text, from 1; 0 is outside
        every region.
    duration_ms : (n,) float64 array, milliseconds
        How long each fixation lasted; above 0.
    region_count : (trials,) int32 array
        How many regions the text of each trial has; at least 1.
    """

    trial: npt.NDArray[np.int64]
    region_order: npt.NDArray[np.int32]
    duration_ms: npt.NDArray[np.float64]
    region_count: npt.NDArray[np.int32]


def check_sequences(sequences: Sequences) -> None:
    """Refuse arrays that the kernels would misread; costs a few passes over the arrays.

    Parameters
    ----------
    sequences : Sequences
        What a caller handed in.

    Raises
    ------
    FaultError
        If a shape, a kind of number, a range or the sorting is not as :class:`Sequences` says. The
        caller is at fault, never the study: whoever fills the arrays has checked the input before.

    Examples
    --------
    >>> check_sequences(Sequences(np.array([0, 0]), np.array([1, 3]), np.array([200.0, 180.0]),
    ...                           np.array([2])))
    Traceback (most recent call last):
        ...
    etl.errors.FaultError: sequences.region_order: 3 at fixation 1 lies beyond the 2 regions of \
trial 0
    """
    problems = _wrong_shapes(sequences) or _wrong_values(sequences)
    if problems:
        raise FaultError("\n".join(f"sequences.{problem}" for problem in problems))


def _wrong_shapes(sequences: Sequences) -> list[str]:
    """What is wrong with the shapes and the kinds of number."""
    problems = []
    count = np.size(sequences.trial)
    for field in fields(sequences):
        array: npt.NDArray[Any] = getattr(sequences, field.name)
        kind = "f" if field.name == "duration_ms" else "i"
        if not isinstance(array, np.ndarray) or array.ndim != 1:
            found = (
                f"shape {array.shape}" if isinstance(array, np.ndarray) else type(array).__name__
            )
            problems.append(f"{field.name}: must be an array of one dimension, got {found}")
        elif array.dtype.kind != kind:
            wanted = "floating-point numbers" if kind == "f" else "signed integers"
            problems.append(f"{field.name}: must hold {wanted}, got {array.dtype}")
        elif field.name != "region_count" and array.size != count:
            problems.append(
                f"{field.name}: must hold one value a fixation, got {array.size} for {count}"
            )
    return problems


def _wrong_values(sequences: Sequences) -> list[str]:
    """What is wrong with the values, in arrays of the right shape; the first place of each kind."""
    problems = []
    trial, order = sequences.trial, sequences.region_order
    duration_ms, region_count = sequences.duration_ms, sequences.region_count
    fewest = int(region_count.min(initial=np.iinfo(region_count.dtype).max))
    if fewest < 1:
        at = int(region_count.argmin())
        problems.append(f"region_count: must be at least 1, got {fewest} for trial {at}")
    if trial.size == 0:
        return problems
    back = trial[1:] < trial[:-1]
    if back.any():
        at = int(back.argmax()) + 1
        problems.append(
            f"trial: must not go back, got {trial[at]} after {trial[at - 1]} at fixation {at}"
        )
    lowest, highest = int(trial.min()), int(trial.max())
    if lowest < 0 or highest >= region_count.size:
        found = lowest if lowest < 0 else highest
        problems.append(f"trial: must be from 0 to below {region_count.size}, got {found}")
    elif int(order.max()) > fewest:
        # Only where some order exceeds the smallest text can any lie beyond its own.
        beyond = order > region_count[trial]
        if beyond.any():
            at = int(beyond.argmax())
            problems.append(
                f"region_order: {order[at]} at fixation {at} lies beyond the "
                f"{region_count[trial[at]]} regions of trial {trial[at]}"
            )
    if int(order.min()) < 0:
        at = int(order.argmin())
        problems.append(f"region_order: must not be below 0, got {order[at]} at fixation {at}")
    # Written so that NaN, which compares as false, is caught as well.
    if not (duration_ms.min() > 0 and duration_ms.max() < np.inf):
        at = int((~((duration_ms > 0) & (duration_ms < np.inf))).argmax())
        problems.append(
            f"duration_ms: must be above 0 and finite, got {duration_ms[at]} at fixation {at}"
        )
    return problems
