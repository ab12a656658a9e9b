"""Join what the logs, the trial list, the reader table and the item table say about each trial."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded, group_rows, place_rows
from etl.files.packed import Packed, PackedColumns, RowTexts
from etl.pseudonyms import Pseudonyms
from etl.trials.fact_tables import FactTable, read_fact_table
from etl.trials.labels import labels_of
from etl.trials.seen import IDS, SeenTrials
from etl.trials.sources import check_ids, find_sources

if TYPE_CHECKING:
    from etl.study import Study


@dataclass(frozen=True, slots=True)
class KnownTrials:
    """Trials with all that is known about them, one row a trial.

    Attributes
    ----------
    seen : SeenTrials
        Where and how the logs show them.
    known : PackedColumns
        Identifiers and facts, by name.
    skipped : (trials,) bool array
        Whether the trial is no part of the study.
    skipped_by : RowTexts
        By which fact, such as ``block = practice``; empty where it is part of the study.
    good : (trials,) bool array
        Whether all that must be known of the trial is known.
    """

    seen: SeenTrials
    known: PackedColumns
    skipped: NDArray[np.bool_]
    skipped_by: RowTexts
    good: NDArray[np.bool_]

    def __len__(self) -> int:
        return len(self.seen)


@dataclass(frozen=True, slots=True)
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
    eyes : dict of str to str
        The eye that counts, for readers of whom the reader table says so.
    pseudonyms : Pseudonyms or None
        By which readers go in the tables, where the study asks for them.
    """

    trial_list: FactTable | None
    participants: FactTable | None
    items: FactTable | None
    sources: dict[str, str]
    from_log: tuple[str, ...]
    skip: dict[str, tuple[str, ...]] = field(default_factory=dict)
    eyes: dict[str, str] = field(default_factory=dict)
    pseudonyms: Pseudonyms | None = None

    def known_facts(self) -> frozenset[str]:
        """What is known of a trial before its text is looked up."""
        own = {name for name, source in self.sources.items() if source != "regions"}
        return frozenset(own | set(IDS))

    def tables(self) -> list[FactTable]:
        """The tables there are."""
        return [t for t in (self.trial_list, self.participants, self.items) if t is not None]

    def release(self) -> None:
        """Let go of the rows of the tables, when all that they say of trials has been joined."""
        for table in self.tables():
            table.columns.release()

    def know(self, seen: SeenTrials, shown: Sequence[str], findings: Findings) -> KnownTrials:
        """Join all that is known about trials.

        Parameters
        ----------
        seen : SeenTrials
            The trials of the logs.
        shown : sequence of str
            The names of the logs, for messages.
        findings : Findings
            Where trials of the study without a row in a table are recorded, and trials for which
            log and table name different items.

        Returns
        -------
        KnownTrials
        """
        known = PackedColumns({**seen.ids, **seen.facts})
        good = np.ones(len(seen), dtype=bool)
        missing: list[tuple[FactTable, NDArray[np.bool_]]] = []
        for source, table in (
            ("participants", self.participants),
            ("trials", self.trial_list),
            ("items", self.items),
        ):
            if table is None:
                continue
            rows = table.find(known)
            missing.append((table, rows < 0))
            for name in (n for n, origin in self.sources.items() if origin == source):
                known[name] = table.columns.packed(name).take(rows)
            if "item" in table.columns and "item" not in table.keys:
                good &= self._agree_on_item(known, table, rows, (seen, shown), findings)
            del rows
        skipped = np.zeros(len(seen), dtype=bool)
        skipped_by = RowTexts(len(seen))
        for name, values in self.skip.items():
            if name not in known:
                continue
            column = known[name]
            listed = column.among(values)
            first = np.flatnonzero(listed & ~skipped)
            for code in np.unique(column.codes[first]).tolist():
                own = first[column.codes[first] == code]
                skipped_by[own] = f"{name} = {'' if code < 0 else column.values[code]}"
            skipped |= listed
        for table, absent in missing:
            # A practice trial need not stand in any table.
            lacking = absent & ~skipped
            good &= ~lacking
            rows = np.flatnonzero(lacking)
            if rows.size:
                # A reader or an item that is not in its table is told once, not for every trial.
                keys = [known[key].take(rows) for key in table.keys if key in known]
                originals = {} if self.pseudonyms is None else self.pseudonyms.originals
                for row in rows[np.sort(group_rows(keys)[0])].tolist():
                    _tell_missing_row(table, known, row, (seen, shown, originals), findings)
        return KnownTrials(seen, known, skipped, skipped_by, good | skipped)

    def _agree_on_item(
        self,
        known: PackedColumns,
        table: FactTable,
        rows: NDArray[np.int64],
        place: tuple[SeenTrials, Sequence[str]],
        findings: Findings,
    ) -> NDArray[np.bool_]:
        """Take the item from a table; where the log has one too, say whether they agree."""
        packed = table.columns.packed("item").take(rows)
        own = known.get("item")
        if own is None:
            known["item"] = packed
            return np.ones(len(rows), dtype=bool)
        theirs = packed.coded()
        both = Coded.joined([own, theirs])
        mine, other = both.codes[: len(rows)], both.codes[len(rows) :]
        known["item"] = Packed(np.where(mine >= 0, mine, other), both.values)
        clash: NDArray[np.bool_] = (mine >= 0) & (other >= 0) & (mine != other)
        seen, shown = place
        for row in np.flatnonzero(clash).tolist():
            findings.error(
                f"the log and {table.shown} name different items",
                path=shown[int(seen.file[row])],
                line=int(seen.line[row]),
                found=own.text(row),
                expected=f'"{theirs.text(row)}" as in {table.shown}:{table.lines[rows[row]]}',
                fix="correct one of the two, or take item out of [logs.columns]",
            )
        agreed: NDArray[np.bool_] = ~clash
        return agreed

    def origins(
        self, name: str, trials: KnownTrials, rows: NDArray[np.int64]
    ) -> tuple[str, NDArray[np.bool_], NDArray[np.int32]]:
        """Where many trials have a fact from.

        Parameters
        ----------
        name : str
            The fact.
        trials : KnownTrials
            All trials.
        rows : (n,) int64 array
            The trials that are asked about.

        Returns
        -------
        shown : str
            The table that holds the fact; empty where none does.
        listed : (n,) bool array
            Whether the table has a row for the trial; if not, the fact is from its log.
        lines : (n,) int32 array
            The line, in the table or in the trial's log.
        """
        table = {
            "trials": self.trial_list,
            "participants": self.participants,
            "items": self.items,
        }.get(self.sources.get(name, ""))
        lines = trials.seen.line[rows]
        if table is None or not len(rows):
            return "", np.zeros(len(rows), dtype=bool), lines
        known = {key: trials.known[key].take(rows) for key in table.keys if key in trials.known}
        at = table.find(known or {"": Coded.absent(len(rows))})
        return table.shown, at >= 0, np.where(at >= 0, table.lines[at], lines)

    def unrecorded(self, seen: SeenTrials) -> list[int]:
        """Rows of the trial list that no log has.

        Only where the list is joined by reader and trial does a row stand for one trial.
        """
        table = self.trial_list
        if table is None or not {"participant", "trial"} <= set(table.keys) <= set(IDS[:3]):
            return []
        own = [table.columns[key] for key in table.keys]
        nowhere = Coded.absent(len(seen))
        lacking = place_rows(own, [seen.ids.get(key, nowhere) for key in table.keys]) < 0
        for name, values in self.skip.items():
            if name in table.columns:
                lacking &= ~table.columns[name].among(values)
        rows: list[int] = np.flatnonzero(lacking).tolist()
        return rows


def _tell_missing_row(
    table: FactTable,
    known: PackedColumns,
    row: int,
    place: tuple[SeenTrials, Sequence[str], Mapping[str, str]],
    findings: Findings,
) -> None:
    """Record that a table has no row for a trial; ``place``: the trials, the logs, whose ids."""
    seen, shown, originals = place
    texts = {key: known[key].text(row) if key in known else "" for key in table.keys}
    near: list[str] = []
    if len(table.keys) == 1:
        (key,) = table.keys
        # Of pseudonyms none is like another.
        values = [originals.get(value, value) for value in table.columns[key].values]
        bare = originals.get(texts[key], texts[key]).lstrip("0")
        # A spreadsheet drops the zeros before a number.
        near = [value for value in values if value.lstrip("0") == bare]
        near = near or get_close_matches(
            originals.get(texts[key], texts[key]), values, n=1, cutoff=0.75
        )
    findings.error(
        f"{table.shown} has no row for this {' and '.join(table.keys)}",
        path=shown[int(seen.file[row])],
        line=int(seen.line[row]),
        found=", ".join(f"{key} {text}" for key, text in texts.items()),
        expected=f"a row of {table.shown} for every trial of the logs",
        fix=f"add the row to {table.shown}"
        + (f' (it has "{near[0]}")' if near else "")
        + ", or leave the trial out by [trials] skip or [logs.where]",
    )


def gather_facts(
    study: Study,
    log_header: Iterable[str],
    region_header: Iterable[str],
    findings: Findings,
    pseudonyms: Pseudonyms | None = None,
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
    pseudonyms : Pseudonyms, optional
        What gives pseudonyms in place of readers' ids, where the study asks for them.

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

    def table(given: str | None, keys: tuple[str, ...]) -> FactTable | None:
        if given is None:
            return None
        shown = shown_path(study, given)
        missing = study.logs.missing
        labels = labels_of(study.logs.kind)
        read = read_fact_table(
            study.folder / given, shown, keys, synonyms, missing, findings, labels
        )
        return None if read is None else read.under(pseudonyms)

    participants = table(study.participants.table if study.participants else None, ("participant",))
    items = table(study.items.table if study.items else None, ("item",))
    trials = study.trials
    canonical = {header: name for name, header in synonyms.items()}
    keys = tuple(key if key in IDS else canonical.get(key, key) for key in trials.keys)
    trial_list = table(trials.table, keys)
    if findings.count("error") > before:
        return None
    sources = find_sources(
        study,
        keys if trial_list else (),
        {
            "trials": tuple(trial_list.columns) if trial_list else (),
            "participants": tuple(participants.columns) if participants else (),
            "items": tuple(items.columns) if items else (),
            "log": tuple(log_header),
            "regions": tuple(region_header),
        },
        findings,
    )
    eyes = _eyes(study, participants, findings)
    check_ids(study, keys, trial_list is not None and "item" in trial_list.columns, findings)
    if findings.count("error") > before:
        return None
    skip = {name: tuple(values) for name, values in trials.skip.items()}
    if pseudonyms is not None:
        for name in {"participant", synonyms.get("participant", "")} & skip.keys():
            skip[name] = tuple(map(pseudonyms.of_reader, skip[name]))
    from_log = tuple(name for name, source in sources.items() if source == "log")
    used = {*sources, "item"}
    return FactBook(
        trial_list.only(used) if trial_list else None,
        participants.only(used) if participants else None,
        items.only(used) if items else None,
        sources,
        from_log,
        skip,
        eyes,
        pseudonyms,
    )


def _eyes(study: Study, readers: FactTable | None, findings: Findings) -> dict[str, str]:
    """The eye that counts, for each reader of whom the reader table says so."""
    eye = study.logs.eye
    if eye is None or eye.column is None or readers is None:
        return {}
    if eye.column not in readers.columns:
        near = get_close_matches(eye.column, readers.columns, n=1)
        findings.error(
            "the reader table does not say which eye counts",
            path=study.shown,
            line=study.line_of("logs", "eye", "column"),
            where="logs.eye.column",
            found=eye.column,
            expected="one of " + ", ".join(readers.columns),
            fix=f'did you mean "{near[0]}"?' if near else "correct the name of the column",
        )
        return {}
    names, column = readers.columns["participant"], readers.columns[eye.column]
    every = range(len(readers.lines))
    return {names.text(row): column.text(row) for row in every if column.codes[row] >= 0}


def shown_path(study: Study, given: str | Path) -> str:
    """A path as the user would name it: relative to the study file, with forward slashes."""
    path = study.folder / given
    try:
        return Path(os.path.relpath(path, study.folder)).as_posix()
    except ValueError:  # another drive on Windows
        return path.as_posix()
