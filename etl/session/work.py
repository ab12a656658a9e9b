"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

import multiprocessing
import signal
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ProcessPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeVar

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.parsers import LogReader
from etl.parsers.canonical import LogNote
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.bench import Bench
from etl.session.kept_logs import Shelf, keep_log
from etl.session.lines import NO_HAND, HandLines
from etl.session.log_figures import LogFigures, figures_of
from etl.session.reader import Options, ReaderTables
from etl.session.reader_group import group_of
from etl.session.seen import seen_trials
from etl.tables import TableDesign
from etl.trials import SeenTrials

Task = TypeVar("Task")
Answer = TypeVar("Answer")


@dataclass(frozen=True, slots=True)
class LogTask:
    """A log to be read and put aside."""

    path: Path
    shown: str
    kept: Path


@dataclass(slots=True)
class LogAnswer:
    """What a log holds."""

    note: LogNote
    batches: dict[str, int] = field(default_factory=dict)
    trials: SeenTrials | None = None
    figures: LogFigures | None = None
    findings: Findings = field(default_factory=Findings)
    #: Whose the pseudonyms are that this log added.
    originals: dict[str, str] = field(default_factory=dict)
    #: Those that stand for two.
    clashes: dict[str, tuple[str, str]] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class ReaderTask:
    """A reader to be finished: where the fixations lie, and what is known of the trials."""

    participant: str
    parts: tuple[tuple[Path, int], ...]
    files: tuple[int, ...]
    trials: TrialColumns
    note: str = ""
    hand: HandLines = NO_HAND
    corrections: str = ""


class LogWork:
    """Reads logs.

    Parameters
    ----------
    reader : LogReader
        How they are read.
    shelf : Shelf
        Where fixations may be put aside.
    pseudonyms : Pseudonyms or None
        The very ones of the reader, which know afterwards whose they gave.
    """

    def __init__(self, reader: LogReader, shelf: Shelf, pseudonyms: Pseudonyms | None) -> None:
        self._reader = reader
        self._shelf = shelf
        self._pseudonyms = pseudonyms

    def __call__(self, task: LogTask) -> LogAnswer:
        """Read one log and put its fixations aside."""
        if self._pseudonyms is None:
            return self._read(task)
        before = len(self._pseudonyms.originals)
        answer = self._read(task)
        answer.originals = self._pseudonyms.learnt_since(before)
        answer.clashes = dict(self._pseudonyms.clashes)
        return answer

    def _read(self, task: LogTask) -> LogAnswer:
        """Read one log and put its fixations aside."""
        findings = Findings()
        read = self._reader.read(task.path, task.shown, findings)
        if read is None:
            return LogAnswer(LogNote(task.shown), findings=findings)
        log, note = read
        trials = seen_trials(log, task.shown, findings)
        batches = keep_log(log, task.kept, self._shelf)
        # A recording of the eye that does not count holds no fixation to compare with others.
        figures = figures_of(log, len(batches), len(trials)) if len(log) else None
        return LogAnswer(note, batches, trials, figures, findings)


class ReaderWork:
    """Finishes readers.

    Parameters
    ----------
    bench : Bench
        The study's texts, tables and decisions.
    shelf : Shelf
        Where fixations may have been put aside.
    write : bool
        Whether rows are wanted; if not, only what is wrong with the reader's fixations.
    """

    def __init__(self, bench: Bench, shelf: Shelf, *, write: bool) -> None:
        self._bench = bench
        self._shelf = shelf
        self._write = write

    def __call__(self, task: ReaderTask) -> ReaderTables:
        """Finish one reader."""
        (tables,) = self._bench.tables(group_of([task], self._shelf), page=self._write).one_by_one()
        if not self._write:
            tables.batches = {}
        return tables


_work: Callable[[Any], Any] | None = None


def _begin(make: Callable[..., Callable[[Any], Any]], arguments: tuple[Any, ...]) -> None:
    """Set up a worker process once."""
    # An interruption from the keyboard reaches every process; the parent alone answers it.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    global _work  # noqa: PLW0603  (the one thing a worker process keeps between tasks)
    _work = make(*arguments)


def _do(task: Any) -> Any:
    """Do one task in a worker process."""
    assert _work is not None  # noqa: S101
    return _work(task)


def make_reader_work(
    design: TableDesign,
    library: RegionLibrary,
    options: Options,
    shelf: Shelf,
    write: bool = True,  # noqa: FBT001, FBT002  (handed over to processes by place)
) -> ReaderWork:
    """Set up the work on readers in whichever process."""
    return ReaderWork(Bench(design, library, options), shelf, write=write)


def map_tasks(
    make: Callable[..., Callable[[Task], Answer]],
    arguments: tuple[Any, ...],
    tasks: Sequence[Task],
    workers: int,
) -> Iterator[Answer]:
    """Answers in the order of the tasks, from this process or from worker processes.

    Parameters
    ----------
    make : callable
        Gives the function that does a task, from ``arguments``; called once in each process.
    arguments : tuple
        What ``make`` needs; pickled once for each worker.
    tasks : sequence
        The tasks.
    workers : int
        Number of processes; 1 works in this one.

    Yields
    ------
    answers
        One a task. At most four tasks a worker are under way or waiting to be taken, so that
        memory does not grow with the number of tasks.
    """
    if workers <= 1 or len(tasks) <= 1:
        work = make(*arguments)
        for task in tasks:
            yield work(task)
        return
    # Workers start afresh ("spawn") on every system, as they do on Windows and macOS.
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(
        min(workers, len(tasks)), context, initializer=_begin, initargs=(make, arguments)
    ) as pool:
        waiting: deque[Future[Answer]] = deque()
        try:
            for task in tasks:
                waiting.append(pool.submit(_do, task))
                if len(waiting) >= 4 * workers:
                    yield waiting.popleft().result()
            while waiting:
                yield waiting.popleft().result()
        finally:
            pool.shutdown(wait=True, cancel_futures=True)
