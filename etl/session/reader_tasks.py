"""The work on readers: each with the trials that were recorded, in the order of the tables."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.files import Coded
from etl.session.line_corrections import LineCorrections, hand_lines, match_corrections
from etl.session.lines import NO_HAND, HandLines
from etl.session.trial_facts import TrialFacts
from etl.session.work import ReaderTask
from etl.tables import TableDesign
from etl.trials import KnownTrials


@dataclass(frozen=True, slots=True)
class Corrections:
    """Lines set by hand, where the study has such a table."""

    table: LineCorrections | None
    findings: Findings
    complete: bool

    def matched(self, columns: TrialColumns, design: TableDesign) -> dict[int, NDArray[np.int64]]:
        """The rows of the table that are about each trial."""
        if self.table is None:
            return {}
        return match_corrections(self.table, columns, design, self.findings, complete=self.complete)

    def of_reader(
        self, of_trials: dict[int, NDArray[np.int64]], rows: NDArray[np.int64]
    ) -> tuple[HandLines, str]:
        """Those about the trials of one reader, and the table's name."""
        if self.table is None:
            return NO_HAND, ""
        return hand_lines(self.table, of_trials, rows), self.table.shown


def texts_in(column: Coded) -> tuple[str, ...]:
    """The texts that occur in a column.

    Parameters
    ----------
    column : Coded
        Any.

    Returns
    -------
    tuple of str
        In the order of the column's list of texts.
    """
    return tuple(column.values[code] for code in np.unique(column.codes).tolist() if code >= 0)


def reader_tasks(
    design: TableDesign,
    trials: KnownTrials,
    looked_up: tuple[NDArray[np.int32], NDArray[np.bool_]],
    facts: TrialFacts,
    parts: dict[str, list[tuple[Path, int, int]]],
    corrections: Corrections,
) -> list[ReaderTask]:
    """Sort trials by reader; readers with a problem are left out.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    trials : KnownTrials
        All trials that the logs show, with their facts.
    looked_up : tuple of two (trials,) arrays
        The text of each trial, -1 for none, and whether nothing is wrong with the trial.
    facts : TrialFacts
        What screening needs to know of each.
    parts : dict of str to list of (Path, int, int)
        For each reader where fixations were put aside: file, batch, and the log's place.
    corrections : Corrections
        Lines set by hand.

    Returns
    -------
    list of ReaderTask
        The readers, and of each the trials, in the order of the tables.
    """
    text, good = looked_up
    known = trials.known
    length = len(trials)
    ids = {
        name: known[name].recoded(design.ids[name].values)
        if name in known
        else np.full(length, -1, dtype=np.int32)
        for name in design.ids
    }
    covariates: dict[str, NDArray[np.float64] | NDArray[np.int32]] = {}
    for name, covariate in design.covariates.items():
        column = known[name]
        if covariate.type == "number":
            # Values of skipped trials need not be numbers; they are not carried along.
            present = set(texts_in(column.take(text >= 0)))
            numbers = [float(v) if v in present else np.nan for v in column.values]
            covariates[name] = np.array([*numbers, np.nan])[column.codes]
        else:
            covariates[name] = column.recoded(covariate.values)
    columns = TrialColumns(
        ids,
        {name: known[name].recoded(levels) for name, levels in design.factors.items()},
        covariates,
        text,
        facts.came_ms,
        facts.went_ms,
        facts.answer,
        tuple(facts.notes),
        tuple(trials.skipped_by),
    )
    of_trials = corrections.matched(columns, design)
    keys = [ids[name] for name in ("trial", "session", "participant") if name in ids]
    order = np.lexsort(keys)
    readers = ids["participant"][order]
    starts = np.flatnonzero(np.diff(readers, prepend=-1))
    stops = np.append(starts[1:], length)
    tasks = []
    for start, stop in zip(starts.tolist(), stops.tolist(), strict=True):
        rows = order[start:stop]
        if not good[rows].all():
            continue
        participant = design.ids["participant"].values[int(readers[start])]
        own = parts[participant]
        tasks.append(
            ReaderTask(
                participant,
                tuple((path, batch) for path, batch, _ in own),
                tuple(number for _, _, number in own),
                columns.take(rows),
                facts.reader_notes.get(participant, ""),
                *corrections.of_reader(of_trials, rows),
            )
        )
    return tasks
