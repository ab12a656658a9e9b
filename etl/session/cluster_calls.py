"""How a build speaks with a cluster: never for ever, and without others talking in between."""

from __future__ import annotations

import asyncio
import concurrent.futures
import contextlib
import logging
import threading
import time
from collections.abc import Callable, Iterator
from typing import Final, TypeVar

Given = TypeVar("Given")

#: How long an answer is awaited before interruptions are looked at.
_STEP_S: Final = 0.25
#: The libraries that write to the console unasked.
_TALKING: Final = ("distributed", "tornado")


def within(seconds: float, ask: Callable[[], Given]) -> Given:
    """What comes of a question to the cluster; nothing that does not answer holds a build up.

    The libraries have no limit of their own for all that may hang, and on Windows nothing
    interrupts a wait without end.

    Parameters
    ----------
    seconds : float
        How long it may take.
    ask : callable
        Asks, in a thread of its own.

    Returns
    -------
    object
        What ``ask`` gives.

    Raises
    ------
    TimeoutError
        If it takes longer.
    """
    answer: concurrent.futures.Future[Given] = concurrent.futures.Future()

    def asking() -> None:
        try:
            answer.set_result(ask())
        except Exception as error:
            answer.set_exception(error)
        except BaseException as error:  # asyncio's way of saying that a connection is gone
            answer.set_exception(ConnectionError(f"called off: {type(error).__name__}"))

    threading.Thread(target=asking, daemon=True).start()
    end = time.monotonic() + seconds
    while not answer.done() and time.monotonic() < end:
        concurrent.futures.wait([answer], timeout=_STEP_S)
    return answer.result(timeout=0)


def knock(address: str, seconds: float) -> None:
    """See whether anything at an address speaks as the parts of a cluster do.

    Parameters
    ----------
    address : str
        Of a scheduler.
    seconds : float
        How long it may take to answer.

    Raises
    ------
    Exception
        Of many kinds, if there is no answer.
    """
    from distributed.comm.core import connect  # noqa: PLC0415  (few builds need it)
    from distributed.security import Security  # noqa: PLC0415

    async def knocking() -> None:
        keys = Security().get_connection_args("client")
        (await connect(address, timeout=seconds, **keys)).abort()

    asyncio.run(knocking())


@contextlib.contextmanager
def silence() -> Iterator[None]:
    """Have the libraries say nothing by themselves: what matters of it is in our messages."""
    names = [name for name in logging.root.manager.loggerDict if name.split(".")[0] in _TALKING]
    loggers = [logging.getLogger(name) for name in {*names, *_TALKING}]
    # Those without a level of their own have that of the ones above.
    before = [(one, one.level) for one in loggers if one.level or one.name in _TALKING]
    for one, _ in before:
        one.setLevel(logging.CRITICAL + 1)
    try:
        yield
    finally:
        for one, level in before:
            one.setLevel(level)
