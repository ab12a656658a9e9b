"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from etl.errors import Findings
from etl.export.publish import digest_of
from etl.export.rows import TrialColumns
from etl.files.pieces import WholeNeededError
from etl.files.text_faults import tell_unreadable
from etl.parsers import LogReader, TableReader
from etl.parsers.canonical import LogNote
from etl.parsers.table_blocks import BlockLog
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.bench import Bench
from etl.session.block_logs import BlockTask, KeptBlock, keep_blocks, whole_log
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
    #: Whether its blocks may be left to others; and whether it is read as a whole, however big.
    share: bool = False
    whole: bool = False


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
    #: Of a log that was read in blocks, for each the entry and the batch of each reader.
    blocks: tuple[tuple[str, dict[str, int]], ...] = ()
    #: What is known of a log whose blocks are left to others.
    begun: BlockLog | None = None

    def parts(self) -> tuple[tuple[str, dict[str, int]], ...]:
        """Where fixations were put aside: entries, and the batch of each reader there."""
        return self.blocks or ((self.kept, self.batches),)

    def entries(self) -> list[str]:
        """All entries of the log."""
        return [self.kept, *(entry for entry, _ in self.blocks)]


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
            if answer is not None and self._has(answer.blocks):
                answer.kept = name
                return answer
        return self._read_big(task) or self._read(task, name)

    def _has(self, blocks: Sequence[tuple[str, object]]) -> bool:
        """Whether the blocks of a log are all there and whole."""
        return all(self._aside.store.is_there(entry) for entry, _ in blocks)

    def _name(self, task: LogTask) -> str:
        """The entry for a log; empty where that can be told by what was read only."""
        if not self._aside.keep:
            return f"{task.number}{LOG}"
        if not self._reader.reads_one_file:
            return ""
        try:
            return self._name_of(digest_of(task.path), task)
        except OSError:  # told of when it is read
            return ""

    def _name_of(self, sha256: str, task: LogTask) -> str:
        """The entry for a log of some content."""
        return content_digest(sha256, task.shown, self._key) + LOG

    def _read_big(self, task: LogTask) -> LogAnswer | None:
        """Read one log in blocks; None for one that is to be read as a whole."""
        reader = self._reader
        if task.whole or not isinstance(reader, TableReader) or not reader.is_big(task.path):
            return None
        before = 0 if self._pseudonyms is None else len(self._pseudonyms.originals)
        answer = LogAnswer(LogNote(task.shown))

        def do(tasks: Sequence[BlockTask]) -> Iterator[Iterator[KeptBlock]]:
            return (keep_blocks(own, reader, self._aside) for own in tasks)

        try:
            answer.begun = reader.begin(task.path, task.shown, answer.findings)
            if answer.begun is not None:
                # Named by the very bytes that are read.
                sha256 = answer.begun.survey.sha256
                keep = self._aside.keep
                answer.kept = self._name_of(sha256, task) if keep else f"{task.number}{LOG}"
                if task.share and answer.begun.survey.alone:
                    return answer
            add_blocks(answer, reader, (task.path, self._aside), do)
        except WholeNeededError:
            return None
        except OSError as why:
            tell_unreadable(task.path, task.shown, why, answer.findings)
        if self._pseudonyms is not None:
            answer.originals = self._pseudonyms.learnt_since(before)
            answer.clashes = dict(self._pseudonyms.clashes)
        put_aside(answer, self._aside)
        return answer

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
            # By what was read, where that came from more files than one, or has just changed.
            if name and self._aside.keep:
                name = self._name_of(answer.note.sha256, task)
            answer.kept = name or content_digest(arrays_of(log), answer.note.shown, self._key) + LOG
            self._aside.put(answer.kept, answer, batches)
        return answer


def add_blocks(
    answer: LogAnswer,
    reader: TableReader,
    aside: tuple[Path, Aside],
    do: Callable[[Sequence[BlockTask]], Iterable[Iterable[KeptBlock]]],
) -> None:
    """Read the blocks of a log.

    Parameters
    ----------
    answer : LogAnswer
        What is known of the log; what it holds is put down there.
    reader : TableReader
        How the study's logs are read.
    aside : tuple of Path and Aside
        The log, and where its fixations are put aside.
    do : callable
        Does the work on blocks.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    """
    begun, answer.begun = answer.begun, None
    path, store = aside
    if begun is None:
        answer.findings.items.sort(key=lambda finding: finding.line or 0)
        return
    try:
        whole = whole_log(begun, reader, (answer.kept, store), do, answer.findings)
    except OSError as why:
        tell_unreadable(path, answer.note.shown, why, answer.findings)
        return
    if whole is not None:
        answer.note, answer.blocks, answer.fixations = whole.note, whole.blocks, whole.fixations
        answer.trials, answer.figures = whole.trials, whole.figures


def put_aside(answer: LogAnswer, aside: Aside) -> None:
    """Put aside what a log holds whose blocks are there, for later builds.

    Parameters
    ----------
    answer : LogAnswer
        What it holds.
    aside : Aside
        Where it is put.
    """
    if aside.keep and answer.trials is not None:
        aside.put(answer.kept, answer, [])


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
