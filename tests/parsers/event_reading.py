"""Logs of events of the orchard, written line by line and read by the description of a study."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.parsers import CanonicalLog, LogReader, reader_for
from etl.parsers.canonical import LogNote
from etl.study import Study

#: The lines of a lab script that nobody but us has.
PATTERNS: Mapping[str, Any] = {
    "fixation": r"^rested (?P<onset>[\d.]+) to (?P<end>[\d.]+) on (?P<x>[\d.]+)/(?P<y>[\d.]+)$",
    "blink": r"^shut (?P<onset>\d+) to (?P<end>\d+)$",
    "trial_start": r"^gate (?P<trial>\d+) opens on (?P<item>\w+)$",
    "trial_end": r"^gate closes(?:, answer (?P<answer>\w+))?$",
    "facts": [r"^visitor (?P<participant>\w+)$", r"^cue: (?P<cue>\w+)$"],
    "lasting": r"^row of (?P<row>\w+)$",
    "ignore": "^wind",
}
VISITOR = "visitor P01"
OPENS, CLOSES = "gate 1 opens on pear", "gate closes"


def rested(onset: float, duration: float = 200, x: float = 50, y: float = 25) -> str:
    """The line of a fixation."""
    return f"rested {onset:g} to {onset + duration:g} on {x:g}/{y:g}"


#: A sound trial; its fixations are lines 3 and 4.
TRIAL = (VISITOR, OPENS, rested(1000), rested(1250, 300, 150), CLOSES)


def reader_of(
    patterns: Mapping[str, Any] | None = None,
    logs: Mapping[str, Any] | None = None,
    facts: tuple[str, ...] = (),
) -> LogReader:
    """A reader of such logs; a pattern of None is not in the study."""
    own = {k: v for k, v in {**PATTERNS, **(patterns or {})}.items() if v is not None}
    study = Study.model_validate(
        {
            "logs": {"files": ["*.log"], "kind": "events", "patterns": own, **(logs or {})},
            "regions": {"file": "regions.csv", "kind": "boxes"},
        }
    )
    return reader_for(study.logs, study.screen, facts)


def text_of(lines: Sequence[str]) -> bytes:
    """Lines as a file in UTF-8."""
    return "".join(f"{line}\n" for line in lines).encode("utf-8")


def read(
    folder: Path, lines: Sequence[str] | bytes, reader: LogReader | None = None
) -> tuple[CanonicalLog, LogNote]:
    """Read a log in which nothing is wrong, and of which nothing is said."""
    log, note, said = read_and_told(folder, lines, reader)
    assert said == ""
    return log, note


def read_and_told(
    folder: Path, lines: Sequence[str] | bytes, reader: LogReader | None = None
) -> tuple[CanonicalLog, LogNote, str]:
    """Read a log in which nothing is wrong, with what is said of it."""
    path = folder / "P01.log"
    path.write_bytes(lines if isinstance(lines, bytes) else text_of(lines))
    findings = Findings()
    found = (reader or reader_of()).read(path, path.name, findings)
    assert found is not None, findings.text()
    assert found[1].account.balances()
    return *found, findings.text()


def refusal(folder: Path, lines: Sequence[str] | bytes, reader: LogReader | None = None) -> str:
    """The whole of what is said of a log in which something is wrong."""
    path = folder / "P01.log"
    path.write_bytes(lines if isinstance(lines, bytes) else text_of(lines))
    findings = Findings()
    assert (reader or reader_of()).read(path, path.name, findings) is None
    return findings.text()


def texts(log: CanonicalLog, name: str) -> list[str]:
    """An identifier or a fact of every fixation."""
    coded = log.ids[name] if name in log.ids else log.facts[name]
    return [coded.text(row) for row in range(len(log))]


def fates(note: LogNote) -> dict[str, int]:
    """How many lines of a log went where."""
    return {fate: tally.count for fate, tally in note.account.lines.items()}
