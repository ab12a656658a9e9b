"""The decisions of a study as the work on readers needs them."""

from __future__ import annotations

from dataclasses import replace

from etl.measures import REASONS
from etl.report import LineGrid
from etl.screening import Limits
from etl.screening.ledger import columns_of_accounts
from etl.screening.rules import OUTLIER
from etl.session.plan import Plan
from etl.session.reader import Options
from etl.tables import TableDesign


def options_of(plan: Plan) -> Options:
    """The decisions that the work on a reader depends on.

    Parameters
    ----------
    plan : Plan
        The study made ready.

    Returns
    -------
    Options
    """
    study, layout = plan.study, plan.study.regions.layout
    return Options(
        study.trials.repeated,
        study.measures.outside,
        study.measures.no_opportunity,
        plan.limits,
        None if layout is None else LineGrid(layout.top_px, layout.line_height_px),
        plan.lines,
    )


def reasons_of(limits: Limits) -> tuple[str, ...]:
    """The reasons for which values can be missing; the first is none."""
    return (*REASONS, OUTLIER) if limits.on("outlier_sd") else tuple(REASONS)


def under_limits(design: TableDesign, limits: Limits) -> TableDesign:
    """The tables of a study as they are under other limits.

    Parameters
    ----------
    design : TableDesign
        The tables of the study.
    limits : Limits
        The rules of screening that hold.

    Returns
    -------
    TableDesign
    """
    return replace(design, reasons=reasons_of(limits), left_out_by=columns_of_accounts(limits))


def facts_needed(plan: Plan) -> tuple[object, ...]:
    """What gathering reads for the sake of rules: plans that agree in it gather the same.

    Parameters
    ----------
    plan : Plan
        A study made ready.

    Returns
    -------
    tuple
        For comparing.
    """
    screening, limits = plan.study.screening, plan.limits
    trials = None if screening is None else screening.trials
    readers = None if screening is None else screening.participants
    return (
        None if trials is None else trials.notes,
        None if readers is None else readers.notes,
        limits.on("outside_text_time"),
        limits.on("answer_wrong") or limits.on("correct_share_under"),
    )
