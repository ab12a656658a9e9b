"""The job of ``trialwright trace``: one reader's rows, and one trial out of them."""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

from etl.errors import DataError, Findings
from etl.export.scratch import scratch
from etl.pseudonyms import Pseudonyms
from etl.report.trace_input import TracedTrial
from etl.report.trace_page import page
from etl.report.trace_picture import draw
from etl.report.trace_text import as_text
from etl.report.trace_words import Explanation, explain
from etl.session.crew import Progress, Room, silent
from etl.session.examining import examine, own_faults
from etl.session.gather import Gathered
from etl.session.plan import Plan
from etl.session.pseudonym_key import open_key
from etl.session.pseudonym_record import told_study
from etl.session.tracing import Tracer, TrialKey
from etl.session.work import ReaderTask, make_reader_work
from etl.study import Study


def trace(
    study: Study,
    participant: str,
    trial: str,
    *,
    session: str | None = None,
    workers: int | None = 1,
    progress: Progress = silent,
) -> TracedTrial:
    """Gather everything about one trial, as a build of the study would have it.

    Parameters
    ----------
    study : Study
        From :func:`etl.load_study`.
    participant, trial : str
        Which trial, as in the tables; a reader who has a pseudonym may be named by id too.
    session : str, optional
        Needed where the reader read the trial in several sessions.
    workers : int or None
        Number of processes that read logs; None finds one out.
    progress : callable, optional
        Called with a stage's name, how much of it is done, and how much there is.

    Returns
    -------
    TracedTrial
        For :func:`picture`, :func:`explained` and the modules of :mod:`etl.report`.

    Raises
    ------
    DataError
        If anything is wrong with an input, or there is no such trial.
    """
    findings = Findings()
    held = open_key(study, findings, needed=True)
    pseudonyms = None if held is None else held.pseudonyms
    with (
        scratch() as folder,
        own_faults(),
        Room(folder, workers, progress) as room,
    ):
        examined = examine(study, room, findings, held)
        if examined is None or findings.failed:
            raise DataError(findings)
        plan, gathered, _, _ = examined
        task = _task(gathered, participant, pseudonyms)
        key, text = _key(plan, gathered, task, trial, session)
        tables = make_reader_work(*gathered.bench())(task)
        if tables.findings.failed:
            tables.findings.names = findings.names
            raise DataError(tables.findings)
        return tracer_of(plan, gathered).traced(
            tables.batches, task.participant, key, text, tables.trust
        )


@dataclass(frozen=True, slots=True)
class Wanted:
    """Which outcomes are to be explained; empty for all."""

    regions: tuple[str, ...] = ()
    measures: tuple[str, ...] = ()


def explained(traced: TracedTrial, width: int, encoding: str, wanted: Wanted) -> str:
    """A trial drawn in characters, and its outcomes explained, for a terminal.

    Parameters
    ----------
    traced : TracedTrial
        From :func:`trace`.
    width : int
        Of the terminal, in characters.
    encoding : str
        Of the terminal; what it cannot show is written in ASCII.
    wanted : Wanted
        The outcomes to be explained.

    Returns
    -------
    str
        Lines no longer than the terminal is wide.

    Raises
    ------
    DataError
        If the trial has no such region or outcome.
    """
    return as_text(traced, width, encoding=encoding, explanation=_explanation(traced, wanted))


def write_picture(traced: TracedTrial, path: Path, wanted: Wanted) -> None:
    """Write a trial as a picture (``.svg``), or as a page with its explanation (``.html``).

    Parameters
    ----------
    traced : TracedTrial
        From :func:`trace`.
    path : Path
        The file; an earlier one is replaced.
    wanted : Wanted
        The outcomes to be explained on a page.

    Raises
    ------
    DataError
        If the name ends in neither, the file cannot be written, or the trial has no such region or
        outcome.
    """
    findings = Findings()
    if path.suffix.lower() not in (".svg", ".html"):
        findings.error(
            "the kind of picture is not known",
            found=path.name,
            expected="a name that ends in .svg, or in .html for a page with the explanation",
            fix="name the file so",
        )
        raise DataError(findings)
    text = (
        draw(traced)
        if path.suffix.lower() == ".svg"
        else page(traced, _explanation(traced, wanted))
    )
    try:
        path.write_text(text, encoding="utf-8", newline="\n")
    except OSError as why:
        findings.error(
            f"the picture cannot be written ({why.strerror or type(why).__name__})",
            path=str(path),
            fix="name a file in a folder that is there and in which you may write",
        )
        raise DataError(findings) from why


def _explanation(traced: TracedTrial, wanted: Wanted) -> Explanation:
    """What is explained of a trial; names that it does not have are an error."""
    findings = Findings()
    for what, asked, there in (
        ("region", wanted.regions, traced.region_names),
        ("outcome", wanted.measures, (*traced.outcomes, *traced.trial_outcomes)),
    ):
        for name in asked:
            if name not in there:
                near = get_close_matches(name, there, n=1)
                findings.error(
                    f"the trial has no such {what}",
                    found=name,
                    expected="one of " + ", ".join(dict.fromkeys(there)),
                    fix=f'did you mean "{near[0]}"?' if near else "correct the name",
                )
    if findings.failed:
        raise DataError(findings)
    whole = explain(traced)
    if not wanted.regions and not wanted.measures:
        return whole
    return whole.only(
        wanted.regions or traced.region_names,
        wanted.measures or tuple(dict.fromkeys((*traced.outcomes, *traced.trial_outcomes))),
    )


def tracer_of(plan: Plan, gathered: Gathered) -> Tracer:
    """The maker of traced trials of a study."""
    return Tracer(told_study(plan.study, plan.pseudonyms), plan.library, gathered.design)


def _task(gathered: Gathered, participant: str, pseudonyms: Pseudonyms | None) -> ReaderTask:
    """The work on one reader, who may be named by id or by pseudonym."""
    meant = participant if pseudonyms is None else pseudonyms.of_either(participant)
    tasks = gathered.tasks.by_name()
    if meant in tasks:
        return tasks[meant]
    readers = list(tasks)
    if pseudonyms is not None:
        readers = [pseudonyms.originals[reader] for reader in readers]
    near = get_close_matches(participant, readers, n=1, cutoff=0.5)
    raise _no_such("reader", participant, readers, near)


def _key(
    plan: Plan, gathered: Gathered, task: ReaderTask, trial: str, session: str | None
) -> tuple[TrialKey, int]:
    """The trial that is meant, and its text."""
    tracer, trials = tracer_of(plan, gathered), task.trials
    keys = [tracer.key(trials, row) for row in range(len(trials))]
    fitting = [
        (key, int(trials.text[row]))
        for row, key in enumerate(keys)
        if key.trial == trial and session in (None, key.session)
    ]
    names = [key.trial for key in keys]
    if len(fitting) == 1:
        return fitting[0]
    if fitting:
        findings = Findings()
        findings.error(
            f"reader {task.participant} read trial {trial} in several sessions",
            found=", ".join(key.session for key, _ in fitting),
            expected="one of them",
            fix="name it by --session",
        )
        raise DataError(findings)
    near = get_close_matches(trial, names, n=1, cutoff=0.5)
    raise _no_such(f"trial of reader {task.participant}", trial, list(dict.fromkeys(names)), near)


def _no_such(what: str, asked: str, there: list[str], near: list[str]) -> DataError:
    """What is said to a name that nothing has."""
    findings = Findings()
    listed = ", ".join(there[:20]) + (f" … ({len(there)} in all)" if len(there) > 20 else "")
    findings.error(
        f"the logs have no such {what}",
        found=asked,
        expected=f"one of {listed}",
        fix=f'did you mean "{near[0]}"?' if near else "look at the table trials or the ledger",
    )
    return DataError(findings)
