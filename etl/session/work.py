"""What workers do: read one log, or finish one reader. Every task and answer can be pickled."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from etl.errors import Findings
from etl.export.rows import TrialColumns
from etl.parsers import LogReader
from etl.parsers.canonical import LogNote
from etl.pseudonyms import Pseudonyms
from etl.regions import RegionLibrary
from etl.session.bench import Bench
from etl.session.joined_readers import group_of
from etl.session.kept_logs import Shelf, keep_log
from etl.session.lines import NO_HAND, HandLines
from etl.session.log_figures import LogFigures, figures_of
from etl.session.reader import Options, ReaderTables
from etl.session.seen import seen_trials
from etl.tables import TableDesign
from etl.trials import SeenTrials


@dataclass(frozen=True, slots=True)
class LogTask:
    """A log to be read and put aside."""

    path: Path
    shown: str
    kept: Path


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
        if self._pseudonyms is None:
            return self._read(task)
        before = len(self._pseudonyms.originals)
        answer = self._read(task)
        answer.originals = self._pseudonyms.learnt_since(before)
        answer.clashes = dict(self._pseudonyms.clashes)
        return answer

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
        return LogAnswer(note, batches, fixations, trials, figures, findings)


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
        (tables,) = self._bench.tables(group_of([task], self._shelf), page=page).one_by_one()
        return tables


def make_reader_work(
    design: TableDesign, library: RegionLibrary, options: Options, shelf: Shelf
) -> ReaderWork:
    """Set up the work on single readers in this process."""
    return ReaderWork(Bench(design, library, options), shelf)
