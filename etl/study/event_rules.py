"""Rules about ``[logs.patterns]``: what the lines of a log of events tell, and by which names."""

from __future__ import annotations

from collections.abc import Iterator

from etl.study.log_kinds import LINE_KEYS, LINE_KINDS, LinePatterns
from etl.study.logs import Logs, groups_in
from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, quoted, rule

#: What only the line of a fixation can tell of it.
_OF_FIXATIONS = ("onset", "fixation", "duration", "end", "x", "y", "label", "blink")
#: What every fixation must have that any has.
_OF_EVERY_FIXATION = ("onset", "fixation", "duration", "end")
#: What a blink can tell of itself.
_OF_BLINKS = ("onset", "end", "duration", "eye")


def _groups(patterns: LinePatterns, *kinds: str) -> list[str]:
    """The groups of some kinds of line, each once."""
    every = patterns.every()
    return list(dict.fromkeys(g for kind in kinds for p in every[kind] for g in p.groups))


def _place(patterns: LinePatterns, kind: str, number: int) -> KeyPath:
    """Where a pattern stands in the study file."""
    several = len(getattr(patterns, kind)) > 1
    return ("logs", "patterns", kind, *((number,) if several else ()))


@rule("logs.kind", "logs.delimiter")
def events_have_no_delimiter(study: StudyFile) -> Iterator[Problem]:
    """Lines that patterns describe are not split."""
    if study.logs.kind == "events" and study.logs.delimiter is not None:
        yield Problem(
            ("logs", "delimiter"),
            'this means nothing with kind = "events"',
            found=study.logs.delimiter,
            expected="lines that [logs.patterns] describes",
            fix="remove the key",
        )


def _asked(logs: Logs) -> Iterator[tuple[KeyPath, str, str]]:
    """Every key that names a group: where it stands, what it means, and the group."""
    by_eye = {} if logs.eye is None else logs.eye.columns
    # Those of the first eye stand in for the columns that are not named.
    first = next(iter(by_eye.values()), None)
    named = logs.columns.present()
    for name, column in named.items():
        if column != getattr(first, name, None):
            yield ("logs", "columns", name), name, column.column
    for eye, columns in by_eye.items():
        for name in type(columns).model_fields:
            if (own := getattr(columns, name)) is not None:
                yield ("logs", "eye", "columns", eye, name), name, own.column
    for name in logs.where:
        if name not in named:
            yield ("logs", "where", name), "", name


@rule("logs.kind", *LINE_KEYS, "logs.columns", "logs.eye", "logs.where")
def columns_are_groups(study: StudyFile) -> Iterator[Problem]:
    """What the columns of a log of events are called are names of groups."""
    logs = study.logs
    if logs.kind != "events" or logs.patterns is None:
        return
    known = groups_in(logs.patterns.model_dump())
    of_fixations = _groups(logs.patterns, "fixation")
    for path, name, header in _asked(logs):
        only = name in _OF_FIXATIONS
        if header in (of_fixations if only else known) or not of_fixations:
            continue
        yield Problem(
            path,
            f"no pattern {'for fixations ' if only else ''}has a group of this name",
            found=header,
            expected="one of " + ", ".join(of_fixations if only else known),
            fix=f"put (?P<{header}>…) around that part of the pattern, or correct the name",
        )


@rule("logs.kind", *LINE_KEYS, "logs.columns", "logs.eye")
def fixations_tell_alike(study: StudyFile) -> Iterator[Problem]:
    """Whatever line tells of a fixation, it tells when and for how long, and no other line does."""
    logs = study.logs
    if logs.kind != "events" or logs.patterns is None:
        return
    by_eye = {} if logs.eye is None else logs.eye.columns
    named = logs.columns.present()
    needed = {n: named[n].column for n in _OF_EVERY_FIXATION if n in named and not by_eye}
    groups = _groups(logs.patterns, "fixation")
    for number, pattern in enumerate(logs.patterns.every()["fixation"]):
        for name, header in needed.items():
            if header in groups and header not in pattern.groups:
                yield Problem(
                    _place(logs.patterns, "fixation", number),
                    f"this pattern for fixations has no group {header}, which another one has",
                    found=pattern.written,
                    expected=f"the {name} of every fixation",
                    fix=f"put (?P<{header}>…) around that part of the pattern",
                )
    for kind in ("trial_start", "trial_end", "facts", "lasting"):
        for number, pattern in enumerate(logs.patterns.every()[kind]):
            for name in _OF_FIXATIONS:
                column = named.get(name)
                own = {name, *([column.column] if column is not None else [])}
                if own & set(groups) & set(pattern.groups):
                    yield Problem(
                        _place(logs.patterns, kind, number),
                        f"a group is called {name}, which is of a fixation",
                        found=pattern.written,
                        expected="facts about trials",
                        fix=f"give the group another name, such as trial_{name}",
                    )


@rule("logs.kind", *LINE_KEYS, "logs.columns")
def blinks_tell_when(study: StudyFile) -> Iterator[Problem]:
    """A blink tells when it was and whose, and nothing else."""
    logs = study.logs
    if logs.kind != "events" or logs.patterns is None:
        return
    for number, pattern in enumerate(logs.patterns.every()["blink"]):
        place = _place(logs.patterns, "blink", number)
        for group in pattern.groups:
            if group not in _OF_BLINKS:
                yield Problem(
                    place,
                    "a blink has a group that means nothing",
                    found=group,
                    expected="groups named onset, end, duration or eye",
                    fix="rename the group, or write (?:…) where it only groups",
                )
        told = set(pattern.groups) & {"onset", "end", "duration"}
        if told and ("onset" not in told or len(told) == 3):
            yield Problem(
                place,
                "these groups do not say when a blink was",
                found=", ".join(sorted(told)),
                expected="onset with end or duration, or none of them",
                fix="name the groups onset and end, or onset and duration",
            )


@rule("logs.kind", *LINE_KEYS)
def lines_tell_something(study: StudyFile) -> Iterator[Problem]:
    """A line of facts tells some; one that is to be left aside tells none."""
    if study.logs.patterns is None:
        return
    for kind in ("facts", "lasting"):
        for number, pattern in enumerate(study.logs.patterns.every()[kind]):
            if not pattern.groups:
                yield Problem(
                    _place(study.logs.patterns, kind, number),
                    "the pattern has no named group, so its lines tell nothing",
                    found=pattern.written,
                    expected="a group such as (?P<cue>…)",
                    fix="put a named group around what the line tells, or move the pattern to "
                    "ignore",
                )
    if study.logs.patterns.unfinished == "keep" and not study.logs.patterns.trial_end:
        yield Problem(
            ("logs", "patterns", "unfinished"),
            "this means nothing where no line says that a trial ends",
            found="keep",
            expected="trial_end",
            fix="remove the key, or add trial_end",
        )


@rule(*LINE_KEYS, "logs.comment")
def remarks_are_no_events(study: StudyFile) -> Iterator[Problem]:
    """Lines that a pattern describes are not at the same time remarks."""
    patterns = study.logs.patterns
    if patterns is None:
        return
    for kind in LINE_KINDS[:-1]:
        for number, pattern in enumerate(patterns.every()[kind]):
            begins = [text.lstrip() for text in pattern.first_characters()]
            marks = [m for m in study.logs.comment if m and any(b.startswith(m) for b in begins)]
            if marks:
                yield Problem(
                    _place(patterns, kind, number),
                    f"its lines begin with {quoted(marks[0])}, which marks a remark",
                    found=pattern.written,
                    expected="lines that are read",
                    fix=f"take {quoted(marks[0])} out of [logs] comment (comment = [] for none)",
                )


EVENT_RULES = (
    events_have_no_delimiter,
    columns_are_groups,
    fixations_tell_alike,
    blinks_tell_when,
    lines_tell_something,
    remarks_are_no_events,
)
