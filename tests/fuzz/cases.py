"""Which damage is done to which kind of log, and in which order."""

from __future__ import annotations

import re
from collections.abc import Iterator
from itertools import count
from random import Random

from tests.fuzz import (
    damage_bids,
    damage_bytes,
    damage_cells,
    damage_events,
    damage_facts,
    damage_headers,
    damage_meaning,
    damage_rows,
)
from tests.fuzz.damage import DAMAGES
from tests.fuzz.kinds import KINDS
from tests.fuzz.oracle import sound_study

#: The modules that register damage; naming them here is what loads them.
MODULES = (
    damage_bytes,
    damage_cells,
    damage_rows,
    damage_headers,
    damage_meaning,
    damage_events,
    damage_bids,
    damage_facts,
)

#: The names of all kinds of damage.
CORPUS = tuple(DAMAGES)

#: A kind of log, a kind of damage, and a seed for the place.
Case = tuple[str, str, int]


def pairs(*, kind: str = "", damage: str = "") -> list[tuple[str, str]]:
    """Every kind of damage with every kind of log, in names in which these patterns are found."""
    return [
        (own_kind, own)
        for own in CORPUS
        for own_kind in KINDS
        if re.search(kind, own_kind) and re.search(damage, own)
    ]


def some_kinds(damage: str, most: int = 3) -> list[str]:
    """A few kinds of log to which a kind of damage applies: others for each kind of damage."""
    turn = CORPUS.index(damage) % len(KINDS)
    in_turn = [*KINDS][turn:] + [*KINDS][:turn]
    applying = []
    for kind in in_turn:
        sound = sound_study(kind)
        files = DAMAGES[damage].spoil(KINDS[kind], dict(sound.files), Random(f"{kind}/{damage}/1"))
        if files is not None and files != sound.files:
            applying.append(kind)
        if len(applying) == most:
            break
    return applying


def cases(seed: int, *, kind: str = "", damage: str = "") -> Iterator[Case]:
    """Cases without an end: each round goes through every pair, at other places.

    Parameters
    ----------
    seed : int
        Of the order, and of the places.
    kind, damage : str
        Only names in which these regular expressions are found.

    Yields
    ------
    (str, str, int)
        As :func:`tests.fuzz.oracle.judge` takes them.
    """
    wanted = pairs(kind=kind, damage=damage)
    if not wanted:
        return
    rng = Random(seed)
    for number in count():
        rng.shuffle(wanted)
        yield from ((*pair, 1000 * seed + number) for pair in wanted)
