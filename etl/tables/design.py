"""The tables of a study: which there are, and the columns of each."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

from etl.coding import Coding, coding_of
from etl.tables.columns import Column, ColumnType, CovariateColumn, IdColumn, MeasureColumn

#: The ledger of everything left out, a CSV file.
LEDGER = "exclusions"
#: What the ledger says of lines: fixations that belong to none, and lines that were set by hand.
#: Neither leaves a fixation out.
LINE_RULES = ("no_line", "line_corrections")
#: The tables, in the order in which they are described.
TABLES = ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")


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
    codings : dict of str to Coding
        The factors that the study wants as numbers too, with the columns that hold them.
    centred : dict of str to float
        The covariates that the study wants centred too, with their means over its trials as read.
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
    codings: Mapping[str, Coding] = field(default_factory=dict)
    centred: Mapping[str, float] = field(default_factory=dict)

    def coding(self, factor: str) -> Coding:
        """A factor as numbers: as the study wants it, else treatment-coded.

        Parameters
        ----------
        factor : str
            Its name.

        Returns
        -------
        Coding
            Its columns are in the tables only where the study wants them.

        Raises
        ------
        KeyError
            If the study has no such factor.
        """
        return self.codings.get(factor) or coding_of(factor, self.factors[factor])

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
        """The experimental factors, each followed by the numbers that the study wants for it."""
        columns: list[Column] = []
        for name, levels in self.factors.items():
            columns.append(Column(name, "category", "experimental factor", levels=levels))
            if name in self.codings:
                columns += _contrast_columns(self.codings[name])
        return tuple(columns)

    def covariate_columns(self) -> tuple[Column, ...]:
        """The facts that are carried along, and after them the centred ones."""
        carried = tuple(
            Column(name, known.type, "covariate, carried along", nullable=True)
            for name, known in self.covariates.items()
        )
        mean = "{} minus {!r}, its mean over the trials of the study as read, before screening"
        return carried + tuple(
            Column(centred_name(name), "number", mean.format(name, number), nullable=True)
            for name, number in self.centred.items()
        )

    def clashes(self) -> dict[str, str]:
        """New columns that have the name of another one, each with a table where they meet.

        Returns
        -------
        dict of str to str
            By name of a column of numbers for a factor, or of a centred one.
        """
        made = {end for coding in self.codings.values() for end in coding.columns}
        made |= {centred_name(name) for name in self.centred}
        met: dict[str, str] = {}
        for table in TABLES:
            counted = Counter(column.name for column in self.columns(table))
            for name, times in counted.items():
                if times > 1 and name in made:
                    met.setdefault(name, table)
        return met

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
        source=measure.source,
        reasons=measure.reasons,
    )


def centred_name(covariate: str) -> str:
    """The column of a covariate without its mean.

    Parameters
    ----------
    covariate : str
        Its name.

    Returns
    -------
    str
        The name of the column.

    Examples
    --------
    >>> centred_name("age")
    'age_centred'
    """
    return f"{covariate}_centred"


def _contrast_columns(coding: Coding) -> list[Column]:
    """The columns that hold a factor as numbers."""
    return [
        Column(
            name,
            "number",
            f"{coding.factor} as {coding.name} contrast: "
            + ", ".join(
                f"{level} {numbers[place]:.6g}"
                for level, numbers in zip(coding.levels, coding.matrix, strict=True)
            ),
        )
        for place, name in enumerate(coding.columns)
    ]
