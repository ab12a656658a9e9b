"""What is told about logs: what cannot be right, how they differ, what was mended and set aside."""

from __future__ import annotations

from collections.abc import Collection, Sequence

import numpy as np

from etl.errors import Finding, Findings
from etl.pseudonyms import Pseudonyms
from etl.session.compared_logs import ComparedLog, Difference, compared
from etl.session.differing_logs import cut_short, differences
from etl.session.far_off import medians_of_others
from etl.session.notice_samples import notice_samples
from etl.session.notices import notice_values_asked_for
from etl.session.told import counted
from etl.session.work import LogAnswer
from etl.study import Study

#: Outside these, a log's median fixation is not one of silent reading, whose means lie near
#: 225 ms (Rayner 1998, doi:10.1037/0033-2909.124.3.372); most often the unit is wrong.
PLAUSIBLE_MEDIAN_MS = (50.0, 1000.0)
#: From one onset to the next it is a fixation and a saccade, so a little more than one duration;
#: outside these the two are not in one unit (our choice, wide enough for logs with gaps).
_PLAUSIBLE_STEPS = (0.5, 20.0)
#: A log that is so many times off the rest, and not plausible either, is in another unit: units of
#: time differ by 1,000 or more, readers by less than a tenth of this (our choice).
_OTHER_UNIT = 100.0
#: How a sentence about a repair begins.
MENDED = "mended "
#: Lines that are read, or hold nothing to be read.
_NOTHING_SET_ASIDE = (
    *("fixations", "samples in fixations", "further lines of rows", "header", "blank lines"),
    *("starts of trials", "ends of trials", "facts", "lasting facts", "blinks"),
)


def notice_logs(
    study: Study,
    answers: Sequence[LogAnswer],
    findings: Findings,
    pseudonyms: Pseudonyms | None = None,
) -> None:
    """Tell of the logs: what cannot be right, how they differ, what was mended or set aside.

    Parameters
    ----------
    study : Study
        As loaded.
    answers : sequence of LogAnswer
        What each log holds.
    findings : Findings
        Where errors, warnings and notes are recorded.
    pseudonyms : Pseudonyms, optional
        By which readers go, where the study asks for them.
    """
    logs = compared(answers)
    _refuse_cut_logs(logs, findings)
    if study.logs.participant_from_name is not None or study.logs.kind == "bids":
        # Where the rows say who read, the trials of a copy are known as recorded twice.
        _refuse_twins(logs, findings)
    _warn_of_guessed_encoding(study, logs, findings)
    wrong = _refuse_other_units(logs, findings)
    for about in told_of_logs(logs, wrong):
        findings.add(about.finding())
    if logs and len(logs) == len(answers):
        notice_samples(study, [log.note for log in logs], findings)
        if aside := set_aside(logs):
            findings.note(aside)
        notice_values_asked_for(study, [log.note for log in logs], findings, pseudonyms)
    _notice_medians(study, [log for log in logs if log.shown not in wrong], findings)


def _warn_of_guessed_encoding(
    study: Study, logs: Sequence[ComparedLog], findings: Findings
) -> None:
    """Warn once of all logs that are no UTF-8 and whose encoding nobody states."""
    if study.logs.encoding is not None:
        return
    guessed = [log.shown for log in logs if log.note.encoding == "cp1252"]
    if not guessed:
        return
    every = len(guessed) == len(logs)
    which = f"{len(guessed):,} of {len(logs):,} logs are" if len(logs) > 1 else "the log is"
    listed = () if every or len(guessed) == 1 else tuple(guessed)
    findings.add(
        Finding(
            f"{which} not UTF-8 and {'was' if len(logs) == 1 else 'were'} read as Windows-1252",
            "warning",
            path=guessed[0] if len(guessed) == 1 else "",
            files=listed,
            fix="check the letters with accents"
            + ('; if they are right, state encoding = "cp1252" in [logs]' if every else ""),
        )
    )


def _refuse_twins(logs: Sequence[ComparedLog], findings: Findings) -> None:
    """Record logs that hold the very same bytes: one was copied over, or named, as another."""
    first: dict[str, str] = {}
    for log in logs:
        twin = first.setdefault(log.note.sha256, log.shown)
        if twin != log.shown:
            findings.error(
                "the log holds the very same bytes as another one",
                path=log.shown,
                found=f"the contents of {twin}",
                expected="a recording of its own",
                fix="copy the right recording here, or remove one of the two files",
            )


def told_of_logs(
    logs: Sequence[ComparedLog], wrong: Collection[str] = frozenset()
) -> list[Difference]:
    """How logs differ, and what was mended in them.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study.
    wrong : collection of str
        Logs whose durations or onsets were found wrong, which needs no telling again.

    Returns
    -------
    list of Difference
        Each names all logs that it is about.
    """
    return [*differences(logs, wrong), *repairs_of(logs)]


def repairs_of(logs: Sequence[ComparedLog]) -> list[Difference]:
    """What was mended, and in which logs how often.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study.

    Returns
    -------
    list of Difference
        One for each kind of repair.
    """
    out = []
    for what in dict.fromkeys(what for log in logs for what in log.note.account.repairs):
        tallies = {
            log.shown: log.note.account.repairs[what]
            for log in logs
            if what in log.note.account.repairs
        }
        total = sum(tally.count for tally in tallies.values())
        out.append(
            Difference(
                "note",
                f"{MENDED}{total:,} times, in {len(tallies):,} of {len(logs):,} logs: {what}",
                f"{MENDED}{counted(total, 'time')}: {what}",
                tuple(tallies),
                tuple(f"{tally.count:,}" for tally in tallies.values()),
                next(iter(tallies.values())).first_line,
            )
        )
    return out


def set_aside(logs: Sequence[ComparedLog]) -> str:
    """How many lines of what kinds hold no fixation, in one sentence about all logs.

    Parameters
    ----------
    logs : sequence of ComparedLog
        In the order of the study.

    Returns
    -------
    str
        Empty where there are none but headers and blank lines.
    """
    counts: dict[str, int] = {}
    for log in logs:
        for what, tally in log.note.account.lines.items():
            counts[what] = counts.get(what, 0) + tally.count
    aside = [
        f"{count:,} {what}" for what, count in counts.items() if what not in _NOTHING_SET_ASIDE
    ]
    if not aside:
        return ""
    return (
        f"set aside, of {sum(counts.values()):,} lines in {counted(len(logs), 'log')}: "
        f"{', '.join(aside)}; log_accounts.csv counts them log by log"
    )


def _refuse_cut_logs(logs: Sequence[ComparedLog], findings: Findings) -> None:
    """Logs that end within a line; see :func:`~etl.session.differing_logs.cut_short`."""
    cut = cut_short(logs)
    for log in cut:
        findings.error(
            f"the last line has no line end, but {len(logs) - len(cut):,} of {len(logs):,} logs "
            "have one: the file seems to be cut short",
            path=log.shown,
            line=log.note.account.total or None,
            expected="a line end after the last row",
            fix="copy the file again; if it is whole, add a line end at its end",
        )


def _refuse_other_units(logs: Sequence[ComparedLog], findings: Findings) -> set[str]:
    """Durations or onsets that are a hundred times off those of the other logs are no reading."""
    wrong: set[str] = set()
    for what, values, (low, high), unit in (
        (
            "the middle (median) duration of the fixations",
            [log.figures.median_ms for log in logs],
            PLAUSIBLE_MEDIAN_MS,
            " ms",
        ),
        (
            "the time from one onset to the next",
            [log.figures.step_ratio for log in logs],
            _PLAUSIBLE_STEPS,
            " durations",
        ),
    ):
        known = [(log.shown, v) for log, v in zip(logs, values, strict=True) if not np.isnan(v)]
        if len(known) < 2:
            continue
        others = medians_of_others([value for _, value in known]).tolist()
        for (shown, value), other in zip(known, others, strict=True):
            near = other / _OTHER_UNIT < value < other * _OTHER_UNIT
            if near or low <= value <= high or shown in wrong:
                continue
            wrong.add(shown)
            findings.error(
                f"{what} is far off that of the other logs: this log has another unit",
                path=shown,
                found=f"{value:g}{unit}",
                expected=f"about {other:g}{unit}",
                fix="export the log again in the unit of the others, or convert its columns",
            )
    return wrong


def _notice_medians(study: Study, logs: Sequence[ComparedLog], findings: Findings) -> None:
    """Warn of durations that are not those of reading."""
    low, high = PLAUSIBLE_MEDIAN_MS
    odd = [log for log in logs if not low <= log.figures.median_ms <= high]
    problem = "the middle (median) duration of the fixations is not one of reading"
    expected = f"between {low:g} and {high:g} ms"
    fix = f"check the unit of the duration in {study.shown}"
    if len(odd) == 1:
        found = f"{odd[0].figures.median_ms:g} ms"
        findings.warning(problem, path=odd[0].shown, found=found, expected=expected, fix=fix)
    elif odd:
        named = tuple(f"{log.shown} ({log.figures.median_ms:g} ms)" for log in odd)
        findings.warning(
            f"in {len(odd):,} of {len(logs):,} logs {problem}",
            expected=expected,
            fix=fix,
            files=named,
        )
