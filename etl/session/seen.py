"""Which trials a log shows, found from its runs of rows."""

from __future__ import annotations

import numpy as np

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
    found: dict[tuple[str, str, str], SeenTrial] = {}

    def text(coded: Coded | None, row: int) -> str:
        return "" if coded is None else coded.text(row)

    ids = [log.ids.get(name) for name in ("participant", "session", "trial", "item")]
    for row in np.flatnonzero(changes).tolist():
        participant, session, trial, item = (text(coded, row) for coded in ids)
        facts = tuple(coded.text(row) for coded in log.facts.values())
        line = int(log.source_line[row])
        seen = SeenTrial(participant, session, trial, item, facts, shown, line)
        known = found.setdefault((participant, session, trial), seen)
        if known is not seen and (known.item, known.facts) != (item, facts):
            tell_variation(known, seen, tuple(log.facts), findings)
    return list(found.values())


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
                found=text,
                expected=f'"{before[name]}" as in {known.shown}:{known.line}, for trial '
                f"{seen.trial} of reader {seen.participant}",
                fix="correct the cells; if these are two trials, number them apart or name a "
                "session column",
            )
