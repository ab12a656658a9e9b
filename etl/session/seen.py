"""Which trials a log shows, found from its runs of rows."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog, Coded
from etl.trials import SeenTrial


def seen_trials(log: CanonicalLog, shown: str, findings: Findings) -> list[SeenTrial]:
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
    list of SeenTrial
        In order of first appearance.
    """
    columns = {**log.ids, **log.facts}
    changes = np.zeros(len(log), dtype=bool)
    changes[:1] = True
    for coded in columns.values():
        changes[1:] |= coded.codes[1:] != coded.codes[:-1]
    rows = np.flatnonzero(changes)
    ids = [_texts(log.ids.get(n), rows) for n in ("participant", "session", "trial", "item")]
    facts = [_texts(coded, rows) for coded in log.facts.values()]
    together = list(zip(*facts, strict=True)) if facts else [()] * len(rows)
    lines = log.source_line[rows].tolist()
    found: dict[tuple[str, str, str], SeenTrial] = {}
    for participant, session, trial, item, own, line in zip(*ids, together, lines, strict=True):
        key = (participant, session, trial)
        known = found.get(key)
        if known is None:
            found[key] = SeenTrial(participant, session, trial, item, own, shown, line)
        elif (known.item, known.facts) != (item, own):
            seen = SeenTrial(participant, session, trial, item, own, shown, line)
            tell_variation(known, seen, tuple(log.facts), findings)
    return list(found.values())


def _texts(coded: Coded | None, rows: NDArray[np.int64]) -> list[str]:
    """The texts of some rows, empty where missing."""
    if coded is None:
        return [""] * len(rows)
    values = (*coded.values, "")
    return [values[code] for code in coded.codes[rows].tolist()]


def tell_variation(
    known: SeenTrial, seen: SeenTrial, names: tuple[str, ...], findings: Findings
) -> None:
    """Record which fact differs between two places of the same trial."""
    before = dict(zip(("item", *names), (known.item, *known.facts), strict=True))
    now = dict(zip(("item", *names), (seen.item, *seen.facts), strict=True))
    for name, text in now.items():
        if text != before[name]:
            findings.error(
                f"{name} varies within a trial",
                path=seen.shown,
                line=seen.line,
                where=f'column "{name}"' if name in names else "logs.columns.item",
                found=text,
                expected=f'"{before[name]}" in all rows of trial {seen.trial} of reader '
                f"{seen.participant}, as in {known.shown}:{known.line}",
                fix="correct the cells; if these are two trials, number them apart or name a "
                "session column",
            )
