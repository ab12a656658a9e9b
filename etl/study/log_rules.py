"""Rules about ``[logs]``: who read what, when, and for how long."""

from __future__ import annotations

import re
from collections.abc import Iterator

from etl.study.models import StudyFile
from etl.study.rule import Problem, rule


@rule("logs.columns.participant", "logs.participant_from_name")
def reader_is_named(study: StudyFile) -> Iterator[Problem]:
    """Each fixation has a reader."""
    if study.logs.columns.participant is None and study.logs.participant_from_name is None:
        yield Problem(
            ("logs", "columns"),
            "nothing says who read",
            expected="participant",
            fix='add participant = "…" with the header of the column, or participant_from_name '
            "to [logs] where the file's name says it",
        )


@rule("logs.columns.trial", "logs.participant_from_name")
def trial_is_named(study: StudyFile) -> Iterator[Problem]:
    """Each fixation has a trial."""
    pattern = re.compile(study.logs.participant_from_name or "")
    if study.logs.columns.trial is None and "trial" not in pattern.groupindex:
        yield Problem(
            ("logs", "columns"),
            "nothing says which trial a fixation belongs to",
            expected="trial",
            fix='add trial = "…" with the header of the column',
        )


@rule("logs.columns.onset", "logs.columns.fixation")
def order_is_known(study: StudyFile) -> Iterator[Problem]:
    """The order of fixations is known."""
    if study.logs.columns.onset is None and study.logs.columns.fixation is None:
        yield Problem(
            ("logs", "columns"),
            "nothing says in which order the fixations were made",
            expected="onset or fixation",
            fix='add onset = "…" (a time) or fixation = "…" (a number in the trial) with the '
            "header of the column",
        )


@rule("logs.columns.duration", "logs.columns.end")
def duration_is_known_once(study: StudyFile) -> Iterator[Problem]:
    """A duration is given, either by itself or by the end."""
    columns = study.logs.columns
    if columns.duration is None and columns.end is None:
        yield Problem(
            ("logs", "columns"),
            "nothing says how long a fixation lasted",
            expected="duration or end",
            fix='add duration = "…" or end = "…" with the header of the column',
        )
    if columns.duration is not None and columns.end is not None:
        yield Problem(
            ("logs", "columns", "end"),
            "duration and end both say how long a fixation lasted",
            found=columns.end.column,
            expected="one of the two",
            fix="remove the one that is less exact in your logs",
        )


@rule("logs.columns.end", "logs.columns.onset")
def end_has_its_onset(study: StudyFile) -> Iterator[Problem]:
    """An end without an onset gives no duration."""
    columns = study.logs.columns
    if columns.end is not None and columns.onset is None:
        yield Problem(
            ("logs", "columns", "end"),
            "an end alone gives no duration",
            found=columns.end.column,
            expected="onset beside it",
            fix='add onset = "…" with the header of the column, or give duration in place of end',
        )


@rule(*(f"logs.columns.{name}" for name in ("onset", "fixation", "duration", "end", "x", "y")))
def measured_columns_differ(study: StudyFile) -> Iterator[Problem]:
    """A column of numbers means one thing only."""
    meaning: dict[str, str] = {}
    for name in ("onset", "fixation", "duration", "end", "x", "y"):
        column = getattr(study.logs.columns, name)
        if column is None:
            continue
        if column.column in meaning:
            yield Problem(
                ("logs", "columns", name),
                f"the column already stands for {meaning[column.column]}",
                found=column.column,
                expected="another column",
                fix="correct one of the two headers",
            )
        meaning.setdefault(column.column, name)


@rule("logs.delimiter", "logs.decimal")
def delimiter_is_no_decimal_sign(study: StudyFile) -> Iterator[Problem]:
    """One character cannot both separate fields and stand inside numbers."""
    if study.logs.delimiter is not None and study.logs.delimiter == study.logs.decimal:
        yield Problem(
            ("logs", "decimal"),
            "the decimal sign is also the delimiter",
            found=study.logs.decimal,
            expected="two different characters",
            fix="correct one of the two, or remove both to have them found out",
        )
