"""What is worth knowing about logs, readers and trials although nothing is wrong with it."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from difflib import get_close_matches

import numpy as np

from etl.errors import Findings
from etl.files.headers import spelled
from etl.report import NotRecorded
from etl.session.plan import Plan
from etl.session.work import LogAnswer
from etl.study import Study
from etl.trials import IDS, KnownTrials, SeenTrials

#: Outside these, a log's median fixation is not one of silent reading, whose means lie near
#: 225 ms (Rayner 1998, doi:10.1037/0033-2909.124.3.372); most often the unit is wrong.
PLAUSIBLE_MEDIAN_MS = (50.0, 1000.0)

#: How many values are looked through for one that is near, and how many are listed.
_LOOKED_THROUGH, _LISTED = 1000, 12


def notice_logs(study: Study, answers: list[LogAnswer], findings: Findings) -> None:
    """Note how the logs were understood, and warn of what is odd in them.

    Parameters
    ----------
    study : Study
        As loaded.
    answers : list of LogAnswer
        What each log holds.
    findings : Findings
        Where notes and warnings are recorded.
    """
    read = [answer for answer in answers if answer.note.decimal]
    _notice_dialects(read, findings)
    for answer in read:
        counts = answer.note.counts
        comments = counts.get("comment lines below the header", 0)
        comments -= counts.get("comment lines like rows", 0)
        if comments:
            findings.note(
                f"{comments:,} lines below the header begin with # and were taken for remarks",
                path=answer.note.shown,
            )
    if read and len(read) == len(answers):
        _notice_values_asked_for(study, read, findings)
    low, high = PLAUSIBLE_MEDIAN_MS
    for answer in read:
        middle = answer.median_ms
        if not low <= middle <= high:
            findings.warning(
                "the middle (median) duration of the fixations is not one of reading",
                path=answer.note.shown,
                found=f"{middle:g} ms",
                expected=f"between {low:g} and {high:g} ms",
                fix=f"check the unit of the duration in {study.shown}",
            )


def _notice_dialects(read: list[LogAnswer], findings: Findings) -> None:
    """Note the logs that are written in another way than most."""
    dialects = Counter((a.note.encoding, a.note.delimiter, a.note.decimal) for a in read)
    if len(dialects) < 2:
        return
    usual = dialects.most_common(1)[0][0]
    for answer in read:
        note = answer.note
        if (note.encoding, note.delimiter, note.decimal) != usual:
            findings.note(
                f"read as {note.encoding}, separated by {spelled(note.delimiter)}, "
                f'decimal sign "{note.decimal}"; most other logs are different',
                path=note.shown,
            )


def _notice_values_asked_for(study: Study, read: list[LogAnswer], findings: Findings) -> None:
    """Warn of values of ``[logs.where]`` that no log has."""
    for name, values in study.logs.where.items():
        occurring = list(dict.fromkeys(v for a in read for v in a.note.asked.get(name, ())))
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


def notice_similar_readers(seen: SeenTrials, shown: Sequence[str], findings: Findings) -> None:
    """Warn of readers whose ids differ in letter case or leading zeros only.

    Parameters
    ----------
    seen : SeenTrials
        The trials that the logs show.
    shown : sequence of str
        The names of the logs.
    findings : Findings
        Where warnings are recorded.
    """
    readers = seen.ids["participant"]
    codes, first = np.unique(readers.codes, return_index=True)
    earlier: dict[str, int] = {}
    for code, row in sorted(zip(codes.tolist(), first.tolist(), strict=True), key=lambda p: p[1]):
        plain = re.sub("(?<![0-9])0+(?=[0-9])", "", readers.values[code].casefold())
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
            ids = {n: c.text(row) for n, c in book.trial_list.columns.items() if n in IDS}
            unrecorded.append(NotRecorded(ids["participant"], ids["trial"], ids.get("session", "")))
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
