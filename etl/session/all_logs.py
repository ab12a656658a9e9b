"""The reading of all logs of a study."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import suppress
from pathlib import Path
from typing import Final

from etl.parsers import LogReader
from etl.pseudonyms import Pseudonyms
from etl.session.crew import Crew, Progress
from etl.session.kept_logs import Aside
from etl.session.seen import Sharing
from etl.session.shared_logs import share_log
from etl.session.work import LogAnswer, LogTask, LogWork

#: Small logs are read together until they have so many bytes, so that handing them over counts for
#: little; but every worker gets that many turns, if there are as many logs.
_TOGETHER_BYTES: Final = 2_000_000
_TURNS: Final = 8


def read_logs(
    logs: tuple[tuple[Path, str], ...],
    reader: LogReader,
    aside: Aside,
    crew: Crew,
    progress: Progress,
    pseudonyms: Pseudonyms | None = None,
) -> list[LogAnswer]:
    """Read all logs and put their fixations aside.

    Parameters
    ----------
    logs : tuple of (Path, str)
        The logs, and their names for messages.
    reader : LogReader
        How they are read.
    aside : Aside
        Where their fixations are put aside.
    crew : Crew
        Does the work.
    progress : callable
        Told how many logs are read.
    pseudonyms : Pseudonyms, optional
        The very ones of the reader.

    Returns
    -------
    list of LogAnswer
        In the order of the logs.
    """
    share = crew.workers > 1
    tasks = [LogTask(path, shown, place, share) for place, (path, shown) in enumerate(logs)]
    arguments = (reader, aside, pseudonyms)
    answers: list[LogAnswer] = []
    sharing = Sharing()
    for some in crew.map(LogWork, arguments, _together(tasks, crew.workers)):
        for answer in some:
            answer.note = sharing.note(answer.note)
            if answer.trials is not None:
                answer.trials = sharing.trials(answer.trials)
            answers.append(answer)
        progress("reading logs", len(answers), len(tasks))
    for number, answer in enumerate(answers):
        if answer.begun is not None:
            answers[number] = share_log(tasks[number], answer, crew, arguments)
    return answers


def _together(tasks: Sequence[LogTask], workers: int) -> Iterator[tuple[LogTask, ...]]:
    """Logs that are handed over together."""
    sizes = []
    for task in tasks:
        sizes.append(0)
        with suppress(OSError):  # a log that is gone is told of when it is read
            sizes[-1] = task.path.stat().st_size
    most = min(_TOGETHER_BYTES, sum(sizes) // (workers * _TURNS))
    some: list[LogTask] = []
    held = 0
    for task, size in zip(tasks, sizes, strict=True):
        some.append(task)
        held += size
        if held >= most:
            yield tuple(some)
            some, held = [], 0
    if some:
        yield tuple(some)
