"""Who does the work: this process, processes of its own, or a cluster.

A stage is the function that does the tasks of one kind, with all that these have in common. It is
made ready once in each process, from a file that all of them can read; a task names the file. So
one crew does every stage of a build, and its processes are started once.
"""

from __future__ import annotations

import contextlib
import pickle
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Mapping
from concurrent.futures import Future, ProcessPoolExecutor
from pathlib import Path
from types import TracebackType
from typing import Any, Final, Protocol, TypeVar

from etl.session.kept_store import KeptStore
from etl.session.workers import WorkerContext, end_with_parent

Task = TypeVar("Task")
Answer = TypeVar("Answer")
Make = Callable[..., Callable[[Task], Answer]]
Progress = Callable[[str, int, int], None]
#: The last stage that a build tells of: it is in its place.
PUBLISHED: Final = "published"

#: Tasks that are under way, or done and waiting to be taken, for each worker: enough for none to
#: be idle, few enough for memory not to grow with the number of tasks.
_UNDER_WAY: Final = 4
#: How long an answer is awaited before interruptions are looked at.
_STEP_S: Final = 0.25
#: Stages that a process keeps ready.
_STAGES_READY: Final = 2


class Crew(Protocol):
    """Does tasks, and gives the answers in the order of the tasks."""

    @property
    def workers(self) -> int:
        """How many work side by side; 1 is this process."""

    def map(
        self, make: Make[Task, Answer], arguments: tuple[Any, ...], tasks: Iterable[Task]
    ) -> Iterator[Answer]:
        """Answers in the order of the tasks.

        Parameters
        ----------
        make : callable
            Gives the function that does a task, from ``arguments``; called once in each process.
        arguments : tuple
            What ``make`` needs.
        tasks : iterable
            The tasks, asked for as they are needed.

        Yields
        ------
        answers
            One a task.
        """


class Alone:
    """A crew of this process, which does one task after the other."""

    workers: Final = 1

    def map(
        self, make: Make[Task, Answer], arguments: tuple[Any, ...], tasks: Iterable[Task]
    ) -> Iterator[Answer]:
        """Answers in the order of the tasks, as in :class:`Crew`."""
        work = make(*arguments)
        for task in tasks:
            yield work(task)


class Processes:
    """Processes of its own on this machine.

    They start afresh ("spawn") on every system, as they do on Windows and macOS.

    Parameters
    ----------
    workers : int
        How many, 2 or more.
    folder : Path
        Where what stages have in common is put aside.
    """

    def __init__(self, workers: int, folder: Path) -> None:
        self.workers = workers
        self._stages = StageFiles(folder)
        self._context = WorkerContext()
        self._pool = ProcessPoolExecutor(workers, self._context, initializer=end_with_parent)

    def map(
        self, make: Make[Task, Answer], arguments: tuple[Any, ...], tasks: Iterable[Task]
    ) -> Iterator[Answer]:
        """Answers in the order of the tasks, as in :class:`Crew`."""
        stage = self._stages.put(make, arguments)
        return in_order(
            lambda task: self._pool.submit(do_task, stage, task), tasks, _UNDER_WAY * self.workers
        )

    def close(self) -> None:
        """End the processes when they have done what they are at."""
        self._pool.shutdown(wait=True, cancel_futures=True)

    def stop(self) -> None:
        """End the processes at once, whatever they are at: nobody wants their answers any more."""
        self._context.kill()
        self.close()

    def __enter__(self) -> Processes:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if kind is None:
            self.close()
        else:
            self.stop()


def in_order(
    submit: Callable[[Task], Future[Answer]], tasks: Iterable[Task], most: int
) -> Iterator[Answer]:
    """Answers in the order of the tasks, of which only some are under way.

    Parameters
    ----------
    submit : callable
        Sets a worker to a task.
    tasks : iterable
        The tasks.
    most : int
        How many may be under way, or done and waiting to be taken.

    Yields
    ------
    answers
        One a task. What has not begun is called off when the crew is let go, and not before: an
        executor whose processes are ended stumbles over what was called off one by one.
    """
    waiting: deque[Future[Answer]] = deque()
    for task in tasks:
        waiting.append(submit(task))
        if len(waiting) >= most:
            yield _answer(waiting.popleft())
    while waiting:
        yield _answer(waiting.popleft())


def _answer(future: Future[Answer]) -> Answer:
    """The answer to a task, awaited in steps: on Windows nothing interrupts a wait without end."""
    while not future.done():
        with contextlib.suppress(TimeoutError):  # the task's own is raised below
            return future.result(timeout=_STEP_S)
    return future.result()


class StageFiles:
    """What stages have in common, in files.

    Parameters
    ----------
    folder : Path
        Where they are; every process of the crew can read it.
    """

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        self._number = 0

    def put(self, make: Callable[..., Any], arguments: tuple[Any, ...]) -> Path:
        """Put a stage aside."""
        self._number += 1
        path = self._folder / f"stage{self._number}.pickle"
        with path.open("wb") as file:
            pickle.dump((make, arguments), file, protocol=pickle.HIGHEST_PROTOCOL)
        return path


_ready: dict[Path, Callable[[Any], Any]] = {}


def do_task(stage: Path, task: Any) -> Any:
    """Do one task in a worker process, which makes the stage ready if it is new to it.

    Parameters
    ----------
    stage : Path
        From :class:`StageFiles`.
    task : object
        The task.

    Returns
    -------
    object
        The answer.
    """
    if stage not in _ready:
        while len(_ready) >= _STAGES_READY:
            del _ready[next(iter(_ready))]
        with stage.open("rb") as file:
            # Written by the process that started this one, into a folder of its own.
            make, arguments = pickle.load(file)  # noqa: S301
        _ready[stage] = make(*arguments)
    return _ready[stage](task)


def forget(folder: Path) -> None:
    """Hold no longer what was made ready from stages in a folder.

    Parameters
    ----------
    folder : Path
        Of :class:`StageFiles`.
    """
    for stage in list(_ready):
        if stage.parent == folder:
            _ready.pop(stage, None)


class Room:
    """Where a build or check works, and with whom; what it hires is let go at the end.

    Parameters
    ----------
    folder : Path
        For what is put aside meanwhile.
    workers : int or None
        How many work side by side; None finds it out from the size of the logs.
    progress : callable
        Called with a stage's name, how much of it is done, and how much there is.
    kept : Path or None
        What earlier builds kept; None where nothing is kept.
    scheduler : str or None
        The address of the cluster that does the work, whatever ``workers`` says.
    """

    def __init__(
        self,
        folder: Path,
        workers: int | None,
        progress: Progress,
        kept: Path | None = None,
        scheduler: str | None = None,
    ) -> None:
        if workers is not None and workers < 1:
            raise ValueError(f"workers must be 1 or more, or None, not {workers}")
        self.folder = folder
        self.workers = workers
        self.progress = progress
        self.keep = kept is not None
        self.store = KeptStore(kept or folder / "earlier", folder)
        self._scheduler = scheduler
        self._hired = contextlib.ExitStack()

    def hire(
        self, workers: int, files: Iterable[Path] = (), names: Mapping[str, str] | None = None
    ) -> Crew:
        """A crew of so many; for 1 this process alone, unless there is a cluster.

        Parameters
        ----------
        workers : int
            How many.
        files : iterable of Path
            What the workers of a cluster must be able to read.
        names : mapping of str to str, optional
            What names that stand for others are turned back into in messages.

        Returns
        -------
        Crew
            Let go with the room.
        """
        if self._scheduler is not None:
            # Only a build that asks for a cluster loads what speaks to one.
            from etl.session.cluster import Cluster  # noqa: PLC0415

            seen = [*files, self.store.earlier]
            cluster = Cluster(self._scheduler, self.folder, seen, names or {})
            return self._hired.enter_context(contextlib.closing(cluster))
        if workers == 1:
            return Alone()
        return self._hired.enter_context(Processes(workers, self.folder))

    def __enter__(self) -> Room:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._hired.__exit__(kind, error, trace)


def silent(stage: str, done: int, total: int) -> None:
    """Show no progress."""
