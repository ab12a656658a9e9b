"""Big logs of which several workers read a block each."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace

from etl.files.pieces import WholeNeededError
from etl.parsers import LogReader, TableReader
from etl.pseudonyms import Pseudonyms
from etl.session.block_logs import BlockTask, KeptBlock, keep_blocks
from etl.session.crew import Crew
from etl.session.kept_logs import Aside
from etl.session.work import LogAnswer, LogTask, LogWork, add_blocks, put_aside

Arguments = tuple[LogReader, Aside, Pseudonyms | None]


class BlockWork:
    """Reads blocks.

    Parameters
    ----------
    reader : TableReader
        How the study's logs are read.
    aside : Aside
        Where fixations are put aside.
    pseudonyms : Pseudonyms or None
        The very ones of the reader, which know afterwards whose they gave.
    """

    def __init__(self, reader: TableReader, aside: Aside, pseudonyms: Pseudonyms | None) -> None:
        self._reader = reader
        self._aside = aside
        self._pseudonyms = pseudonyms

    def __call__(self, task: BlockTask) -> list[KeptBlock] | Exception:
        """Read some blocks; what stands against it is an answer, too."""
        before = 0 if self._pseudonyms is None else len(self._pseudonyms.originals)
        try:
            kept = list(keep_blocks(task, self._reader, self._aside))
        except (WholeNeededError, OSError) as why:
            return why
        if self._pseudonyms is not None and kept:
            kept[-1].originals = self._pseudonyms.learnt_since(before)
            kept[-1].clashes = dict(self._pseudonyms.clashes)
        return kept


def finished_logs(
    answers: Iterable[LogAnswer], tasks: Sequence[LogTask], crew: Crew, arguments: Arguments
) -> Iterator[LogAnswer]:
    """What logs hold, those included of which the blocks were left to others.

    Parameters
    ----------
    answers : iterable of LogAnswer
        What workers say of each log.
    tasks : sequence of LogTask
        The logs.
    crew : Crew
        Does the work on blocks.
    arguments : tuple of LogReader, Aside, and Pseudonyms or None
        How logs are read and where they are put aside.

    Yields
    ------
    LogAnswer
        In the order of the logs.
    """
    for task, answer in zip(tasks, answers, strict=True):
        yield answer if answer.begun is None else _shared(task, answer, crew, arguments)


def _shared(task: LogTask, answer: LogAnswer, crew: Crew, arguments: Arguments) -> LogAnswer:
    """Read a big log, a block a task."""
    reader, aside, _ = arguments
    assert isinstance(reader, TableReader)  # noqa: S101

    def do(tasks: Sequence[BlockTask]) -> Iterator[list[KeptBlock]]:
        for some in crew.map(BlockWork, arguments, tasks):
            if isinstance(some, Exception):
                raise some
            for kept in some:
                answer.originals.update(kept.originals)
                answer.clashes.update(kept.clashes)
            yield some

    try:
        add_blocks(answer, reader, (task.path, aside), do)
    except WholeNeededError:
        (whole,) = crew.map(LogWork, arguments, [replace(task, whole=True)])
        return whole
    put_aside(answer, aside)
    return answer
