"""A Dask cluster of real processes on this computer, whose workers can be held in their work."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from types import TracebackType

#: How long anything may take that is sure to come, on however slow a machine.
PATIENCE_S = 300.0

#: What every worker of the tests does before it begins: with a file named hold in its folder, it
#: tells which process has a task, and waits until that file is gone.
_HOLDING = """
import os, time
from pathlib import Path
from etl.session import cluster_work
real = cluster_work.do_task
folder = Path(os.environ["TRIALWRIGHT_TEST_FOLDER"])
def do_task(stage, task):
    with (folder / f"did.{os.getpid()}").open("a") as file:
        file.write(f"{stage.name}\\n")
    while (folder / "hold").exists():
        (folder / f"held.{os.getpid()}").touch()
        time.sleep(0.02)
    return real(stage, task)
cluster_work.do_task = do_task
"""
_WORKER = """
from distributed.cli.dask_worker import main
main()
"""


def until(true: Callable[[], object]) -> None:
    """Wait until something holds."""
    end = time.monotonic() + PATIENCE_S
    while not true():
        assert time.monotonic() < end, "this never came"
        time.sleep(0.02)


class LocalCluster:
    """A scheduler and workers, processes of their own.

    Parameters
    ----------
    folder : Path
        For their files.
    workers : int
        How many to begin with.
    prologue : str
        What these do before they begin, in Python.
    settings : str
        Settings of the scheduler and the workers, as Dask reads them from the environment.
    """

    def __init__(self, folder: Path, workers: int = 2, prologue: str = "", **settings: str) -> None:
        self.folder = folder
        self._environment = {
            **os.environ,
            **settings,
            "TRIALWRIGHT_TEST_FOLDER": str(folder),
            "PYTHONPATH": os.getcwd(),  # noqa: PTH109
        }
        self.processes: dict[int, subprocess.Popen[bytes]] = {}
        folder.mkdir()
        (folder / "elsewhere").mkdir()
        told = folder / "scheduler.json"
        scheduler = ["-m", "distributed.cli.dask_scheduler", "--port", "0", "--no-dashboard"]
        try:
            self.scheduler = self._start(*scheduler, "--scheduler-file", told, log="scheduler")
            until(lambda: told.exists() and told.read_bytes().endswith(b"}"))
            self.address: str = json.loads(told.read_text(encoding="utf-8"))["address"]
            for _ in range(workers):
                self.add_worker(prologue)
            until(lambda: len(self.workers_there()) == workers)
        except BaseException:
            self.close()
            raise

    def add_worker(self, prologue: str = "") -> int:
        """Start a worker; gives the number of its process."""
        code = _HOLDING + prologue + _WORKER
        # A place of its own, so that no path means the same by accident.
        options = ["--nthreads", "1", "--no-nanny", "--no-dashboard", "--local-directory"]
        number = len(self.processes)
        return self._start(
            *("-c", code, self.address, *options, self.folder / "elsewhere"), log=f"worker{number}"
        )

    def _start(self, *arguments: object, log: str) -> int:
        with (self.folder / f"{log}.log").open("wb") as file:
            process = subprocess.Popen(
                [sys.executable, *map(str, arguments), "--host", "127.0.0.1"],
                cwd=self.folder / "elsewhere",
                env=self._environment,
                stdin=subprocess.DEVNULL,
                stdout=file,
                stderr=subprocess.STDOUT,
            )
        self.processes[process.pid] = process
        return process.pid

    def workers_there(self) -> list[str]:
        """The workers that the scheduler knows."""
        from distributed import Client  # noqa: PLC0415  (there need not be one)

        with Client(self.address, set_as_default=False, timeout=PATIENCE_S) as client:
            return list(client.nthreads())

    def left(self) -> list[str]:
        """What of anybody's work the scheduler still knows."""
        from distributed import Client  # noqa: PLC0415  (as above)

        with Client(self.address, set_as_default=False, timeout=PATIENCE_S) as client:
            found: list[str] = client.run_on_scheduler(
                lambda dask_scheduler: [str(key) for key in dask_scheduler.tasks]
            )
            return found

    def hold(self) -> None:
        """Have workers wait in the task that they begin next."""
        (self.folder / "hold").touch()

    def release(self) -> None:
        """Let them go on."""
        (self.folder / "hold").unlink()

    def held(self) -> list[int]:
        """The processes that wait in a task, or did."""
        return self._numbers("held")

    def did(self) -> list[int]:
        """The processes that have begun a task."""
        return self._numbers("did")

    def _numbers(self, kind: str) -> list[int]:
        return [int(path.suffix[1:]) for path in self.folder.glob(f"{kind}.*")]

    def kill(self, number: int) -> None:
        """End a process at once."""
        self.processes[number].kill()
        self.processes[number].wait()

    def close(self) -> None:
        """End all processes."""
        for number in self.processes:
            self.kill(number)

    def __enter__(self) -> LocalCluster:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()
