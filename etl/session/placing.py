"""Where each fixation was: its line and its region."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.regions import Assigned, RegionLibrary
from etl.session.lines import LineWork, ReaderLines
from etl.session.ordered import OrderedFixations
from etl.session.reader import ReaderGroup


@dataclass(frozen=True, slots=True, eq=False)
class Placed:
    """Where fixations were, in time order.

    Attributes
    ----------
    line : (n,) int32 array
        Line of the text, from 1; 0 on none.
    order : (n,) int32 array
        Order of the region, from 1; 0 outside.
    lines : ReaderLines or None
        How the lines were told; None where texts have no lines to tell apart.
    """

    line: NDArray[np.int32]
    order: NDArray[np.int32]
    lines: ReaderLines | None


def place_fixations(
    group: ReaderGroup,
    log: CanonicalLog,
    ordered: OrderedFixations,
    using: tuple[RegionLibrary, LineWork | None],
) -> Placed:
    """Tell lines, where the study does, and take every fixation to its region.

    Parameters
    ----------
    group : ReaderGroup
        Trials, and lines set by hand, all of which fit.
    log : CanonicalLog
        The fixations, in time order.
    ordered : OrderedFixations
        Trial and number of each.
    using : tuple
        The texts, and what tells lines; None where nothing does.

    Returns
    -------
    Placed
    """
    library, work = using
    text = group.trials.text.astype(np.int64)[ordered.trial]
    if work is None:
        found = _assigned(library, log, text, None)
        return Placed(found.line, found.order, None)
    told = work.told(group.trials, log, ordered)
    # A trial that is no part of the study has no lines, which was told with the table.
    hand = group.hand.take(group.trials.text[group.hand.trial] >= 0)
    if len(hand):
        at = np.searchsorted(ordered.trial, hand.trial) + hand.fixation - 1
        before = _assigned(library, log, text, told.line).line[at]
        told = work.corrected(told, hand, at, before, ordered.trial)
    found = _assigned(library, log, text, told.line)
    told = work.labelled(told, group.trials, log, ordered, found.line)
    return Placed(found.line, found.order, told)


def _assigned(
    library: RegionLibrary,
    log: CanonicalLog,
    text: NDArray[np.int64],
    told: NDArray[np.int32] | None,
) -> Assigned:
    """Line and region order of every fixation; 0 where there is none."""
    line = np.zeros(len(text), dtype=np.int32)
    order = np.zeros(len(text), dtype=np.int32)
    read = text >= 0
    # Mostly every trial is part of the study, and nothing need be picked out and put back.
    rows = slice(None) if read.all() else np.flatnonzero(read)
    found: Assigned
    if library.labels is not None and log.label is not None:
        found = library.assign_labels(text[rows], log.label.codes[rows], log.label.values)
    else:
        known = None if told is None else told[rows]
        found = library.assign_points(text[rows], log.x_px[rows], log.y_px[rows], known)
    line[rows], order[rows] = found.line, found.order
    return Assigned(order, line)


def refuse_hand_lines(
    group: ReaderGroup,
    ordered: OrderedFixations,
    library: RegionLibrary,
    told: Mapping[str, Findings],
) -> None:
    """Record lines set by hand that fit no fixation, or no line of the text.

    Parameters
    ----------
    group : ReaderGroup
        Readers, trials and lines set by hand.
    ordered : OrderedFixations
        Trial and number of each fixation.
    library : RegionLibrary
        The texts.
    told : mapping of str to Findings
        For each reader, where errors are recorded.
    """
    hand, geometry = group.hand, library.geometry
    if not len(hand):
        return
    assert geometry is not None  # noqa: S101 - a study with lines has places
    first = np.searchsorted(ordered.trial, hand.trial)
    count = np.searchsorted(ordered.trial, hand.trial, side="right") - first
    text = group.trials.text[hand.trial]
    readers = group.reader_of_trial[hand.trial].tolist()
    for row, reader in enumerate(readers):
        participant = group.participants[reader]
        number, line = int(hand.fixation[row]), int(hand.line[row])
        numbers: list[int] = []
        if text[row] >= 0:
            own = slice(*geometry.line_offsets[text[row] : text[row] + 2].tolist())
            numbers = geometry.line_numbers[own].tolist()
        if number > count[row]:
            told[participant].error(
                "the trial has no fixation of this number",
                path=group.corrections,
                line=int(hand.source_line[row]),
                found=f"reader {participant}, fixation {number}",
                expected=f"a number from 1 to {count[row]}, as in the table fixations",
                fix="correct the row, or remove it",
            )
        elif text[row] >= 0 and line and line not in numbers:
            item = library.texts[int(text[row])]
            told[participant].error(
                "the text has no line of this number",
                path=group.corrections,
                line=int(hand.source_line[row]),
                found=str(line),
                expected=f"{_listed(numbers)}, or 0 for no line; the text is defined in "
                f"{item.path}:{item.line}",
                fix="correct the row, or remove it",
            )


def _listed(numbers: list[int]) -> str:
    """Numbers of lines in words: a range where none is left out."""
    if numbers == list(range(1, len(numbers) + 1)):
        return f"a line from 1 to {numbers[-1]}"
    return "one of the lines " + ", ".join(map(str, numbers))
