"""A kind of damage: what it does to the files of a study, and what a build owes its user then."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from random import Random
from typing import Literal

from tests.fuzz.logs import Files, Log, LogKind, content_of, unzipped

#: What is owed, should the outcomes be those of the undamaged study: that the account of logs says
#: what was mended, or nothing, where the damage changes nothing that the format knows of.
Owes = Literal["told", "nothing"]
#: Damage to a study: new files, or None where it does not apply to this kind of log.
Spoil = Callable[[LogKind, Files, Random], Files | None]


@dataclass(frozen=True, slots=True)
class Damage:
    """A kind of damage.

    Attributes
    ----------
    name : str
        What it is called in reports.
    spoil : callable
        Does it.
    owes : {"told", "nothing"}
        What is owed where the outcomes are the right ones.
    at_line : bool
        Whether a refusal must name a line.
    told_by : str
        A regular expression for the warning that must be given where the damage can be neither
        refused nor mended, since a sound study may look the same; empty where it can.
    """

    name: str
    spoil: Spoil
    owes: Owes = "told"
    at_line: bool = False
    told_by: str = ""


DAMAGES: dict[str, Damage] = {}
#: How an area that no region has is told of: a label that is not listed is outside by the contract.
UNKNOWN_LABEL = "label"
#: How trials that are lost with their rows are told of.
LOST_TRIALS = "the (trial is in the list|reader is in the table) but in no log"


def whole(name: str, *, owes: Owes = "told", told_by: str = "") -> Callable[[Spoil], Spoil]:
    """Register damage to a whole study."""

    def register(spoil: Spoil) -> Spoil:
        assert name not in DAMAGES, name
        DAMAGES[name] = Damage(name, spoil, owes, told_by=told_by)
        return spoil

    return register


def a_log(kind: LogKind, files: Files, rng: Random) -> str:
    """The name of some log."""
    return rng.choice(kind.logs(files))


ToBytes = Callable[[bytes, Random], bytes | None]


def to_bytes(
    name: str, *, owes: Owes = "told", stored: bool = False, told_by: str = ""
) -> Callable[[ToBytes], ToBytes]:
    """Register damage to the bytes of one log; ``stored``: compressed, as they are on the disk."""

    def register(change: ToBytes) -> ToBytes:
        def spoil(kind: LogKind, files: Files, rng: Random) -> Files | None:
            name = a_log(kind, files, rng)
            content = content_of(files, name)
            if stored:
                changed = change(content, rng)
                return None if changed is None else {**files, name: changed}
            changed = change(unzipped(content), rng)
            return None if changed is None else {**files, name: kind.packed(name, changed)}

        assert name not in DAMAGES, name
        DAMAGES[name] = Damage(name, spoil, owes, told_by=told_by)
        return change

    return register


#: Changes the lines of a log in place; False where it does not apply.
ToLog = Callable[[Log, Random], bool]


def to_log(
    name: str, *, owes: Owes = "told", at_line: bool = True, told_by: str = ""
) -> Callable[[ToLog], ToLog]:
    """Register damage to the lines of one log."""

    def register(change: ToLog) -> ToLog:
        def spoil(kind: LogKind, files: Files, rng: Random) -> Files | None:
            name = a_log(kind, files, rng)
            log = kind.read(name, files)
            if not change(log, rng):
                return None
            return {**files, name: kind.packed(name, log.content())}

        assert name not in DAMAGES, name
        DAMAGES[name] = Damage(name, spoil, owes, at_line, told_by)
        return change

    return register


#: Changes one cell; None where it does not apply.
ToCell = Callable[[str, Random], str | None]


def to_cells(
    name: str, *facts: str, owes: Owes = "told", at_line: bool = True, told_by: str = ""
) -> Callable[[ToCell], ToCell]:
    """Register damage to one cell, of one of these things, in one row of a log."""

    def register(change: ToCell) -> ToCell:
        @to_log(name, owes=owes, at_line=at_line, told_by=told_by)
        def damaged(log: Log, rng: Random) -> bool:
            present = [fact for fact in facts if log.has(fact)]
            rows = log.rows()
            rng.shuffle(rows)
            for row in rows:
                fact = rng.choice(present) if present else ""
                changed = change(log.cell(row, fact), rng) if fact else None
                if changed is not None:
                    log.set(row, fact, changed)
                    return True
            return False

        return change

    return register
