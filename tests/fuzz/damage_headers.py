"""Damage to the header of a table: lost, misspelt, doubled, in another order."""

from __future__ import annotations

from random import Random

from tests.fuzz.damage import to_log
from tests.fuzz.logs import Log


def _needed(log: Log, rng: Random) -> int:
    """Which column that the study needs is spoiled."""
    places = [place for fact, place in log.kind.columns.items() if fact != "word"]
    return rng.choice(places)


@to_log("no header")
def no_header(log: Log, _: Random) -> bool:
    """The first line is a row."""
    if log.kind.header != 1:
        return False
    del log.lines[0]
    return True


@to_log("a header misspelt")
def misspelt(log: Log, rng: Random) -> bool:
    """A name lost a letter."""
    if log.kind.header != 1:
        return False
    names, place = log.cells(0), _needed(log, rng)
    names[place] = names[place][:-1] or "q"
    log.put(0, names)
    return True


@to_log("a header in other letters")
def other_letters(log: Log, _: Random) -> bool:
    """All names in capitals."""
    if log.kind.header != 1:
        return False
    log.lines[0] = log.lines[0].upper()
    return True


@to_log("a header with blanks", owes="nothing", at_line=False)
def blanks_in_header(log: Log, _: Random) -> bool:
    """Blanks around the names mean nothing."""
    if log.kind.header != 1:
        return False
    log.put(0, [f" {name} " for name in log.cells(0)])
    return True


@to_log("two columns of one name")
def equal_names(log: Log, rng: Random) -> bool:
    """A name stands over two columns."""
    if log.kind.header != 1:
        return False
    names, place = log.cells(0), _needed(log, rng)
    names[place - 1] = names[place]
    log.put(0, names)
    return True


@to_log("a name too few")
def name_too_few(log: Log, rng: Random) -> bool:
    """The header has a name less than the rows have cells."""
    if log.kind.header != 1:
        return False
    names = log.cells(0)
    del names[rng.randrange(len(names))]
    log.put(0, names)
    return True


@to_log("a name too many")
def name_too_many(log: Log, rng: Random) -> bool:
    """The header has a name more than the rows have cells."""
    if log.kind.header != 1:
        return False
    names = log.cells(0)
    names.insert(rng.randrange(len(names) + 1), "extra")
    log.put(0, names)
    return True


@to_log("columns in another order", owes="nothing", at_line=False)
def other_order(log: Log, rng: Random) -> bool:
    """Header and cells together: the same table."""
    if log.kind.header != 1:
        return False
    order = list(range(len(log.cells(0))))
    rng.shuffle(order)
    for number in range(len(log.lines)):
        cells = log.cells(number)
        log.put(number, [cells[place] for place in order])
    return True


@to_log("names of columns change places", at_line=False)
def names_swapped(log: Log, rng: Random) -> bool:
    """The header alone is in another order."""
    if log.kind.header != 1:
        return False
    pairs = [
        pair
        for pair in (
            *(("x", "y"), ("onset", "duration"), ("participant", "trial"), ("trial", "item")),
            *(("trial", "duration"), ("x", "onset"), ("number", "duration"), ("label", "item")),
            *(("blink", "trial"), ("blink", "x"), ("number", "trial"), ("y", "duration")),
        )
        if log.has(*pair)
    ]
    one, other = (log.kind.columns[fact] for fact in rng.choice(pairs))
    names = log.cells(0)
    names[one], names[other] = names[other], names[one]
    log.put(0, names)
    return True


@to_log("the header again")
def header_again(log: Log, rng: Random) -> bool:
    """Two logs were put together."""
    if log.kind.header != 1:
        return False
    rows = log.rows()
    log.lines.insert(rows[rng.randrange(1, len(rows))], log.lines[0])
    return True


@to_log("the header again, in another order")
def header_again_in_other_order(log: Log, rng: Random) -> bool:
    """Two logs were put together that have the same columns in another order."""
    if log.kind.header != 1:
        return False
    rows = log.rows()
    at = rows[rng.randrange(1, len(rows) - 1)]
    order = list(range(len(log.cells(0))))
    while order == sorted(order):
        rng.shuffle(order)
    below = [log.joined([log.cells(n)[p] for p in order]) for n in (0, *range(at, len(log.lines)))]
    log.lines[at:] = below
    return True


@to_log("the header at the end")
def header_at_end(log: Log, _: Random) -> bool:
    """A table sorted with its header."""
    if log.kind.header != 1:
        return False
    log.lines.append(log.lines.pop(0))
    return True


@to_log("a line above the header")
def line_above(log: Log, rng: Random) -> bool:
    """A spreadsheet has a title above its table."""
    if log.kind.header != 1:
        return False
    log.lines.insert(
        0, rng.choice(["Orchard notes", "recorded in May;by hand", "Table 1", "sep=;"])
    )
    return True


@to_log("units below the header")
def units_below(log: Log, _: Random) -> bool:
    """A second line says in which unit each column is."""
    if log.kind.header != 1:
        return False
    units = {"onset": "ms", "duration": "ms", "x": "px", "y": "px"}
    facts = {place: fact for fact, place in log.kind.columns.items()}
    log.lines.insert(
        1, log.joined([units.get(facts.get(p, ""), "") for p in range(len(log.cells(0)))])
    )
    return True


@to_log("rows counted in a column without a name", owes="nothing", at_line=False)
def counted_rows(log: Log, _: Random) -> bool:
    """Some programs number the rows they write, and name the numbers not at all."""
    if log.kind.header != 1:
        return False
    for number in range(len(log.lines)):
        log.put(number, ["" if number == 0 else str(number), *log.cells(number)])
    return True
