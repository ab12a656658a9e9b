"""One table of facts, ready to be joined to many trials."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass
from difflib import get_close_matches

from etl.errors import Findings
from etl.trials.fact_tables import FactTable

#: What identifies a fixation's trial; every log or table may carry these under canonical names.
IDS = ("participant", "session", "trial", "item")


@dataclass(frozen=True, slots=True)
class Join:
    """A table with the places of what is taken from it, so that a trial costs one look-up.

    Attributes
    ----------
    table : FactTable
        The table.
    ids : tuple of (str, int)
        Identifiers that it adds to those of the log, and their columns.
    facts : tuple of (str, int)
        Facts that are taken from it, and their columns.
    """

    table: FactTable
    ids: tuple[tuple[str, int], ...]
    facts: tuple[tuple[str, int], ...]

    @classmethod
    def of(cls, table: FactTable, facts: Collection[str]) -> Join:
        """Prepare a table for the facts that are taken from it."""
        ids = [name for name in IDS if name in table.columns and name not in table.keys]
        return cls(
            table,
            tuple((name, table.columns.index(name)) for name in ids),
            tuple((name, table.columns.index(name)) for name in facts),
        )

    def add(
        self,
        identity: dict[str, str],
        facts: dict[str, str],
        place: tuple[str, int],
        findings: Findings,
    ) -> bool:
        """Add what the table says about one trial.

        Parameters
        ----------
        identity, facts : dict of str to str
            What is known of the trial; completed in place.
        place : tuple of (str, int)
            File and line where the trial was seen.
        findings : Findings
            Where a missing row, or another item than the log's, is recorded.

        Returns
        -------
        bool
            Whether the table has a row for the trial and agrees with the log.
        """
        key = self.key(identity, facts)
        row = self.table.rows.get(key)
        if row is None:
            self._tell_missing(key, place, findings)
            return False
        for name, column in self.facts:
            facts[name] = row[column]
        good = True
        for name, column in self.ids:
            text = row[column]
            if text and identity.setdefault(name, text) != text and name == "item":
                good = False
                findings.error(
                    f"the log and {self.table.shown} name different items",
                    path=place[0],
                    line=place[1],
                    found=identity[name],
                    expected=f'"{text}" as in {self.table.shown}:{self.table.lines[key]}',
                    fix="correct one of the two, or take item out of [logs.columns]",
                )
        return good

    def key(self, identity: Mapping[str, str], facts: Mapping[str, str]) -> tuple[str, ...]:
        """The key values of a trial."""
        return tuple([identity.get(name) or facts.get(name, "") for name in self.table.keys])

    def _tell_missing(
        self, key: tuple[str, ...], place: tuple[str, int], findings: Findings
    ) -> None:
        """Record that the table has no row for a trial."""
        shown, keys = self.table.shown, self.table.keys
        near: list[str] = []
        if len(key) == 1:
            near = get_close_matches(key[0], [k[0] for k in self.table.rows], n=1, cutoff=0.75)
        findings.error(
            f"{shown} has no row for this {' and '.join(keys)}",
            path=place[0],
            line=place[1],
            found=", ".join(f"{name} {text}" for name, text in zip(keys, key, strict=True)),
            expected=f"a row of {shown} for every trial of the logs",
            fix=f"add the row to {shown}"
            + (f' (it has "{near[0]}")' if near else "")
            + ", or leave the trial out by [logs.where]",
        )
