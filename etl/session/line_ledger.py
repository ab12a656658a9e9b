"""What the ledger says of lines: fixations that belong to none, and lines set by hand.

Neither leaves a fixation out: the accounts are charged with nothing.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from typing import Final

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from etl.errors import FaultError, Findings
from etl.lines.consensus import REASONS
from etl.screening.entries import Entry, Screened, in_order
from etl.session.lines import ReaderLines
from etl.study import Study
from etl.tables import LINE_RULES

NO_LINE, CORRECTED = LINE_RULES
OUTSIDE: Final = "counted as outside"

#: The counts in the run record.
ON_NONE, BY_HAND = "fixations on no line", "lines set by hand"
JUDGED, SURE = "trials whose lines are judged", "trials sure of their lines"
#: More than this share of unsure trials is worth a warning (our choice: the methods were calibrated
#: to be sure of most trials of usual recordings).
MOST_UNSURE: Final = 0.2


def with_lines(entries: list[Entry], screened: Screened, lines: ReaderLines | None) -> list[Entry]:
    """The ledger with what became of fixations by their lines, in its order.

    Parameters
    ----------
    entries : list of Entry
        The rows so far, in order.
    screened : Screened
        What screening found out.
    lines : ReaderLines or None
        How lines were told; None adds nothing.

    Returns
    -------
    list of Entry
        A row for each fixation that is counted as outside since it belongs to no line, and for each
        line set by hand. Before other rows about the same fixation: the line comes first.
    """
    if lines is None:
        return entries
    added = [
        _entry(screened, row, NO_LINE, _why_on_none(lines, row), OUTSIDE)
        for row in np.flatnonzero(_on_none(screened, lines)).tolist()
    ]
    added += [
        _entry(
            screened,
            row,
            CORRECTED,
            _spelled(int(lines.before[row])),
            f"line set to {int(lines.line[row]) or 'none'}",
        )
        for row in np.flatnonzero(lines.by_hand).tolist()
    ]
    if not added:
        return entries
    added.sort(key=lambda entry: entry.row)
    # What is equal keeps its order.
    return in_order([*added, *entries])


def _entry(screened: Screened, row: int, rule: str, observed: str, action: str) -> Entry:
    """A row about one fixation."""
    trial, number = int(screened.recorded.trial[row]), int(screened.number[row])
    reader = int(screened.reader[trial])
    return Entry("fixation", trial, -1, number, rule, "", observed, action, "", row, reader)


def _on_none(screened: Screened, lines: ReaderLines) -> NDArray[np.bool_]:
    """Fixations that a method puts on no line and that no rule for fixations leaves out."""
    none = (lines.line == 0) & ~lines.by_hand
    return np.asarray(none & (screened.fixations.left_out < 0))


def _why_on_none(lines: ReaderLines, row: int) -> str:
    """Why a fixation belongs to no line, and how sure that is."""
    reason = REASONS[int(lines.reason[row])]
    return f"{reason}, confidence {lines.confidence[row]:.3f}"


def _spelled(line: int) -> str:
    """A line, as the ledger shows what was there before."""
    return f"line {line}" if line else "no line"


def check_lines(
    entries: Sequence[Entry],
    screened: Screened,
    lines: ReaderLines | None,
    fixations: pa.RecordBatch,
) -> None:
    """See that ledger and table say the same of the lines of each reader.

    Parameters
    ----------
    entries : sequence of Entry
        The rows of the ledger.
    screened : Screened
        What screening found out.
    lines : ReaderLines or None
        How lines were told.
    fixations : pa.RecordBatch
        The rows of ``fixations``.

    Raises
    ------
    FaultError
        If a fixation on no line has a region, or the ledger leaves one out, or has one too many.
        Nothing is published then.
    """
    if lines is None:
        return
    in_table = pc.and_(pc.is_null(fixations.column("line")), pc.is_null(fixations.column("region")))
    on_none = _on_none(screened, lines)
    if (
        not in_table.filter(pa.array(on_none | (lines.line == 0)))
        .to_numpy(zero_copy_only=False)
        .all()
    ):
        raise FaultError("a fixation that belongs to no line has a line or a region in the tables")
    told = _told(entries)
    reader, readers = screened.reader[screened.recorded.trial], len(screened.readers.left_out)
    for rule, which in ((NO_LINE, on_none), (CORRECTED, lines.by_hand)):
        wanted = np.bincount(reader[which], minlength=readers).tolist()
        for place, count in enumerate(wanted):
            if told[place, rule] != count:
                raise FaultError(f"the ledger has {told[place, rule]} rows for {rule}, of {count}")


def _told(entries: Sequence[Entry]) -> Counter[tuple[int, str]]:
    """How many rows the ledger has about lines, by reader and rule."""
    return Counter((entry.reader, entry.rule) for entry in entries if entry.rule in LINE_RULES)


def counts_of_lines(
    entries: Sequence[Entry], screened: Screened, lines: ReaderLines | None
) -> list[dict[str, int]]:
    """What is counted about the lines of each reader.

    Parameters
    ----------
    entries : sequence of Entry
        The rows of the ledger.
    screened : Screened
        What screening found out.
    lines : ReaderLines or None
        How lines were told; None counts nothing.

    Returns
    -------
    list of dict of str to int
        One a reader.
    """
    readers = len(screened.readers.left_out)
    if lines is None:
        return [{} for _ in range(readers)]
    told = _told(entries)
    is_judged = np.isfinite(lines.trial_confidence)
    judged = np.bincount(screened.reader[is_judged], minlength=readers).tolist()
    sure = np.bincount(screened.reader[is_judged & lines.sure], minlength=readers).tolist()
    return [
        {
            ON_NONE: told[place, NO_LINE],
            BY_HAND: told[place, CORRECTED],
            JUDGED: judged[place],
            SURE: sure[place],
        }
        for place in range(readers)
    ]


def notice_lines(counts: Mapping[str, int], study: Study, findings: Findings) -> None:
    """Record how far the lines of a study can be trusted.

    Parameters
    ----------
    counts : mapping of str to int
        What the readers add up to; see :func:`counts_of_lines`.
    study : Study
        As loaded.
    findings : Findings
        Where it is recorded: as a warning where many trials are not sure, else as a note.
    """
    judged, sure = counts.get(JUDGED, 0), counts.get(SURE, 0)
    where, line = ("lines", study.line_of("lines")) if study.lines else ("", None)
    unsure = judged - sure
    if unsure:
        tell = findings.warning if unsure > MOST_UNSURE * judged else findings.note
        tell(
            f"the lines of {sure:,} of {judged:,} trials of several lines are sure; {unsure:,} "
            f"{'is' if unsure == 1 else 'are'} not",
            path=study.shown,
            line=line,
            where=where,
            fix="look at them in the audit page and with trace; correct them by hand, or leave "
            "them out by line_confidence_under in [screening.trials]",
        )
    on_none, by_hand = counts.get(ON_NONE, 0), counts.get(BY_HAND, 0)
    if on_none:
        findings.note(
            f"{on_none:,} fixation{' belongs' if on_none == 1 else 's belong'} to no line and "
            f"{'counts' if on_none == 1 else 'count'} as outside; the ledger lists "
            + ("it" if on_none == 1 else "them"),
            path=study.shown,
            line=line,
            where=where,
        )
    if by_hand:
        findings.note(
            f"the line of {by_hand:,} fixation{'' if by_hand == 1 else 's'} was set by hand",
            path=study.shown,
            line=study.line_of("lines", "corrections"),
            where="lines.corrections",
        )
