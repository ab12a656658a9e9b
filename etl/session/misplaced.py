"""Logs whose fixations miss the regions that those of the other logs hit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.session.far_off import FEWEST_PLACED, medians_of_others
from etl.session.reader import ReaderGroup

#: A log that has at least this share of its fixations outside every region, while the other logs
#: have less than that one in the middle, was recorded in other coordinates (our choice: a text that
#: is all regions leaves a few in a hundred outside, and a badly calibrated reader some tens).
NEARLY_ALL, OF_OTHERS = 0.9, 0.5
#: A log with fewer positions than this says too little even where all of them are outside (our
#: choice).
_FEWEST_OF_ALL = 5


def outside_by_log(
    group: ReaderGroup,
    trial: NDArray[np.int64],
    file: NDArray[np.int32],
    places: tuple[NDArray[np.int32], NDArray[np.bool_]],
) -> list[dict[int, tuple[int, int]]]:
    """For each log, how many fixations have a position, and how many of these are in no region.

    What the experimenter has a note on is known to be odd already.

    Parameters
    ----------
    group : ReaderGroup
        Fixations and trials of some readers.
    trial : (n,) int64 array
        Index of each fixation's trial.
    file : (n,) int32 array
        The log of each, by its place among the study's.
    places : tuple of (n,) int32 array and (n,) bool array
        The order of each fixation's region, 0 outside; and whether it says where it is.

    Returns
    -------
    list of dict of int to (int, int)
        For each reader, by log; nothing for one on whom there is a note.
    """
    order, placed = places
    judged = (group.trials.text >= 0) & np.array([not note for note in group.trials.notes])
    counted = placed & judged[trial]
    found: list[dict[int, tuple[int, int]]] = [{} for _ in group.participants]
    if not len(file):
        return found
    # A reader's rows are mostly of one log, so that there are few stretches to be added up.
    reader = group.reader_of_row
    starts = np.flatnonzero(
        np.concatenate([[True], (reader[1:] != reader[:-1]) | (file[1:] != file[:-1])])
    )
    every = np.add.reduceat(counted, starts, dtype=np.int64)
    outside = np.add.reduceat(counted & (order == 0), starts, dtype=np.int64)
    for own, log, some, beside in zip(
        *(reader[starts].tolist(), file[starts].tolist(), every.tolist(), outside.tolist()),
        strict=True,
    ):
        if not group.notes[own]:
            known = found[own].get(log, (0, 0))
            found[own][log] = (known[0] + some, known[1] + beside)
    return [dict(sorted(own.items())) for own in found]


def refuse_misplaced(
    outside: Mapping[int, tuple[int, int]], logs: Sequence[str], findings: Findings
) -> None:
    """Record an error for each log that lies beside the regions, where most others do not.

    Parameters
    ----------
    outside : mapping of int to (int, int)
        For each log, by its place: how many fixations have a position, and how many of these lie
        outside every region.
    logs : sequence of str
        The names of the logs.
    findings : Findings
        Where errors are recorded.
    """
    shares = {
        file: beside / placed
        for file, (placed, beside) in sorted(outside.items())
        if placed >= FEWEST_PLACED or (placed == beside and placed >= _FEWEST_OF_ALL)
    }
    if len(shares) < 2:
        return
    others = medians_of_others(list(shares.values())).tolist()
    for (file, share), other in zip(shares.items(), others, strict=True):
        if share >= NEARLY_ALL and other < OF_OTHERS:
            placed, beside = outside[file]
            findings.error(
                "nearly all fixations lie outside every region, unlike those of the other logs",
                path=logs[file],
                found=f"{beside:,} of {placed:,}",
                expected=f"about {other:.0%} of them, as in the other logs",
                fix="x and y may be swapped, or in another unit or from another origin than in the "
                "other logs: export the log again; if the recording is lost, leave the reader out "
                "by a note ([screening.participants] notes)",
            )
