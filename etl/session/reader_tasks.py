"""The work on readers: each with the trials that were recorded, in the order of the tables."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TypeVar, overload

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.files import Coded
from etl.files.packed import Narrow, RowTexts, narrow
from etl.session.line_corrections import LineCorrections, hand_lines, match_corrections
from etl.session.lines import NO_HAND, HandLines
from etl.session.trial_facts import TrialFacts
from etl.session.work import ReaderTask
from etl.tables import CovariateColumn, TableDesign
from etl.trials import KnownTrials


@dataclass(frozen=True, slots=True)
class Corrections:
    """Lines set by hand, where the study has such a table."""

    table: LineCorrections | None
    findings: Findings
    complete: bool

    def matched(self, columns: StudyTrials, design: TableDesign) -> dict[int, NDArray[np.int64]]:
        """The rows of the table that are about each trial."""
        if self.table is None:
            return {}
        known = columns.ids, columns.skipped_by
        return match_corrections(self.table, known, design, self.findings, complete=self.complete)

    def of_reader(
        self, of_trials: Mapping[int, NDArray[np.int64]], trials: range
    ) -> tuple[HandLines, str]:
        """Those about the trials of one reader, and the table's name."""
        if self.table is None:
            return NO_HAND, ""
        return hand_lines(self.table, of_trials, trials), self.table.shown


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


@dataclass(frozen=True, slots=True)
class StudyTrials:
    """All trials of a study in the order of the tables, in as little memory as they need.

    Attributes
    ----------
    ids, factors : dict of str to (trials,) array of whole numbers
        As in :class:`~etl.export.rows.TrialColumns`.
    covariates : dict of str to (array of whole numbers, array or None)
        Places in the design's list of texts; or, for numbers, places among the distinct ones and
        these, the last of which is NaN.
    text : (trials,) array of whole numbers
        The text that was read; -1 for a trial that is no part of the study.
    came_ms, went_ms, answer : (trials,) float64 array
        When the text came up and went away, and whether the answer was right; NaN where unknown.
    notes, skipped_by : RowTexts
        The note on each trial; why it is no part of the study.
    """

    ids: dict[str, Narrow]
    factors: dict[str, Narrow]
    covariates: dict[str, tuple[Narrow, NDArray[np.float64] | None]]
    text: Narrow
    came_ms: NDArray[np.float64]
    went_ms: NDArray[np.float64]
    answer: NDArray[np.float64]
    notes: RowTexts
    skipped_by: RowTexts

    def __len__(self) -> int:
        return len(self.text)

    def between(self, start: int, stop: int) -> TrialColumns:
        """Some trials that follow one another, as the work on readers wants them."""
        own = slice(start, stop)
        covariates: dict[str, NDArray[np.float64] | NDArray[np.int32]] = {
            name: places[own].astype(np.int32) if numbers is None else numbers[places[own]]
            for name, (places, numbers) in self.covariates.items()
        }
        return TrialColumns(
            {name: codes[own].astype(np.int32) for name, codes in self.ids.items()},
            {name: codes[own].astype(np.int32) for name, codes in self.factors.items()},
            covariates,
            self.text[own].astype(np.int32),
            # Copied: part of an array is pickled, but one number that stands for all is not part.
            np.array(self.came_ms[own]),
            np.array(self.went_ms[own]),
            np.array(self.answer[own]),
            self.notes.texts_of(start, stop),
            self.skipped_by.texts_of(start, stop),
        )


class ReaderTasks(Sequence[ReaderTask]):
    """The readers of a study in the order of the tables, each task made when it is asked for.

    Parameters
    ----------
    trials : StudyTrials
        All trials.
    bounds : (readers, 2) int64 array
        Of each reader, the first trial and the one after the last.
    participants : tuple of str
        The readers.
    parts : dict of str to list of (str, int, int)
        For each reader where fixations were put aside: entry, batch, and the log's place.
    notes : dict of str to str
        The note on each reader who has one.
    hand : callable
        Gives the lines set by hand of a reader, from the bounds of the trials.
    """

    def __init__(
        self,
        trials: StudyTrials,
        bounds: NDArray[np.int64],
        participants: tuple[str, ...],
        parts: Mapping[str, Sequence[tuple[str, int, int]]],
        notes: Mapping[str, str],
        hand: Callable[[int, int], tuple[HandLines, str]],
    ) -> None:
        self._trials = trials
        self._bounds = bounds
        self.participants = participants
        self._parts = parts
        self._notes = notes
        self._hand = hand

    def __len__(self) -> int:
        return len(self.participants)

    @overload
    def __getitem__(self, index: int) -> ReaderTask: ...
    @overload
    def __getitem__(self, index: slice) -> list[ReaderTask]: ...
    def __getitem__(self, index: int | slice) -> ReaderTask | list[ReaderTask]:
        if isinstance(index, slice):
            return [self[place] for place in range(*index.indices(len(self)))]
        participant = self.participants[index]
        start, stop = self._bounds[index].tolist()
        own = self._parts[participant]
        return ReaderTask(
            participant,
            tuple([(name, batch) for name, batch, _ in own]),
            tuple([number for _, _, number in own]),
            self._trials.between(start, stop),
            self._notes.get(participant, ""),
            *self._hand(start, stop),
        )

    def trial_counts(self) -> NDArray[np.int64]:
        """How many trials each reader has."""
        counts: NDArray[np.int64] = self._bounds[:, 1] - self._bounds[:, 0]
        return counts

    def by_name(self) -> Mapping[str, ReaderTask]:
        """The tasks by reader, each made when it is asked for."""
        return _ByName(self)


class _ByName(Mapping[str, ReaderTask]):
    """Tasks by reader."""

    def __init__(self, tasks: ReaderTasks) -> None:
        self._tasks = tasks
        self._places = {name: place for place, name in enumerate(tasks.participants)}

    def __getitem__(self, participant: str) -> ReaderTask:
        return self._tasks[self._places[participant]]

    def __iter__(self) -> Iterator[str]:
        return iter(self._places)

    def __len__(self) -> int:
        return len(self._places)


def reader_tasks(
    design: TableDesign,
    trials: KnownTrials,
    looked_up: tuple[NDArray[np.int32], NDArray[np.bool_]],
    facts: TrialFacts,
    parts: Mapping[str, Sequence[tuple[str, int, int]]],
    corrections: Corrections,
) -> ReaderTasks:
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
    parts : mapping of str to sequence of (str, int, int)
        For each reader where fixations were put aside: entry, batch, and the log's place.
    corrections : Corrections
        Lines set by hand.

    Returns
    -------
    ReaderTasks
        The readers, and of each the trials, in the order of the tables.
    """
    text, good = looked_up
    known = trials.known
    ids = {
        name: narrow(known[name].recoded(known_ids.values), len(known_ids.values))
        if name in known
        else np.full(len(trials), -1, dtype=np.int8)
        for name, known_ids in design.ids.items()
    }
    order = _order([ids[name] for name in ("trial", "session", "participant") if name in ids])
    columns = StudyTrials(
        {name: _sorted(codes, order) for name, codes in ids.items()},
        {
            name: _sorted(narrow(known[name].recoded(levels), len(levels)), order)
            for name, levels in design.factors.items()
        },
        {
            name: _covariate(known[name], covariate, text, order)
            for name, covariate in design.covariates.items()
        },
        _sorted(narrow(text, int(text.max(initial=-1)) + 1), order),
        _sorted(facts.came_ms, order),
        _sorted(facts.went_ms, order),
        _sorted(facts.answer, order),
        facts.notes.ordered(order),
        trials.skipped_by.ordered(order),
    )
    good = _sorted(good, order)
    del ids, order
    readers = columns.ids["participant"]
    starts = np.flatnonzero(np.concatenate([[len(readers) > 0], readers[1:] != readers[:-1]]))
    stops = np.append(starts[1:], len(readers))
    sound = np.minimum.reduceat(good, starts) if len(starts) else np.zeros(0, dtype=bool)
    starts, stops = starts[sound], stops[sound]
    names = design.ids["participant"].values
    of_trials = corrections.matched(columns, design)

    def hand(start: int, stop: int) -> tuple[HandLines, str]:
        return corrections.of_reader(of_trials, range(start, stop))

    return ReaderTasks(
        columns,
        np.stack([starts, stops], axis=1),
        tuple([names[code] for code in readers[starts].tolist()]),
        parts,
        facts.reader_notes,
        hand,
    )


Values = TypeVar("Values", bound=np.generic)


def _order(keys: Sequence[Narrow]) -> NDArray[np.int64] | None:
    """The order in which keys ascend, the last first; None where they do."""
    falls = np.zeros(max(len(keys[0]) - 1, 0), dtype=bool)
    for key in keys:
        same = key[1:] == key[:-1]
        falls &= same
        falls |= key[1:] < key[:-1]
    return np.lexsort(keys) if falls.any() else None


def _sorted(values: NDArray[Values], order: NDArray[np.int64] | None) -> NDArray[Values]:
    """Values in another order; one that stands for all of them stays so."""
    return values if order is None or values.strides == (0,) else values[order]


def _covariate(
    column: Coded,
    covariate: CovariateColumn,
    text: NDArray[np.int32],
    order: NDArray[np.int64] | None,
) -> tuple[Narrow, NDArray[np.float64] | None]:
    """A covariate as places, and the numbers at these places where it is one of numbers."""
    if covariate.type != "number":
        places = narrow(column.recoded(covariate.values), len(covariate.values))
        return _sorted(places, order), None
    # Values of skipped trials need not be numbers; they are not carried along.
    present = set(texts_in(column.take(text >= 0)))
    numbers = [float(v) if v in present else np.nan for v in column.values]
    return _sorted(narrow(column.codes, len(numbers)), order), np.array([*numbers, np.nan])
