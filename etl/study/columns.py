"""A column of a log: its header, and its unit where it has one."""

from __future__ import annotations

from typing import Any

from pydantic import ConfigDict, Field, GetJsonSchemaHandler, model_validator
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from etl.study.values import Name, PlaceUnit, Table, TimeUnit


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
