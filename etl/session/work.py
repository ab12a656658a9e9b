"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field
from pathlib import Path

import pyarrow as pa

from etl.errors import Findings
from etl.export.earlier import digest_of
from etl.export.rows import TrialColumns
from etl.files.pieces import WholeNeededError
from etl.files.text_faults import tell_unreadable
from etl.parsers import LogReader, TableReader
from etl.parsers.canonical import LogNote
from etl.parsers.table_blocks import BlockLog
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.bench import Bench
from etl.session.block_logs import BlockTask, KeptBlock, block_name, keep_blocks, whole_log
from etl.session.content_digest import content_digest, program_digest
from etl.session.joined_readers import group_of
from etl.session.kept_logs import Aside, arrays_of, batches_of
from etl.session.kept_store import LOG
from etl.session.lines import NO_HAND, HandLines
from etl.session.log_figures import LogFigures, figures_of
from etl.session.reader import Options, ReaderTables
from etl.session.seen import seen_trials
from etl.tables import TableDesign
from etl.trials import SeenTrials


@dataclass(frozen=True, slots=True)
class LogTask:
    """A log to be read and put aside; ``number`` counts the logs of the study."""

    path: Path
    shown: str
    number: int
    #: Whether it may be left to others, and is not read in blocks whatever its size.
    share: bool = False
    whole: bool = False


@dataclass(slots=True)
class LogAnswer:
    """What a log holds."""

    note: LogNote
    batches: dict[str, int] = field(default_factory=dict)
    #: The same for each block, where it was read in blocks.
    blocks: tuple[dict[str, int], ...] = ()
    #: What is known of it, and its entry, where its blocks are left to others.
    begun: tuple[BlockLog, str] | None = None
    #: How many fixations each reader has.
    fixations: dict[str, int] = field(default_factory=dict)
    trials: SeenTrials | None = None
    figures: LogFigures | None = None
    findings: Findings = field(default_factory=Findings)
    #: Whose the pseudonyms are that this log added.
    originals: dict[str, str] = field(default_factory=dict)
    #: Those that stand for two.
    clashes: dict[str, tuple[str, str]] = field(default_factory=dict)
    #: The entry that has the fixations.
    kept: str = ""

    def entries(self) -> Iterator[tuple[str, dict[str, int]]]:
        """The entries that have the fixations, and the batch of each reader there."""
        if self.kept:
            yield self.kept, self.batches
        for place, batches in enumerate(self.blocks):
            yield block_name(self.kept, place), batches


@dataclass(frozen=True, slots=True)
class ReaderTask:
    """A reader to be finished: where the fixations lie, and what is known of the trials."""

    participant: str
    parts: tuple[tuple[str, int], ...]
    files: tuple[int, ...]
    trials: TrialColumns
    note: str = ""
    hand: HandLines = NO_HAND
    corrections: str = ""


class LogWork:
    """Reads logs.

    Parameters
    ----------
    reader : LogReader
        How they are read.
    aside : Aside
        Where fixations are put aside.
    pseudonyms : Pseudonyms or None
        The very ones of the reader, which know afterwards whose they gave.
    """

    def __init__(self, reader: LogReader, aside: Aside, pseudonyms: Pseudonyms | None) -> None:
        self._reader = reader
        self._aside = aside
        self._pseudonyms = pseudonyms
        self._key = content_digest(reader, pseudonyms, program_digest()) if aside.keep else ""

    def __call__(self, tasks: Sequence[LogTask]) -> list[LogAnswer]:
        """Read some logs and put their fixations aside."""
        return [self._one(task) for task in tasks]

    def _one(self, task: LogTask) -> LogAnswer:
        """Read one log, or find that an earlier build did."""
        if self._aside.keep and self._reader.reads_one_file:
            with suppress(OSError):  # a log that cannot be read is told of below
                answer = self._kept(self.name(task, digest_of(task.path)))
                if answer is not None:
                    return answer
        hidden = self._pseudonyms
        with noted(hidden) as given:
            batches: list[pa.RecordBatch] = []
            answer = self._read_big(task)
            if answer is None:
                answer, batches = self._read(task)
        if hidden is not None:
            answer.originals = given
            answer.clashes = dict(hidden.clashes)
        if answer.kept:
            self._aside.put(answer.kept, answer, batches)
        return answer

    def name(self, task: LogTask, sha256: str) -> str:
        """The entry for a log of that content."""
        if not self._aside.keep:
            return f"{task.number}{LOG}"
        return content_digest(sha256, task.shown, self._key) + LOG

    def _kept(self, name: str) -> LogAnswer | None:
        """What an earlier build kept of a log, if all of it is there."""
        store = self._aside.store
        answer: LogAnswer | None = store.head(name)
        if answer is None or not all(store.has(own) for own, _ in answer.entries() if own != name):
            return None
        return answer

    def _read_big(self, task: LogTask) -> LogAnswer | None:
        """Read one log in blocks; None for one that is to be read as a whole."""
        reader = self._reader
        if task.whole or not isinstance(reader, TableReader) or not reader.is_big(task.path):
            return None
        findings = Findings()

        def do(tasks: Iterable[BlockTask]) -> Iterator[Iterator[KeptBlock]]:
            return (keep_blocks(own, reader, self._aside) for own in tasks)

        try:
            log = reader.begin(task.path, task.shown, findings)
            name = "" if log is None else self.name(task, log.survey.sha256)
            if log is not None and task.share and log.survey.alone:
                return LogAnswer(LogNote(task.shown), begun=(log, name), findings=findings)
            return answer_of(log, reader, (task.shown, name, self._aside), do, findings)
        except WholeNeededError:
            return None
        except OSError as why:
            tell_unreadable(task.path, task.shown, why, findings)
            return LogAnswer(LogNote(task.shown), findings=findings)

    def _read(self, task: LogTask) -> tuple[LogAnswer, list[pa.RecordBatch]]:
        """Read one log as a whole; its fixations, a batch a reader."""
        answer = LogAnswer(LogNote(task.shown))
        read = self._reader.read(task.path, task.shown, answer.findings)
        if read is None:
            return answer, []
        log, answer.note = read
        answer.trials = seen_trials(log, task.shown, answer.findings)
        batches, answer.batches, answer.fixations = batches_of(log)
        # A recording of the eye that does not count holds no fixation to compare with others.
        if len(log):
            answer.figures = figures_of(log, len(batches), len(answer.trials))
        if self._reader.reads_one_file or not self._aside.keep:
            answer.kept = self.name(task, answer.note.sha256)
        else:  # by what was read, which came from more files than one
            answer.kept = content_digest(arrays_of(log), task.shown, self._key) + LOG
        return answer, batches


@contextmanager
def noted(pseudonyms: Pseudonyms | None) -> Iterator[dict[str, str]]:
    """Note the pseudonyms that are given meanwhile, those that were given before too.

    Parameters
    ----------
    pseudonyms : Pseudonyms or None
        What gives them.

    Yields
    ------
    dict of str to str
        What each stands for. All of them: an entry that is kept must tell of every reader of its
        log, also where the log that told first is gone at the next build.
    """
    given: dict[str, str] = {}
    if pseudonyms is None:
        yield given
        return
    before, pseudonyms.noted = pseudonyms.noted, given
    try:
        yield given
    finally:
        pseudonyms.noted = before


def answer_of(
    log: BlockLog | None,
    reader: TableReader,
    aside: tuple[str, str, Aside],
    do: Callable[[Sequence[BlockTask]], Iterable[Iterable[KeptBlock]]],
    findings: Findings,
) -> LogAnswer:
    """What a log holds that is read in blocks.

    Parameters
    ----------
    log : BlockLog or None
        The log; None where something is wrong with it already.
    reader : TableReader
        How the study's logs are read.
    aside : tuple of str, str, and Aside
        The log's name for messages, its entry, and where its fixations are put aside.
    do : callable
        Does the work on blocks.
    findings : Findings
        What is known to be wrong.

    Returns
    -------
    LogAnswer

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    OSError
        If the log cannot be read.
    """
    shown, name, place = aside
    refused = LogAnswer(LogNote(shown), findings=findings)
    if log is None:
        findings.items.sort(key=lambda finding: finding.line or 0)
        return refused
    whole = whole_log(log, reader, (name, place), do, findings)
    if whole is None:
        return refused
    return LogAnswer(
        whole.note,
        blocks=whole.blocks,
        fixations=whole.fixations,
        trials=whole.trials,
        figures=whole.figures,
        findings=findings,
        kept=name,
    )


class ReaderWork:
    """Finishes readers.

    Parameters
    ----------
    bench : Bench
        The study's texts, tables and decisions.
    aside : Aside
        Where fixations were put aside.
    """

    def __init__(self, bench: Bench, aside: Aside) -> None:
        self._bench = bench
        self._aside = aside

    def __call__(self, task: ReaderTask) -> ReaderTables:
        """Finish one reader, without the summary for the audit page."""
        group = group_of([task], self._aside)
        (tables,) = self._bench.tables(group, page=False).one_by_one()
        return tables


def make_reader_work(
    design: TableDesign, library: RegionLibrary, options: Options, aside: Aside
) -> ReaderWork:
    """Set up the work on single readers in this process."""
    return ReaderWork(Bench(design, library, options), aside)
