"""The entries of the codebook: one for every column, and for every outcome of the study."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Final

from etl.errors import FaultError
from etl.handoff.codebook_cells import in_one_cell
from etl.handoff.codebook_study import StudyFacts
from etl.handoff.codebook_tables import (
    ACCOUNTS,
    CODEBOOK,
    FORMULAS,
    LOG_ACCOUNTS,
    READINESS,
    all_tables,
)
from etl.handoff.regions_table import REGIONS
from etl.tables import LEDGER, Column, MeasureColumn, TableDesign
from etl.tables.design import centred_name

#: When a cell of a column is empty, whatever the table.
_EMPTY: Final = {
    "item": "no text is known of the trial",
    "region": "the fixation is outside every region, or its trial is no part of the study",
    "region_order": "as region",
    "visit": "the fixation is outside every region or left out",
    "first_pass": "the fixation is outside every region or left out",
    "line": "the fixation is on no line, or the regions have no places",
    "onset_ms": "the log has no times of onset",
    "x_px": "the log has no position for the fixation",
    "y_px": "the log has no position for the fixation",
    "amplitude_px": "the log has no position for one of the two fixations",
    "line_confidence": "the way in which lines are told gives none",
    "left_out_by": "the fixation is kept",
}
#: The same where it depends on the table.
_EMPTY_IN: Final = {
    ("outcomes", "value"): "the column missing says why; see each outcome below",
    ("outcomes", "missing"): "there is a value",
    ("trials", "missing"): "every outcome of the trial has a value",
    (LEDGER, "session"): "the row is about a reader",
    (LEDGER, "trial"): "the row is about a reader",
    (LEDGER, "item"): "the row is about a reader, or no text is known of the trial",
    (LEDGER, "region"): "the row is not about a value",
    (LEDGER, "fixation"): "the row is not about a fixation",
    (LEDGER, "limit"): "the rule has none",
    (LEDGER, "observed"): "the rule measures nothing",
    (LEDGER, "source_file"): "the row is about a reader or a value",
    (LEDGER, "source_line"): "the row is about a reader or a value",
    (LEDGER, "also"): "no later rule would have left it out",
    (LOG_ACCOUNTS, "first_line"): "it is on no line of the log",
    (READINESS, "region"): "the outcome is one of trials",
    (READINESS, "rate"): "there is no value",
    (READINESS, "rate_low"): "there is no value",
    (READINESS, "rate_high"): "there is no value",
    (READINESS, "state"): "there are zeros and ones",
    **{(READINESS, f"items{end}"): "no texts are known" for end in ("", "_all_zero", "_all_one")},
    **{(READINESS, name): "the row is about one condition" for name in ("verdict", "why")},
    (FORMULAS, "region"): "the outcome is one of trials",
    (FORMULAS, "change"): "it is the first step",
    (FORMULAS, "expectation"): "nothing speaks against the formula",
    (REGIONS, "region_text"): "the definitions of regions hold no text",
    (REGIONS, "region_characters"): "the definitions of regions hold no text",
    (REGIONS, "region_lines"): "regions are known by labels and have no places",
    **{
        (REGIONS, side): "regions are known by labels and have no places"
        for side in ("left_px", "top_px", "right_px", "bottom_px")
    },
    (REGIONS, "region_labels"): "regions are known by their places",
    (CODEBOOK, "outcome"): "the column holds no outcome, or several",
    (CODEBOOK, "unit"): "there is none",
    (CODEBOOK, "levels"): "the column has no fixed levels",
    (CODEBOOK, "when_missing"): "no cell of the column is ever empty",
    (CODEBOOK, "source"): "the program itself",
}
_CONDITION_EMPTY: Final = "the row is about all conditions together"
_NO_FACT: Final = "no value is known for the trial"

#: Who defines what is neither an outcome nor a fact.
_SOURCES: Final = {
    (READINESS, "rate_low"): "Wilson (1927). Probable inference, the law of succession, and "
    "statistical inference. Journal of the American Statistical Association, 22, 209-212. "
    "doi:10.1080/01621459.1927.10502953",
    (FORMULAS, "formula"): "Barr, Levy, Scheepers & Tily (2013). Random effects structure for "
    "confirmatory hypothesis testing: keep it maximal. Journal of Memory and Language, 68, "
    "255-278. doi:10.1016/j.jml.2012.11.001; Bates, Kliegl, Vasishth & Baayen (2015). "
    "Parsimonious mixed models. arXiv:1506.04967",
}
_CONTRASTS: Final = "Chambers & Hastie (1992). Statistical Models in S, section 2.3"
_SOURCES_TOO: Final = {(READINESS, "rate_high"): (READINESS, "rate_low")}
_FROM_LOGS: Final = ("participant", "session", "trial", "item", "onset_ms", "duration_ms")
_FROM_REGIONS: Final = (
    *("region", "region_order", "from_region", "to_region", "region_text", "region_lines"),
    *("left_px", "top_px", "right_px", "bottom_px", "region_labels"),
)


@dataclass(frozen=True, slots=True)
class CodebookEntry:
    """One row of the codebook.

    Attributes
    ----------
    table : str
        The table.
    column : Column
        The column; for an outcome in the long table, with the outcome's own type and meaning.
    outcome : str
        The outcome that the column holds; empty where none, or several.
    when_missing : str
        When a cell is empty; empty where none ever is.
    source : str
        Where it comes from, or who defines it.
    """

    table: str
    column: Column
    outcome: str
    when_missing: str
    source: str

    def cells(self) -> list[str | None]:
        """The entry as a row of ``codebook.csv``."""
        column = self.column
        texts = (
            *(self.table, column.name, self.outcome, column.type, column.unit),
            *(in_one_cell(column.levels), column.meaning, self.when_missing, self.source),
        )
        return [text or None for text in texts]


def codebook_entries(design: TableDesign, study: StudyFacts) -> list[CodebookEntry]:
    """Every entry of the codebook.

    Parameters
    ----------
    design : TableDesign
        What the study's tables have in common.
    study : StudyFacts
        The study's decisions.

    Returns
    -------
    list of CodebookEntry
        Table by table, column by column; the outcomes of the study follow the column ``value``.

    Raises
    ------
    FaultError
        If a column may be empty and nothing is known of when.
    """
    entries = []
    for table, columns in all_tables(design, study).items():
        outcomes = _outcomes_of(design, table)
        for column in columns:
            measure = outcomes.get(column.name)
            if measure is not None:
                entries.append(_of_outcome(table, column, measure, study.reasons))
                continue
            entries.append(
                CodebookEntry(
                    table,
                    column,
                    "",
                    _when_empty(table, column, design) if column.nullable else "",
                    _source(table, column.name, design, study),
                )
            )
            if (table, column.name) == ("outcomes", "value"):
                entries += _values(design, column, study.reasons)
    return entries


def _outcomes_of(design: TableDesign, table: str) -> Mapping[str, MeasureColumn]:
    """The outcomes that have a column of their own in a table."""
    own = {"outcomes_wide": design.measures, "trials": design.trial_measures}.get(table, ())
    return {measure.name: measure for measure in own}


def _values(design: TableDesign, value: Column, reasons: Mapping[str, str]) -> list[CodebookEntry]:
    """An entry for each outcome that the column of values holds."""
    wide = {column.name: column for column in design.columns("outcomes_wide")}
    return [
        _of_outcome("outcomes", replace(wide[m.name], name=value.name), m, reasons)
        for m in sorted(design.measures, key=lambda m: m.name)
    ]


def _of_outcome(
    table: str, column: Column, measure: MeasureColumn, reasons: Mapping[str, str]
) -> CodebookEntry:
    """The entry of a column that holds one outcome."""
    why = "; ".join(f"{reason}: {reasons[reason]}" for reason in measure.reasons)
    return CodebookEntry(table, column, measure.name, why, measure.source)


def _when_empty(table: str, column: Column, design: TableDesign) -> str:
    """When a cell of a column that holds no outcome is empty."""
    name = column.name
    if name in design.factors:
        return _CONDITION_EMPTY
    if name in {covariate.name for covariate in design.covariate_columns()}:
        return _NO_FACT
    known = _EMPTY_IN.get((table, name)) or _EMPTY.get(name)
    if known is None:
        raise FaultError(f"the codebook does not know when {name} of {table} is empty")
    return known


def _source(table: str, name: str, design: TableDesign, study: StudyFacts) -> str:
    """Where a column that holds no outcome comes from."""
    if name in study.origins:
        return study.origins[name]
    for factor, coding in design.codings.items():
        if name in coding.columns:
            given = "numbers that the study gives" if coding.name == "given" else _CONTRASTS
            return f"computed from {factor}; {given}"
    for covariate in design.centred:
        if name == centred_name(covariate):
            return f"computed from {covariate}"
    at = _SOURCES_TOO.get((table, name), (table, name))
    if at in _SOURCES:
        return _SOURCES[at]
    if table in (ACCOUNTS, LOG_ACCOUNTS, READINESS, FORMULAS, CODEBOOK):
        return ""
    if name in _FROM_REGIONS:
        return "the region definitions"
    return "the logs" if name in _FROM_LOGS else ""
