"""The types of columns as Arrow and Parquet have them."""

from __future__ import annotations

import base64

import pyarrow as pa

from etl.tables.columns import Column

#: Few distinct texts in many rows: written as codes and read back as plain text.
CODED = pa.dictionary(pa.int32(), pa.string())
_WRITTEN: dict[str, pa.DataType] = {
    "text": CODED,
    "category": CODED,
    "flag": pa.int8(),
    "integer": pa.int64(),
    "number": pa.float64(),
}


def written_schema(columns: tuple[Column, ...]) -> pa.Schema:
    """The types in which rows are handed to the writers (texts as codes).

    Parameters
    ----------
    columns : tuple of Column
        Of one table.

    Returns
    -------
    pa.Schema
        A field for each.
    """
    return pa.schema([pa.field(c.name, _WRITTEN[c.type], nullable=c.nullable) for c in columns])


def read_schema(columns: tuple[Column, ...]) -> pa.Schema:
    """The types in which a Parquet reader gets them back (only categories as codes).

    Parameters
    ----------
    columns : tuple of Column
        Of one table.

    Returns
    -------
    pa.Schema
        A field for each.
    """
    return pa.schema(
        [
            pa.field(
                c.name, pa.string() if c.type == "text" else _WRITTEN[c.type], nullable=c.nullable
            )
            for c in columns
        ]
    )


def schema_note(columns: tuple[Column, ...]) -> dict[str, str]:
    """The Parquet metadata entry that carries :func:`read_schema`.

    Texts are written from codes, which costs a tenth of writing them as text; Arrow's own entry
    would make every reader get codes back, also for ids, where categories are a nuisance.

    Parameters
    ----------
    columns : tuple of Column
        Of one table.

    Returns
    -------
    dict of str to str
        Arrow's own key, and the schema as Arrow spells it there.
    """
    return {"ARROW:schema": base64.b64encode(read_schema(columns).serialize()).decode("ascii")}
