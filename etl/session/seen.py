"""Which trials a log shows, found from its runs of rows."""

from __future__ import annotations

import numpy as np

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.trials import SeenTrials


def seen_trials(log: CanonicalLog, shown: str, findings: Findings) -> SeenTrials:
    """List the trials of a log, each with its item and the facts that stand in the log.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log.
    shown : str
        Its name for messages.
    findings : Findings
        Where a fact that varies within a trial is recorded.

    Returns
    -------
    SeenTrials
        In order of first appearance, all of log 0.
    """
    changes = np.zeros(len(log), dtype=bool)
    changes[:1] = True
    for coded in (*log.ids.values(), *log.facts.values()):
        changes[1:] |= coded.codes[1:] != coded.codes[:-1]
    rows = np.flatnonzero(changes)
    runs = SeenTrials(
        {name: column.take(rows) for name, column in log.ids.items()},
        {name: column.take(rows) for name, column in log.facts.items()},
        np.zeros(len(rows), dtype=np.int32),
        log.source_line[rows],
    )
    return runs.once((shown,), findings)
