"""Join what the logs, the trial list, the reader table and the item table say about each trial."""

from __future__ import annotations

import os
from collections.abc import Collection, Iterable, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

from etl.errors import Findings
from etl.trials.fact_tables import FactTable, read_fact_table
from etl.trials.joining import IDS, Join

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

    def identity(self, participant: str, trial: KnownTrial) -> dict[str, str]:
        """Everything that is known of a trial, by name."""
        known = dict(zip(self.names, trial.facts, strict=True))
        ids = (participant, trial.session, trial.trial, trial.item)
        return known | dict(zip(IDS, ids, strict=True))

    def known_facts(self) -> frozenset[str]:
        """What is known of a trial before its text is looked up."""
        own = {name for name, source in self.sources.items() if source != "regions"}
        return frozenset(own | set(IDS))

    def tables(self) -> list[FactTable]:
        """The tables there are."""
        return [t for t in (self.trial_list, self.participants, self.items) if t is not None]

    def know(self, seen: SeenTrial, findings: Findings) -> KnownTrial | None:
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
        good = True
        for join in self._joins:
            good &= join.add(identity, facts, place, findings)
        # A practice trial may stand in no item table: whether it counts is asked first.
        skipped_by = ""
        items = self._item_join
        if items is not None and items.key(identity, facts) in items.table.rows:
            good &= items.add(identity, facts, place, findings)
            items = None
        for name, values in self.skip.items():
            if (identity.get(name) or facts.get(name, "")) in values:
                skipped_by = name
                break
        else:
            if items is not None:
                good &= items.add(identity, facts, place, findings)
        if not good:
            return None
        return KnownTrial(
            seen.session,
            seen.trial,
            identity.get("item", ""),
            tuple([facts.get(name, "") for name in self.sources]),
            -1,
            skipped_by,
            seen.shown,
            seen.line,
        )

    @cached_property
    def _joins(self) -> tuple[Join, ...]:
        """The tables that are joined to every trial, in the order in which they are."""
        return tuple(
            Join.of(table, self._facts_from(source))
            for source, table in (("participants", self.participants), ("trials", self.trial_list))
            if table is not None
        )

    @cached_property
    def _item_join(self) -> Join | None:
        """The item table, joined to trials that are not skipped."""
        return None if self.items is None else Join.of(self.items, self._facts_from("items"))

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
        known = self.identity(participant, trial)
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
        The header of one of its logs.
    region_header : iterable of str
        The header of its region file.
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
    header = set(log_header)

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
    skip = {name: tuple(values) for name, values in trials.skip.items()}
    named = [
        *((name, ("trials", "factors")) for name in trials.factors),
        *((name, ("trials", "covariates")) for name in trials.covariates),
        *((name, ("trials", "skip", name)) for name in skip),
        *((name, ("trials", "keys")) for name in keys if name not in IDS),
    ]
    single = {
        "answer_correct": trials.answer_correct,
        "onset": trials.onset,
        "offset": trials.offset,
    }
    named += [(name, ("trials", key)) for key, name in single.items() if name is not None]
    places = [
        ("trials", trial_list.columns if trial_list else ()),
        ("participants", participants.columns if participants else ()),
        ("items", items.columns if items else ()),
        ("log", tuple(header)),
        ("regions", tuple(region_header)),
    ]
    sources: dict[str, str] = {}
    for name, loc in named:
        if name in IDS and name not in sources:
            continue
        source = next((where for where, has in places if name in has), None)
        if source is None or (source == "regions" and loc[1] == "skip"):
            everything = sorted({n for _, has in places for n in has if n})
            near = get_close_matches(name, everything, n=1)
            findings.error(
                f'no table, log or region file has a column "{name}"',
                path=study.shown,
                line=study.line_of(*loc),
                where=".".join(loc[:2]),
                found=name,
                expected="one of " + ", ".join(everything),
                fix=f'did you mean "{near[0]}"?' if near else "correct the name",
            )
            continue
        sources[name] = source
    if findings.count("error") > before:
        return None
    from_log = tuple(name for name, source in sources.items() if source == "log")
    return FactBook(trial_list, participants or None, items or None, sources, from_log, skip)


def shown_path(study: Study, given: str | Path) -> str:
    """A path as the user would name it: relative to the study file, with forward slashes."""
    path = study.folder / given
    try:
        return Path(os.path.relpath(path, study.folder)).as_posix()
    except ValueError:  # another drive on Windows
        return path.as_posix()
