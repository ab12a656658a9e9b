"""What must be done to its end, though the user is impatient."""

from __future__ import annotations

from collections.abc import Callable


def despite_interruption(work: Callable[[], None]) -> None:
    """Do something to its end though it is interrupted once; the interruption goes on after it.

    Parameters
    ----------
    work : callable
        What is to be done; called anew where it was interrupted.

    Raises
    ------
    KeyboardInterrupt
        If it was interrupted.
    """
    try:
        work()
    except KeyboardInterrupt:
        work()
        raise
