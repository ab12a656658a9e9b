"""What a model needs besides facts: factors as numbers, centred covariates, defined outcomes."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from etl.coding import Coding
from etl.errors import Findings
from etl.files import Coded
from etl.measures import Measure
from etl.screening.rules import OUTLIER
from etl.session.plan import Plan
from etl.study import Study
from etl.study.output_rules import clash, wanted_coding
from etl.tables import CovariateColumn, MeasureColumn, TableDesign, centred_name


def codings_wanted(
    study: Study, levels: Mapping[str, tuple[str, ...]], findings: Findings
) -> dict[str, Coding]:
    """The factors that a study wants as numbers, in the order of its factors.

    Parameters
    ----------
    study : Study
        As loaded.
    levels : mapping of str to tuple of str
        The levels of each factor in order, as stated or as found.
    findings : Findings
        Where a factor is told of that has no contrast.

    Returns
    -------
    dict of str to Coding
    """
    codings = {}
    for name in levels:
        if name not in study.output.contrasts:
            continue
        codings[name] = wanted_coding(study, name, levels[name])
        if not codings[name].columns:
            findings.warning(
                f"the factor {name} has no contrast: it has only one level",
                path=study.shown,
                line=study.line_of("output", "contrasts", name),
                found=", ".join(levels[name]),
                fix="remove it from [output] contrasts, or correct its levels",
            )
    return codings


def centred_means(
    study: Study,
    covariates: Mapping[str, CovariateColumn],
    known: tuple[Mapping[str, Coded], NDArray[np.int32]],
) -> dict[str, float]:
    """The means of the covariates that a study wants centred, over its trials as read.

    Parameters
    ----------
    study : Study
        As loaded.
    covariates : mapping of str to CovariateColumn
        Those of text are left out: something has been said of them.
    known : tuple of mapping of str to Coded and (trials,) int32 array
        The facts of all trials, and the text of each, -1 for trials that are no part of the study.

    Returns
    -------
    dict of str to float
        Each mean is rounded once, so that it depends on no order of adding.
    """
    facts, text = known
    means = {}
    for name in study.output.centred:
        if covariates[name].type != "number":
            continue
        column = facts[name].take(text >= 0)
        times = np.bincount(column.codes[column.codes >= 0], minlength=len(column.values))
        numbers = [
            (float(column.values[code]), int(times[code]))
            for code in np.flatnonzero(times).tolist()
        ]
        total = sum((Fraction(number) * count for number, count in numbers), Fraction(0))
        means[name] = float(total / int(times.sum()))
    return means


def tell_clashes(study: Study, design: TableDesign, findings: Findings) -> None:
    """Record each new column that has the name of another column of the tables.

    Parameters
    ----------
    study : Study
        As loaded.
    design : TableDesign
        Its tables.
    findings : Findings
        Where they are recorded.
    """
    met = design.clashes()
    places: list[tuple[tuple[str | int, ...], str]] = [
        (("output", "contrasts", factor), column)
        for factor, coding in design.codings.items()
        for column in coding.columns
    ]
    places += [
        (("output", "centred", place), centred_name(name))
        for place, name in enumerate(study.output.centred)
    ]
    told = set()
    for place, column in places:
        if column not in met or column in told:
            continue
        told.add(column)
        problem = clash(place, column)
        findings.error(
            problem.problem,
            path=study.shown,
            line=study.line_of(*place),
            where=".".join(str(key) for key in place if isinstance(key, str)),
            found=f"{column} in the table {met[column]}",
            expected=problem.expected,
            fix=problem.fix,
        )


def measure_column(plan: Plan, measure: Measure) -> MeasureColumn:
    """What the tables need to know of a measure, under the options of a study.

    Parameters
    ----------
    plan : Plan
        The study's options.
    measure : Measure
        From the catalogue.

    Returns
    -------
    MeasureColumn
    """
    options = plan.study.measures
    reasons = measure.reasons_under(options.no_opportunity)
    # Outliers are durations of regions; see the rule.
    if measure.kind == "duration" and measure.level == "region" and plan.limits.on("outlier_sd"):
        reasons = (*reasons, OUTLIER)
    return MeasureColumn(
        measure.name,
        measure.kind,
        measure.unit,
        measure.definition_under(options.outside, options.no_opportunity),
        measure.source,
        reasons,
    )
