"""The draft for logs that are tables."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from pathlib import Path

from etl.drafting.beginning import begun, write_names
from etl.drafting.columns import Pooled
from etl.drafting.made import Made
from etl.drafting.meanings import counted, shortened
from etl.drafting.place_text import write_regions, write_screen
from etl.drafting.readers import factors_among
from etl.drafting.table_heads import TableHead, tell_no_log
from etl.drafting.table_text import (
    write_columns,
    write_facts,
    write_form,
    write_rest,
)
from etl.drafting.tables import UnderstoodTables, understand
from etl.errors import Findings

#: A fixation has a time at least, and something that tells trials apart.
_LEAST_NUMBERS = 2


def of_tables(
    tables: Sequence[TableHead],
    implied: Collection[Path],
    target: Path | None,
    told_of: tuple[Findings, Findings],
) -> Made | None:
    """Draft a study file for tables.

    Parameters
    ----------
    tables : sequence of TableHead
        The beginning of each log.
    implied : collection of Path
        Files that nobody named, which only stand in a folder of logs: they may be something else.
    target : Path or None
        Where the study file goes.
    told_of : tuple of two Findings
        Where it is recorded that the tables are none of fixations; where logs are named that lack
        a column, and files that are left out.

    Returns
    -------
    Made or None
        None where a problem was recorded.
    """
    findings, notes = told_of
    usual, others = _by_header(tables)
    pooled = Pooled.of([(one.head.path.name, one.cells) for one in usual])
    if sum(column.numeric for column in pooled.columns.values()) < _LEAST_NUMBERS:
        tell_no_log(usual[0].head, findings)
        return None
    understood = understand(pooled)
    found, names = understood.found, understood.names
    strange = _lacking(others, understood, implied, notes)
    tables = [table for table in tables if table not in strange]
    out = begun([one.head.path for one in tables], target)
    rows = sum(len(one.cells) for one in tables) - pooled.unit_rows
    what = "a sample of gaze" if found.samples else "a fixation"
    told = (
        f"{counted(rows, 'row')} of {counted(len(pooled.headers), 'column')} below a header, with "
        f"{what} in each row"
    )
    out.guess("kind", "table", told)
    write_names(out, names, pooled.names[0])
    write_form(out, tables, pooled.decimals, found)
    write_columns(out, found)
    by_name = names is not None and "item" in names.said
    known = {"item"} & (found.meanings.keys() | found.questions.keys())
    write_facts(out, found, item_is_known=bool(known) or by_name)
    write_screen(out, found, understood.extent)
    write_regions(out, found, understood.extent)
    write_rest(out)
    eye = next(iter(found.eyes), "") or next(iter(found.eye_values), "")
    others = [one for one in tables if one is not usual[0]]
    logs = tuple(one.head.path for one in (usual[0], *others))
    return Made(out, logs, eye, tuple(factors_among(found.facts)))


def _by_header(tables: Sequence[TableHead]) -> tuple[list[TableHead], list[TableHead]]:
    """The logs that have the columns that most have, and the others."""
    groups: dict[frozenset[str], list[TableHead]] = {}
    for table in tables:
        groups.setdefault(frozenset(name for name in table.cells.header if name), []).append(table)
    # Of two kinds of table of which there is one each, the longer one holds the fixations.
    most = max(groups.values(), key=lambda own: (len(own), sum(len(one.cells) for one in own)))
    return most, [table for group in groups.values() if group is not most for table in group]


def _lacking(
    others: Sequence[TableHead],
    understood: UnderstoodTables,
    implied: Collection[Path],
    notes: Findings,
) -> list[TableHead]:
    """Warn of tables that lack a column of the draft; those that nobody named are no logs."""
    needed = understood.found.used()
    strange = []
    for table in others:
        lacking = sorted(needed - set(table.cells.header))
        if not lacking:
            continue
        left_out = table.head.path in implied
        if left_out:
            strange.append(table)
        notes.warning(
            "this file of the folder has other columns than most, and was left out"
            if left_out
            else "the log has other columns than most",
            path=table.head.shown,
            line=table.cells.header_line,
            found=", ".join(table.cells.header),
            expected=f"columns {shortened(lacking)} too",
            fix="name the logs themselves if it is one"
            if left_out
            else "leave the log out of files, or give its columns the names of the others",
        )
    return strange
