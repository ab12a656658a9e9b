"""Where each fixation of a reader was: its line and its region."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.regions import Assigned, RegionLibrary
from etl.session.lines import HandLines, LineWork, ReaderLines
from etl.session.ordering import OrderedFixations
from etl.session.reader import Reader


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
    reader: Reader,
    log: CanonicalLog,
    ordered: OrderedFixations,
    using: tuple[RegionLibrary, LineWork | None],
    findings: Findings,
) -> Placed:
    """Tell lines, where the study does, and take every fixation to its region.

    Parameters
    ----------
    reader : Reader
        Trials, and lines set by hand.
    log : CanonicalLog
        The fixations, in time order.
    ordered : OrderedFixations
        Trial and number of each.
    using : tuple
        The texts, and what tells lines; None where nothing does.
    findings : Findings
        Where lines set by hand that fit no fixation, or no line, are recorded.

    Returns
    -------
    Placed
    """
    library, work = using
    text = reader.trials.text.astype(np.int64)[ordered.trial]
    if work is None:
        found = _assigned(library, log, text, None)
        return Placed(found.line, found.order, None)
    told = work.told(reader.trials, log, ordered)
    hand = reader.hand
    if len(hand):
        hand, at = _fixations_meant(reader, ordered, library, findings)
        before = _assigned(library, log, text, told.line).line[at]
        told = work.corrected(told, hand, at, before, ordered.trial)
    found = _assigned(library, log, text, told.line)
    told = work.labelled(told, reader.trials, log, ordered, found.line)
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
    rows = np.flatnonzero(text >= 0)
    found: Assigned
    if library.labels is not None and log.label is not None:
        found = library.assign_labels(text[rows], log.label.codes[rows], log.label.values)
    else:
        known = None if told is None else told[rows]
        found = library.assign_points(text[rows], log.x_px[rows], log.y_px[rows], known)
    line[rows], order[rows] = found.line, found.order
    return Assigned(order, line)


def _fixations_meant(
    reader: Reader, ordered: OrderedFixations, library: RegionLibrary, findings: Findings
) -> tuple[HandLines, NDArray[np.int64]]:
    """The corrections that can be made, and the fixation of each."""
    hand, geometry = reader.hand, library.geometry
    assert geometry is not None  # noqa: S101 - a study with lines has places
    first = np.searchsorted(ordered.trial, hand.trial)
    count = np.searchsorted(ordered.trial, hand.trial, side="right") - first
    text = reader.trials.text[hand.trial]
    sound = np.ones(len(hand), dtype=bool)
    for row in range(len(hand)):
        number, line = int(hand.fixation[row]), int(hand.line[row])
        numbers: list[int] = []
        if text[row] >= 0:
            own = slice(*geometry.line_offsets[text[row] : text[row] + 2].tolist())
            numbers = geometry.line_numbers[own].tolist()
        if number > count[row]:
            sound[row] = False
            findings.error(
                "the trial has no fixation of this number",
                path=reader.corrections,
                line=int(hand.source_line[row]),
                found=f"reader {reader.participant}, fixation {number}",
                expected=f"a number from 1 to {count[row]}, as in the table fixations",
                fix="correct the row, or remove it",
            )
        elif text[row] >= 0 and line and line not in numbers:
            sound[row] = False
            item = library.texts[int(text[row])]
            findings.error(
                "the text has no line of this number",
                path=reader.corrections,
                line=int(hand.source_line[row]),
                found=str(line),
                expected=f"{_listed(numbers)}, or 0 for no line; the text is defined in "
                f"{item.path}:{item.line}",
                fix="correct the row, or remove it",
            )
        # A trial that is no part of the study has no lines, which was told with the table.
        sound[row] &= bool(text[row] >= 0)
    kept = HandLines(
        hand.trial[sound], hand.fixation[sound], hand.line[sound], hand.source_line[sound]
    )
    return kept, (first + hand.fixation - 1)[sound].astype(np.int64)


def _listed(numbers: list[int]) -> str:
    """Numbers of lines in words: a range where none is left out."""
    if numbers == list(range(1, len(numbers) + 1)):
        return f"a line from 1 to {numbers[-1]}"
    return "one of the lines " + ", ".join(map(str, numbers))
