"""What is wrong or doubtful about the readers of a study, told before anything is written."""

from __future__ import annotations

from contextlib import closing

from etl.errors import Findings
from etl.session.all_groups import finish_groups
from etl.session.crew import Progress
from etl.session.examining import Examined
from etl.session.log_tellings import account_for_moved
from etl.session.totals import Totals


def judged(examined: Examined, progress: Progress, findings: Findings) -> Totals:
    """Work on all readers without writing rows, and tell what is wrong or doubtful about them.

    Parameters
    ----------
    examined : Examined
        The study, its logs read.
    progress : callable
        Told how many readers are done.
    findings : Findings
        Where everything is recorded.

    Returns
    -------
    Totals
        What was counted.
    """
    plan, gathered, _, crew = examined
    totals = Totals(plan.limits)
    with closing(finish_groups(gathered, crew, progress, {})) as groups:
        for answer in groups:
            for tables in answer.readers:
                findings.extend(tables.findings)
                totals.add(tables)
    notice_readers(examined, totals, findings)
    return totals


def notice_readers(examined: Examined, totals: Totals, findings: Findings) -> None:
    """Tell what is wrong or doubtful about the readers, all of whom were worked on.

    Parameters
    ----------
    examined : Examined
        The study, its logs read.
    totals : Totals
        What was counted.
    findings : Findings
        Where it is recorded.
    """
    plan, gathered, answers, _ = examined
    labels = plan.library.labels
    known = () if labels is None else labels.codes
    totals.notice_places(plan.study, known, gathered.design.files, findings)
    account_for_moved(answers, totals.moved, findings)
    if not findings.failed:
        totals.notice(plan.study, findings)
