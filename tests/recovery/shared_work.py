"""Pieces of work done once, whichever of several test processes comes to them first."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Mapping
from pathlib import Path

import pytest

#: How long to wait for what another process does, in seconds.
PATIENCE_S = 900.0
#: How often to look, in seconds.
PAUSE_S = 0.1


def shared_folder(factory: pytest.TempPathFactory, name: str) -> Path:
    """A folder that all processes of one test run have in common."""
    base = factory.getbasetemp()
    # With pytest-xdist each worker has a folder of its own within that of the run.
    if "PYTEST_XDIST_WORKER" in os.environ:
        base = base.parent
    folder = base / name
    folder.mkdir(exist_ok=True)
    return folder


def share(folder: Path, work: Mapping[str, Callable[[], None]]) -> None:
    """Do what nobody has begun, and wait for what others have.

    Parameters
    ----------
    folder : Path
        Where it is noted what was begun and done.
    work : mapping of str to callable
        Names of pieces, and what does them; the same in all processes.

    Raises
    ------
    RuntimeError
        If another process failed at a piece, or does not come to an end.
    """
    for name, do in work.items():
        try:
            # Of several processes that make a folder one succeeds, on every system.
            (folder / f"{name}.begun").mkdir()
        except FileExistsError:
            continue
        try:
            do()
        except BaseException as failure:
            note(folder / f"{name}.done", f"{type(failure).__name__}: {failure}")
            raise
        note(folder / f"{name}.done", "")
    until = time.monotonic() + PATIENCE_S
    for name in work:
        done = folder / f"{name}.done"
        while not done.exists():
            if time.monotonic() > until:
                raise RuntimeError(f"no end of {name} after {PATIENCE_S:.0f} seconds")
            time.sleep(PAUSE_S)
        if failure := done.read_text(encoding="utf-8"):
            raise RuntimeError(f"{name} failed: {failure}")


def note(path: Path, text: str) -> None:
    """Write a small file so that it is there as a whole or not at all."""
    part = path.with_suffix(".part")
    part.write_text(text, encoding="utf-8")
    part.replace(path)
