"""The command ``build`` in a process that says how far it is, and may die at a step.

``python -m tests.unbreakable.disturbed STUDY INTO --workers N`` prints ``begin`` when the command
begins, ``settle`` when all is written and only publishing is left, and ``end``.
"""

from __future__ import annotations

import argparse
import os
import shutil
import signal
import sys
from collections.abc import Callable
from pathlib import Path

from etl.cli import main
from etl.export import publish, swapping
from tests.unbreakable.steps import watched


def run() -> None:
    """Build as told on the command line."""
    parser = argparse.ArgumentParser()
    parser.add_argument("study", type=Path)
    parser.add_argument("into", type=Path)
    parser.add_argument("--workers", type=int, default=1)
    parser.add_argument("--die-at", type=int, default=0, help="the step at which to die")
    parser.add_argument("--no-exchange", action="store_true", help="as on other systems")
    parser.add_argument("--fault", choices=["copied", "emptied"], help="a fault to be found")
    asked = parser.parse_args()
    if asked.no_exchange:
        swapping.exchange = lambda *_: False
    if asked.fault == "copied":
        publish.replace_folder = copied
    elif asked.fault == "emptied":
        publish.replace_folder = emptied
    settle = publish.to_disk

    def told(folder: Path) -> None:
        say("settle")
        settle(folder)

    publish.to_disk = told
    command = ["build", str(asked.study), "--into", str(asked.into), "--quiet"]
    command += ["--workers", str(asked.workers)]

    def step(number: int, _: str) -> None:
        if number == asked.die_at:
            os.kill(os.getpid(), signal.SIGKILL)

    say("begin")
    with watched(asked.into.parent, step):
        status = main(command, prog_name="trialwright", standalone_mode=False)
    say("end")
    sys.exit(status or 0)


def say(word: str) -> None:
    """Tell whoever started this process."""
    sys.stdout.write(f"{word}\n")
    sys.stdout.flush()


def copied(fresh: Path, target: Path, aside: Path, keep: Callable[[Path], None]) -> None:
    """Publish file by file: a fault that a kill must bring to light."""
    del aside, keep
    shutil.copytree(fresh, target, dirs_exist_ok=True)


def emptied(fresh: Path, target: Path, aside: Path, keep: Callable[[Path], None]) -> None:
    """Remove the earlier build before the new one is in place: another such fault."""
    del aside, keep
    shutil.rmtree(target)
    fresh.replace(target)


if __name__ == "__main__":
    run()
