"""Big logs of which several workers read a block each."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

from etl.files.pieces import WholeNeededError
from etl.files.text_faults import tell_unreadable
from etl.parsers import LogReader, TableReader
from etl.parsers.canonical import LogNote
from etl.pseudonyms import Pseudonyms
from etl.session.block_logs import BlockTask, KeptBlock, keep_blocks
from etl.session.crew import Crew
from etl.session.kept_logs import Aside
from etl.session.work import LogAnswer, LogTask, LogWork, answer_of, noted

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
        hidden = self._pseudonyms
        try:
            with noted(hidden) as given:
                kept = list(keep_blocks(task, self._reader, self._aside))
        except (WholeNeededError, OSError) as why:
            return why
        if hidden is not None and kept:
            kept[-1].originals = given
            kept[-1].clashes = dict(hidden.clashes)
        return kept


def share_log(task: LogTask, begun: LogAnswer, crew: Crew, arguments: Arguments) -> LogAnswer:
    """Read a big log, a block a task.

    Parameters
    ----------
    task : LogTask
        The log.
    begun : LogAnswer
        What is known of it.
    crew : Crew
        Does the work.
    arguments : tuple of LogReader, Shelf, and Pseudonyms or None
        How logs are read and where they are put aside.

    Returns
    -------
    LogAnswer
        The same as if one worker had read it.
    """
    reader, aside, _ = arguments
    assert isinstance(reader, TableReader)  # noqa: S101
    assert begun.begun is not None  # noqa: S101
    log, name = begun.begun
    originals = dict(begun.originals)
    clashes = dict(begun.clashes)

    def do(tasks: Sequence[BlockTask]) -> Iterator[list[KeptBlock]]:
        for some in crew.map(BlockWork, arguments, tasks):
            if isinstance(some, Exception):
                raise some
            for kept in some:
                originals.update(kept.originals)
                clashes.update(kept.clashes)
            yield some

    try:
        answer = answer_of(log, reader, (task.shown, name, aside), do, begun.findings)
    except WholeNeededError:
        ((answer,),) = crew.map(LogWork, arguments, [(replace(task, whole=True),)])
        return answer
    except OSError as why:
        tell_unreadable(task.path, task.shown, why, begun.findings)
        return LogAnswer(LogNote(task.shown), findings=begun.findings)
    answer.originals, answer.clashes = originals, clashes
    if answer.kept:
        aside.put(answer.kept, answer, [])
    return answer
