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

    def row(self, identity: Mapping[str, str], facts: Mapping[str, str]) -> tuple[str, ...] | None:
        """The table's row for a trial, None where it has none."""
        return self.table.rows.get(self.key(identity, facts))

    def take(
        self,
        row: tuple[str, ...],
        identity: dict[str, str],
        facts: dict[str, str],
        place: tuple[str, int],
        findings: Findings,
    ) -> bool:
        """Take what a row says about its trial.

        Parameters
        ----------
        row : tuple of str
            From :meth:`row`.
        identity, facts : dict of str to str
            What is known of the trial; completed in place.
        place : tuple of (str, int)
            File and line where the trial was seen.
        findings : Findings
            Where another item than the log's is recorded.

        Returns
        -------
        bool
            Whether the table agrees with the log.
        """
        for name, column in self.facts:
            facts[name] = row[column]
        good = True
        for name, column in self.ids:
            text = row[column]
            if text and identity.setdefault(name, text) != text and name == "item":
                good = False
                line = self.table.lines[self.key(identity, facts)]
                findings.error(
                    f"the log and {self.table.shown} name different items",
                    path=place[0],
                    line=place[1],
                    found=identity[name],
                    expected=f'"{text}" as in {self.table.shown}:{line}',
                    fix="correct one of the two, or take item out of [logs.columns]",
                )
        return good

    def key(self, identity: Mapping[str, str], facts: Mapping[str, str]) -> tuple[str, ...]:
        """The key values of a trial."""
        return tuple([identity.get(name) or facts.get(name, "") for name in self.table.keys])

    def tell_absent(self, key: tuple[str, ...], place: tuple[str, int], findings: Findings) -> None:
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
