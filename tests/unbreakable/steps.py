"""Every step of a build on the disk, counted, so that one of them can fail or be the last.

Python tells what it asks of the system by audit events; the few calls without an event are wrapped.
What is written by libraries is not seen here; small disks see to that.
"""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any
from unittest import mock

from etl.export import swapping

#: Audit events with the path that they are about first.
_EVENTS = {"open", "os.mkdir", "os.rename", "os.remove", "os.rmdir", "os.listdir", "os.scandir"}
_WRAPPED = (
    *((os, "fsync"), (os, "write"), (os, "ftruncate")),
    (swapping, "exchange"),
)

Step = Callable[[int, str], None]


class _Watch:
    """What is done at each step below a folder; nothing while nobody watches."""

    def __init__(self) -> None:
        self.folder = ""
        self.step: Step | None = None
        self.count = 0
        self.hooked = False

    def hook(self, event: str, arguments: tuple[Any, ...]) -> None:
        """Count an audit event if it is a step."""
        if self.step is None or event not in _EVENTS:
            return
        path = arguments[0]
        # What is removed within a folder that is open already is named without that folder.
        below = isinstance(path, str | bytes) and os.fsdecode(path).startswith(self.folder)
        if below or (event in ("os.remove", "os.rmdir") and not os.path.isabs(os.fsdecode(path))):  # noqa: PTH117
            self.take(f"{event} {path!r}")

    def take(self, name: str) -> None:
        """Count a step."""
        if self.step is not None:
            self.count += 1
            self.step(self.count, name)


_watch = _Watch()


@contextlib.contextmanager
def watched(folder: Path, step: Step) -> Iterator[None]:
    """Call a function at every step below a folder, with its number and name."""
    if not _watch.hooked:
        sys.addaudithook(_watch.hook)  # there is no way to take it away
        _watch.hooked = True
    with contextlib.ExitStack() as stack:
        for module, name in _WRAPPED:
            stack.enter_context(mock.patch.object(module, name, _counted(module, name)))
        _watch.folder, _watch.count, _watch.step = str(folder.resolve()), 0, step
        try:
            yield
        finally:
            _watch.step = None


def _counted(module: Any, name: str) -> Callable[..., Any]:
    """A call that is a step."""
    real = getattr(module, name)

    def call(*arguments: Any) -> Any:
        _watch.take(name)
        return real(*arguments)

    return call


def counted(folder: Path, work: Callable[[], object]) -> list[str]:
    """The steps that some work takes below a folder."""
    names: list[str] = []
    with watched(folder, lambda _, name: names.append(name)):
        work()
    return names
