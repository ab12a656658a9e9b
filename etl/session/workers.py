"""Worker processes that neither an interruption nor the death of their parent leaves behind."""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import signal
import sys
import threading
from collections.abc import Iterator
from multiprocessing import connection
from multiprocessing.context import SpawnContext, SpawnProcess
from typing import Any

#: How long a process that was killed may take to end.
_PATIENCE_S = 5.0
#: Ends a process that does not listen; on Windows every signal does.
_AT_ONCE: signal.Signals = getattr(signal, "SIGKILL", signal.SIGTERM)


class WorkerProcess(SpawnProcess):
    """A process that starts afresh, and that the keyboard cannot interrupt.

    An interruption from the keyboard reaches every process of a terminal; the parent alone answers
    it, and ends its workers.
    """

    def start(self) -> None:
        """Start the process."""
        with _interruptions_kept_from_children():
            super().start()


class WorkerContext(SpawnContext):
    """Makes worker processes for an executor, and knows them."""

    def __init__(self) -> None:
        super().__init__()
        self._made: list[WorkerProcess] = []

    def Process(self, *arguments: Any, **named: Any) -> WorkerProcess:  # type: ignore[override]  # noqa: N802
        """Make a process, as executors ask for it."""
        process = WorkerProcess(*arguments, **named)
        self._made.append(process)
        return process

    def kill(self) -> None:
        """End all processes at once, whatever they are at."""
        started = [process for process in self._made if process.pid is not None]
        for process in started:
            # One that has ended and was let go needs no killing.
            with contextlib.suppress(ValueError, OSError):
                process.kill()
        for process in started:
            with contextlib.suppress(ValueError, OSError):
                process.join(_PATIENCE_S)


def end_with_parent() -> None:
    """Have this process end when its parent ends, however that does."""
    # Where a worker was started by other means than those of this module.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is None:
        return
    sentinel = parent.sentinel

    def wait() -> None:
        connection.wait([sentinel])
        # Nobody waits for what this process does; its threads need not be asked.
        os.kill(os.getpid(), _AT_ONCE)

    threading.Thread(target=wait, name="end with parent", daemon=True).start()


if sys.platform == "win32":
    import ctypes

    @contextlib.contextmanager
    def _interruptions_kept_from_children() -> Iterator[None]:
        """Have processes that are started meanwhile ignore the keyboard, as they inherit it."""
        ctypes.windll.kernel32.SetConsoleCtrlHandler(None, True)  # noqa: FBT003
        try:
            yield
        finally:
            ctypes.windll.kernel32.SetConsoleCtrlHandler(None, False)  # noqa: FBT003
else:
    from multiprocessing import resource_tracker

    @contextlib.contextmanager
    def _interruptions_kept_from_children() -> Iterator[None]:
        """Have processes that are started meanwhile hold back the keyboard, as they inherit it.

        What arrives meanwhile reaches this process afterwards.
        """
        # Its own start would undo what follows.
        resource_tracker.ensure_running()
        before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
        try:
            yield
        finally:
            signal.pthread_sigmask(signal.SIG_SETMASK, before)
