"""Where the command begins: before the libraries are loaded, so that it can be interrupted then."""

from __future__ import annotations

import signal
import sys

_SIGNALLED = 128


def main() -> None:
    """Load the command and run it."""
    try:
        from etl.cli import main as command  # noqa: PLC0415  (see above)
    except KeyboardInterrupt:
        sys.stderr.write("interrupted\n")
        sys.exit(_SIGNALLED + signal.SIGINT)
    command()
