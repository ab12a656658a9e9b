"""Everything up to the work on readers: the study made ready, its logs read, facts gathered."""

from __future__ import annotations

import gc
import os
from collections.abc import Iterable, Iterator
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

from etl.errors import FaultError, Findings
from etl.parsers import reader_for
from etl.session.all_logs import read_logs
from etl.session.crew import Crew, Room
from etl.session.gather import Gathered, gather
from etl.session.kept_logs import ROOM_BYTES, Aside, Shelf
from etl.session.notice_logs import notice_logs
from etl.session.plan import Plan, make_plan
from etl.session.pseudonym_guards import refuse_clashes
from etl.session.pseudonym_key import KeyFile
from etl.session.pseudonym_record import under_pseudonyms
from etl.session.work import LogAnswer
from etl.study import Study
from etl.study.models import Logs

#: A study whose logs are smaller than this is done sooner by one process than by starting more:
#: 400 logs of 50 kB took one process 2 s, and two processes 3 s, of which 2 s to start twice over.
_WORTH_WORKERS_BYTES = 50_000_000
#: The same where lines are told by consensus: a megabyte of log holds some 15,000 fixations, whose
#: lines take one process 5 s.
_WORTH_WORKERS_BY_CONSENSUS_BYTES = 1_000_000
#: Work on readers alone takes so much less than a build.
_TURNS_OF_A_BUILD = 10


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


#: A study whose facts are gathered: its plan, its readers, its logs, and who works.
Examined = tuple[Plan, Gathered, list[LogAnswer], Crew]


@dataclass(frozen=True, slots=True)
class LogsRead:
    """A study whose logs were read.

    Attributes
    ----------
    plan : Plan
        The study made ready.
    answers, told : list of LogAnswer
        What each log holds, in the order of the plan's logs, and in that in which they are told of.
    aside : Aside
        Where the fixations were put aside.
    crew : Crew
        Who did the work, and can do more.
    """

    plan: Plan
    answers: list[LogAnswer]
    told: list[LogAnswer]
    aside: Aside
    crew: Crew

    def gathered(self, findings: Findings) -> Gathered | None:
        """Facts and texts joined to every trial; None where no reader is left to work on."""
        with _collector_at_rest():
            return gather(self.plan, self.answers, self.aside, findings)


def read_study(
    study: Study,
    room: Room,
    findings: Findings,
    held: KeyFile | None = None,
    *,
    turns: int = 1,
) -> LogsRead | None:
    """Make a study ready and read its logs; None where it cannot be made ready.

    Parameters
    ----------
    study : Study
        As loaded.
    room : Room
        Where the work is done, and by whom.
    findings : Findings
        Where problems are recorded.
    held : KeyFile, optional
        The pseudonyms of the study.
    turns : int
        How often its readers will be worked on, which decides how many workers are worth starting.

    Returns
    -------
    LogsRead or None
    """
    pseudonyms = None if held is None else held.pseudonyms
    if pseudonyms is not None:
        findings.names = pseudonyms.originals
    with _collector_at_rest():
        plan, logs = make_plan(study, findings, pseudonyms)
    by_consensus = plan is not None and plan.lines is not None and plan.lines.method == "consensus"
    worth = _WORTH_WORKERS_BY_CONSENSUS_BYTES if by_consensus else _WORTH_WORKERS_BYTES
    crew = room.hire(
        _workers(room.workers, logs, worth // max(1, turns // _TURNS_OF_A_BUILD)),
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
    return LogsRead(under_pseudonyms(plan), answers, told, aside, crew)


def examine(
    study: Study,
    room: Room,
    findings: Findings,
    held: KeyFile | None = None,
) -> Examined | None:
    """Everything up to the work on readers; None where that makes no sense."""
    read = read_study(study, room, findings, held)
    gathered = None if read is None else read.gathered(findings)
    if read is None or gathered is None:
        return None
    # All that the tables say of trials has been joined.
    read.plan.facts.release()
    return read.plan, gathered, read.told, read.crew


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
