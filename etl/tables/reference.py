"""The columns of every table as the README shows them."""

from __future__ import annotations

from dataclasses import replace

from etl.tables.columns import IdColumn
from etl.tables.design import BARE_DESIGN, LEDGER, TABLES


def table_reference() -> str:
    """The columns of every table as Markdown, as the README shows them.

    Returns
    -------
    str
        A heading and a table for each; measures, factors and covariates, which differ from study
        to study, are named in a sentence.
    """
    ids = {name: IdColumn((), "text") for name in ("participant", "session", "trial", "item")}
    design = replace(BARE_DESIGN, ids=ids)
    units = {"flag": "0 or 1", "number": "number", "integer": "whole number"}
    parts = []
    for name in (*TABLES, LEDGER):
        lines = [f"#### `{name}`", "", "| Column | Holds | Meaning |", "|---|---|---|"]
        for column in design.columns(name):
            holds = column.unit or units.get(column.type, "text")
            lines.append(f"| `{column.name}` | {holds} | {column.meaning} |")
        parts.append("\n".join(lines))
    return "\n\n".join(parts) + "\n"
