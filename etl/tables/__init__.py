"""The tables that a build writes, each declared once: column, type, unit, meaning.

Writers, codebook, documentation and tests all read these declarations.
"""

from etl.tables.columns import Column, ColumnType, CovariateColumn, IdColumn, MeasureColumn
from etl.tables.design import BARE_DESIGN, LEDGER, LINE_RULES, TABLES, TableDesign, centred_name
from etl.tables.reference import table_reference
from etl.tables.schemas import CODED, read_schema, schema_note, written_schema

__all__ = [
    "BARE_DESIGN",
    "CODED",
    "LEDGER",
    "LINE_RULES",
    "TABLES",
    "Column",
    "ColumnType",
    "CovariateColumn",
    "IdColumn",
    "MeasureColumn",
    "TableDesign",
    "centred_name",
    "read_schema",
    "schema_note",
    "table_reference",
    "written_schema",
]
