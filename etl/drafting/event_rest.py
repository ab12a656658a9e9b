"""The lines of a log of events that are neither fixations nor the bounds of trials."""

from __future__ import annotations

import numpy as np

from etl.drafting.event_names import find_facts
from etl.drafting.event_roles import EventRoles, Lines, Telling, has_word, is_about, lines_of
from etl.drafting.event_shapes import Shape

_SACCADE = ("sac", "sak")
_BLINK = ("blink", "lid", "blinz", "clign", "parpade", "pisca", "眨")


def find_the_rest(lines: Lines, roles: EventRoles) -> None:
    """Find blinks, facts about trials, and lines that mean nothing here.

    Parameters
    ----------
    lines : Lines
        The lines.
    roles : EventRoles
        What they tell; the rest of it is recorded.
    """
    taken = roles.used()
    for telling in roles.ends:
        find_facts(roles, telling)
    starts = lines_of([telling.shape for telling in roles.starts])
    for shape in lines.shapes:
        if any(shape is one for one in taken):
            continue
        if is_about(shape, _BLINK) and not has_word(shape, _SACCADE):
            roles.blinks.append(shape)
            continue
        telling = Telling(shape)
        home = _home(shape, starts, lines, roles)
        if home is not None and find_facts(roles, telling):
            home.append(telling)
        else:
            roles.others.append(shape)


def _home(
    shape: Shape, starts: np.ndarray, lines: Lines, roles: EventRoles
) -> list[Telling] | None:
    """Whether lines tell of the trial they stand in, of those to come, or of none."""
    own = np.asarray(shape.lines)
    if not len(starts):
        return roles.lasting if len(own) <= len(lines.names) else None
    if own[0] < starts[0]:
        # Before the first trial: it tells of what comes, and may be told anew.
        return roles.lasting if len(own) <= len(starts) + len(lines.names) else None
    once = len(np.unique(np.searchsorted(starts, own))) == len(own)
    return roles.facts if once else None
