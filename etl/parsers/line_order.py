"""What is wrong with a log, told in the order of its lines."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

from etl.errors import Findings

Answer = TypeVar("Answer")


def in_line_order(read: Callable[[Findings], Answer | None], findings: Findings) -> Answer | None:
    """Read something; what is found on the way is recorded in the order of lines.

    Parameters
    ----------
    read : callable
        Reads it, and records in the findings that it is given.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    object or None
        What was read; None where an error was recorded.
    """
    own = Findings()
    answer = read(own)
    own.items.sort(key=lambda finding: finding.line or 0)
    findings.extend(own)
    return None if own.failed else answer
