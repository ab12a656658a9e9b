"""Every table that leaves: what a row of it is, its columns, and what tells its rows apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Final

from etl.handoff.codebook_study import StudyFacts
from etl.handoff.regions_table import REGIONS, region_columns
from etl.readiness.facts import ALL_REGIONS, VERDICT_RULES, VERDICTS
from etl.tables import BARE_DESIGN, LEDGER, TABLES, Column, TableDesign

CODEBOOK: Final = "codebook"
ACCOUNTS: Final = "accounts"
LOG_ACCOUNTS: Final = "log_accounts"
READINESS: Final = "readiness"
FORMULAS: Final = "formulas"
#: What one row of each table is, in the order in which tables are described.
ROWS: Final = {
    "outcomes": "a reader × trial × region × outcome",
    "outcomes_wide": "a reader × trial × region, with a column for each outcome",
    "trials": "a trial that was kept, with its outcomes",
    "regressions": "a saccade to an earlier region",
    "fixations": "a fixation that was read, kept or not",
    LEDGER: "a fixation, trial, reader or value that was left out or changed",
    ACCOUNTS: "a reader × unit: what was read, what each rule left out, what was kept",
    LOG_ACCOUNTS: "a kind of line, or a kind of repair, of a log",
    READINESS: "a binary outcome × region, all conditions together and then each of them",
    FORMULAS: "a formula for a binary outcome × region, from the fullest to the simplest",
    REGIONS: "a region of a text",
    CODEBOOK: "a column of a table; of the table outcomes, also an outcome",
}


def all_tables(design: TableDesign, study: StudyFacts) -> dict[str, tuple[Column, ...]]:
    """The columns of every table that leaves.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    study : StudyFacts
        The study's decisions.

    Returns
    -------
    dict of str to tuple of Column
        By name of the table, in the order in which tables are described.
    """
    own = {name: design.columns(name) for name in (*TABLES, LEDGER)}
    return {
        **own,
        ACCOUNTS: account_columns(design.left_out_by),
        LOG_ACCOUNTS: log_account_columns(),
        READINESS: readiness_columns(design),
        FORMULAS: formula_columns(design),
        REGIONS: region_columns(study.region_keys, design.regions),
        CODEBOOK: codebook_columns(),
    }


def names_in_use() -> frozenset[str]:
    """Names that no factor may bear, for tables with a column for each factor have them already.

    Returns
    -------
    frozenset of str
        Of the tables of readiness and of regions, and of those that a design declares itself.

    Examples
    --------
    >>> {"zeros", "region_text", "measure"} <= names_in_use()
    True
    """
    bare = StudyFacts("", "ignore", "missing")
    return frozenset(
        column.name
        for name, columns in all_tables(BARE_DESIGN, bare).items()
        if name in (*TABLES, READINESS, REGIONS)
        for column in columns
    )


def row_key(design: TableDesign, table: str, study: StudyFacts) -> tuple[str, ...]:
    """The columns that together tell the rows of a table apart, none of them ever empty.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    table : str
        One of ``ROWS``.
    study : StudyFacts
        The study's decisions.

    Returns
    -------
    tuple of str
        Names of columns; none where no such columns tell them apart.
    """
    # An item says what was read, not which trial it was, and may be missing.
    trial = tuple(name for name in design.ids if name != "item")
    return {
        "outcomes": (*trial, "region_order", "measure"),
        "outcomes_wide": (*trial, "region_order"),
        "trials": trial,
        "regressions": (*trial, "landing_fixation"),
        "fixations": (*trial, "fixation"),
        ACCOUNTS: ("participant", "unit"),
        LOG_ACCOUNTS: ("source_file", "unit", "what"),
        REGIONS: (*(column.name for column in study.region_keys), "region_order"),
    }.get(table, ())


def account_columns(rules: Sequence[str]) -> tuple[Column, ...]:
    """The columns of the accounts, for the rules that a study uses.

    Parameters
    ----------
    rules : sequence of str
        In order of application.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    return (
        Column("participant", "text", "the reader; (all) for all readers together"),
        Column("unit", "category", "what is counted", levels=("trials", "fixations")),
        Column("read", "integer", "how many were read", "count"),
        *(Column(rule, "integer", f"how many {rule} left out", "count") for rule in rules),
        Column("kept", "integer", "how many are left", "count"),
    )


def log_account_columns() -> tuple[Column, ...]:
    """The columns of the accounts of the logs.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    return (
        Column("source_file", "text", "the log"),
        Column(
            "unit",
            "category",
            "what is counted: lines, or repairs within lines that are counted already",
            levels=("lines", "repairs"),
        ),
        Column(
            "what",
            "text",
            "what became of the lines, or what was mended; all lines: their sum",
        ),
        Column("count", "integer", "how many", "count"),
        Column(
            "first_line",
            "integer",
            "the first line of the log at which it is, from 1",
            nullable=True,
        ),
    )


def readiness_columns(design: TableDesign) -> tuple[Column, ...]:
    """The columns of the table of readiness.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    factors = tuple(
        replace(column, nullable=True)
        for column in design.factor_columns()
        if column.name in design.factors
    )
    interval = "of Wilson's interval of 95 % for the rate, as if values were independent"
    return (
        *_outcome_and_region(design),
        *factors,
        Column("zeros", "integer", "rows with the value 0", "count"),
        Column("ones", "integer", "rows with the value 1", "count"),
        Column("missing", "integer", "rows with a reason in place of a value", "count"),
        Column("rate", "number", "share of ones among the values", "share", nullable=True),
        Column("rate_low", "number", f"lower end {interval}", "share", nullable=True),
        Column("rate_high", "number", f"upper end {interval}", "share", nullable=True),
        Column(
            "state",
            "category",
            "what is the matter with the counts",
            nullable=True,
            levels=("empty", "all 0", "all 1"),
        ),
        *_constant("readers"),
        # Not every study knows which texts its trials show.
        *(replace(column, nullable=True) for column in _constant("items")),
        Column(
            "verdict",
            "category",
            "the worst that can be said of the outcome in the region, from worst to best: "
            + "; ".join(f"{verdict}: {rule}" for verdict, rule in VERDICT_RULES.items()),
            nullable=True,
            levels=VERDICTS,
        ),
        Column("why", "text", "what the verdict rests on", nullable=True),
    )


def _constant(units: str) -> tuple[Column, ...]:
    """How many readers or items there are, and how many of them are constant."""
    one_value = f"how many {units} have the value {{}} only"
    return (
        Column(units, "integer", f"how many {units} have a value", "count"),
        Column(f"{units}_all_zero", "integer", one_value.format(0), "count"),
        Column(f"{units}_all_one", "integer", one_value.format(1), "count"),
    )


def formula_columns(design: TableDesign) -> tuple[Column, ...]:
    """The columns of the table of formulas.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    return (
        *_outcome_and_region(design),
        Column("step", "integer", "place in the ladder, from 1, the maximal formula"),
        Column("formula", "text", "as lme4 writes it, the response on the left"),
        Column("change", "text", "what was taken away from the step before", nullable=True),
        Column("fixed_parameters", "integer", "coefficients of fixed effects", "count"),
        Column(
            "random_parameters", "integer", "variances of random effects, correlations too", "count"
        ),
        Column(
            "random_effects",
            "integer",
            "random effects of the grouping that has most: its units times its coefficients",
            "count",
        ),
        Column(
            "ones_per_parameter",
            "number",
            "ones, or zeros where they are rarer, for each parameter",
        ),
        Column("expectation", "text", "what to expect of the formula", nullable=True),
        Column("start", "flag", "1 for the step to begin with, 0 for the others"),
    )


def _outcome_and_region(design: TableDesign) -> tuple[Column, ...]:
    """What a row about readiness is about."""
    measures = (*design.measures, *design.trial_measures)
    binary = tuple(dict.fromkeys(m.name for m in measures if m.kind == "binary"))
    return (
        Column("outcome", "category", "name of the binary outcome", levels=binary),
        Column(
            "region",
            "category",
            f"the region, or {ALL_REGIONS}",
            nullable=True,
            levels=(*design.regions, ALL_REGIONS),
        ),
    )


def codebook_columns() -> tuple[Column, ...]:
    """The columns of the codebook itself.

    Returns
    -------
    tuple of Column
        In the order of the file.
    """
    bar = "with | between them, and a backslash before a | within one"
    types = ("text", "category", "flag", "integer", "number")
    return (
        Column("table", "category", "name of the table", levels=tuple(ROWS)),
        Column("column", "text", "name of the column"),
        Column("outcome", "text", "the outcome that the column holds", nullable=True),
        Column(
            "type",
            "category",
            "text; category: one of the levels; flag: 0 or 1; integer; number with decimals",
            levels=types,
        ),
        Column("unit", "text", "what one of it is", nullable=True),
        Column("levels", "text", f"levels in order, the reference first, {bar}", nullable=True),
        Column("meaning", "text", "what it is, as computed under the options of the study"),
        Column(
            "when_missing",
            "text",
            "when a cell is empty; for outcomes each reason with what it means",
            nullable=True,
        ),
        Column("source", "text", "where it comes from, or who defines it", nullable=True),
    )
