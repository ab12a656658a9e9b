"""The JSON Schema for editors, and the reference of keys."""

import tomllib
from collections.abc import Iterator
from typing import Any

import jsonschema
import pytest

from etl.study.columns import Column
from etl.study.reference import key_reference
from etl.study.schema import SCHEMA_FILE, schema_text, study_schema
from etl.study.shape import known_keys, table_at
from etl.study.values import Table
from tests.study.written import ALL_OFF, EXAMPLE, SOUND, changed


def judge() -> jsonschema.Draft202012Validator:
    """A validator that is not ours, with the schema as shipped."""
    schema = study_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def explanations(schema: dict[str, Any]) -> Iterator[tuple[str, str | None]]:
    """Each key that the schema knows, in whatever table, and what an editor says of it."""
    for name, part in {"": schema, **schema["$defs"]}.items():
        for shape in (part, *part.get("anyOf", ())):
            for key, described in shape.get("properties", {}).items():
                target = schema["$defs"].get(described.get("$ref", "").rpartition("/")[2], {})
                yield f"{name}.{key}", described.get("description", target.get("description"))


def test_shipped_schema_is_current() -> None:
    """The schema in the package is the one that the models give."""
    assert SCHEMA_FILE.read_text(encoding="utf-8") == schema_text(), (
        "write it anew: python -m etl.study.schema"
    )


@pytest.mark.parametrize(
    "text",
    [
        pytest.param(EXAMPLE, id="the design's example"),
        pytest.param(SOUND, id="the least"),
        pytest.param(ALL_OFF, id="every rule off"),
    ],
)
def test_schema_accepts_a_sound_study(text: str) -> None:
    """What the program accepts an editor accepts."""
    judge().validate(tomllib.loads(text))


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        pytest.param("trial =", "trail =", "'trail' was unexpected", id="unknown key"),
        pytest.param("[regions]", "[regoins]", "'regoins' was unexpected", id="unknown table"),
        pytest.param(
            "[regions]", "[screening]\nunder_ms = 1\n[regions]", "'under_ms' was", id="rule astray"
        ),
        pytest.param(
            "[regions]",
            "[screening.fixations]\nunder_ms = true\n[regions]",
            "True is not valid under any",
            id="limit that is true",
        ),
        pytest.param(
            "[regions]",
            "[screening.trials]\nduration_ms = [500]\n[regions]",
            "is not valid under any",
            id="half a range",
        ),
        pytest.param('"boxes"\n', '"circles"\n', "'circles' is not one of", id="no choice"),
        pytest.param('file = "boxes.csv"\n', "", "'file' is a required property", id="missing"),
        pytest.param('["logs/*.tsv"]', "[]", "should be non-empty", id="empty list"),
        pytest.param('"t_start"', '{ column = "t", unit = "min" }', "is not valid", id="unit"),
    ],
)
def test_schema_refuses_what_the_program_refuses(old: str, new: str, said: str) -> None:
    """An editor marks the mistakes that lie in single keys."""
    with pytest.raises(jsonschema.ValidationError, match=said):
        judge().validate(tomllib.loads(changed(old, new)))


def test_every_key_is_explained_to_editors() -> None:
    """Each key has a description in the schema."""
    assert [key for key, said in explanations(study_schema()) if not said] == []


def test_every_table_has_a_title() -> None:
    """Each table is titled as it is written in the file."""
    titles = {name: part["title"] for name, part in study_schema()["$defs"].items()}
    assert {title for name, title in titles.items() if not name.endswith("Column")} == {
        "[logs.eye.columns]",  # one for each eye, under a name that the lab chooses
        *(f"[{'.'.join(path)}]" for path, _ in known_keys() if _is_described_table(path)),
    }


def _is_described_table(path: tuple[str | int, ...]) -> bool:
    """Whether a path is a table with keys of its own, and no column of a log."""
    table = table_at(path)
    return table is not None and issubclass(table, Table) and not issubclass(table, Column)


def test_schema_knows_no_null() -> None:
    """TOML has no null; what is absent is not written."""
    assert "null" not in schema_text()


def test_reference_has_a_row_for_every_key() -> None:
    """No key is left out of the reference."""
    rows = key_reference().splitlines()[2:]
    named = [row.split("`")[1] for row in rows]
    assert named == [".".join(str(key) for key in path) for path, _ in known_keys()]


def test_every_row_of_the_reference_is_whole() -> None:
    """Each row has four filled cells."""
    cells = [row.strip("| ").split(" | ") for row in key_reference().splitlines()[2:]]
    assert [row for row in cells if len(row) != 4 or not all(row)] == []


@pytest.mark.parametrize(
    ("key", "kind", "default"),
    [
        pytest.param("title", "text", '`""`', id="text"),
        pytest.param("logs.missing", "list of text", '`["", ".", "NA"]`', id="list"),
        pytest.param("logs.columns.trial", "header of a column", "(absent)", id="column"),
        pytest.param(
            "logs.columns.onset",
            'header of a column, or `{ column = …, unit = … }`; unit `"ms"`, `"s"`, `"us"`',
            "(absent)",
            id="column with a unit",
        ),
        pytest.param("trials.skip", "table of list of text", "`{}`", id="table of lists"),
        pytest.param("screen", "table", "(absent)", id="absent table"),
        pytest.param("measures", "table", "(its keys' defaults)", id="table with defaults"),
        pytest.param(
            "screen.width_px",
            "whole number, above 0, at most 100000",
            "(needed)",
            id="whole number",
        ),
        pytest.param("regions.tolerance_px", "number, at least 0", "`0.0`", id="number"),
        pytest.param("logs.decimal", '`"."`, `","`', "(absent)", id="choices"),
        pytest.param(
            "output.formats", 'list of `"parquet"`, `"csv"`', '`["parquet"]`', id="list of choices"
        ),
        pytest.param("output.pseudonyms", "true or false", "`false`", id="switch"),
        pytest.param(
            "screening.trials.outside_share_over",
            "number, at least 0, at most 1",
            "(absent)",
            id="share",
        ),
        pytest.param("screening.trials.duration_ms", "list of 2 numbers", "(absent)", id="range"),
    ],
)
def test_row_of_the_reference(key: str, kind: str, default: str) -> None:
    """A row says key, type with bounds or choices, and default, before the meaning."""
    assert f"\n| `{key}` | {kind} | {default} | " in key_reference()


def test_every_needed_key_has_an_example() -> None:
    """A message about a missing key can show how to write it."""
    needed = [(path, field) for path, field in known_keys() if field.is_required()]
    assert [path for path, field in needed if table_at(path) is None and not field.examples] == []
