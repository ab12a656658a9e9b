"""Where each fact that a study names comes from: which table, the logs or the region file."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from difflib import get_close_matches
from typing import TYPE_CHECKING

from etl.errors import Findings
from etl.trials.seen import IDS

if TYPE_CHECKING:
    from etl.study import Study

#: What a trial list can be joined by: known before the list itself is read.
_BEFORE_THE_LIST = ("participants", "log")


def find_sources(
    study: Study,
    keys: Sequence[str],
    columns: Mapping[str, Sequence[str]],
    findings: Findings,
) -> dict[str, str]:
    """Find out where each fact of a study comes from.

    Parameters
    ----------
    study : Study
        The study as loaded.
    keys : sequence of str
        What joins the trial list, by canonical name or fact.
    columns : mapping of str to sequence of str
        The columns of each source in order of precedence: ``"trials"``, ``"participants"``,
        ``"items"``, ``"log"``, ``"regions"``. Of a log or region file that could not be read
        there are none.
    findings : Findings
        Where facts that are nowhere to be found are recorded.

    Returns
    -------
    dict of str to str
        The source of every fact that was found.
    """
    sources: dict[str, str] = {}
    for name, place in _named(study, keys):
        if name in sources or name in IDS:
            continue
        # A column of the trial list itself cannot tell which of its rows is meant.
        allowed = _BEFORE_THE_LIST if name in keys else tuple(columns)
        if place[1] == "skip":
            allowed = tuple(source for source in allowed if source != "regions")
        found = next((source for source in allowed if name in columns[source]), None)
        # What could not be read has no columns and is reported by who reads it; that a fact is
        # missing cannot be said then.
        unread = next((s for s in ("log", "regions") if s in allowed and not columns[s]), None)
        source = found or unread
        if source is None:
            _tell_nowhere(study, name, place, [n for s in allowed for n in columns[s]], findings)
        else:
            sources[name] = source
    return sources


def check_ids(study: Study, keys: Sequence[str], has_item: bool, findings: Findings) -> None:  # noqa: FBT001
    """Record identifiers by which tables are joined and which no trial would have.

    Parameters
    ----------
    study : Study
        The study as loaded.
    keys : sequence of str
        What joins the trial list.
    has_item : bool
        Whether the trial list says which item a trial shows.
    findings : Findings
        Where problems are recorded.
    """
    pattern = study.logs.participant_from_name or ""
    in_logs = {
        name
        for name in IDS
        if getattr(study.logs.columns, name) is not None or f"(?P<{name}>" in pattern
    }
    if study.trials.table is not None:
        for key in keys:
            if key in IDS and key not in in_logs:
                findings.error(
                    f"the trial list is joined by {key}, which the logs do not say",
                    path=study.shown,
                    line=study.line_of("trials", "keys"),
                    where="trials.keys",
                    found=", ".join(study.trials.keys),
                    expected=f"{key} in [logs.columns], or other keys",
                    fix=f'add {key} = "…" to [logs.columns] with the header of the column, or '
                    "remove it from keys",
                )
    if study.items is not None and "item" not in in_logs and not has_item:
        findings.error(
            "nothing says which item a trial shows, so the item table cannot be joined",
            path=study.shown,
            line=study.line_of("items", "table"),
            where="items.table",
            found=study.items.table,
            expected="item in [logs.columns], or a column item in the trial list",
            fix='add item = "…" to [logs.columns] with the header of the column, add a column '
            "item to the trial list, or remove [items]",
        )


def _named(study: Study, keys: Sequence[str]) -> Iterator[tuple[str, tuple[str, ...]]]:
    """The facts that a study names, and where it names them."""
    trials = study.trials
    if trials.table is not None:
        yield from ((name, ("trials", "keys")) for name in keys)
    yield from ((name, ("trials", "factors")) for name in trials.factors)
    yield from ((name, ("trials", "covariates")) for name in trials.covariates)
    yield from ((name, ("trials", "skip", name)) for name in trials.skip)
    for key in ("answer_correct", "onset", "offset"):
        name = getattr(trials, key)
        if name is not None:
            yield name, ("trials", key)


def _tell_nowhere(
    study: Study, name: str, place: tuple[str, ...], there: list[str], findings: Findings
) -> None:
    """Record a fact that no source has."""
    listed = sorted({column for column in there if column})
    near = get_close_matches(name, listed, n=1)
    by = "log or reader table" if place[1] == "keys" else "table, log or region file"
    findings.error(
        f'no {by} has a column "{name}"',
        path=study.shown,
        line=study.line_of(*place),
        where=".".join(place[:2]),
        found=name,
        expected="one of " + ", ".join(listed),
        fix=f'did you mean "{near[0]}"?' if near else "correct the name",
    )
