"""The JSON Schema of the study file, by which editors complete and check it.

``python -m etl.study.schema`` writes it anew beside this module after a change to the models.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from pydantic.json_schema import GenerateJsonSchema, JsonSchemaValue
from pydantic_core import core_schema

from etl.study.models import StudyFile

#: The schema as shipped with the package.
SCHEMA_FILE = Path(__file__).with_name("study.schema.json")


class _TomlSchema(GenerateJsonSchema):
    """A schema for TOML, which has no null: what is absent is simply not written."""

    def nullable_schema(self, schema: core_schema.NullableSchema) -> JsonSchemaValue:
        """Leave out null."""
        return self.generate_inner(schema["schema"])

    def default_schema(self, schema: core_schema.WithDefaultSchema) -> JsonSchemaValue:
        """Leave out defaults of null, and of whole tables."""
        if isinstance(schema.get("default"), (str, bool, int, float, tuple, dict)):
            return super().default_schema(schema)
        return self.generate_inner(schema["schema"])

    def field_title_should_be_set(self, schema: Any) -> bool:  # noqa: ARG002 - the parent's signature
        """Give no title to keys: their names and descriptions say it."""
        return False


def study_schema() -> dict[str, Any]:
    """Make the JSON Schema (draft 2020-12) of the study file.

    Returns
    -------
    dict
        Rules about several keys at once are not in it.

    Examples
    --------
    >>> study_schema()["required"]
    ['logs', 'regions']
    """
    schema = StudyFile.model_json_schema(schema_generator=_TomlSchema)
    return {"$schema": GenerateJsonSchema.schema_dialect, **schema}


def schema_text() -> str:
    """The schema as it is written to its file.

    Returns
    -------
    str
    """
    return json.dumps(study_schema(), indent=2, ensure_ascii=False) + "\n"


if __name__ == "__main__":
    SCHEMA_FILE.write_text(schema_text(), encoding="utf-8", newline="\n")
