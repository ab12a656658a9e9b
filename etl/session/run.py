"""The main job: check a study, or build its tables."""

from __future__ import annotations

import gc
import os
import time
from collections.abc import Iterable, Iterator
from concurrent.futures.process import BrokenProcessPool
from contextlib import closing, contextmanager, nullcontext, suppress
from dataclasses import replace
from pathlib import Path
from typing import Any

import pandas as pd  # noqa: F401  (pyarrow would load it in a call that loses an interruption)

from etl.errors import DataError, FaultError, Findings
from etl.export.accounts import write_accounts
from etl.export.log_accounts import write_log_accounts
from etl.export.publish import published
from etl.export.run_record import RunRecord
from etl.export.scratch import scratch
from etl.export.writers import TableWriters
from etl.handoff import READ_TABLES
from etl.measures import REASON_MEANINGS
from etl.parsers import reader_for
from etl.report import AuditInput, write_audit
from etl.session.all_groups import finish_groups
from etl.session.all_logs import read_logs
from etl.session.crew import PUBLISHED, Crew, Progress, Room, silent
from etl.session.gallery import drawn
from etl.session.gather import Gathered, gather
from etl.session.hand_over import describe, hand_over
from etl.session.kept_logs import ROOM_BYTES, Aside, Shelf
from etl.session.kept_places import kept_folder, settle_kept
from etl.session.log_tellings import (
    account_for_moved,
    check_nothing_lost,
    log_accounts,
    log_counts,
    log_inputs,
    logs_told,
    told_elsewhere,
)
from etl.session.notice_logs import notice_logs
from etl.session.plan import Plan, make_plan
from etl.session.pseudonym_guards import refuse_clashes
from etl.session.pseudonym_key import KeyFile, known_by, open_key, refuse_key_inside, save_key
from etl.session.pseudonym_record import for_record, hidden_inputs, told_study, under_pseudonyms
from etl.session.result import Result
from etl.session.told import summary
from etl.session.totals import Totals
from etl.session.tracing import Tracer
from etl.session.work import LogAnswer, make_reader_work
from etl.study import Study
from etl.study.models import Logs
from etl.tables import LEDGER, TABLES
from etl.trials.facts import shown_path

#: A study whose logs are smaller than this is done sooner by one process than by starting more:
#: 400 logs of 50 kB took one process 2 s, and two processes 3 s, of which 2 s to start twice over.
_WORTH_WORKERS_BYTES = 50_000_000
#: The same where lines are told by consensus: a megabyte of log holds some 15,000 fixations, whose
#: lines take one process 5 s.
_WORTH_WORKERS_BY_CONSENSUS_BYTES = 1_000_000


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
            plan, gathered, answers, crew = examined
            totals = Totals(plan.limits)
            with closing(finish_groups(gathered, crew, progress, {})) as groups:
                for answer in groups:
                    for tables in answer.readers:
                        findings.extend(tables.findings)
                        totals.add(tables)
            labels = plan.library.labels
            known = () if labels is None else labels.codes
            totals.notice_places(study, known, gathered.design.files, findings)
            account_for_moved(answers, totals.moved, findings)
            if not findings.failed:
                totals.notice(study, findings)
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
            labels = plan.library.labels
            known = () if labels is None else labels.codes
            totals.notice_places(study, known, gathered.design.files, findings)
            account_for_moved(answers, totals.moved, findings)
            if not findings.failed:
                totals.notice(study, findings)
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
            _inputs(plan, gathered, answers),
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


@contextmanager
def own_faults() -> Iterator[None]:
    """Turn the death of a worker process into an error that says so."""
    try:
        yield
    except BrokenProcessPool as dead:
        raise FaultError(
            "a worker process ended before its work was done: for want of memory (try fewer "
            'workers), or because a script that builds has no if __name__ == "__main__":'
        ) from dead


@contextmanager
def _collector_at_rest() -> Iterator[None]:
    """Spare the garbage collector looking again and again through what is there to stay.

    Facts about trials are many small tuples without cycles; walking all of them (and every module
    loaded) each time some more are made took a tenth of a build of 50,000 trials.
    """
    if not gc.isenabled():
        yield
        return
    gc.disable()
    try:
        yield
    finally:
        gc.enable()


def examine(
    study: Study,
    room: Room,
    findings: Findings,
    held: KeyFile | None = None,
) -> tuple[Plan, Gathered, list[LogAnswer], Crew] | None:
    """Everything up to the work on readers; None where that makes no sense."""
    pseudonyms = None if held is None else held.pseudonyms
    if pseudonyms is not None:
        findings.names = pseudonyms.originals
    with _collector_at_rest():
        plan, logs = make_plan(study, findings, pseudonyms)
    by_consensus = plan is not None and plan.lines is not None and plan.lines.method == "consensus"
    worth = _WORTH_WORKERS_BY_CONSENSUS_BYTES if by_consensus else _WORTH_WORKERS_BYTES
    crew = room.hire(
        _workers(room.workers, logs, worth),
        [study.path, *(path for path, _ in logs)],
        findings.names,
    )
    alone = reader_for(_logs_alone(study), study.screen, pseudonyms=pseudonyms)
    reader = plan.reader if plan is not None else alone
    # Processes of their own share nothing in memory: then everything goes to the disk.
    aside = Aside(room.store, room.keep, Shelf(ROOM_BYTES if crew.workers == 1 else 0))
    answers = read_logs(logs, reader, aside, crew, room.progress, pseudonyms)
    told = answers
    if pseudonyms is not None:
        for answer in answers:
            pseudonyms.learn(answer.originals)
            pseudonyms.clashes.update(answer.clashes)
        refuse_clashes(pseudonyms)
        # Logs are told of in the order of the names that they have now.
        told = sorted(answers, key=lambda answer: answer.note.shown)
    for answer in told:
        findings.extend(answer.findings)
    notice_logs(study, told, findings, pseudonyms)
    if plan is None:
        return None
    plan = under_pseudonyms(plan)
    with _collector_at_rest():
        gathered = gather(plan, answers, aside, findings)
    return None if gathered is None else (plan, gathered, told, crew)


def _used(answers: list[LogAnswer], groups: list[str]) -> list[str]:
    """The kept entries that a build has used."""
    return [name for answer in answers for name, _ in answer.entries()] + groups


def _logs_alone(study: Study) -> Logs:
    """How logs are read where a table that says which eye counts could not be read."""
    if study.logs.eye is None or study.logs.eye.column is None:
        return study.logs
    return study.logs.model_copy(update={"eye": None})


def _workers(asked: int | None, logs: Iterable[tuple[Path, str]], worth_bytes: int) -> int:
    """How many processes to use: one for logs that are smaller than is worth more."""
    if asked is not None:
        return asked
    size = 0
    for path, _ in logs:
        with suppress(OSError):  # a log that is gone is told of when it is read
            size += path.stat().st_size
    return (os.cpu_count() or 1) if size >= worth_bytes else 1


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


def _inputs(plan: Plan, gathered: Gathered, answers: list[LogAnswer]) -> list[dict[str, Any]]:
    """Every file read, with its digest."""
    study = plan.study
    # Digests of what was used, and not of what lies there by now.
    inputs: list[dict[str, Any]] = [
        {"file": study.path.name, "role": "study file", "sha256": study.sha256},
        {
            "file": shown_path(study, study.regions.file),
            "role": "regions",
            "sha256": plan.library.sha256,
        },
    ]
    inputs += [
        {"file": table.shown, "role": "facts", "sha256": table.sha256}
        for table in plan.facts.tables()
    ]
    inputs += [
        {"file": notes.shown, "role": "notes", "sha256": notes.sha256} for notes in gathered.notes
    ]
    if plan.corrections is not None:
        made = plan.corrections
        inputs.append({"file": made.shown, "role": "line corrections", "sha256": made.sha256})
    return hidden_inputs(inputs + log_inputs(answers), plan)
