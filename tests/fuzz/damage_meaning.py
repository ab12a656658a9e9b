"""Damage to what a log says: who read, which trial, when, and where."""

from __future__ import annotations

from random import Random

from tests.fuzz.damage import LOST_TRIALS, a_log, to_log, whole
from tests.fuzz.logs import Files, Link, Log, LogKind, content_of


def _value(cell: str) -> float:
    """A cell as a number, whatever its decimal sign."""
    return float(cell.replace(",", "."))


def _every(log: Log, fact: str, change: object) -> None:
    """Change a thing in every row that has it."""
    assert callable(change)
    for row in log.rows():
        cell = log.cell(row, fact)
        try:
            value = _value(cell)
        except ValueError:
            continue
        changed = f"{change(value):.3f}".rstrip("0").rstrip(".")
        log.set(row, fact, changed.replace(".", "," if "," in cell else "."))


@to_log("the clock begins anew", at_line=True)
def clock_anew(log: Log, rng: Random) -> bool:
    """Within a trial the recorder was started again."""
    if not log.has("onset"):
        return False
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 5])
    first = rows[rng.randrange(2, len(rows) - 2)]
    start = _value(log.cell(first, "onset"))
    for row in log.rows():
        if row >= first:
            for fact in ("onset", "end"):
                if log.has(fact):
                    log.set(row, fact, f"{_value(log.cell(row, fact)) - start:.0f}")
    return True


@to_log("fixations that overlap")
def overlap(log: Log, rng: Random) -> bool:
    """One lasts until the next one is half over."""
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 5])
    at = rng.randrange(len(rows) - 1)
    if not log.has("onset") or not (log.has("duration") or log.has("end")):
        return False
    onset = _value(log.cell(rows[at], "onset"))
    following = _value(log.cell(rows[at + 1], "onset"))
    if log.has("duration"):
        log.set(rows[at], "duration", f"{following - onset + 60:.0f}")
    else:
        log.set(rows[at], "end", f"{following + 60:.0f}")
    return True


@to_log("an onset that goes back")
def onset_back(log: Log, rng: Random) -> bool:
    """One clock reading is wrong."""
    if not log.has("onset"):
        return False
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 5])
    at = rng.randrange(2, len(rows))
    row = rows[at]
    # Somewhat before the one above it; before all of them the trial would have begun anew.
    start = _value(log.cell(rows[at - 1], "onset")) - 5
    if log.has("end"):
        log.set(row, "end", f"{start + 100:.0f}")
    log.set(row, "onset", f"{start:.0f}")
    return True


@to_log("times in another unit", at_line=False)
def other_time_unit(log: Log, rng: Random) -> bool:
    """One log is in seconds, or in microseconds, where the others are in milliseconds."""
    factor = rng.choice([0.001, 1000])
    for fact in ("onset", "end", "duration"):
        if log.has(fact):
            _every(log, fact, lambda value: value * factor)
    return log.has("onset")


@to_log("durations in another unit", at_line=False)
def other_duration_unit(log: Log, rng: Random) -> bool:
    """Only durations are in seconds or microseconds."""
    if not log.has("duration"):
        return False
    factor = rng.choice([0.001, 1000])
    _every(log, "duration", lambda value: value * factor)
    return True


@to_log("places in another unit", at_line=False)
def other_place_unit(log: Log, _: Random) -> bool:
    """One log is in degrees, or as shares of the screen, where the others are in pixels."""
    if not log.has("x", "y"):
        return False
    _every(log, "x", lambda value: (value - 960) / 38)
    _every(log, "y", lambda value: (value - 540) / 38)
    return True


@to_log("places as shares of the screen", at_line=False)
def places_as_shares(log: Log, _: Random) -> bool:
    """One log counts the whole screen as 1."""
    if not log.has("x", "y"):
        return False
    _every(log, "x", lambda value: value / 1920)
    _every(log, "y", lambda value: value / 1080)
    return True


@to_log("places from another origin", at_line=False)
def other_origin(log: Log, _: Random) -> bool:
    """One log counts from the middle of the screen."""
    if not log.has("x", "y"):
        return False
    _every(log, "x", lambda value: value - 960)
    _every(log, "y", lambda value: value - 540)
    return True


@to_log("x and y change places", at_line=False)
def places_swapped(log: Log, _: Random) -> bool:
    """In one log x stands where y should."""
    if not log.has("x", "y"):
        return False
    for row in log.rows():
        x, y = log.cell(row, "x"), log.cell(row, "y")
        log.set(row, "x", y)
        log.set(row, "y", x)
    return True


@to_log("one place for all", at_line=False)
def one_place(log: Log, _: Random) -> bool:
    """The recorder lost the eye and wrote on."""
    if not log.has("x", "y"):
        return False
    _every(log, "x", lambda _: 0)
    _every(log, "y", lambda _: 0)
    return True


@to_log("a trial under another number")
def trial_renumbered(log: Log, rng: Random) -> bool:
    """A whole trial bears the number of another one."""
    if not log.has("trial"):
        return False
    one, other = rng.sample(log.trial_blocks(), 2)
    number = log.cell(other[0], "trial")
    for row in one:
        log.set(row, "trial", number)
    return True


@to_log("a row under another trial")
def row_renumbered(log: Log, rng: Random) -> bool:
    """One row bears the number of another trial."""
    if not log.has("trial"):
        return False
    one, other = rng.sample(log.trial_blocks(), 2)
    log.set(rng.choice(one), "trial", log.cell(other[0], "trial"))
    return True


@to_log("two trials change their numbers")
def trials_swapped(log: Log, rng: Random) -> bool:
    """Their texts tell."""
    if not log.has("trial", "item"):
        return False
    one, other = rng.sample(log.trial_blocks(), 2)
    numbers = log.cell(one[0], "trial"), log.cell(other[0], "trial")
    for row in one:
        log.set(row, "trial", numbers[1])
    for row in other:
        log.set(row, "trial", numbers[0])
    return True


@to_log("texts of two trials change places")
def items_swapped(log: Log, rng: Random) -> bool:
    """The trial list tells."""
    if not log.has("item"):
        return False
    one, other = rng.sample(log.trial_blocks(), 2)
    items = log.cell(one[0], "item"), log.cell(other[0], "item")
    for row in one:
        log.set(row, "item", items[1])
    for row in other:
        log.set(row, "item", items[0])
    return True


@to_log("a number of a fixation twice")
def number_twice(log: Log, rng: Random) -> bool:
    """Two rows of a trial bear one number."""
    if not log.has("number"):
        return False
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 4])
    at = rng.randrange(1, len(rows))
    log.set(rows[at], "number", log.cell(rows[at - 1], "number"))
    return True


@to_log("a number of a fixation that is not whole")
def number_not_whole(log: Log, rng: Random) -> bool:
    """Half a number."""
    if not log.has("number"):
        return False
    log.set(rng.choice(log.rows()), "number", "2,5")
    return True


@to_log("trials in another order", owes="nothing", at_line=False)
def trials_moved(log: Log, rng: Random) -> bool:
    """The same trials, one below the other in another order."""
    if log.kind.header != 1:
        return False
    blocks = log.trial_blocks()
    if len(blocks) < 2:
        return False
    order = blocks[:]
    while order == blocks:
        rng.shuffle(order)
    log.lines = [log.lines[0], *(log.lines[row] for block in order for row in block)]
    return True


def _other(kind: LogKind, files: Files, rng: Random) -> tuple[str, str]:
    """Two logs."""
    one, other = rng.sample(kind.logs(files), 2)
    return one, other


@whole("the log of another reader")
def of_another(kind: LogKind, files: Files, rng: Random) -> Files:
    """One log was copied over another."""
    one, other = _other(kind, files, rng)
    return {**files, one: files[other]}


@whole("a log twice under two names")
def under_two_names(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """A copy lies beside the log."""
    name = a_log(kind, files, rng)
    place, _, end = name.rpartition("/")
    return {**files, f"{place}/a_{end}": files[name]} if kind.by_itself else None


@whole("half a log in another one")
def half_overwritten(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """The second half of a log is that of another one; where rows name no reader, all may be so."""
    if "participant" not in kind.columns:
        return None
    one, other = _other(kind, files, rng)
    mine, theirs = kind.read(one, files), kind.read(other, files)
    rows = mine.rows()
    middle = rows[len(rows) // 2]
    mine.lines[middle:] = theirs.lines[min(middle, len(theirs.lines) - 3) :]
    return {**files, one: kind.packed(one, mine.content())}


@whole("two readers with one id")
def one_id(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """In one log stands the id of another reader."""
    one, other = _other(kind, files, rng)
    log, ids = kind.read(one, files), kind.read(other, files)
    mine, theirs = _reader_in(log), _reader_in(ids)
    if mine is None or theirs is None:
        return None
    log.lines = [line.replace(mine, theirs) for line in log.lines]
    return {**files, one: kind.packed(one, log.content())}


@whole("a reader's id in other letters")
def id_in_other_letters(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """In a whole log the id is spelt as nowhere else."""
    name = a_log(kind, files, rng)
    log = kind.read(name, files)
    own = _reader_in(log)
    if own is None:
        return None
    changed = rng.choice([own.lower(), own.replace("P0", "P"), own.replace("P", "P-"), f"{own}a"])
    log.lines = [line.replace(own, changed) for line in log.lines]
    return {**files, name: kind.packed(name, log.content())}


def _reader_in(log: Log) -> str | None:
    """The reader that a log names."""
    text = "\n".join(log.lines)
    return next((who for who in ("P01", "P02", "P03") if who in text), None)


@whole("the log of another study")
def of_another_study(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """A reader whom nobody knows."""
    name = a_log(kind, files, rng)
    log = kind.read(name, files)
    own = _reader_in(log)
    if own is None:
        return None
    log.lines = [line.replace(own, "S77") for line in log.lines]
    place, _, end = name.rpartition("/")
    return {**files, f"{place}/P77{end[end.index('.') :]}": kind.packed(name, log.content())}


@whole("an empty log beside the others")
def empty_beside(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """A recording that was begun and never made."""
    name = a_log(kind, files, rng)
    return {**files, name.replace("P0", "P9"): b""} if kind.by_itself else None


@whole("another table among the logs")
def other_table(kind: LogKind, files: Files, rng: Random) -> Files | None:
    """The trial list lies where the logs are."""
    if not kind.by_itself:
        return None
    name = a_log(kind, files, rng)
    content = content_of(files, "trial_list.csv")
    return {**files, name.replace("P0", "P9"): kind.packed(name, content)}


@whole("a log is missing", told_by=LOST_TRIALS)
def missing(kind: LogKind, files: Files, rng: Random) -> Files:
    """A reader may never have come; only the trial list knows."""
    name = a_log(kind, files, rng)
    return {own: content for own, content in files.items() if own != name}


@to_log("cut between two trials", told_by=LOST_TRIALS)
def cut_between_trials(log: Log, rng: Random) -> bool:
    """The recording ended early; only the trial list knows."""
    blocks = log.trial_blocks()
    if len(blocks) < 2 or log.kind.header != 1:
        return False
    del log.lines[rng.choice(blocks[:-1])[-1] + 1 :]
    return True


@whole("a link to nowhere")
def link_to_nowhere(kind: LogKind, files: Files, rng: Random) -> Files:
    """What the link pointed to is gone."""
    return {**files, a_log(kind, files, rng): Link("gone.tsv")}


@whole("a link to itself")
def link_to_itself(kind: LogKind, files: Files, rng: Random) -> Files:
    """A loop of links."""
    name = a_log(kind, files, rng)
    return {**files, name: Link(name.rpartition("/")[2])}


@whole("a link to another log", owes="nothing")
def link_to_other(kind: LogKind, files: Files, rng: Random) -> Files:
    """Two names for one log, which is read once."""
    name = a_log(kind, files, rng)
    place, _, end = name.rpartition("/")
    return {**files, f"{place}/Q{end}": Link(end)}


@whole("a lock file beside the logs", owes="nothing")
def lock_file(kind: LogKind, files: Files, rng: Random) -> Files:
    """An office program has the log open."""
    place, _, end = a_log(kind, files, rng).rpartition("/")
    return {**files, f"{place}/~${end}": b"\x05orchard" + b" " * 40}


@whole("a folder named like a log", told_by=LOST_TRIALS)
def folder(kind: LogKind, files: Files, rng: Random) -> Files:
    """In place of the log there is a folder."""
    return {**files, a_log(kind, files, rng): None}


@whole("a hidden file beside the logs", owes="nothing")
def hidden(kind: LogKind, files: Files, rng: Random) -> Files:
    """Some systems lay one beside each file that they copy."""
    name = a_log(kind, files, rng)
    place, _, end = name.rpartition("/")
    return {**files, f"{place}/._{end}": b"\x00\x05\x16\x07\x00\x02\x00\x00orchard"}
