"""Rules about ``kind = "bids"``: what the open standard says itself, the study file does not."""

from __future__ import annotations

from collections.abc import Iterator

from etl.study.logs import BIDS_COLUMNS
from etl.study.models import StudyFile
from etl.study.rule import Problem, quoted, rule

#: What the standard has one column for, and which key says its unit where the sidecar does not.
_MEASURED = {"onset": "onset_unit", "duration": "duration_unit", "x": "", "y": ""}
#: The eyes of the standard (BIDS 1.11 schema, ``objects.metadata.RecordedEye``).
EYES = ("left", "right", "cyclopean")


@rule("logs.kind", "logs.columns.trial")
def bids_trials_have_a_column(study: StudyFile) -> Iterator[Problem]:
    """A recording holds many trials, so the file's name cannot say which one it is."""
    logs = study.logs
    named_elsewhere = "(?P<trial>" in (logs.participant_from_name or "")
    if logs.kind == "bids" and logs.columns.trial is None and named_elsewhere:
        yield Problem(
            ("logs", "columns"),
            "nothing says which trial a row of the events is",
            expected="trial",
            fix='add trial = "…" with the header of its column in …_events.tsv',
        )


@rule("logs.kind", *(f"logs.columns.{name}" for name in (*_MEASURED, "end")))
def bids_has_its_columns(study: StudyFile) -> Iterator[Problem]:
    """What is measured has the standard's own columns, in units that the sidecars say."""
    logs = study.logs
    if logs.kind != "bids":
        return
    for name, key in _MEASURED.items():
        column = getattr(logs.columns, name)
        if column is None:
            continue
        if column.column != BIDS_COLUMNS[name]:
            yield Problem(
                ("logs", "columns", name),
                "the standard has a column of its own for this",
                found=column.column,
                expected=quoted(BIDS_COLUMNS[name]),
                fix="remove the key",
            )
        elif key and "unit" in column.model_fields_set:
            yield Problem(
                ("logs", "columns", name, "unit"),
                "the sidecars say this unit",
                found=column.unit,
                expected=f"{key} in [logs.bids], where they do not",
                fix=f'remove the key, or write {key} = "{column.unit}" in [logs.bids]',
            )
    if logs.columns.end is not None:
        yield Problem(
            ("logs", "columns", "end"),
            "the standard says how long a fixation lasted, not when it ended",
            found=logs.columns.end.column,
            fix="remove the key",
        )


@rule("logs.kind", "logs.delimiter", "logs.decimal", "logs.encoding")
def bids_is_written_in_one_way(study: StudyFile) -> Iterator[Problem]:
    """The standard leaves no choice of encoding, delimiter and decimal sign."""
    logs = study.logs
    if logs.kind != "bids":
        return
    for key, means in (("delimiter", "tabs"), ("decimal", "a point"), ("encoding", "UTF-8")):
        value = getattr(logs, key)
        if value is not None:
            yield Problem(
                ("logs", key),
                'this means nothing with kind = "bids"',
                found=value,
                expected=f"{means}, as in the standard",
                fix="remove the key",
            )


@rule("logs.kind", "logs.eye")
def bids_has_its_eyes(study: StudyFile) -> Iterator[Problem]:
    """An eye is called as the standard calls it, and has a recording of its own."""
    eye = study.logs.eye
    if study.logs.kind != "bids" or eye is None:
        return
    if eye.columns:
        yield Problem(
            ("logs", "eye", "columns"),
            'this means nothing with kind = "bids": each eye has a recording of its own',
            fix="remove the tables; the eye is known from RecordedEye",
        )
    used = [] if eye.use is None else [(("logs", "eye", "use"), eye.use)]
    for place, one in [
        *used,
        *((("logs", "eye", "readers", n), e) for n, e in eye.readers.items()),
    ]:
        if one not in EYES:
            yield Problem(
                place,
                "the standard has no such eye",
                found=one,
                expected=" or ".join(quoted(known) for known in EYES),
                fix="write the eye as RecordedEye has it",
            )
