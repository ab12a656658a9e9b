"""The codebook and the table of regions of a study, from its plan."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Final

from etl.handoff import (
    RegionRow,
    Rule,
    StudyFacts,
    region_columns,
    region_key_columns,
    write_codebook,
    write_regions,
)
from etl.measures import REASON_MEANINGS
from etl.report.rules import rule_level, rule_meaning
from etl.screening.rules import OUTLIER, VALUE_RULES
from etl.session.plan import Plan
from etl.session.region_rows import region_rows
from etl.tables import TableDesign

#: Where a fact comes from, by the name of its source in the plan.
_ORIGINS: Final = {
    "trials": "the trial list",
    "participants": "the table of readers",
    "items": "the table of texts",
    "log": "the logs",
    "regions": "the region definitions",
}


def write_described(folder: Path, plan: Plan, design: TableDesign) -> StudyFacts:
    """Write ``regions.csv``, ``codebook.csv`` and ``codebook.md`` into a folder.

    Parameters
    ----------
    folder : Path
        Where they go.
    plan : Plan
        The study made ready.
    design : TableDesign
        What its tables have in common.

    Returns
    -------
    StudyFacts
        What the data packages need, too.
    """
    rows = region_rows(plan.library)
    study = codebook_facts(plan, design, rows)
    write_regions(folder, rows, region_columns(study.region_keys, design.regions))
    write_codebook(folder, design, study)
    return study


def codebook_facts(plan: Plan, design: TableDesign, regions: Sequence[RegionRow]) -> StudyFacts:
    """What the codebook tells of a study besides its tables.

    Parameters
    ----------
    plan : Plan
        The study made ready.
    design : TableDesign
        What its tables have in common.
    regions : sequence of RegionRow
        The regions of all texts.

    Returns
    -------
    StudyFacts
        As the study is understood: where readers have pseudonyms, without their ids.
    """
    study = plan.understood()
    of_values = [
        Rule(
            rule,
            "value",
            f"a duration more than {plan.limits.outlier_sd:g} standard deviations from the mean of "
            "its reader and region; the value is set missing",
        )
        for rule in VALUE_RULES
        if plan.limits.on(rule)
    ]
    of_rows = [Rule(n, rule_level(n), rule_meaning(n, study)) for n in design.left_out_by]
    return StudyFacts(
        study["title"],
        study["measures"]["outside"],
        study["measures"]["no_opportunity"],
        study["lines"]["method"] if plan.lines is not None else "",
        (*of_rows, *of_values),
        {**REASON_MEANINGS, OUTLIER: "the duration is an outlier by the rule outlier_sd"},
        {n: _ORIGINS[plan.facts.sources[n]] for n in (*design.factors, *design.covariates)},
        region_key_columns(plan.library.keys, regions, design.factors),
        plan.study.output.pseudonyms,
    )
