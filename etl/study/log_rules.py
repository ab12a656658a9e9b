"""Rules about ``[logs]``: who read what, when, and for how long."""

from __future__ import annotations

import re
from collections.abc import Iterator

from etl.study.models import StudyFile
from etl.study.positions import KeyPath
from etl.study.rule import Problem, rule


def _undescribed(study: StudyFile) -> bool:
    """Whether the lines of a log of events are not described, which is a problem of its own."""
    patterns = study.logs.patterns
    described = patterns is not None and patterns.fixation and patterns.trial_start
    return study.logs.kind == "events" and not described


def _listed(study: StudyFile) -> KeyPath:
    """The table that says what there is in a log."""
    return ("logs", "patterns" if study.logs.kind == "events" else "columns")


def _add(study: StudyFile, name: str) -> str:
    """How a column is added that the study needs."""
    if study.logs.kind == "events":
        return f"put (?P<{name}>…) around it in a pattern of [logs.patterns]"
    return f'add {name} = "…" with the header of the column'


@rule("logs.columns.participant", "logs.participant_from_name")
def reader_is_named(study: StudyFile) -> Iterator[Problem]:
    """Each fixation has a reader."""
    logs = study.logs
    if _undescribed(study):
        return
    if logs.columns.participant is None and logs.participant_from_name is None:
        yield Problem(
            _listed(study),
            "nothing says who read",
            expected="participant",
            fix=f"{_add(study, 'participant')}, or participant_from_name to [logs] where the "
            "file's name says it",
        )


@rule("logs.columns.trial", "logs.participant_from_name")
def trial_is_named(study: StudyFile) -> Iterator[Problem]:
    """Each fixation has a trial."""
    pattern = re.compile(study.logs.participant_from_name or "")
    if _undescribed(study):
        return
    if study.logs.columns.trial is None and "trial" not in pattern.groupindex:
        yield Problem(
            _listed(study),
            "nothing says which trial a fixation belongs to",
            expected="trial",
            fix=_add(study, "trial"),
        )


@rule(*(f"logs.columns.{name}" for name in ("onset", "fixation", "end", "duration")))
def order_is_known(study: StudyFile) -> Iterator[Problem]:
    """The order of fixations is known."""
    if _undescribed(study):
        return
    if study.logs.columns.clock is None and study.logs.columns.fixation is None:
        yield Problem(
            _listed(study),
            "nothing says in which order the fixations were made",
            expected="onset or fixation",
            fix=_add(study, "onset")
            if study.logs.kind == "events"
            else 'add onset = "…" (a time) or fixation = "…" (a number in the trial) with the '
            "header of the column",
        )


@rule("logs.columns.duration", "logs.columns.end", "logs.columns.onset")
def duration_is_known_once(study: StudyFile) -> Iterator[Problem]:
    """A duration is given, either by itself or by the end."""
    columns = study.logs.columns
    if _undescribed(study):
        return
    if study.logs.samples is None and columns.duration is None and columns.end is None:
        yield Problem(
            _listed(study),
            "nothing says how long a fixation lasted",
            expected="duration or end",
            fix=_add(study, "duration")
            if study.logs.kind == "events"
            else 'add duration = "…" or end = "…" with the header of the column',
        )
    if None not in (columns.onset, columns.duration) and columns.end is not None:
        yield Problem(
            ("logs", "columns", "end"),
            "duration and end both say how long a fixation lasted",
            found=columns.end.column,
            expected="two of onset, duration and end",
            fix="remove the one that is less exact in your logs",
        )


@rule("logs.columns.end", "logs.columns.onset", "logs.columns.duration")
def end_has_its_onset(study: StudyFile) -> Iterator[Problem]:
    """An end gives a duration with an onset, and an onset with a duration."""
    columns = study.logs.columns
    if columns.end is not None and columns.onset is None and columns.duration is None:
        yield Problem(
            ("logs", "columns", "end"),
            "an end alone gives no duration",
            found=columns.end.column,
            expected="onset or duration beside it",
            fix='add onset = "…" with the header of the column, or duration = "…"',
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


@rule("logs.kind", "logs.patterns.fixation", "logs.patterns.trial_start")
def events_have_lines(study: StudyFile) -> Iterator[Problem]:
    """A log of events is described by its lines, another one is not."""
    logs = study.logs
    if logs.kind != "events":
        if logs.patterns is not None:
            yield Problem(
                ("logs", "patterns"),
                f'patterns for lines mean nothing with kind = "{logs.kind}"',
                expected='kind = "events"',
                fix="correct the kind, or remove [logs.patterns]",
            )
        return
    for key in ("fixation", "trial_start"):
        if logs.patterns is None or not getattr(logs.patterns, key):
            yield Problem(
                ("logs", "patterns", key),
                "nothing says which lines tell that "
                + ("a fixation is over" if key == "fixation" else "a trial starts"),
                expected=key,
                fix=f"add {key} = '…' to [logs.patterns] with a regular expression for such a line",
            )


@rule("logs.kind", "logs.bids")
def bids_has_its_kind(study: StudyFile) -> Iterator[Problem]:
    """The table about the open standard goes with its kind."""
    if study.logs.bids is not None and study.logs.kind != "bids":
        yield Problem(
            ("logs", "bids"),
            f'this means nothing with kind = "{study.logs.kind}"',
            expected='kind = "bids"',
            fix="correct the kind, or remove [logs.bids]",
        )


@rule("logs.eye", "logs.columns.eye", "participants")
def eye_is_known(study: StudyFile) -> Iterator[Problem]:
    """Something says which eye a row or a column is of, and which eye counts."""
    eye = study.logs.eye
    if eye is None:
        return
    if eye.use is None and eye.column is None and not eye.readers:
        yield Problem(
            ("logs", "eye"),
            "nothing says which eye counts",
            expected="use, column or readers",
            fix='add use = "…" with the eye as the logs spell it',
        )
    if eye.column is not None and study.participants is None:
        yield Problem(
            ("logs", "eye", "column"),
            "there is no reader table that could say which eye counts",
            found=eye.column,
            expected="[participants] with a table",
            fix="add [participants], or name the eye by use or readers",
        )
    if not eye.columns and study.logs.columns.eye is None and study.logs.kind != "bids":
        yield Problem(
            ("logs", "eye"),
            "nothing says which eye a row is of",
            expected="eye in [logs.columns], or the columns of each eye in [logs.eye.columns]",
            fix='add eye = "…" to [logs.columns] with the header of the column',
        )
    named = {*([eye.use] if eye.use is not None else []), *eye.readers.values()}
    for one in sorted(named - set(eye.columns) if eye.columns else ()):
        yield Problem(
            ("logs", "eye"),
            "an eye is chosen that has no columns",
            found=one,
            expected="one of " + ", ".join(eye.columns),
            fix=f"add [logs.eye.columns.{one}], or correct the name of the eye",
        )


@rule("logs.eye.columns")
def eyes_have_the_same_columns(study: StudyFile) -> Iterator[Problem]:
    """What is named for one eye is named for each, in one unit."""
    eye = study.logs.eye
    if eye is None or not eye.columns:
        return
    first_name, first = next(iter(eye.columns.items()))
    for name, columns in eye.columns.items():
        for key in type(columns).model_fields:
            one, other = getattr(first, key), getattr(columns, key)
            if (one is None) != (other is None):
                lacking = first_name if one is None else name
                yield Problem(
                    ("logs", "eye", "columns", lacking),
                    f"{key} is named for one eye only",
                    expected=key,
                    fix=f'add {key} = "…" with the header of its column',
                )
            elif one is not None and one.unit != other.unit:
                yield Problem(
                    ("logs", "eye", "columns", name, key),
                    f"the unit is not that of {first_name}",
                    found=other.unit,
                    expected=str(one.unit),
                    fix="give both eyes the same unit",
                )
