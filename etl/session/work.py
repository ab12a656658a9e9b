"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from etl.errors import Findings
from etl.export.earlier import digest_of
from etl.export.rows import TrialColumns
from etl.parsers import LogReader
from etl.parsers.canonical import LogNote
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.bench import Bench
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


@dataclass(slots=True)
class LogAnswer:
    """What a log holds."""

    note: LogNote
    batches: dict[str, int] = field(default_factory=dict)
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

    def __call__(self, task: LogTask) -> LogAnswer:
        """Read one log and put its fixations aside, or find that an earlier build did."""
        name = self._name(task)
        if self._aside.keep and name:
            answer: LogAnswer | None = self._aside.store.head(name)
            if answer is not None:
                answer.kept = name
                return answer
        return self._read(task, name)

    def _name(self, task: LogTask) -> str:
        """The entry for a log; empty where that can be told by what was read only."""
        if not self._aside.keep:
            return f"{task.number}{LOG}"
        if not self._reader.reads_one_file:
            return ""
        try:
            return content_digest(digest_of(task.path), task.shown, self._key) + LOG
        except OSError:  # told of when it is read
            return ""

    def _read(self, task: LogTask, name: str) -> LogAnswer:
        """Read one log and put its fixations aside."""
        before = 0 if self._pseudonyms is None else len(self._pseudonyms.originals)
        answer = LogAnswer(LogNote(task.shown))
        read = self._reader.read(task.path, task.shown, answer.findings)
        if read is not None:
            log, answer.note = read
            answer.trials = seen_trials(log, task.shown, answer.findings)
            batches, readers = batches_of(log)
            answer.batches = {reader: number for number, reader in enumerate(readers)}
            answer.fixations = {
                reader: batch.num_rows for reader, batch in zip(readers, batches, strict=True)
            }
            # A recording of the eye that does not count holds no fixation to compare with others.
            if len(log):
                answer.figures = figures_of(log, len(batches), len(answer.trials))
        if self._pseudonyms is not None:
            answer.originals = self._pseudonyms.learnt_since(before)
            answer.clashes = dict(self._pseudonyms.clashes)
        if read is not None:
            # By what was read, where that came from more files than one.
            answer.kept = name or content_digest(arrays_of(log), answer.note.shown, self._key) + LOG
            self._aside.put(answer.kept, answer, batches)
        return answer


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
