"""What is worth knowing about readers, trials and values although nothing is wrong with it."""

from __future__ import annotations

import re
from collections.abc import Sequence
from difflib import get_close_matches

import numpy as np

from etl.errors import Findings
from etl.parsers.canonical import LogNote
from etl.pseudonyms import Pseudonyms
from etl.report import NotRecorded
from etl.session.plan import Plan
from etl.session.pseudonym_record import in_order_of_readers, reader_columns
from etl.study import Study
from etl.trials import IDS, KnownTrials, SeenTrials

#: How many values are looked through for one that is near, and how many are listed.
_LOOKED_THROUGH, _LISTED = 1000, 12


def notice_values_asked_for(
    study: Study,
    logs: Sequence[LogNote],
    findings: Findings,
    pseudonyms: Pseudonyms | None = None,
) -> None:
    """Warn of values of ``[logs.where]`` that no log has; only to be asked where all were read.

    Parameters
    ----------
    study : Study
        As loaded.
    logs : sequence of LogNote
        What is told about each log.
    findings : Findings
        Where warnings are recorded.
    pseudonyms : Pseudonyms, optional
        By which readers go in the logs.
    """
    for name, values in study.logs.where.items():
        if pseudonyms is not None and name in reader_columns(study):
            values = tuple(map(pseudonyms.of_reader, values))
        occurring = list(dict.fromkeys(v for log in logs for v in log.asked.get(name, ())))
        for value in values:
            if value not in occurring:
                _warn_of_value(study, ("logs", "where", name), value, occurring, findings)


def _warn_of_value(
    study: Study,
    key: tuple[str, str, str],
    value: str,
    occurring: Sequence[str],
    findings: Findings,
) -> None:
    """Warn of a value in the study file that occurs nowhere."""
    near = get_close_matches(value, occurring[:_LOOKED_THROUGH], n=1)
    listed = ", ".join(occurring[:_LISTED]) + (" …" if len(occurring) > _LISTED else "")
    findings.warning(
        "no log has this value" if key[0] == "logs" else "no trial has this value",
        path=study.shown,
        line=study.line_of(*key),
        where=".".join(key),
        found=value,
        expected=f"one of {listed}" if listed else "a value that occurs",
        fix=f'did you mean "{near[0]}"?' if near else "correct the value, or remove it",
    )


def notice_similar_readers(
    seen: SeenTrials,
    shown: Sequence[str],
    findings: Findings,
    pseudonyms: Pseudonyms | None = None,
) -> None:
    """Warn of readers whose ids differ in letter case or leading zeros only.

    Parameters
    ----------
    seen : SeenTrials
        The trials that the logs show.
    shown : sequence of str
        The names of the logs.
    findings : Findings
        Where warnings are recorded.
    pseudonyms : Pseudonyms, optional
        What knows the ids, where readers go by pseudonyms.
    """
    readers = seen.ids["participant"]
    originals = {} if pseudonyms is None else pseudonyms.originals
    codes, first = np.unique(readers.codes, return_index=True)
    earlier: dict[str, int] = {}
    for code, row in sorted(zip(codes.tolist(), first.tolist(), strict=True), key=lambda p: p[1]):
        known = originals.get(readers.values[code], readers.values[code])
        plain = re.sub("(?<![0-9])0+(?=[0-9])", "", known.casefold())
        other = earlier.setdefault(plain, row)
        if other != row:
            findings.warning(
                "two readers' ids differ in letter case or leading zeros only",
                path=shown[int(seen.file[row])],
                line=int(seen.line[row]),
                found=readers.text(row),
                expected=f'"{readers.text(other)}" as in {shown[int(seen.file[other])]}:'
                f"{int(seen.line[other])}, if this is the same reader",
            )


def notice_what_is_missing(
    plan: Plan, trials: KnownTrials, findings: Findings
) -> list[NotRecorded]:
    """Warn of what the study names and no log has; only to be asked where all logs were read.

    Parameters
    ----------
    plan : Plan
        The study's tables.
    trials : KnownTrials
        The trials that the logs show.
    findings : Findings
        Where warnings are recorded: of trials of the list, readers of the table and values of
        ``[trials] skip``.

    Returns
    -------
    list of NotRecorded
        The trials of the list that no log has.
    """
    book, seen = plan.facts, trials.seen
    unrecorded: list[NotRecorded] = []
    if book.trial_list is not None:
        for row in book.unrecorded(seen):
            findings.warning(
                "the trial is in the list but in no log",
                path=book.trial_list.shown,
                line=int(book.trial_list.lines[row]),
                found=book.trial_list.spelled(row),
            )
            listed = book.trial_list
            ids = {name: listed.text(name, row) for name in IDS if name in listed.columns}
            unrecorded.append(NotRecorded(ids["participant"], ids["trial"], ids.get("session", "")))
        unrecorded = in_order_of_readers(unrecorded, plan.pseudonyms)
    if book.participants is not None:
        readers = book.participants.columns["participant"]
        for row in np.flatnonzero(~readers.among(seen.ids["participant"].values)).tolist():
            findings.warning(
                "the reader is in the table but in no log",
                path=book.participants.shown,
                line=int(book.participants.lines[row]),
                found=readers.text(row),
            )
    for name, values in book.skip.items():
        # A table's values count too where they are those of trials that were not recorded.
        occurring = trials.known[name].values if name in trials.known else ()
        for value in values:
            if value not in occurring:
                key = ("trials", "skip", name)
                _warn_of_value(plan.study, key, value, occurring, findings)
    return unrecorded
