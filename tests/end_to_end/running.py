"""The command run as a user runs it: as a process of its own, its streams apart."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

#: What marks a colour or a move of the cursor on a terminal.
ESCAPE = "\x1b["


@dataclass(frozen=True)
class Ran:
    """What a command said, and its exit status."""

    status: int
    out: str
    err: str


def command(*arguments: object) -> list[str]:
    """The command line of the program in this Python."""
    return [sys.executable, "-m", "etl.cli", *map(str, arguments)]


def environment(**changes: str) -> Mapping[str, str]:
    """The tests' own environment with UTF-8 streams and nothing that decides about colours."""
    decided = ("NO_COLOR", "FORCE_COLOR", "COLUMNS", "TTY_COMPATIBLE", "TTY_INTERACTIVE")
    rest = {name: value for name, value in os.environ.items() if name not in decided}
    return {**rest, "PYTHONUTF8": "1", "TERM": "xterm-256color", **changes}


def run(*arguments: object, folder: Path | None = None) -> Ran:
    """Run the command in a folder (by default that of the tests) with streams that are pipes."""
    done = subprocess.run(
        command(*arguments),
        cwd=folder,
        env=environment(**({"PYTHONPATH": os.getcwd()} if folder else {})),  # noqa: PTH109
        capture_output=True,
        check=False,
        timeout=120,
    )
    newline = os.linesep
    out, err = (
        stream.decode("utf-8").replace(newline, "\n") for stream in (done.stdout, done.stderr)
    )
    return Ran(done.returncode, out, err)


def on_terminal(*arguments: object, **changes: str) -> Ran:
    """Run the command with stderr on a terminal and stdout in a pipe (POSIX only)."""
    import pty  # noqa: PLC0415  (there is none on Windows)

    ours, theirs = pty.openpty()
    process = subprocess.Popen(
        command(*arguments),
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=theirs,
        env=environment(**changes),
    )
    os.close(theirs)
    shown = bytearray()
    while True:
        try:
            part = os.read(ours, 65536)
        except OSError:
            # On Linux a terminal that nobody holds any more ends with an error, not with nothing.
            break
        if not part:
            break
        shown += part
    os.close(ours)
    assert process.stdout is not None
    with process.stdout:
        out = process.stdout.read()
    return Ran(process.wait(timeout=120), out.decode("utf-8"), shown.decode("utf-8"))
