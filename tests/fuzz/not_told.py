"""Damage that no program can tell from a sound study, each with the reason why.

It is no part of the corpus. A test holds that each of these is indeed read without a complaint: one
that is told some day belongs into the corpus.
"""

from __future__ import annotations

from random import Random

from tests.fuzz.damage import DAMAGES, Damage, to_cells, to_log
from tests.fuzz.logs import Log

_BEFORE = frozenset(DAMAGES)


@to_cells("another digit in a position", "x")
def other_digit_in_position(cell: str, rng: Random) -> str | None:
    """Any position on the screen may have been looked at."""
    digits = [place for place, sign in enumerate(cell) if sign.isdecimal() and place > 0]
    if not digits or cell.startswith("-"):
        return None
    place = rng.choice(digits)
    return f"{cell[:place]}{(int(cell[place]) + 1) % 10}{cell[place + 1 :]}"


@to_cells("a shorter duration", "duration")
def shorter_duration(cell: str, _: Random) -> str | None:
    """Any duration may have been measured that ends before the next fixation."""
    return str(int(cell) - 7) if cell.isdecimal() and int(cell) > 100 else None


@to_cells("a lost position", "x")
def lost_position(_: str, __: Random) -> str:
    """Recorders lose the eye and write so; run.json counts such fixations."""
    return "."


@to_cells("another blink", "blink")
def other_blink(cell: str, _: Random) -> str:
    """A blink may come at any time."""
    return "0" if cell == "1" else "1"


@to_log("a row is lost")
def row_lost(log: Log, rng: Random) -> bool:
    """A saccade may be as long as two; where nothing numbers fixations, none is missed."""
    if log.has("number"):
        return False
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 5])
    del log.lines[rows[rng.randrange(1, len(rows) - 1)]]
    return True


@to_log("the last rows are lost")
def last_rows_lost(log: Log, _: Random) -> bool:
    """A file that ends after a row with its line end is whole, for all that it says."""
    if log.kind.header != 1:
        return False
    del log.lines[-2:]
    return True


@to_log("another area that there is")
def other_area(log: Log, rng: Random) -> bool:
    """Any area may have been looked at."""
    if not log.has("label"):
        return False
    rows = log.rows()
    label = log.cell(rng.choice(rows), "label")
    others = [row for row in rows if log.cell(row, "label") != label]
    log.set(rng.choice(others), "label", label)
    return True


@to_log("a trial read a little to the right")
def shifted(log: Log, rng: Random) -> bool:
    """A calibration that drifted is where the text says it is; looking at the audit page helps."""
    if not log.has("x", "trial"):
        return False
    for row in rng.choice(log.trial_blocks()):
        cell = log.cell(row, "x")
        if cell.replace(".", "").replace(",", "").isdecimal():
            whole, sign, rest = cell.partition("," if "," in cell else ".")
            log.set(row, "x", f"{int(whole) + 25}{sign}{rest}")
    return True


#: By name; taken out of the corpus.
NOT_TOLD: dict[str, Damage] = {
    name: DAMAGES.pop(name) for name in list(DAMAGES) if name not in _BEFORE
}
