"""Readiness of the tables that were built: read them again, count, and write what was found."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from math import prod
from pathlib import Path
from typing import Any, Final

import numpy as np

from etl.errors import FaultError
from etl.export.readiness_files import write_readiness_files
from etl.measures.dependence import Conventions, shared_fixations
from etl.readiness import Conditions, outcome_readiness
from etl.readiness.facts import ALL_REGIONS, Dependence, Readiness
from etl.session.readiness_counting import (
    UNITS,
    Counted,
    GroupCounting,
    GroupCounts,
    GroupTask,
    TableCounts,
    opened,
)
from etl.tables import TableDesign

#: With more region names than this they are counted together, as on the audit page.
MOST_REGIONS: Final = 20
#: With more combinations of levels than this only those that occur are listed.
MOST_CELLS: Final = 400
_TABLES: Final = ("trials", "outcomes_wide")

#: Does tasks, here or in other processes: given what makes the function that does one, the
#: arguments of that, and the tasks, it gives the answers in the order of the tasks.
Mapper = Callable[[Callable[..., Any], tuple[Any, ...], Sequence[Any]], Iterator[Any]]


def map_here(
    make: Callable[..., Callable[[Any], Any]], arguments: tuple[Any, ...], tasks: Sequence[Any]
) -> Iterator[Any]:
    """Do tasks in this process.

    Parameters
    ----------
    make : callable
        Gives the function that does a task.
    arguments : tuple
        What ``make`` needs.
    tasks : sequence
        The tasks.

    Yields
    ------
    answers
        One a task.
    """
    yield from map(make(*arguments), tasks)


def readiness_of(
    folder: Path,
    design: TableDesign,
    conventions: Conventions | None = None,
    mapped: Mapper = map_here,
) -> Readiness:
    """What is to be known of all binary outcomes of a study before the first fit.

    Parameters
    ----------
    folder : Path
        Where ``outcomes_wide.parquet`` and ``trials.parquet`` are, finished.
    design : TableDesign
        What the tables have in common.
    conventions : tuple of str or None
        What the study does with fixations outside every region, and where there was no
        opportunity; for None dependences are told that hold whatever it does.
    mapped : callable, optional
        What has row groups counted, here or in other processes.

    Returns
    -------
    Readiness
        Outcomes of regions in the order of the catalogue, over the design's regions in
        their order; then those of trials.
    """
    together = len(design.regions) > MOST_REGIONS
    wanted = {
        "trials": Counted(_binary(design.trial_measures)),
        "outcomes_wide": Counted(
            _binary(design.measures), ("",) if together else design.regions or ("",)
        ),
    }
    conditions = _conditions(folder, design, mapped)
    tasks = [task for table in _TABLES for task in _groups(folder, design, table)]
    if not wanted["outcomes_wide"].outcomes:
        tasks = [task for task in tasks if task.table == "trials"]
    units = tuple(name for name in UNITS if name in design.ids)
    counted = {name: TableCounts(own, conditions, units) for name, own in wanted.items()}
    own: GroupCounts
    for own in mapped(GroupCounting, (folder, design, conditions, wanted), tasks):
        counted[own.table].add(own)
    trials, wide = counted["trials"], counted["outcomes_wide"]
    for unit in units:
        if not np.isin(wide.keys(unit), trials.keys(unit), assume_unique=True).all():
            raise FaultError("a row of outcomes_wide has no row in trials")
    regions = [(0, ALL_REGIONS)] if together else list(enumerate(design.regions))
    if not together:
        # A region that no kept trial has is left out.
        regions = [region for region in regions if wide.rows[region[0]]] or regions
    codings = {name: design.coding(name) for name in design.factors}
    outcomes = [
        outcome_readiness(wide.counts(name, *region), codings)
        for name in wide.wanted.outcomes
        for region in regions
    ]
    outcomes += [
        outcome_readiness(trials.counts(name, 0, ""), codings) for name in trials.wanted.outcomes
    ]
    names = tuple(m.name for m in design.measures), tuple(m.name for m in design.trial_measures)
    shared = tuple(Dependence(*pair) for pair in shared_fixations(*names, conventions))
    return Readiness(tuple(design.factors), tuple(outcomes), shared, together)


def write_readiness(readiness: Readiness, folder: Path) -> None:
    """Write ``readiness.csv``, ``readiness.json`` and ``formulas.csv`` into a folder.

    Parameters
    ----------
    readiness : Readiness
        From :func:`readiness_of`.
    folder : Path
        Where they go; files of these names are replaced.
    """
    write_readiness_files(readiness, folder)


def _binary(measures: Sequence[Any]) -> tuple[str, ...]:
    """The names of the binary outcomes."""
    return tuple(measure.name for measure in measures if measure.kind == "binary")


def _groups(folder: Path, design: TableDesign, table: str) -> list[GroupTask]:
    """The row groups of a table."""
    with opened(folder, table, design) as file:
        return [GroupTask(table, group) for group in range(file.num_row_groups)]


def _conditions(folder: Path, design: TableDesign, mapped: Mapper) -> Conditions:
    """The conditions: all combinations of levels, or of very many those that occur."""
    levels = dict(design.factors)
    sizes = tuple(len(own) for own in levels.values())
    if not sizes:
        rows = np.zeros((1, 0), dtype=np.int64)
    elif prod(sizes) <= MOST_CELLS:
        rows = np.stack(np.unravel_index(np.arange(prod(sizes)), sizes), axis=1)
    else:
        tasks = _groups(folder, design, "trials")
        found = mapped(GroupCounting, (folder, design, None, {"trials": Counted(())}), tasks)
        none = np.zeros((0, len(sizes)), dtype=np.int64)
        rows = np.unique(np.concatenate([none, *(own.cells for own in found)]), axis=0)
    return Conditions(tuple(levels), tuple(levels.values()), rows)
