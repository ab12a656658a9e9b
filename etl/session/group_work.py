"""The work on a group of readers: kept fixations in, parts of all tables out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from etl.export.parts import Part, PartMaker
from etl.regions import RegionLibrary
from etl.session.bench import Bench
from etl.session.content_digest import content_digest, program_digest
from etl.session.joined_readers import group_of
from etl.session.kept_logs import Aside
from etl.session.kept_store import GROUP
from etl.session.reader import Options, ReaderTables
from etl.session.reader_groups import GroupTask
from etl.tables import TableDesign


@dataclass(slots=True)
class GroupAnswer:
    """What became of the readers of a group.

    Attributes
    ----------
    readers : list of ReaderTables
        What was counted and noticed, without rows.
    parts : dict of str to Part
        Their rows, by table; empty where rows were not wanted, or a problem was found.
    kept : str
        The entry that has this answer for later builds; empty where there is none.
    """

    readers: list[ReaderTables]
    parts: dict[str, Part]
    kept: str = ""


class GroupWork:
    """Finishes groups of readers.

    Parameters
    ----------
    design : TableDesign
        The study's tables, without the values that groups have of their own.
    library : RegionLibrary
        Its texts.
    options : Options
        Its decisions.
    aside : Aside
        Where fixations were put aside.
    formats : mapping of str to tuple of str
        For each table, the formats in which it is wanted; empty where only what is wrong is.
    """

    def __init__(
        self,
        design: TableDesign,
        library: RegionLibrary,
        options: Options,
        aside: Aside,
        formats: Mapping[str, tuple[str, ...]],
    ) -> None:
        self._design = design
        self._library = library
        self._options = options
        self._aside = aside
        self._parts = PartMaker(design, formats)
        self._write = bool(formats)
        self._key = ""
        if aside.keep and self._write:
            self._key = content_digest(design, library, options, formats, program_digest())

    def __call__(self, task: GroupTask) -> GroupAnswer:
        """Finish one group, or find that an earlier build did."""
        if not self._key:
            return self._finished(task)
        # All that the answer can hang on: what the task says, and by name what the entries hold
        # that it names.
        name = content_digest(task, self._key) + GROUP
        store = self._aside.store
        answer: GroupAnswer | None = store.head(name)
        if answer is None:
            answer = self._finished(task)
            if any(tables.findings.failed for tables in answer.readers):
                return answer
            store.put(name, answer)
        answer.kept = name
        return answer

    def _finished(self, task: GroupTask) -> GroupAnswer:
        bench = Bench(task.own.design(self._design), self._library, self._options)
        tables = bench.tables(group_of(task.readers, self._aside), page=self._write)
        wrong = any(reader.findings.failed for reader in tables.readers)
        parts = self._parts.parts(tables.batches) if self._write and not wrong else {}
        return GroupAnswer(tables.readers, parts)
