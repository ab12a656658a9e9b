"""The command ``build`` in a process that says how far it is, and may die at a step.

``python -m tests.unbreakable.disturbed STUDY INTO --workers N`` prints ``begin`` when the command
begins, ``settle`` when all is written and only publishing is left, ``swap`` when the new folder is
put in place, and ``end`` if all went well, each with the number of steps on the disk so far.
"""

from __future__ import annotations

import argparse
import os
import shutil
import signal
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

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
    faults = {"copied": copied, "emptied": emptied}
    settle, swap = publish.to_disk, faults.get(asked.fault, publish.replace_folder)
    steps = [0]

    def say(word: str) -> None:
        sys.stdout.write(f"{word} {steps[0]}\n")
        sys.stdout.flush()

    def settling(folder: Path) -> None:
        say("settle")
        settle(folder)

    def swapping_folders(*folders: Any) -> None:
        say("swap")
        swap(*folders)

    publish.to_disk, publish.replace_folder = settling, swapping_folders
    command = ["build", str(asked.study), "--into", str(asked.into), "--quiet"]
    command += ["--workers", str(asked.workers)]

    def step(number: int, _: str) -> None:
        steps[0] = number
        if number == asked.die_at:
            os.kill(os.getpid(), signal.SIGKILL)

    say("begin")
    with watched(asked.into.parent, step):
        status = main(command, prog_name="trialwright", standalone_mode=False)
    if not status:
        say("end")
    sys.exit(status or 0)


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
