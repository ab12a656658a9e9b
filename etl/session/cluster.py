"""A crew of the workers of a Dask cluster, for builds that are too large for one computer.

The cluster does the tasks; files go the way they go on one computer, through the folder in which
the build works, which is why all workers must share the file system. Workers may come and go. A
task of a worker that is lost is done again by another; nothing else is ever done twice.
"""

from __future__ import annotations

import contextlib
import pickle
import threading
import time
import uuid
import warnings
from collections import deque
from collections.abc import Iterable, Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, NoReturn, TypeVar

from etl.errors import ClusterError, Findings
from etl.session.block_logs import BlockTask
from etl.session.cluster_calls import knock, silence, within
from etl.session.cluster_work import MARK, Raised, Site, Unfit, looked, versions, work
from etl.session.crew import Make, StageFiles, forget
from etl.session.reader_groups import GroupTask
from etl.session.work import LogTask

if TYPE_CHECKING:
    from distributed import Client, Future

Task = TypeVar("Task")
Answer = TypeVar("Answer")

#: How long the scheduler may take to answer, and the first worker to be there.
_CONNECT_S: Final = 10.0
#: How long an answer is awaited before interruptions are looked at, and the cluster.
_STEP_S: Final = 0.25
_LOOK_AFTER_S: Final = 2.0
#: How long a cluster may have no worker in the middle of a build: those that ended may be started
#: again by what looks after them.
_NO_WORKER_S: Final = 60.0
#: How long an answer may take on its way; each time that it does not come, twice as long.
_FETCH_S: Final = 15.0
#: How long the scheduler and the workers may take to answer a question; they may be busy.
_ANSWER_S: Final = 120.0
#: How long each step of saying goodbye may take.
_GOODBYE_S: Final = 1.0
#: Tasks that are under way, or done and waiting to be taken, for each worker, as on one computer.
_UNDER_WAY: Final = 4
#: Of how many folders with files of the study workers are asked whether they see them.
_FOLDERS_ASKED: Final = 20
_NAMES_TOLD: Final = 5


class Cluster:
    """The workers of a Dask cluster.

    Parameters
    ----------
    address : str
        Of its scheduler.
    folder : Path
        Where the build works.
    files : iterable of Path
        Files of the study, which the workers must be able to read.
    names : mapping of str to str
        What names that stand for others are turned back into in messages.

    Raises
    ------
    ClusterError
        If there is no such cluster, or one of its workers cannot work for this build.
    """

    def __init__(
        self, address: str, folder: Path, files: Iterable[Path], names: Mapping[str, str]
    ) -> None:
        self._address = address
        self._folder = folder
        self._names = names
        self._token = uuid.uuid4().hex
        self._stages = StageFiles(folder)
        self._sent = 0
        self._count = 0
        self._looked_after = self._last_worker = time.monotonic()
        (folder / MARK).write_text(self._token, encoding="ascii")
        site = Site(folder, self._token, _asked_for(files), versions())
        self._site = pickle.dumps(site, protocol=pickle.HIGHEST_PROTOCOL)
        self._quiet = contextlib.ExitStack()
        try:
            self._client = self._connected()
        except BaseException:
            self._quiet.close()
            raise
        try:
            self._ask_all()
        except BaseException:
            self.close()
            raise

    @property
    def workers(self) -> int:
        """How many work side by side; never 1, since none of them is this process."""
        return max(2, self._count)

    def map(
        self, make: Make[Task, Answer], arguments: tuple[Any, ...], tasks: Iterable[Task]
    ) -> Iterator[Answer]:
        """Answers in the order of the tasks, as in :class:`etl.session.crew.Crew`."""
        return self._answers(self._stages.put(make, arguments), tasks)

    def close(self) -> None:
        """Leave the cluster as it was; what it is still at goes nowhere."""
        with contextlib.suppress(Exception):
            within(_GOODBYE_S, lambda: self._client.run(forget, self._folder, on_error="ignore"))
        with contextlib.suppress(Exception):
            within(_GOODBYE_S, lambda: self._client.close(timeout=_GOODBYE_S))
        self._quiet.close()
        # A worker that nobody could stop may still be writing here. Under another name the folder
        # is out of its reach, and whoever removes it finds nothing new in it. On Windows an open
        # file keeps the name.
        with contextlib.suppress(OSError):
            self._folder.replace(self._folder.with_name(f"{self._folder.name}-over"))

    def _connected(self) -> Client:
        """The connection to the scheduler."""
        try:
            from distributed import Client  # noqa: PLC0415  (takes a second that few builds need)
        except ImportError as missing:
            self._refuse(
                f"what speaks to clusters is not installed ({missing})",
                fix='install it with: pip install "trialwright[cluster]"',
                why=missing,
            )
        self._quiet.enter_context(silence())
        try:
            with warnings.catch_warnings():
                # Versions are compared below, and told once.
                warnings.simplefilter("ignore")
                # A client that does not come about talks while it goes; so we knock first.
                within(2 * _CONNECT_S, lambda: knock(self._address, _CONNECT_S))
                return within(
                    2 * _CONNECT_S,
                    lambda: Client(
                        self._address, timeout=_CONNECT_S, set_as_default=False, name="trialwright"
                    ),
                )
        except Exception as why:
            self._refuse(
                f"no Dask scheduler answers here ({_short(why)})",
                expected="the address of one that runs, such as tcp://node1:8786",
                fix="see that it runs, that this computer may reach it, and that both or neither "
                "use TLS",
                why=why,
            )

    def _ask_all(self) -> None:
        """Ask the scheduler and every worker whether they can work for this build."""
        try:
            within(_ANSWER_S, lambda: self._client.run_on_scheduler(versions))
        except Exception as why:
            self._refuse(
                f"the scheduler cannot load trialwright ({_short(why)})",
                expected="the same installation for scheduler, workers and this computer",
                fix="install the same versions there, and start the scheduler again",
                why=why,
            )
        try:
            within(_ANSWER_S, lambda: self._client.wait_for_workers(1, timeout=_CONNECT_S))
            answers: dict[str, object] = within(
                _ANSWER_S, lambda: self._client.run(looked, self._site, on_error="return")
            )
            there = self._there()
        except ClusterError:
            raise
        except Exception as why:
            if isinstance(why, TimeoutError) and not self._there():
                self._refuse(
                    "the cluster has no worker",
                    expected="one or more",
                    fix=f"start workers, for instance: dask worker --nthreads 1 {self._address}",
                    why=why,
                )
            self._lost(why)
        unfit = [
            _unfit(address, answer)
            for address, answer in answers.items()
            # A worker that has left since then need not answer.
            if answer is not None and (isinstance(answer, Unfit) or address in there)
        ]
        if unfit:
            self._refuse_unfit(unfit)
        self._count = len(there)

    def _answers(self, stage: Path, tasks: Iterable[Task]) -> Iterator[Any]:
        waiting: deque[tuple[Future[Any], Task]] = deque()
        try:
            for task in tasks:
                waiting.append((self._submit(stage, task), task))
                if len(waiting) >= _UNDER_WAY * self.workers:
                    yield self._taken(*waiting.popleft())
            while waiting:
                yield self._taken(*waiting.popleft())
        finally:
            with contextlib.suppress(Exception):
                if waiting:
                    within(
                        _GOODBYE_S,
                        lambda: self._client.cancel([future for future, _ in waiting]),
                    )

    def _submit(self, stage: Path, task: object) -> Future[Any]:
        """Set the cluster to a task, under a key that no other build has."""
        self._sent += 1
        data = pickle.dumps(task, protocol=pickle.HIGHEST_PROTOCOL)
        key = f"trialwright-{self._token}-{self._sent}"
        try:
            return self._client.submit(work, self._site, stage, data, key=key)
        except Exception as why:
            self._lost(why)

    def _taken(self, future: Future[Any], task: object) -> Any:
        """The answer to a task, which the cluster may then forget."""
        done = threading.Event()
        future.add_done_callback(lambda _: done.set())
        while not done.wait(_STEP_S):
            self._look_after()
        answer = self._fetched(future, task)
        if isinstance(answer, Unfit):
            self._refuse_unfit([answer])
        if isinstance(answer, Raised):
            raise answer.error
        return answer

    def _fetched(self, future: Future[Any], task: object) -> Any:
        from distributed import CancelledError, KilledWorker  # noqa: PLC0415  (as above)

        patience = _FETCH_S
        while True:
            try:
                return future.result(timeout=patience)
            except TimeoutError as why:
                if future.status == "error":
                    self._lost(why)
                # Where the worker that has the answer is lost, the task is done again.
                self._look_after()
                patience *= 2
            except KilledWorker as why:
                self._refuse(
                    f"{why.allowed_failures + 1} workers ended one after the other while they had "
                    f"{_called(task)}",
                    fix="see what their logs say. Most often memory is too small: start workers "
                    "with more of it for each process",
                    why=why,
                )
            except CancelledError as why:
                self._lost(why)
            except Exception as why:
                self._lost(why)

    def _look_after(self) -> None:
        """See now and then whether the cluster is still there."""
        now = time.monotonic()
        if now - self._looked_after < _LOOK_AFTER_S:
            return
        count = len(self._there())
        self._looked_after = time.monotonic()
        if count:
            self._count, self._last_worker = count, self._looked_after
        elif self._looked_after - self._last_worker > _NO_WORKER_S:
            self._refuse(
                "all workers of the cluster have gone",
                expected="one or more",
                fix="see why in their logs, start workers, and build again",
            )

    def _there(self) -> Mapping[str, int]:
        """The workers by address, with the threads of each."""
        try:
            there: Mapping[str, int] = within(_ANSWER_S, self._client.nthreads)
        except Exception as why:
            self._lost(why)
        return there

    def _refuse_unfit(self, unfit: Iterable[Unfit]) -> NoReturn:
        """Say which workers cannot work for this build, those with the same problem at once."""
        alike: dict[tuple[str, str], list[Unfit]] = {}
        for one in unfit:
            alike.setdefault((one.problem, one.found), []).append(one)
        findings = Findings(names=self._names)
        for same in alike.values():
            one = same[0]
            more = f" and {len(same) - 1} more" if len(same) > 1 else ""
            findings.error(
                f"{one.problem}: {one.found}",
                path=self._address,
                where=f"{one.worker}{more}",
                expected=one.expected,
                fix=one.fix,
            )
        raise ClusterError(findings)

    def _lost(self, why: BaseException) -> NoReturn:
        self._refuse(
            f"the connection to the cluster was lost, or what it should do was called off "
            f"({_short(why)})",
            fix="see whether the scheduler runs and what its log says, and build again",
            why=why,
        )

    def _refuse(
        self, problem: str, *, expected: str = "", fix: str, why: BaseException | None = None
    ) -> NoReturn:
        findings = Findings(names=self._names)
        findings.error(problem, path=self._address, expected=expected, fix=fix)
        raise ClusterError(findings) from why


def _unfit(address: str, answer: object) -> Unfit:
    """What is wrong with a worker that did not answer as it should."""
    if isinstance(answer, Unfit):
        return answer
    loading = isinstance(answer, ImportError | AttributeError)
    return Unfit(
        f"worker {address}",
        "the worker cannot load trialwright, or loads another version"
        if loading
        else "the worker does not answer as it should",
        _short(answer),
        "the same installation for scheduler, workers and this computer",
        "install the same versions there, and start the worker again",
    )


def _asked_for(files: Iterable[Path]) -> tuple[tuple[Path, int], ...]:
    """Of files and folders that are there, the first of each of some folders, with its size."""
    asked: dict[Path, tuple[Path, int]] = {}
    for path in files:
        if len(asked) >= _FOLDERS_ASKED:
            break
        folder = path.parent
        if folder not in asked or path.is_dir():
            with contextlib.suppress(OSError):  # told of where it is read
                size = -1 if path.is_dir() else path.stat().st_size
                asked[path if size < 0 else folder] = (path, size)
    return tuple(asked.values())


def _called(task: object) -> str:
    """A task in words."""
    logs = [one for one in task if isinstance(one, LogTask)] if isinstance(task, tuple) else []
    if logs:
        return _listed("log", [log.shown for log in logs])
    if isinstance(task, BlockTask):
        return f"a part of the log {task.log.survey.path}"
    if isinstance(task, GroupTask):
        return _listed("reader", [reader.participant for reader in task.readers])
    return "a part of the finished tables"


def _listed(kind: str, names: list[str]) -> str:
    """Some of some names."""
    more = len(names) - _NAMES_TOLD
    told = ", ".join(names[:_NAMES_TOLD]) + (f" and {more} more" if more > 0 else "")
    return f"the {kind}{'s' if len(names) > 1 else ''} {told}"


def _short(why: object) -> str:
    """An error of others in a line."""
    text = " ".join(str(why).split())
    if isinstance(why, TimeoutError) and not text:
        return "it did not answer in time"
    return f"{type(why).__name__}: {text[:200]}"
