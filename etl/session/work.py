"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.files.pieces import WholeNeededError
from etl.files.text_faults import tell_unreadable
from etl.parsers import LogReader, TableReader
from etl.parsers.canonical import LogNote
from etl.parsers.table_blocks import BlockLog
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.block_logs import BlockTask, KeptBlock, block_path, keep_blocks, whole_log
from etl.session.kept_logs import Shelf, keep_log, kept_log
from etl.session.lines import NO_HAND, HandLines
from etl.session.log_figures import LogFigures, figures_of
from etl.session.one_reader import Bench
from etl.session.reader import Options, Reader, ReaderTables
from etl.session.seen import seen_trials
from etl.tables import TableDesign
from etl.trials import SeenTrials


@dataclass(frozen=True, slots=True)
class LogTask:
    """A log to be read and put aside."""

    path: Path
    shown: str
    kept: Path
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
    #: What is known of it, where its blocks are left to others.
    begun: BlockLog | None = None
    #: How many fixations each reader has.
    fixations: dict[str, int] = field(default_factory=dict)
    trials: SeenTrials | None = None
    figures: LogFigures | None = None
    findings: Findings = field(default_factory=Findings)
    #: Whose the pseudonyms are that this log added.
    originals: dict[str, str] = field(default_factory=dict)
    #: Those that stand for two.
    clashes: dict[str, tuple[str, str]] = field(default_factory=dict)

    def kept(self, path: Path) -> Iterator[tuple[Path, dict[str, int]]]:
        """Where fixations were put aside, and the batch of each reader there."""
        if self.batches:
            yield path, self.batches
        for place, batches in enumerate(self.blocks):
            yield block_path(path, place), batches


@dataclass(frozen=True, slots=True)
class ReaderTask:
    """A reader to be finished: where the fixations lie, and what is known of the trials."""

    participant: str
    parts: tuple[tuple[Path, int], ...]
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
    shelf : Shelf
        Where fixations may be put aside.
    pseudonyms : Pseudonyms or None
        The very ones of the reader, which know afterwards whose they gave.
    """

    def __init__(self, reader: LogReader, shelf: Shelf, pseudonyms: Pseudonyms | None) -> None:
        self._reader = reader
        self._shelf = shelf
        self._pseudonyms = pseudonyms

    def __call__(self, task: LogTask) -> LogAnswer:
        """Read one log and put its fixations aside."""
        before = 0 if self._pseudonyms is None else len(self._pseudonyms.originals)
        answer = self._read_big(task) or self._read(task)
        if self._pseudonyms is not None:
            answer.originals = self._pseudonyms.learnt_since(before)
            answer.clashes = dict(self._pseudonyms.clashes)
        return answer

    def _read_big(self, task: LogTask) -> LogAnswer | None:
        """Read one log in blocks; None for one that is to be read as a whole."""
        reader = self._reader
        if task.whole or not isinstance(reader, TableReader) or not reader.is_big(task.path):
            return None
        findings = Findings()

        def do(tasks: Iterable[BlockTask]) -> Iterator[Iterator[KeptBlock]]:
            return (keep_blocks(own, reader, self._shelf) for own in tasks)

        try:
            log = reader.begin(task.path, task.shown, findings)
            if log is not None and task.share and log.survey.alone:
                return LogAnswer(LogNote(task.shown), begun=log, findings=findings)
            return answer_of(log, reader, (task, self._shelf), do, findings)
        except WholeNeededError:
            return None
        except OSError as why:
            tell_unreadable(task.path, task.shown, why, findings)
            return LogAnswer(LogNote(task.shown), findings=findings)

    def _read(self, task: LogTask) -> LogAnswer:
        """Read one log and put its fixations aside."""
        findings = Findings()
        read = self._reader.read(task.path, task.shown, findings)
        if read is None:
            return LogAnswer(LogNote(task.shown), findings=findings)
        log, note = read
        trials = seen_trials(log, task.shown, findings)
        batches, fixations = keep_log(log, task.kept, self._shelf)
        # A recording of the eye that does not count holds no fixation to compare with others.
        figures = figures_of(log, len(batches), len(trials)) if len(log) else None
        return LogAnswer(
            note,
            batches,
            fixations=fixations,
            trials=trials,
            figures=figures,
            findings=findings,
        )


def answer_of(
    log: BlockLog | None,
    reader: TableReader,
    aside: tuple[LogTask, Shelf],
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
    aside : tuple of LogTask and Shelf
        Where its fixations are put aside.
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
    """
    task, shelf = aside
    refused = LogAnswer(LogNote(task.shown), findings=findings)
    try:
        whole = None
        if log is not None:
            whole = whole_log(log, reader, (task.kept, shelf), do, findings)
        else:
            findings.items.sort(key=lambda finding: finding.line or 0)
    except OSError as why:
        tell_unreadable(task.path, task.shown, why, findings)
        return refused
    if whole is None:
        return refused
    return LogAnswer(
        whole.note,
        blocks=whole.blocks,
        fixations=whole.fixations,
        trials=whole.trials,
        figures=whole.figures,
        findings=findings,
    )


class ReaderWork:
    """Finishes readers.

    Parameters
    ----------
    bench : Bench
        The study's texts, tables and decisions.
    shelf : Shelf
        Where fixations may have been put aside.
    """

    def __init__(self, bench: Bench, shelf: Shelf) -> None:
        self._bench = bench
        self._shelf = shelf

    def __call__(self, task: ReaderTask, *, page: bool = True) -> ReaderTables:
        """Finish one reader; the summary for the audit page may be left out."""
        log, part = kept_log(task.parts, self._shelf)
        file = np.asarray(task.files, dtype=np.int32)[part]
        reader = Reader(
            task.participant, log, file, task.trials, task.note, task.hand, task.corrections
        )
        return self._bench.tables(reader, page=page)


def make_reader_work(
    design: TableDesign, library: RegionLibrary, options: Options, shelf: Shelf
) -> ReaderWork:
    """Set up the work on single readers in this process."""
    return ReaderWork(Bench(design, library, options), shelf)
