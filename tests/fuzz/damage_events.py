"""Damage to logs of events: lines that are lost, doubled, spoiled, or contradict each other."""

from __future__ import annotations

import re
from collections.abc import Callable
from random import Random

from tests.fuzz.damage import to_log
from tests.fuzz.logs import Log

#: Lines of each wording, by what they say.
_LINES = {
    "sentences": {
        "reader": r"reader: ",
        "start": r"trial \d+ begins",
        "end": r"trial ends",
        "blink": r"blinked ",
        "fixation": r"fixated ",
    },
    "fields": {
        "reader": r"who\|",
        "start": r"\d+\|go\|",
        "end": r"\d+\|stop\|",
        "blink": r"\d+\|lid\|",
        "fixation": r"\d+\|fix\|",
    },
}


def _lines(log: Log, what: str) -> list[int]:
    """The lines of a log of events that say one thing; none in a log of another kind."""
    wording = _LINES.get(log.kind.name)
    if wording is None:
        return []
    return [number for number, line in enumerate(log.lines) if re.match(wording[what], line)]


def to_events(
    name: str, what: str, *, at_line: bool = True, told_by: str = ""
) -> Callable[[Callable[[Log, int, Random], bool]], object]:
    """Register damage to one line of a log of events that says one thing."""

    def register(change: Callable[[Log, int, Random], bool]) -> object:
        @to_log(name, at_line=at_line, told_by=told_by)
        def damaged(log: Log, rng: Random) -> bool:
            lines = _lines(log, what)
            return bool(lines) and change(log, rng.choice(lines), rng)

        return change

    return register


@to_events("a trial that does not end", "end")
def no_end(log: Log, line: int, _: Random) -> bool:
    """The line that says so is lost."""
    del log.lines[line]
    return True


@to_events("a trial that does not start", "start")
def no_start(log: Log, line: int, _: Random) -> bool:
    """The line that says so is lost."""
    del log.lines[line]
    return True


@to_events("a trial that starts twice", "start")
def starts_twice(log: Log, line: int, _: Random) -> bool:
    """The line that says so stands there twice."""
    log.lines.insert(line, log.lines[line])
    return True


@to_events("a trial that starts again", "fixation")
def starts_again(log: Log, line: int, _: Random) -> bool:
    """In the midst of its fixations."""
    above = [start for start in _lines(log, "start") if start < line]
    log.lines.insert(line, log.lines[above[-1]])
    return line - above[-1] > 1


@to_events("a trial that ends early", "end", told_by="fixations outside every trial")
def ends_early(log: Log, line: int, _: Random) -> bool:
    """Its end stands above its last fixation, which by the contract belongs to no trial then."""
    above = [one for one in _lines(log, "fixation") if one < line]
    log.lines.insert(above[-1], log.lines.pop(line))
    return True


@to_events("a trial that ends twice", "end")
def ends_twice(log: Log, line: int, _: Random) -> bool:
    """The line that says so stands there twice."""
    log.lines.insert(line, log.lines[line])
    return True


@to_events("a start that cannot be read", "start")
def spoiled_start(log: Log, line: int, _: Random) -> bool:
    """A letter in its number."""
    log.lines[line] = re.sub(r"(\d)(?=\D*$|\|)", r"\1?", log.lines[line], count=1)
    log.lines[line] = log.lines[line].replace("trial ", "trial no. ").replace("|go|", "|gone|")
    return True


@to_events("a fixation that cannot be read", "fixation")
def spoiled_fixation(log: Log, line: int, rng: Random) -> bool:
    """Its first word is another."""
    log.lines[line] = rng.choice(["Fixated", "fix", "saw", "", "?"]) + log.lines[line][7:]
    return True


@to_events("a blink that cannot be read", "blink")
def spoiled_blink(log: Log, line: int, _: Random) -> bool:
    """It was cut."""
    log.lines[line] = log.lines[line][:-4]
    return not re.search(r"\d{3}$", log.lines[line]) or log.kind.name == "fields"


@to_events("a fixation before the first trial", "fixation", told_by="fixations outside every trial")
def before_first(log: Log, line: int, _: Random) -> bool:
    """It stands above all trials, and belongs to none by the contract."""
    log.lines.insert(_lines(log, "start")[0], log.lines.pop(line))
    return True


@to_events("another reader within a log", "end")
def another_reader(log: Log, line: int, _: Random) -> bool:
    """A line says that somebody else reads from here on."""
    own = log.lines[_lines(log, "reader")[0]]
    other = "P02" if "P01" in own else "P01"
    log.lines.insert(line + 1, re.sub(r"P\d+", other, own))
    return line + 2 < len(log.lines)


@to_events("no reader", "reader", at_line=False)
def no_reader(log: Log, line: int, _: Random) -> bool:
    """Nothing says who read."""
    del log.lines[line]
    return True


@to_events("a trial of two texts", "start")
def two_texts(log: Log, line: int, _: Random) -> bool:
    """The trial list says another one."""
    others = [log.lines[start] for start in _lines(log, "start") if start != line]
    theirs, mine = (re.findall(r"pré-\S+", one)[0] for one in (others[0], log.lines[line]))
    log.lines[line] = log.lines[line].replace(mine, theirs)
    return True


@to_events("a line of something else", "fixation")
def something_else(log: Log, line: int, rng: Random) -> bool:
    """A line that no pattern describes."""
    log.lines.insert(line, rng.choice(["drift 0.3 deg", "55|warn|low light", "%%", "trial"]))
    return True


@to_events("a fixation whose end is before its onset", "fixation")
def end_before_onset(log: Log, line: int, _: Random) -> bool:
    """The two changed places."""
    if not log.has("end"):
        return False
    onset, end = log.cell(line, "onset"), log.cell(line, "end")
    log.set(line, "onset", end)
    log.set(line, "end", onset)
    return True
