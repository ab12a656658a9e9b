"""The tables ``[logs]`` and ``[logs.columns]``: the logs' files, columns and units."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, ConfigDict, Field, GetJsonSchemaHandler, model_validator
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from etl.study.values import (
    CellTexts,
    Encoding,
    FileNames,
    Name,
    NamePattern,
    PlaceUnit,
    Table,
    Texts,
    TimeUnit,
    refusal,
)


class Column(Table):
    """A column of the log: its header, or a table with its header and its unit."""

    column: Name = Field(description="The column's header in the log.", examples=["trial_no"])
    unit: TimeUnit | PlaceUnit | None = None

    @model_validator(mode="before")
    @classmethod
    def _header_alone(cls, entry: Any) -> Any:
        """Take a header alone as the column of that name in the usual unit."""
        return {"column": entry} if isinstance(entry, str) else entry

    @classmethod
    def __get_pydantic_json_schema__(
        cls, core_schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Let the schema accept a header alone, as the validator does."""
        reference = handler(core_schema)
        schema = handler.resolve_ref_schema(reference)
        table = {key: value for key, value in schema.items() if key not in ("title", "description")}
        if table["properties"]["unit"].get("type") == "null":
            del table["properties"]["unit"]
        kept: JsonSchemaValue = {"title": schema["title"], "description": schema["description"]}
        schema.clear()
        schema.update(kept, anyOf=[{"type": "string", "minLength": 1}, table])
        return reference


class PlainColumn(Column):
    """A column without a unit: its header, or { column = header }."""

    model_config = ConfigDict(title="a column")

    unit: None = None


class TimeColumn(Column):
    """A column of times: its header (in ms), or { column = header, unit = "ms" | "s" | "us" }."""

    model_config = ConfigDict(title="a column of times")

    unit: TimeUnit = Field(
        default="ms", description="Unit of the times: milli-, whole or microseconds."
    )


class PlaceColumn(Column):
    """A column of positions: its header (in px), or { column = header, unit = "px" | "deg" }."""

    model_config = ConfigDict(title="a column of positions")

    unit: PlaceUnit = Field(
        default="px",
        description="Unit of the positions: pixels, or degrees from the middle of the screen.",
    )


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
        description="How long the fixation lasted. Either this or end.",
        examples=[{"column": "dur", "unit": "ms"}],
    )
    end: TimeColumn | None = Field(
        default=None,
        description="When the fixation ended, in log time; needs onset. Either this or duration.",
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
    kind: Literal["table"] = Field(
        default="table", description="How a log is laid out: a table with one fixation a row."
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
    columns: Columns = Field(
        description="What each thing is called in the log: the log's own header, or a table with "
        "its unit."
    )
    where: dict[Name, CellTexts] = Field(
        default={},
        description="Rows to keep: a column (its name in [logs.columns], or a header) and the "
        "values of which a row must have one.",
        examples=[{"eye": ["R"]}],
    )
