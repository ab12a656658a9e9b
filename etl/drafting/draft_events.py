"""The draft for logs that are lines of events."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from etl.drafting.beginning import begun, write_names
from etl.drafting.event_clock import settle_clock
from etl.drafting.event_clusters import shapes_of
from etl.drafting.event_rest import find_the_rest
from etl.drafting.event_roles import EventRoles, Lines, find_fixations, understand_within_trials
from etl.drafting.event_text import write_events
from etl.drafting.event_tokens import has_decimal_commas
from etl.drafting.event_trials import find_trials
from etl.drafting.heads import Head
from etl.drafting.made import Made
from etl.drafting.meanings import counted
from etl.drafting.place_text import write_regions, write_screen
from etl.drafting.readers import factors_among, pattern_of
from etl.drafting.table_text import write_facts, write_rest

#: How many lines of all logs together are looked at, and of each at least: seconds, our choice.
_ALL_LINES, _LEAST_LINES = 150_000, 400


def event_roles(heads: Sequence[Head]) -> tuple[EventRoles, bool]:
    """Find out what the lines of logs tell.

    Parameters
    ----------
    heads : sequence of Head
        The beginning of each log.

    Returns
    -------
    EventRoles
        Without a fixation where no line looks like one.
    bool
        Whether numbers have decimal commas.
    """
    most = max(_LEAST_LINES, _ALL_LINES // len(heads))
    lines: list[str] = []
    file: list[int] = []
    for number, head in enumerate(heads):
        own = [line for line in head.lines() if line.strip()][:most]
        lines += own
        file += [number] * len(own)
    names = tuple(head.path.name for head in heads)
    looked_at = Lines(names, np.array(file, dtype=np.int32), shapes_of(lines, file))
    roles = find_fixations(looked_at)
    if roles.fixation is not None:
        find_trials(looked_at, roles)
        understand_within_trials(looked_at, roles)
        settle_clock(roles)
        find_the_rest(looked_at, roles)
    return roles, has_decimal_commas(lines[:2000])


def of_events(
    heads: Sequence[Head], roles: EventRoles, target: Path | None, *, commas: bool
) -> Made:
    """Draft a study file for lines of events.

    Parameters
    ----------
    heads : sequence of Head
        The beginning of each log.
    roles : EventRoles
        What their lines tell; fixations are among them.
    target : Path or None
        Where the study file goes.
    commas : bool
        Whether numbers have decimal commas.

    Returns
    -------
    Made
    """
    assert roles.understood is not None  # noqa: S101
    assert roles.fixation is not None  # noqa: S101
    found = roles.understood.found
    out = begun([head.path for head in heads], target)
    told = f"lines of several kinds; those of fixations are {counted(len(roles.fixation), 'line')}"
    out.guess("kind", "events", told)
    said = roles.names()
    known = {name for name in ("participant", "session", "trial", "item") if name in said}
    names = None
    if "participant" not in said:
        names = pattern_of([head.path.name for head in heads], known)
    if names is not None or "participant" in said:
        found.questions.pop("participant", None)
    else:
        found.questions.setdefault("participant", "who read?")
    write_names(out, names, heads[0].path.name)
    write_events(out, heads, roles, commas=commas)
    found.facts = {
        name: tuple(dict.fromkeys(telling.shape.cells[place]))
        for telling in roles.tellings()
        for place, name in telling.names.items()
        if name not in ("participant", "session", "trial", "item")
    }
    write_facts(out, found, item_is_known="item" in known or "item" in roles.questions)
    write_screen(out, found, roles.understood.extent)
    write_regions(out, found, roles.understood.extent)
    write_rest(out)
    eye = next(iter(found.eyes), "") or next(iter(found.eye_values), "")
    factors = tuple(factors_among(found.facts))
    return Made(out, tuple(head.path for head in heads), eye, factors)
