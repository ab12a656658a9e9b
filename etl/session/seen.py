"""Which trials a log shows, found from its runs of rows."""

from __future__ import annotations

import numpy as np

from etl.errors import Findings
from etl.files import group_rows
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
    return trial_runs(log).once((shown,), findings)


def trial_runs(log: CanonicalLog) -> SeenTrials:
    """The runs of rows of one trial, each with the facts that stand in its first row.

    Parameters
    ----------
    log : CanonicalLog
        The fixations of one log, or of a part of it.

    Returns
    -------
    SeenTrials
        In the order of the log; a trial that comes again is there again.
    """
    changes = np.zeros(len(log), dtype=bool)
    changes[:1] = True
    for coded in (*log.ids.values(), *log.facts.values()):
        changes[1:] |= coded.codes[1:] != coded.codes[:-1]
    rows = np.flatnonzero(changes)
    return SeenTrials(
        {name: column.take(rows) for name, column in log.ids.items()},
        {name: column.take(rows) for name, column in log.facts.items()},
        np.zeros(len(rows), dtype=np.int32),
        log.source_line[rows],
    )


def distinct_runs(runs: SeenTrials) -> SeenTrials:
    """The first of all runs that are alike in everything.

    Parameters
    ----------
    runs : SeenTrials
        From :func:`trial_runs`.

    Returns
    -------
    SeenTrials
        Enough to tell what varies within a trial, and where first.
    """
    if not len(runs):
        return runs
    first, _ = group_rows([*runs.ids.values(), *runs.facts.values()])
    return runs.take(np.sort(first))
