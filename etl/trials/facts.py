"""Join what the logs, the trial list, the reader table and the item table say about each trial."""

from __future__ import annotations

import os
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

from etl.errors import Findings
from etl.trials.fact_tables import FactTable, read_fact_table
from etl.trials.joining import IDS, Join
from etl.trials.sources import check_ids, find_sources

if TYPE_CHECKING:
    from etl.study import Study


class SeenTrial(NamedTuple):
    """A trial as one log shows it.

    Tuples of texts are no burden to the garbage collector, however many trials there are.

    Attributes
    ----------
    participant, session, trial, item : str
        Its identity; ``session`` and ``item`` are empty where the log has none.
    facts : tuple of str
        Facts that stand in the log, in the order of :attr:`FactBook.from_log`.
    shown : str
        The log.
    line : int
        The first line of the trial in that log.
    """

    participant: str
    session: str
    trial: str
    item: str
    facts: tuple[str, ...]
    shown: str
    line: int


class KnownTrial(NamedTuple):
    """A trial with all that is known about it.

    Attributes
    ----------
    session, trial, item : str
        Its identity within its reader.
    facts : tuple of str
        Every fact that the study uses, in the order of :attr:`FactBook.names`; empty texts where
        unknown.
    text : int
        Its text among the study's texts; -1 where it is no part of the study or not yet known.
    skipped_by : str
        The fact by which the trial is no part of the study (``block``), or empty.
    shown, line : str, int
        Where it was first seen.
    """

    session: str
    trial: str
    item: str
    facts: tuple[str, ...]
    text: int
    skipped_by: str
    shown: str
    line: int


class Facts(NamedTuple):
    """What is known of a trial, by name, and the fact by which it is skipped, or empty."""

    identity: dict[str, str]
    facts: dict[str, str]
    skipped_by: str

    def get(self, name: str) -> str:
        """One fact or identifier; empty where unknown."""
        return self.identity.get(name) or self.facts.get(name, "")


@dataclass(frozen=True)
class FactBook:
    """The tables of a study and where each fact comes from.

    Attributes
    ----------
    trial_list, participants, items : FactTable or None
        The lab's tables.
    sources : dict of str to str
        For each fact that the study names: ``"trials"``, ``"participants"``, ``"items"``,
        ``"log"`` or ``"regions"``.
    from_log : tuple of str
        Facts that are columns of the logs.
    skip : dict of str to tuple of str
        Values by which trials are no part of the study.
    """

    trial_list: FactTable | None
    participants: FactTable | None
    items: FactTable | None
    sources: dict[str, str]
    from_log: tuple[str, ...]
    skip: dict[str, tuple[str, ...]] = field(default_factory=dict)

    @cached_property
    def names(self) -> tuple[str, ...]:
        """The facts that the study uses, in the order in which a trial has them."""
        return tuple(self.sources)

    def known_facts(self) -> frozenset[str]:
        """What is known of a trial before its text is looked up."""
        own = {name for name, source in self.sources.items() if source != "regions"}
        return frozenset(own | set(IDS))

    def tables(self) -> list[FactTable]:
        """The tables there are."""
        return [t for t in (self.trial_list, self.participants, self.items) if t is not None]

    def know(self, seen: SeenTrial, findings: Findings) -> Facts | None:
        """Join all that is known about one trial.

        Returns None, with a finding, where a table has no row for a trial that belongs to the
        study, or where log and trial list name different items.
        """
        facts = dict(zip(self.from_log, seen.facts, strict=True))
        identity = {"participant": seen.participant, "trial": seen.trial}
        if seen.session:
            identity["session"] = seen.session
        if seen.item:
            identity["item"] = seen.item
        place = (seen.shown, seen.line)
        absent = []
        good = True
        for join in self._joins:
            row = join.row(identity, facts)
            if row is None:
                absent.append(join)
            else:
                good &= join.take(row, identity, facts, place, findings)
        skipped_by = ""
        for name, values in self.skip.items():
            # A fact of a table without a row for the trial is unknown, and nothing is skipped by
            # that; an identifier that the trial does not have is an empty text.
            if (identity.get(name) or facts.get(name, "" if name in IDS else None)) in values:
                skipped_by = name
                break
        # A trial that is no part of the study, such as one for practice, may stand in no table.
        if absent and not skipped_by:
            good = False
            # The item of a trial may have to come from the very list that has no row for it.
            for join in absent[:1] if "item" not in identity else absent:
                self._tell_absent(join, join.key(identity, facts), place, findings)
        return Facts(identity, facts, skipped_by) if good else None

    def _tell_absent(
        self, join: Join, key: tuple[str, ...], place: tuple[str, int], findings: Findings
    ) -> None:
        """Record that a table has no row for a trial; once for each reader or item."""
        if (join.table.shown, key) not in self._told:
            self._told.add((join.table.shown, key))
            join.tell_absent(key, place, findings)

    @cached_property
    def _told(self) -> set[tuple[str, tuple[str, ...]]]:
        """The missing rows that have been reported."""
        return set()

    @cached_property
    def _joins(self) -> tuple[Join, ...]:
        """The tables that are joined to every trial, in the order in which they are."""
        return tuple(
            Join.of(table, self._facts_from(source))
            for source, table in (
                ("participants", self.participants),
                ("trials", self.trial_list),
                # The trial list may say which item was shown.
                ("items", self.items),
            )
            if table is not None
        )

    def _facts_from(self, source: str) -> tuple[str, ...]:
        """The facts that come from one source."""
        return tuple(name for name, origin in self.sources.items() if origin == source)

    def origin(self, name: str, participant: str, trial: KnownTrial) -> tuple[str, int]:
        """File and line from which a trial has a fact: a row of a table, or the trial's log."""
        table = {
            "trials": self.trial_list,
            "participants": self.participants,
            "items": self.items,
        }.get(self.sources.get(name, ""))
        if table is None:
            return trial.shown, trial.line
        known = dict(zip(self.names, trial.facts, strict=True))
        ids = (participant, trial.session, trial.trial, trial.item)
        known |= dict(zip(IDS, ids, strict=True))
        key = tuple(known.get(n, "") for n in table.keys)
        return table.shown, table.lines.get(key, 1)

    def unrecorded(self, seen: Mapping[str, Collection[tuple[str, str]]]) -> list[tuple[str, int]]:
        """Rows of the trial list that no log has, as their spelled key and line.

        Only where the list is joined by reader and trial does a row stand for one trial.
        """
        table = self.trial_list
        if table is None or not {"participant", "trial"} <= set(table.keys):
            return []
        if not set(table.keys) <= set(IDS):
            return []
        by_own_fact = [
            (name, values) for name, values in self.skip.items() if name in table.columns
        ]
        places = [table.keys.index(n) if n in table.keys else None for n in IDS[:3]]
        by_trial = {participant: {trial for _, trial in own} for participant, own in seen.items()}
        none: frozenset[str] = frozenset()
        found = []
        for key in table.rows:
            participant, session, trial = ["" if p is None else key[p] for p in places]
            if session:
                there = (session, trial) in seen.get(participant, ())
            else:
                there = trial in by_trial.get(participant, none)
            if there or any(table.value(key, name) in values for name, values in by_own_fact):
                continue
            spelled = ", ".join(f"{n} {k}" for n, k in zip(table.keys, key, strict=True))
            found.append((spelled, table.lines[key]))
        return found


def gather_facts(
    study: Study, log_header: Iterable[str], region_header: Iterable[str], findings: Findings
) -> FactBook | None:
    """Read the study's tables and find out where each fact comes from.

    Parameters
    ----------
    study : Study
        The study as loaded.
    log_header : iterable of str
        The header of one of its logs; empty where that could not be read.
    region_header : iterable of str
        The header of its region file; empty where that could not be read.
    findings : Findings
        Where problems are recorded.

    Returns
    -------
    FactBook or None
        None where a table cannot be read or a named fact is nowhere to be found. A fact that
        stands in several places is taken from the trial list, the reader table, the item table,
        the logs, the region file, in this order.
    """
    before = findings.count("error")
    columns = study.logs.columns
    synonyms = {
        name: column.column for name in IDS if (column := getattr(columns, name)) is not None
    }
    missing = study.logs.missing

    def table(given: str | None, keys: tuple[str, ...]) -> FactTable | None:
        if given is None:
            return None
        return read_fact_table(
            study.folder / given, shown_path(study, given), keys, synonyms, missing, findings
        )

    participants = study.participants and table(study.participants.table, ("participant",))
    items = study.items and table(study.items.table, ("item",))
    trials = study.trials
    back = {header_: name for name, header_ in synonyms.items()}
    keys = tuple(back.get(key, key) if key not in IDS else key for key in trials.keys)
    trial_list = table(trials.table, keys)
    if findings.count("error") > before:
        return None
    sources = find_sources(
        study,
        keys if trial_list else (),
        {
            "trials": trial_list.columns if trial_list else (),
            "participants": participants.columns if participants else (),
            "items": items.columns if items else (),
            "log": tuple(log_header),
            "regions": tuple(region_header),
        },
        findings,
    )
    check_ids(study, keys, trial_list is not None and "item" in trial_list.columns, findings)
    if findings.count("error") > before:
        return None
    skip = {name: tuple(values) for name, values in trials.skip.items()}
    from_log = tuple(name for name, source in sources.items() if source == "log")
    return FactBook(trial_list, participants or None, items or None, sources, from_log, skip)


def shown_path(study: Study, given: str | Path) -> str:
    """A path as the user would name it: relative to the study file, with forward slashes."""
    path = study.folder / given
    try:
        return Path(os.path.relpath(path, study.folder)).as_posix()
    except ValueError:  # another drive on Windows
        return path.as_posix()
