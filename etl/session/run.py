"""The main job: check a study, or build its tables."""

from __future__ import annotations

import os
import time
from contextlib import closing, nullcontext
from dataclasses import replace
from pathlib import Path

import pandas as pd  # noqa: F401  (pyarrow would load it in a call that loses an interruption)

from etl.errors import DataError, Findings
from etl.export.accounts import write_accounts
from etl.export.log_accounts import write_log_accounts
from etl.export.publish import published
from etl.export.run_record import RunRecord
from etl.export.scratch import scratch
from etl.export.writers import TableWriters
from etl.handoff import READ_TABLES
from etl.measures import REASON_MEANINGS
from etl.report import AuditInput, write_audit
from etl.session.all_groups import finish_groups
from etl.session.crew import PUBLISHED, Progress, Room, silent
from etl.session.examining import examine, own_faults
from etl.session.gallery import drawn
from etl.session.gather import Gathered
from etl.session.hand_over import describe, hand_over
from etl.session.inputs_read import inputs_read
from etl.session.judging import judged, notice_readers
from etl.session.kept_places import kept_folder, settle_kept
from etl.session.log_tellings import (
    check_nothing_lost,
    log_accounts,
    log_counts,
    logs_told,
    told_elsewhere,
)
from etl.session.plan import Plan
from etl.session.pseudonym_key import known_by, open_key, refuse_key_inside, save_key
from etl.session.pseudonym_record import for_record, told_study
from etl.session.result import Result
from etl.session.told import summary
from etl.session.totals import Totals
from etl.session.tracing import Tracer
from etl.session.work import LogAnswer, make_reader_work
from etl.study import Study
from etl.tables import LEDGER, TABLES
from etl.trials.facts import shown_path


def check(study: Study, *, workers: int | None = 1, progress: Progress = silent) -> Findings:
    """Read everything a study names, write nothing, and list all that was found.

    Parameters
    ----------
    study : Study
        From :func:`etl.load_study`.
    workers : int or None
        Number of processes; None finds one out from the size of the logs. With more than one, the
        calling script must guard its work by ``if __name__ == "__main__":``.
    progress : callable, optional
        Called with a stage's name, how much of it is done, and how much there is.

    Returns
    -------
    Findings
        Errors, warnings and notes; ``findings.failed`` says whether a build would be refused.
    """
    findings = Findings()
    held = open_key(study, findings)
    with (
        scratch() as folder,
        own_faults(),
        Room(folder, workers, progress) as room,
    ):
        examined = examine(study, room, findings, held)
        if examined is not None:
            totals = judged(examined, progress, findings)
            if not findings.failed:
                findings.note(summary(totals.counts))
    return findings


def build(
    study: Study,
    *,
    into: str | os.PathLike[str] | None = None,
    workers: int | None = 1,
    progress: Progress = silent,
    keep: bool = True,
    scheduler: str | None = None,
) -> Result:
    """Build all tables of a study.

    Parameters
    ----------
    study : Study
        From :func:`etl.load_study`.
    into : path, optional
        The output folder; the study's ``[output] folder`` where absent. An earlier build there is
        replaced as a whole, when everything else is done.
    workers : int or None
        Number of processes; None finds one out from the size of the logs. The tables are the same
        bytes with any number. With more than one, the calling script must guard its work by
        ``if __name__ == "__main__":``.
    progress : callable, optional
        Called with a stage's name, how much of it is done, and how much there is.
    keep : bool
        Whether to use what the build before kept beside the output folder (or, where readers have
        pseudonyms, beside the file of these), and to keep parsed logs for the next one there. The
        tables are the same bytes either way.
    scheduler : str, optional
        The address of a Dask cluster that does the work in place of processes of this computer; it
        needs the optional libraries of ``trialwright[cluster]`` and a file system that all its
        workers share. The tables are the same bytes.

    Returns
    -------
    Result
        Where the tables are, what was counted and noticed.

    Raises
    ------
    DataError
        If anything is wrong with an input, or the output folder may not be replaced. Nothing is
        written then.
    ClusterError
        If the cluster cannot do the work, or is lost in the middle. Nothing is written then.
    """
    if scheduler is not None and workers not in (None, 1):
        raise ValueError(
            "workers says how many processes this computer starts; with a scheduler it starts none"
        )
    started = time.perf_counter()
    target = Path(into) if into is not None else study.folder / study.output.folder
    shown = shown_path(study, study.output.folder) if into is None else str(into)
    refuse_key_inside(study, target)
    findings = Findings()
    groups_kept: list[str] = []
    with (
        published(target, shown) as shop,
        own_faults(),
        nullcontext(open_key(study, findings, target=target)) as held,
        nullcontext(kept_folder(target, held) if keep else None) as kept,
        Room(shop.kept, workers, progress, kept, scheduler) as room,
    ):
        examined = examine(study, room, findings, held)
        if examined is None:
            raise DataError(findings)
        plan, gathered, answers, crew = examined
        totals = Totals(plan.limits)
        formats, apart = _formats(study), _csv_apart(study, shop.kept)
        with TableWriters(shop.fresh, gathered.design, formats, apart) as writers:
            as_csv = {name: (*formats[name], "csv") for name in apart}
            wanted = {} if findings.failed else {**formats, **as_csv}
            with closing(finish_groups(gathered, crew, progress, wanted)) as groups:
                for group in groups:
                    groups_kept.append(group.kept)
                    for tables in group.readers:
                        findings.extend(tables.findings)
                        totals.add(tables)
                    if not findings.failed:
                        writers.add(group.parts)
            notice_readers(examined, totals, findings)
            if findings.failed:
                raise DataError(findings)
        check_nothing_lost(answers, totals.counts["fixations read"])
        rows = writers.rows
        write_accounts(totals.account_rows(), shop.fresh)
        write_log_accounts(log_accounts(answers), shop.fresh)
        described = describe(shop.fresh, plan, gathered.design, crew.map)
        page = _audit(plan, gathered, totals, answers, findings)
        write_audit(shop.fresh, replace(page, readiness=described.readiness))
        hand_over(shop.fresh, plan, gathered.design, described, apart)
        told = {**log_counts(answers), **totals.counts}
        RunRecord(
            plan.understood(),
            inputs_read(plan, gathered.notes, answers),
            told,
            rows,
            for_record(findings, plan).lines(("warning", "note")),
            [one.spelled() for one in gathered.unrecorded],
            time.perf_counter() - started,
            "" if held is None else known_by(held.pseudonyms.key),
        ).write(shop.fresh)
        progress("publishing", 1, 1)
        # The key is written when nothing is left to go wrong but moving a folder.
        shop.settle()
        if held is not None:
            save_key(held)
        settle_kept(room.store, target, held, used=_used(answers, groups_kept) if keep else ())
    progress(PUBLISHED, 1, 1)
    key = None if held is None else held.path
    return Result(target, told, rows, findings, described.readiness, key)


def _used(answers: list[LogAnswer], groups: list[str]) -> list[str]:
    """The kept entries that a build has used."""
    return [name for answer in answers for name, _ in answer.entries()] + groups


def _audit(
    plan: Plan, gathered: Gathered, totals: Totals, answers: list[LogAnswer], findings: Findings
) -> AuditInput:
    """Everything that the audit page tells of."""
    study = told_study(plan.study, plan.pseudonyms)
    tasks = gathered.tasks.by_name()
    tracer = Tracer(study, plan.library, gathered.design)
    return AuditInput(
        plan.understood(),
        gathered.design,
        totals.profiles,
        totals.audit_rows(),
        REASON_MEANINGS,
        for_record(told_elsewhere(findings, answers), plan).lines(("warning", "note")),
        gathered.unrecorded,
        drawn(
            totals.choice.chosen(),
            tasks,
            make_reader_work(*gathered.bench()),
            tracer,
        ),
        logs_told(answers),
        totals.choice.unsure(tasks, tracer),
    )


def _formats(study: Study) -> dict[str, tuple[str, ...]]:
    """The formats of each table; the ledger is a CSV file always."""
    formats = ("parquet", "csv") if "csv" in study.output.formats else ("parquet",)
    return {**dict.fromkeys(TABLES, formats), LEDGER: ("csv",)}


def _csv_apart(study: Study, folder: Path) -> dict[str, Path]:
    """Tables that the bundle has as CSV though the study does not ask for it."""
    if "csv" in study.output.formats:
        return {}
    return {name: folder / f"{name}.csv" for name in READ_TABLES}
