"""Readers in groups, each of which is one task: what it needs, and nothing that others decide.

A group's task holds its own ids, logs and texts of facts, not the study's. So its rows do not hang
on which other readers the study has, and a group that is as it was in an earlier build need not be
worked on again.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from etl.session.work import ReaderTask
from etl.tables import CovariateColumn, IdColumn, TableDesign

#: About how many fixations a group has: enough for what is done once a group not to count, few
#: enough for a worker's memory and for groups to be shared out evenly.
FIXATIONS_A_GROUP: Final = 40_000
#: No group of several readers has more than so many times that, nor is one closed before it has
#: that part of it.
_MOST, _LEAST = 2, 0.25
_HASHES: Final = 2.0**64


@dataclass(frozen=True, slots=True)
class OwnValues:
    """The values that occur among some readers, in the order of the study's.

    Attributes
    ----------
    ids, covariates : dict of str to tuple of str
        By column.
    files : tuple of str
        The logs.
    """

    ids: Mapping[str, tuple[str, ...]]
    covariates: Mapping[str, tuple[str, ...]]
    files: tuple[str, ...]

    def design(self, study: TableDesign) -> TableDesign:
        """The study's tables with these values only."""
        return replace(
            study,
            ids={name: IdColumn(own, study.ids[name].type) for name, own in self.ids.items()},
            covariates={
                name: CovariateColumn(known.type, self.covariates.get(name, ()))
                for name, known in study.covariates.items()
            },
            files=self.files,
        )


@dataclass(frozen=True, slots=True)
class GroupTask:
    """Some readers to be finished; codes in their tasks are places among the group's own values."""

    readers: tuple[ReaderTask, ...]
    own: OwnValues


def without_values(design: TableDesign) -> TableDesign:
    """The study's tables without the values that groups have of their own.

    Parameters
    ----------
    design : TableDesign
        Of the study.

    Returns
    -------
    TableDesign
        For :meth:`OwnValues.design`.
    """
    none = OwnValues(dict.fromkeys(design.ids, ()), {}, ())
    return none.design(design)


def group_sizes(participants: Sequence[str], fixations: Sequence[int]) -> list[int]:
    """Where to cut the readers of a study into groups.

    A reader ends a group or not by id and size alone, as far as sizes allow: a reader more or less
    changes the group where that one belongs, and leaves the others as they are.

    Parameters
    ----------
    participants : sequence of str
        The readers in the order of the tables.
    fixations : sequence of int
        How many each has.

    Returns
    -------
    list of int
        How many readers each group has, in order.
    """
    sizes: list[int] = []
    count = total = 0
    for participant, own in zip(participants, fixations, strict=True):
        if count and total + own > _MOST * FIXATIONS_A_GROUP:
            sizes.append(count)
            count = total = 0
        count += 1
        total += own
        chance = _share(participant) * FIXATIONS_A_GROUP < own
        if total >= _LEAST * FIXATIONS_A_GROUP and chance:
            sizes.append(count)
            count = total = 0
    return [*sizes, count] if count else sizes


def _share(participant: str) -> float:
    """A number from 0 to 1 that looks drawn by chance, the same for a reader always."""
    digest = hashlib.sha256(participant.encode("utf-8")).digest()
    return int.from_bytes(digest[:8], "big") / _HASHES


def group_tasks(
    design: TableDesign, tasks: Sequence[ReaderTask], sizes: Sequence[int]
) -> Iterator[GroupTask]:
    """The tasks of the groups, made as they are asked for.

    Parameters
    ----------
    design : TableDesign
        Of the study.
    tasks : sequence of ReaderTask
        The readers in the order of the tables.
    sizes : sequence of int
        From :func:`group_sizes`.

    Yields
    ------
    GroupTask
    """
    start = 0
    for size in sizes:
        yield _group_task(design, [tasks[place] for place in range(start, start + size)])
        start += size


def _group_task(design: TableDesign, tasks: Sequence[ReaderTask]) -> GroupTask:
    """The task of one group."""
    ids = {n: _places([task.trials.ids[n] for task in tasks]) for n in design.ids}
    # A reader without a trial is there all the same.
    named = [design.ids["participant"].ranks[task.participant] for task in tasks]
    ids["participant"] = np.union1d(ids["participant"], named)
    texts = {
        name: _places([task.trials.covariates[name].astype(np.int64) for task in tasks])
        for name, known in design.covariates.items()
        if known.type == "text"
    }
    files = np.unique(np.concatenate([np.array(task.files, dtype=np.int64) for task in tasks]))
    own = OwnValues(
        {name: _named(places, design.ids[name].values) for name, places in ids.items()},
        {name: _named(places, design.covariates[name].values) for name, places in texts.items()},
        _named(files, design.files),
    )
    return GroupTask(tuple(_recoded(task, ids, texts, files) for task in tasks), own)


def _places(codes: Sequence[NDArray[np.integer]]) -> NDArray[np.int64]:
    """Which places occur, in order; a missing one (-1) is none."""
    found = np.unique(np.concatenate([*codes, np.zeros(0, dtype=np.int64)]))
    return found[found >= 0].astype(np.int64)


def _named(places: NDArray[np.int64], values: Sequence[str]) -> tuple[str, ...]:
    return tuple([values[place] for place in places.tolist()])


def _recoded(
    task: ReaderTask,
    ids: Mapping[str, NDArray[np.int64]],
    texts: Mapping[str, NDArray[np.int64]],
    files: NDArray[np.int64],
) -> ReaderTask:
    """A reader's task with places among the group's own values."""
    trials = task.trials
    return replace(
        task,
        files=tuple(np.searchsorted(files, task.files).tolist()),
        trials=replace(
            trials,
            ids={name: _place(codes, ids[name]) for name, codes in trials.ids.items()},
            covariates={
                name: _place(values, texts[name]) if name in texts else values
                for name, values in trials.covariates.items()
            },
        ),
    )


def _place(codes: NDArray[np.generic], among: NDArray[np.int64]) -> NDArray[np.int32]:
    """Places among some of the values; a missing one stays so."""
    whole = codes.astype(np.int64)
    return np.where(whole >= 0, np.searchsorted(among, whole), -1).astype(np.int32)
