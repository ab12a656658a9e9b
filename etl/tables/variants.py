"""The tables that tell of variants of a study, each declared once."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

from etl.tables.columns import Column
from etl.tables.design import TableDesign

#: What a cell can be in the study as it stands.
IN_STUDY: Final = ("value", "missing", "left out")
VARIANTS: Final = "variants"
VARIANT_ACCOUNTS: Final = "variant_accounts"
RATES: Final = "rates"
COMPARISONS: Final = "comparisons"
DECISIONS: Final = "decisions"
CHANGES: Final = "changes"
CHANGES_BY_VARIANT: Final = "changes_by_variant"
READERS: Final = "readers"
CHANGED_CELLS: Final = "changed_cells"
#: What one row of each table is, in the order in which tables are described.
VARIANT_ROWS: Final = {
    VARIANTS: "a variant: what it decides, and what it keeps",
    VARIANT_ACCOUNTS: "a variant × unit: what was read, what each rule left out, what was kept",
    RATES: "a variant × binary outcome × region × condition",
    COMPARISONS: "a binary outcome × region × level against the reference level, over all variants",
    DECISIONS: "a comparison × setting × alternative",
    CHANGES: "an outcome × region × setting: how many cells of outcomes hang on it",
    CHANGES_BY_VARIANT: "a variant × outcome × region: cells that are not as in the study",
    READERS: "a reader × setting",
    CHANGED_CELLS: "a cell of outcomes that is not the same in all variants",
}

_VARIANT = Column("variant", "integer", "number of the variant, from 1; variants.csv has them")
_MEASURE = Column("measure", "text", "name of the outcome")
_REGION = Column(
    "region",
    "text",
    "name of the region; empty for an outcome of trials, (all regions) where all are counted "
    "together",
    nullable=True,
)
_SETTING = Column("setting", "text", "key of the study file that is varied")
_PER_PAIR = (
    "over all pairs of variants that differ in this setting only; empty where not every "
    "combination is among the variants"
)


def rate_columns(factors: Mapping[str, Sequence[str]]) -> tuple[Column, ...]:
    """The columns of ``rates``.

    Parameters
    ----------
    factors : mapping of str to sequence of str
        The levels of each factor in order.

    Returns
    -------
    tuple of Column
    """
    any_level = "level of the experimental factor; empty where all levels are counted together"
    interval = "{} limit of its 95 % interval"
    return (
        _VARIANT,
        _MEASURE,
        _REGION,
        *(
            Column(name, "category", any_level, nullable=True, levels=tuple(levels))
            for name, levels in factors.items()
        ),
        Column("rows", "integer", "rows of outcomes (of trials, for an outcome of trials)"),
        Column("rows_lost", "integer", "rows that screening has left out"),
        Column("missing", "integer", "rows without a value"),
        Column("n", "integer", "rows with a value"),
        Column("ones", "integer", "values that are 1"),
        Column("rate", "number", "ones / n", nullable=True),
        Column("rate_low", "number", interval.format("lower") + " (Wilson 1927)", nullable=True),
        Column("rate_high", "number", interval.format("upper"), nullable=True),
        Column("against", "text", "the condition with which it is compared", nullable=True),
        Column(
            "difference",
            "number",
            "log-odds here less those of the condition it is compared with; empty where one of "
            "them has no value, or all values of both are the same",
            nullable=True,
        ),
        Column(
            "difference_low",
            "number",
            interval.format("lower") + " (Woolf 1955), trials taken as independent",
            nullable=True,
        ),
        Column("difference_high", "number", interval.format("upper"), nullable=True),
        Column(
            "corrected",
            "flag",
            "1 if 0.5 was added to each of the four counts of the difference, since one was 0",
            nullable=True,
        ),
    )


def variant_columns(settings: Mapping[str, str]) -> tuple[Column, ...]:
    """The columns of ``variants``; for each setting its column and its key."""
    return (
        _VARIANT,
        Column("name", "text", "what the variants file calls it", nullable=True),
        Column("study", "flag", "1 for the study as it stands"),
        *(Column(name, "text", f"value of {key} as TOML has it") for name, key in settings.items()),
        Column("readers_kept", "integer", "readers of whom a trial is kept"),
        Column("readers_lost", "integer", "readers left out by rules on readers"),
        Column("trials_read", "integer", "trials of the study that were read"),
        Column("trials_kept", "integer", "those that are kept"),
        Column("fixations_read", "integer", "fixations of the trials of the study"),
        Column("fixations_kept", "integer", "those that are kept"),
        Column("values_set_missing", "integer", "values set missing by outlier_sd"),
        Column("cells_changed", "integer", "cells of outcomes that are not as in the study"),
        Column("trials_changed", "integer", "trials that these are of"),
    )


def variant_account_columns(rules: Sequence[str]) -> tuple[Column, ...]:
    """The columns of ``variant_accounts``."""
    return (
        _VARIANT,
        Column("unit", "text", "trials or fixations"),
        Column("read", "integer", "how many were read"),
        *(Column(rule, "integer", f"left out by {rule}") for rule in rules),
        Column("kept", "integer", "how many are kept"),
    )


def _comparison() -> tuple[Column, ...]:
    """What tells comparisons apart."""
    return (
        _MEASURE,
        _REGION,
        Column("factor", "text", "the factor; empty in a study without", nullable=True),
        Column("level", "text", "the level that is compared", nullable=True),
        Column("reference", "text", "the level that it is compared with", nullable=True),
    )


def comparison_columns() -> tuple[Column, ...]:
    """The columns of ``comparisons``."""
    what = "difference in log-odds (in a study without factors the rate)"
    sign = "variants in which it is {}"
    return (
        *_comparison(),
        Column("in_study", "number", f"{what} in the study as it stands", nullable=True),
        Column("in_study_low", "number", "lower limit of its 95 % interval", nullable=True),
        Column("in_study_high", "number", "upper limit of its 95 % interval", nullable=True),
        Column("lowest", "number", "the lowest of all variants", nullable=True),
        Column("lowest_variant", "integer", "the variant that has it", nullable=True),
        Column("highest", "number", "the highest of all variants", nullable=True),
        Column("highest_variant", "integer", "the variant that has it", nullable=True),
        Column("positive", "integer", sign.format("above 0"), nullable=True),
        Column("negative", "integer", sign.format("below 0"), nullable=True),
        Column("zero", "integer", sign.format("exactly 0"), nullable=True),
        Column("without", "integer", "variants in which there is none"),
        Column(
            "same_sign",
            "integer",
            "variants that have the sign of the study as it stands; empty for rates",
            nullable=True,
        ),
        Column(
            "clear",
            "integer",
            "those of them with an interval that leaves out 0",
            nullable=True,
        ),
        Column(
            "leaves_out_0",
            "integer",
            "variants with an interval that leaves out 0, on whichever side",
            nullable=True,
        ),
        Column("decides_most", "text", "the setting that decides most about it", nullable=True),
        Column(
            "decides_share",
            "number",
            "the share of the variance that is left when all other settings are fixed",
            nullable=True,
        ),
        Column("turns_with", "text", "the setting that turns its sign most often", nullable=True),
        Column(
            "clears_with",
            "text",
            "the setting that most often decides whether the interval leaves out 0",
            nullable=True,
        ),
    )


def decision_columns() -> tuple[Column, ...]:
    """The columns of ``decisions``."""
    return (
        *_comparison(),
        _SETTING,
        Column("alternative", "text", "its value, as TOML has it"),
        Column("in_study", "flag", "1 for the value of the study as it stands"),
        Column("variants", "integer", "variants with it"),
        Column("without", "integer", "those of them in which there is no difference"),
        Column("mean", "number", "mean difference over the others", nullable=True),
        Column(
            "alone",
            "number",
            "share of the variance over all variants that the setting explains by itself, the same "
            "for all its alternatives; empty where not every combination is among the variants, "
            "one has no difference, or all have the same",
            nullable=True,
        ),
        Column("together", "number", "the same with its interactions", nullable=True),
        Column(
            "turns",
            "number",
            "how often the sign is not the same (0 has a sign of its own), over all pairs of "
            "variants that differ in this setting only; empty for rates",
            nullable=True,
        ),
        Column(
            "leaves_out_0",
            "integer",
            "variants with it whose interval leaves out 0",
            nullable=True,
        ),
        Column(
            "clears",
            "number",
            "how often the side of 0 on which the interval lies, or that it includes 0, is not the "
            "same, over such pairs",
            nullable=True,
        ),
    )


def change_columns() -> tuple[Column, ...]:
    """The columns of ``changes``."""
    return (
        _MEASURE,
        Column("kind", "text", "binary, count or duration"),
        _REGION,
        Column("cells", "integer", "cells that are there in any variant"),
        Column("cells_changed", "integer", "those that are not the same in all variants"),
        Column("trials_changed", "integer", "trials that these are of"),
        _SETTING,
        Column("chance", "number", f"how often a cell changes, {_PER_PAIR}", nullable=True),
        Column(
            "share",
            "number",
            "this chance, of the sum over all settings",
            nullable=True,
        ),
    )


def change_by_variant_columns() -> tuple[Column, ...]:
    """The columns of ``changes_by_variant``."""
    return (
        _VARIANT,
        _MEASURE,
        _REGION,
        Column("cells_changed", "integer", "cells that are not as in the study as it stands"),
        Column("trials_changed", "integer", "trials that these are of"),
    )


def reader_columns() -> tuple[Column, ...]:
    """The columns of ``readers``."""
    return (
        Column("participant", "text", "the reader"),
        Column("cells", "integer", "cells of binary outcomes"),
        Column("cells_changed", "integer", "those that are not the same in all variants"),
        _SETTING,
        Column("chance", "number", f"how often such a cell changes, {_PER_PAIR}", nullable=True),
    )


def changed_cell_columns(design: TableDesign, hangs_on: Mapping[str, str]) -> tuple[Column, ...]:
    """The columns of ``changed_cells``.

    Parameters
    ----------
    design : TableDesign
        The tables of the study.
    hangs_on : mapping of str to str
        For each setting, the column that says how much a cell hangs on it, and the setting's key.

    Returns
    -------
    tuple of Column
    """
    names = tuple(sorted(m.name for m in design.measures))
    return (
        *design.id_columns(),
        Column("region", "category", "name of the region", levels=design.regions),
        Column("region_order", "integer", "place of the region in reading order, from 1"),
        Column("measure", "category", "name of the outcome", levels=names),
        Column("value", "number", "its value in the study as it stands", nullable=True),
        Column("in_study", "category", "what it is in the study as it stands", levels=IN_STUDY),
        Column("variants_same", "integer", "variants in which it is the same, the study included"),
        Column("variants_other_value", "integer", "variants in which it has another value"),
        Column("variants_missing", "integer", "variants in which it has no value any more"),
        Column("variants_left_out", "integer", "variants that leave out its trial or reader"),
        *(
            Column(name, "number", f"how often it changes with {key}, {_PER_PAIR}", nullable=True)
            for name, key in hangs_on.items()
        ),
    )
