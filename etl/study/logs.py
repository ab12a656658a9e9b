"""The tables ``[logs]`` and ``[logs.columns]``: the logs' files, columns and units."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import suppress
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, ConfigDict, Field, ValidationError, model_validator
from pydantic_core import PydanticCustomError

from etl.study.columns import Column, PlaceColumn, PlainColumn, TimeColumn
from etl.study.log_kinds import GROUPED_LINES, Bids, Eye, EyeColumns, LinePatterns, Samples
from etl.study.pattern_reading import searched_pattern, sound_pattern
from etl.study.values import (
    CellTexts,
    Encoding,
    FileNames,
    Name,
    NamePattern,
    Table,
    Texts,
    refusal,
)

#: What an open standard's recording calls things, where the study file says nothing else.
BIDS_COLUMNS = {
    "participant": "participant_id",
    "session": "session_id",
    "onset": "onset",
    "duration": "duration",
    "x": "x_coordinate",
    "y": "y_coordinate",
    "blink": "blink",
}
#: What the standard writes in a cell that has no value.
BIDS_MISSING = "n/a"


class Columns(Table):
    """What each thing is called in the log: the log's own header, or a table with its unit."""

    model_config = ConfigDict(title="[logs.columns]")

    participant: PlainColumn | None = Field(
        default=None,
        description="Who read. Needed, unless participant_from_name takes it from the file's name.",
        examples=["reader"],
    )
    trial: PlainColumn | None = Field(
        default=None,
        description="Which trial of the reader. Needed, unless taken from the file's name.",
        examples=["trial_no"],
    )
    item: PlainColumn | None = Field(
        default=None, description="Which text was read.", examples=["sentence"]
    )
    session: PlainColumn | None = Field(
        default=None,
        description="Which visit: part of a trial's identity where a reader came more than once.",
        examples=["session"],
    )
    onset: TimeColumn | None = Field(
        default=None,
        description="When the fixation began, in log time. Gives the order of fixations.",
        examples=[{"column": "t_start", "unit": "ms"}],
    )
    fixation: PlainColumn | None = Field(
        default=None,
        description="The fixation's number in the trial; gives the order where there is no onset.",
        examples=["n"],
    )
    duration: TimeColumn | None = Field(
        default=None,
        description="How long the fixation lasted. Not needed with onset and end.",
        examples=[{"column": "dur", "unit": "ms"}],
    )
    end: TimeColumn | None = Field(
        default=None,
        description="When the fixation ended, in log time. With onset, in place of duration; with "
        "duration, in place of onset.",
        examples=[{"column": "t_end", "unit": "ms"}],
    )
    x: PlaceColumn | None = Field(
        default=None,
        description="Where the fixation was, across the screen.",
        examples=[{"column": "gx", "unit": "px"}],
    )
    y: PlaceColumn | None = Field(
        default=None,
        description='Where it was, down the screen. Not needed with regions.vertical = "any".',
        examples=[{"column": "gy", "unit": "px"}],
    )
    label: PlainColumn | None = Field(
        default=None,
        description='Which area was fixated, as the log says; used with regions.kind = "labels".',
        examples=["area"],
    )
    eye: PlainColumn | None = Field(
        default=None, description="Which eye was recorded.", examples=["eye"]
    )
    blink: PlainColumn | None = Field(
        default=None,
        description="Nonzero or true where a blink touches the fixation.",
        examples=["blink"],
    )

    @property
    def clock(self) -> TimeColumn | None:
        """The column that places fixations in time: the onset, or the end where durations say it.

        A log that is written as fixations end has the end and the duration of each, no onset.
        """
        return self.onset or (self.end if self.duration is not None else None)

    def present(self) -> dict[str, Column]:
        """The columns that the study names, by canonical name, in the order of this table."""
        named = {name: getattr(self, name) for name in type(self).model_fields}
        return {name: column for name, column in named.items() if column is not None}


def _one_character(text: str) -> str:
    """Refuse a delimiter that cannot separate fields."""
    if len(text) != 1 or text in '"\r\n':
        raise refusal(
            "this cannot separate the fields of a row",
            expected="one character",
            fix=r'write for example delimiter = "\t" for a tab, or ";"',
        )
    return text


class Logs(Table):
    """The fixation logs: which files, and how they are written."""

    model_config = ConfigDict(title="[logs]")

    files: FileNames = Field(
        description="The logs: file names or patterns with *, relative to the study file. "
        "Files that end in .gz are read as they are.",
        examples=[["logs/*.tsv"]],
    )
    kind: Literal["table", "events", "bids"] = Field(
        default="table",
        description="How a log is laid out: a table with a fixation a row; lines that each tell of "
        "an event; or the Brain Imaging Data Structure (BIDS 1.11) for eye tracking.",
    )
    participant_from_name: NamePattern | None = Field(
        default=None,
        description="A regular expression that is searched in the log's file name. Its group "
        "participant names the reader; groups session, trial and item may be there too.",
        examples=[r"(?P<participant>P\d+)"],
    )
    delimiter: Annotated[str, AfterValidator(_one_character)] | None = Field(
        default=None,
        description="The character between two fields. Found out when absent.",
        examples=["\t"],
    )
    decimal: Literal[".", ","] | None = Field(
        default=None, description="The decimal sign. Found out when absent.", examples=["."]
    )
    encoding: Encoding | None = Field(
        default=None,
        description="The text encoding. Found out when absent.",
        examples=["utf-8"],
    )
    missing: Texts = Field(
        default=("", ".", "NA"),
        description="What stands in a cell that has no value.",
        examples=[["", ".", "NA"]],
    )
    comment: Texts = Field(
        default=("#",),
        description="What a line begins with that is a remark; it is counted and not read.",
        examples=[["#"]],
    )
    columns: Columns = Field(
        description="What each thing is called in the log: the log's own header, or a table with "
        'its unit. With kind = "events" each canonical name is the group of that name, unless '
        'said otherwise; with "bids" the standard\'s own columns are known.'
    )
    where: dict[Name, CellTexts] = Field(
        default={},
        description="Rows to keep: a column (its name in [logs.columns], or a header) and the "
        "values of which a row must have one.",
        examples=[{"eye": ["R"]}],
    )
    patterns: LinePatterns | None = Field(
        default=None,
        description='What the lines of a log of events say; needed with kind = "events".',
    )
    eye: Eye | None = Field(default=None, description="Which eye counts, where both were recorded.")
    samples: Samples | None = Field(
        default=None,
        description="How fixations are found, where the log holds gaze samples.",
    )
    bids: Bids | None = Field(
        default=None,
        description='How recordings are read with kind = "bids"; all has a default.',
    )

    @model_validator(mode="before")
    @classmethod
    def _columns_known_already(cls, entry: Any) -> Any:
        """Fill in the columns that the kind of log, or the tables of both eyes, already name."""
        if not isinstance(entry, dict):
            return entry
        if entry.get("kind") == "bids":
            entry = {"bids": {}, **_with_mark_of_the_standard(entry)}
        known = dict(_known_columns(entry))
        stated = entry.get("columns", {} if known else None)
        if not known or not isinstance(stated, dict):
            return entry
        return {**entry, "columns": {**known, **stated}}


def _with_mark_of_the_standard(logs: dict[str, Any]) -> dict[str, Any]:
    """The table with what the open standard writes for no value among the missing marks."""
    missing = logs.get("missing", Logs.model_fields["missing"].default)
    if not isinstance(missing, (list, tuple)) or BIDS_MISSING in missing:
        return logs
    return {**logs, "missing": [*missing, BIDS_MISSING]}


def _known_columns(logs: Mapping[str, Any]) -> Iterator[tuple[str, Any]]:
    """The columns that need not be named, by canonical name."""
    kind, eye = logs.get("kind"), logs.get("eye")
    if kind == "bids":
        yield from BIDS_COLUMNS.items()
    if kind == "events" and isinstance(logs.get("patterns"), dict):
        for group in groups_in(logs["patterns"]):
            if group in Columns.model_fields:
                yield group, group
    by_eye = eye.get("columns") if isinstance(eye, dict) else None
    if isinstance(by_eye, dict):
        first = next(iter(by_eye.values()), None)
        for name, column in first.items() if isinstance(first, dict) else ():
            # A mistake is reported once, where it stands.
            with suppress(ValidationError):
                EyeColumns.model_validate({name: column})
                yield name, column


def groups_in(patterns: Mapping[str, Any]) -> list[str]:
    """The groups of ``[logs.patterns]`` that are columns, each once; faulty patterns have none.

    Parameters
    ----------
    patterns : mapping
        The table as read, with a pattern or a list of patterns for each key.

    Returns
    -------
    list of str
        Without those of blinks, which are no columns of fixations.

    Examples
    --------
    >>> groups_in({"fixation": "(?P<x>.) (?P<y>.)", "facts": ["(?P<cue>.)", "("], "other": "error"})
    ['x', 'y', 'cue']
    """
    groups: dict[str, None] = {}
    for key in GROUPED_LINES:
        own = patterns.get(key, ())
        for pattern in own if isinstance(own, (list, tuple)) else (own,):
            try:
                groups |= dict.fromkeys(searched_pattern(sound_pattern(pattern)).groups)
            except (PydanticCustomError, TypeError):
                continue
    return list(groups)
