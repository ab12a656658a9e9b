"""The tables that a build writes, each declared once: column, type, unit, meaning.

Writers, codebook, documentation and tests all read these declarations.
"""

from __future__ import annotations

import base64
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import pyarrow as pa

ColumnType = Literal["text", "category", "flag", "integer", "number"]

#: Few distinct texts in many rows: written as codes and read back as plain text.
CODED = pa.dictionary(pa.int32(), pa.string())
_WRITTEN: dict[str, pa.DataType] = {
    "text": CODED,
    "category": CODED,
    "flag": pa.int8(),
    "integer": pa.int64(),
    "number": pa.float64(),
}
#: The ledger of everything left out, a CSV file.
LEDGER = "exclusions"
#: What the ledger says of lines: fixations that belong to none, and lines that were set by hand.
#: Neither leaves a fixation out.
LINE_RULES = ("no_line", "line_corrections")
#: The tables, in the order in which they are described.
TABLES = ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
        As it stands in the file.
    type : {"text", "category", "flag", "integer", "number"}
        A flag is 0 or 1; a category has a fixed order of levels.
    meaning : str
        In a sentence.
    unit : str
        Empty where there is none.
    nullable : bool
        Whether cells may be missing.
    levels : tuple of str
        Levels of a category, the reference level first.
    """

    name: str
    type: ColumnType
    meaning: str
    unit: str = ""
    nullable: bool = False
    levels: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class MeasureColumn:
    """What the tables need to know of a measure."""

    name: str
    kind: str
    unit: str
    definition: str


@dataclass(frozen=True)
class IdColumn:
    """An identifier: all values that the study has, in the order in which rows are sorted."""

    values: tuple[str, ...]
    type: Literal["text", "integer"]

    @classmethod
    def of(cls, texts: Iterable[str]) -> IdColumn:
        """Order the values of an id: as numbers where all are whole numbers, else as text.

        Examples
        --------
        >>> IdColumn.of(["10", "9"]).values, IdColumn.of(["10", "P9"]).values
        (('9', '10'), ('10', 'P9'))
        """
        distinct = set(texts)
        # "007" is a name, not the number 7: it must come back as it was.
        if distinct and all(
            text.isascii() and text.isdigit() and str(int(text)) == text and len(text) < 19
            for text in distinct
        ):
            return cls(tuple(sorted(distinct, key=int)), "integer")
        return cls(tuple(sorted(distinct)), "text")

    @cached_property
    def ranks(self) -> dict[str, int]:
        """The place of each value."""
        return {text: rank for rank, text in enumerate(self.values)}


@dataclass(frozen=True, slots=True)
class CovariateColumn:
    """A fact that is carried along: a number, or one of some texts."""

    type: Literal["text", "number"]
    values: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class TableDesign:
    """What a study's tables have in common.

    Attributes
    ----------
    ids : dict of str to IdColumn
        ``participant``, ``session`` where readers came more than once, ``trial``, ``item``.
    factors : dict of str to tuple of str
        Levels in order.
    covariates : dict of str to CovariateColumn
        Facts that are carried along.
    regions : tuple of str
        All names of regions.
    measures, trial_measures : tuple of MeasureColumn
        The outcomes asked for, and those of whole trials, in the order of the catalogue.
    reasons : tuple of str
        Why a value can be missing.
    left_out_by : tuple of str
        What can leave a fixation out.
    files : tuple of str
        The logs.
    lines : bool
        Whether texts have several lines and a method says which one each fixation belongs to.
    """

    ids: Mapping[str, IdColumn]
    factors: Mapping[str, tuple[str, ...]]
    covariates: Mapping[str, CovariateColumn]
    regions: tuple[str, ...]
    measures: tuple[MeasureColumn, ...]
    trial_measures: tuple[MeasureColumn, ...]
    reasons: tuple[str, ...]
    left_out_by: tuple[str, ...]
    files: tuple[str, ...]
    lines: bool = False

    def id_columns(self) -> tuple[Column, ...]:
        """The columns that say which trial a row is about."""
        meanings = {
            "participant": "the reader",
            "session": "which visit of the reader to the laboratory",
            "trial": "the trial, as numbered or named in the logs",
            "item": "the text that was read",
        }
        return tuple(
            Column(name, known.type, meanings[name], nullable=name == "item")
            for name, known in self.ids.items()
        )

    @property
    def ledger_rules(self) -> tuple[str, ...]:
        """The rules that the ledger may name."""
        return (*self.left_out_by, "outlier_sd", *(LINE_RULES if self.lines else ()))

    def factor_columns(self) -> tuple[Column, ...]:
        """The experimental factors."""
        return tuple(
            Column(name, "category", "experimental factor", levels=levels)
            for name, levels in self.factors.items()
        )

    def covariate_columns(self) -> tuple[Column, ...]:
        """The facts that are carried along."""
        return tuple(
            Column(name, known.type, "covariate, carried along", nullable=True)
            for name, known in self.covariates.items()
        )

    def columns(self, table: str) -> tuple[Column, ...]:
        """The columns of one table, in order."""
        ids, factors = self.id_columns(), self.factor_columns()
        design = (*ids, *factors, *self.covariate_columns())
        region = (
            Column("region", "category", "name of the region", levels=self.regions),
            Column("region_order", "integer", "place of the region in reading order, from 1"),
        )
        if table == "outcomes":
            return (*design, *region, *self._long_columns())
        if table == "outcomes_wide":
            return (*design, *region, *(_measure_column(m) for m in self.measures))
        if table == "trials":
            measured = (_measure_column(m) for m in self.trial_measures)
            why = "why outcomes of this trial are missing (outcome: reason), empty where none is"
            sure = "chance that the lines of the trial are right; empty where none was told"
            lines = (Column("line_confidence", "number", sure, nullable=True),)
            missing = Column("missing", "text", why, nullable=True)
            return (*design, *measured, *(lines if self.lines else ()), missing)
        if table == "regressions":
            return (*ids, *factors, *self._regression_columns())
        if table == "fixations":
            return (*ids, *self._fixation_columns())
        if table == LEDGER:
            return self._ledger_columns()
        raise KeyError(table)

    def _ledger_columns(self) -> tuple[Column, ...]:
        ids = tuple(
            replace(column, nullable=column.name != "participant") for column in self.id_columns()
        )
        what = "what was left out or changed: fixation, trial, participant or value"
        where = "region of the value; empty where it is not about one"
        which = "number of the fixation in its trial; empty where it is not about one"
        done = "left out, merged into fixation n, or set missing"
        if self.lines:
            done += "; counted as outside, or line set to n"
        later = "later rules that would have left it out too, separated by blanks"
        return (
            Column("level", "category", what, levels=("fixation", "trial", "participant", "value")),
            *ids,
            Column("region", "category", where, nullable=True, levels=self.regions),
            Column("fixation", "integer", which, nullable=True),
            Column("rule", "category", "the rule", levels=self.ledger_rules),
            Column("limit", "text", "the limit that the study sets", nullable=True),
            Column("observed", "text", "what was found", nullable=True),
            Column("action", "text", done),
            Column("source_file", "text", "the log; empty for a reader", nullable=True),
            Column("source_line", "integer", "the line in that log", nullable=True),
            Column("also", "text", later, nullable=True),
        )

    def _long_columns(self) -> tuple[Column, ...]:
        names = tuple(sorted(m.name for m in self.measures))
        kinds = tuple(sorted({m.kind for m in self.measures}))
        why = "why there is no value; empty where there is one"
        value = "the outcome: 0 or 1 where binary, a count, or milliseconds where a duration"
        return (
            Column("measure", "category", "name of the outcome", levels=names),
            Column("kind", "category", "binary, count or duration", levels=kinds),
            Column("value", "number", value, nullable=True),
            Column("missing", "category", why, nullable=True, levels=self.reasons[1:]),
        )

    def _regression_columns(self) -> tuple[Column, ...]:
        regions = self.regions
        return (
            Column("from_region", "category", "region that the eye left", levels=regions),
            Column("from_order", "integer", "its place in reading order"),
            Column("to_region", "category", "region that the eye went back to", levels=regions),
            Column("to_order", "integer", "its place in reading order"),
            Column("regions_crossed", "integer", "from_order - to_order"),
            Column("ends_first_pass", "flag", "1 if it ends the first pass on the region left"),
            Column("launch_fixation", "integer", "number of the fixation before it in the trial"),
            Column("landing_fixation", "integer", "number of the fixation after it in the trial"),
            Column("onset_ms", "number", "onset of the landing fixation", "ms", nullable=True),
            Column(
                "amplitude_px",
                "number",
                "horizontal distance from launch to landing, negative to the left",
                "px",
                nullable=True,
            ),
        )

    def _fixation_columns(self) -> tuple[Column, ...]:
        first = "1 if the fixation belongs to the first pass on its region, 0 if not"
        return (
            Column("fixation", "integer", "its number in the trial, from 1, in time order"),
            Column("onset_ms", "number", "when it began, in log time", "ms", nullable=True),
            Column("duration_ms", "number", "how long it lasted", "ms"),
            Column("x_px", "number", "from the left edge of the screen", "px", nullable=True),
            Column("y_px", "number", "from the top edge of the screen", "px", nullable=True),
            Column("line", "integer", "line of the text, from 1", nullable=True),
            Column(
                "region",
                "category",
                "region fixated; missing: outside",
                nullable=True,
                levels=self.regions,
            ),
            Column("region_order", "integer", "its place in reading order", nullable=True),
            Column("visit", "integer", "which visit to its region, from 1", nullable=True),
            Column("first_pass", "flag", first, nullable=True),
            *(self._line_columns() if self.lines else ()),
            Column("kept", "flag", "1 if the outcomes are computed from it, 0 if left out"),
            Column(
                "left_out_by",
                "category",
                "what left it out; empty where kept",
                nullable=True,
                levels=self.left_out_by,
            ),
            Column("source_file", "text", "the log it was read from"),
            Column("source_line", "integer", "its line in that log, from 1"),
        )

    def _line_columns(self) -> tuple[Column, ...]:
        sure = "chance that its line is right; empty where none was told"
        sweep = "1 if a return sweep to a later line came down on it, 0 if not"
        short = "1 if that sweep fell short and the next saccade corrects it, 0 if not"
        return (
            Column("line_confidence", "number", sure, nullable=True),
            Column("return_sweep", "flag", sweep),
            Column("undersweep", "flag", short),
        )


#: The tables of a study without factors, measures or readers: the columns that studies have, with
#: those about lines.
BARE_DESIGN = TableDesign({}, {}, {}, (), (), (), ("",), (), (), lines=True)


def _measure_column(measure: MeasureColumn) -> Column:
    """A column that holds one measure."""
    types: dict[str, ColumnType] = {"binary": "flag", "count": "integer"}
    return Column(
        measure.name,
        types.get(measure.kind, "number"),
        measure.definition,
        measure.unit,
        nullable=True,
    )


def written_schema(columns: tuple[Column, ...]) -> pa.Schema:
    """The types in which rows are handed to the writers (texts as codes)."""
    return pa.schema([pa.field(c.name, _WRITTEN[c.type], nullable=c.nullable) for c in columns])


def read_schema(columns: tuple[Column, ...]) -> pa.Schema:
    """The types in which a Parquet reader gets them back (only categories as codes)."""
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
    """
    return {"ARROW:schema": base64.b64encode(read_schema(columns).serialize()).decode("ascii")}


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
