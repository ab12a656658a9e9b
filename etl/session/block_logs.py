"""Big logs read in blocks, by one worker or by several, and put aside block by block."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import TableReader
from etl.parsers.canonical import LogNote
from etl.parsers.joined_blocks import joined, to_read_again
from etl.parsers.table_blocks import BlockAnswer, BlockLog, Reading, read_block, texts_of
from etl.session.block_figures import BlockFigures, block_figures, joined_figures
from etl.session.kept_logs import Aside, batches_of
from etl.session.kept_store import LOG
from etl.session.log_figures import LogFigures
from etl.session.seen import distinct_runs, trial_runs
from etl.trials import SeenTrials


@dataclass(frozen=True, slots=True)
class BlockTask:
    """Blocks of a log to be read and put aside.

    Attributes
    ----------
    log : BlockLog
        The log.
    readings : tuple of Reading
        Which blocks, in order, and how they are to be read.
    kept : str
        The entry of the log; each block has one of its own.
    """

    log: BlockLog
    readings: tuple[Reading, ...]
    kept: str


@dataclass(slots=True)
class KeptBlock:
    """What a block holds.

    Attributes
    ----------
    answer : BlockAnswer
        What it tells of the log, without its fixations.
    batches, fixations : dict of str to int
        For each reader, the number of the batch put aside, and how many fixations that holds.
    trials : SeenTrials or None
        The runs of its trials; None where it has no fixations that can be used.
    figures : BlockFigures or None
        Its figures.
    originals : dict of str to str
        Whose the pseudonyms are that it added.
    clashes : dict of str to (str, str)
        Those that stand for two.
    """

    answer: BlockAnswer
    batches: dict[str, int] = field(default_factory=dict)
    fixations: dict[str, int] = field(default_factory=dict)
    trials: SeenTrials | None = None
    figures: BlockFigures | None = None
    originals: dict[str, str] = field(default_factory=dict)
    clashes: dict[str, tuple[str, str]] = field(default_factory=dict)


@dataclass(slots=True)
class WholeLog:
    """What the blocks of a log hold together; the first part of each is its answer."""

    note: LogNote
    blocks: tuple[dict[str, int], ...]
    fixations: dict[str, int]
    trials: SeenTrials
    figures: LogFigures | None


def block_name(kept: str, place: int) -> str:
    """The entry that has the fixations of a block.

    Parameters
    ----------
    kept : str
        The entry of the log.
    place : int
        Which block.

    Returns
    -------
    str

    Examples
    --------
    >>> block_name("7.log", 2)
    '7-2.log'
    """
    return f"{kept.removesuffix(LOG)}-{place}{LOG}"


def keep_blocks(task: BlockTask, reader: TableReader, aside: Aside) -> Iterator[KeptBlock]:
    """Read blocks of a log, and put their fixations aside.

    Parameters
    ----------
    task : BlockTask
        Which blocks.
    reader : TableReader
        How the study's logs are read.
    aside : Aside
        Where fixations are put aside.

    Yields
    ------
    KeptBlock
        One a block.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    ChangedError
        If the log changes.
    """
    readings = {how.place: how for how in task.readings}
    for place, text in texts_of(task.log, frozenset(readings)):
        kept = KeptBlock(read_block(task.log, reader.reading, readings[place], text))
        log, kept.answer.log = kept.answer.log, None
        if log is not None and kept.answer.part.sound:
            kept.trials = distinct_runs(trial_runs(log))
            batches, kept.batches, kept.fixations = batches_of(log)
            name = block_name(task.kept, place)
            aside.put(name, None, batches)
            if len(log):
                kept.figures, steps = block_figures(log)
                np.save(_steps_path(aside, name), steps)
        yield kept


def _steps_path(aside: Aside, name: str) -> Path:
    """Where the steps from onset to onset of a block are put aside."""
    return aside.store.fresh / f"{name}.npy"


def whole_log(
    log: BlockLog,
    reader: TableReader,
    aside: tuple[str, Aside],
    do: Callable[[Sequence[BlockTask]], Iterable[Iterable[KeptBlock]]],
    findings: Findings,
) -> WholeLog | None:
    """Read a log in blocks.

    Parameters
    ----------
    log : BlockLog
        The log.
    reader : TableReader
        How the study's logs are read.
    aside : tuple of str and Aside
        Its entry, and where its fixations are put aside.
    do : callable
        Does tasks, and gives what their blocks hold in the order of the tasks.
    findings : Findings
        Where it is recorded what is wrong with the log.

    Returns
    -------
    WholeLog or None
        None where an error was recorded.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    ChangedError
        If the log changes.
    """
    name, put_aside = aside
    readings = [Reading(place, below=place == 0) for place in range(len(log.survey.blocks))]
    blocks: dict[int, KeptBlock] = {}
    while readings:
        tasks = [BlockTask(log, tuple(own), name) for own in _shared(log, readings)]
        for some in do(tasks):
            for kept in some:
                blocks[kept.answer.reading.place] = kept
        every = [blocks[place] for place in range(len(log.survey.blocks))]
        log, readings = to_read_again(log, reader.reading, [kept.answer for kept in every])
    note = joined(log, reader.reading, [kept.answer for kept in every], findings)
    findings.items.sort(key=lambda finding: finding.line or 0)
    if note is None or findings.failed:
        return None
    runs = [kept.trials for kept in every if kept.trials is not None]
    # A block with rows that nobody asked for tells no trial; the log has some, or was refused.
    trials = SeenTrials.joined(runs, [0] * len(runs)).once((log.survey.shown,), findings)
    fixations: Counter[str] = Counter()
    for kept in every:
        fixations.update(kept.fixations)
    measured = [kept.figures for kept in every if kept.figures is not None]
    figures = None
    if measured:
        values = partial(_values, every, name, put_aside)
        figures = joined_figures(measured, (len(fixations), len(trials)), values)
    for kept in every:
        own = block_name(name, kept.answer.reading.place)
        _steps_path(put_aside, own).unlink(missing_ok=True)
    return WholeLog(note, tuple(kept.batches for kept in every), dict(fixations), trials, figures)


def _shared(log: BlockLog, readings: Sequence[Reading]) -> Iterator[Sequence[Reading]]:
    """Blocks that are read by one worker: one by one, or all where each needs those before it."""
    if not log.survey.alone:
        yield readings
        return
    for how in readings:
        yield (how,)


def _values(
    blocks: Sequence[KeptBlock], kept_as: str, aside: Aside, of: str
) -> Iterator[NDArray[np.float64]]:
    """One column of all fixations that were put aside, block by block."""
    for kept in blocks:
        if kept.figures is None:
            continue
        name = block_name(kept_as, kept.answer.reading.place)
        if of == "steps":
            yield np.load(_steps_path(aside, name))
            continue
        for column in aside.column(name, len(kept.batches), of):
            yield np.asarray(column.to_numpy(zero_copy_only=False), dtype=np.float64)
