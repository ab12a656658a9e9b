"""Small studies on paper for the checks of screening: written in a few characters, built, read."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

import etl
from tests.end_to_end.building import Row, rows_of, write

#: The eye rests between two fixations for so long where the onset is not said.
GAP_MS = 20
STUDY = """\
[logs]
files = ["logs/*.csv"]
kind = "table"
[logs.columns]
participant = "who"
{session}trial = "trial"
item = "text"
fixation = "n"
onset = {{ column = "start", unit = "ms" }}
duration = {{ column = "dur", unit = "ms" }}
x = "x"
y = "y"
blink = "blink"
[trials]
table = "trials.csv"
keys = [{keys}]
factors = ["cue"]
answer_correct = "ok"
onset = "on"
offset = "off"
{skip}
repeated = "{repeated}"
[screen]
width_px = 400
height_px = 100
width_cm = 40
distance_cm = 60
[regions]
file = "regions.csv"
kind = "boxes"
[measures]
outcomes = ["binary", "count", "duration"]
outside = "{outside}"
[output]
formats = ["parquet", "csv"]
"""
#: Two texts; the second has no verb. From x = 300 on there is nothing.
REGIONS = """\
item,region,order,left,top,right,bottom
pear,who,1,0,0,100,100
pear,verb,2,100,0,200,100
pear,fruit,3,200,0,300,100
plum,who,1,0,0,200,100
plum,fruit,2,200,0,300,100
"""
TEXTS = {
    "pear": (("who", 100), ("verb", 200), ("fruit", 300)),
    "plum": (("who", 200), ("fruit", 300)),
}
_LOOK = re.compile(r"(-?[\d.]+)(?:/(-?[\d.]+))?(?:@([\d.]+))?:([\d.]+)(b?)")


@dataclass(frozen=True)
class Look:
    """One fixation as logged."""

    x_px: float
    y_px: float
    onset_ms: float
    duration_ms: float
    blink: bool


def looks_of(text: str, start_ms: float) -> list[Look]:
    """Fixations written as ``x:duration``, with ``/y``, ``@onset`` and ``b`` for a blink at will.

    Examples
    --------
    >>> looks_of("50:200 60/10@900:80b", 0)[1]
    Look(x_px=60.0, y_px=10.0, onset_ms=900.0, duration_ms=80.0, blink=True)
    """
    looks, clock_ms = [], start_ms
    for word in text.split():
        found = _LOOK.fullmatch(word)
        assert found, word
        x, y, onset, duration, blink = found.groups()
        onset_ms = float(onset) if onset else clock_ms
        looks.append(Look(float(x), float(y or 25), onset_ms, float(duration), bool(blink)))
        clock_ms = onset_ms + float(duration) + GAP_MS
    return looks


@dataclass(frozen=True)
class Trial:
    """One trial of a study on paper: who, which, the fixations, and what is known of it.

    Several texts are several recordings. ``on`` and ``off`` are in log time.
    """

    who: str
    number: int
    looks: str | tuple[str, ...]
    item: str = "pear"
    cue: str = "early"
    ok: str = "1"
    on: str = ""
    off: str = ""
    block: str = "main"
    session: str = ""

    def recordings(self, place: int) -> list[list[Look]]:
        """The fixations, recording by recording."""
        texts = (self.looks,) if isinstance(self.looks, str) else self.looks
        return [
            looks_of(text, (10 * place + again) * 100_000 + 1000)
            for again, text in enumerate(texts)
        ]


def rows_to_log(trials: Sequence[Trial]) -> list[list[object]]:
    """The rows of one reader's log, session first."""
    return [
        [
            *(t.who, t.session, t.number, t.item, n, look.onset_ms, look.duration_ms),
            *(look.x_px, look.y_px, int(look.blink)),
        ]
        for place, t in enumerate(trials)
        for looks in t.recordings(place)
        for n, look in enumerate(looks, start=1)
    ]


def table(header: str, rows: Sequence[Sequence[object]]) -> str:
    """A CSV file as text."""
    lines = [
        ",".join(f"{cell:.12g}" if isinstance(cell, float) else str(cell) for cell in row)
        for row in rows
    ]
    return "\n".join([header, *lines, ""])


def study(
    folder: Path,
    trials: Sequence[Trial],
    rules: str,
    *,
    notes: str = "",
    outside: str = "ignore",
    repeated: str = "error",
    also: Mapping[str, str] | None = None,
) -> Path:
    """Write a study: a log a reader, a trial list, the regions, notes; gives the study file."""
    sessions = any(t.session for t in trials)
    keys = '"participant", "session", "trial"' if sessions else '"participant", "trial"'
    files = {
        "study.toml": STUDY.format(
            session='session = "came"\n' if sessions else "",
            keys=keys,
            outside=outside,
            repeated=repeated,
            skip='skip = { block = ["practice"] }'
            if any(t.block == "practice" for t in trials)
            else "# nothing is skipped",
        )
        + rules,
        "regions.csv": REGIONS,
        "trials.csv": table(
            "participant,session,trial,cue,ok,on,off,block",
            [[t.who, t.session, t.number, t.cue, t.ok, t.on, t.off, t.block] for t in trials],
        ),
    }
    for who in sorted({t.who for t in trials}):
        own = rows_to_log([t for t in trials if t.who == who])
        files[f"logs/{who}.csv"] = table("who,came,trial,text,n,start,dur,x,y,blink", own)
    if notes:
        files["notes.csv"] = notes
    return write(folder, {**files, **(also or {})})


def read_csv(path: Path) -> list[dict[str, str]]:
    """The rows of a CSV file by the standard library."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@dataclass(frozen=True)
class Built:
    """A built study, read back."""

    folder: Path
    findings: list[str] = field(default_factory=list)

    @cached_property
    def fixations(self) -> list[Row]:
        """The rows of ``fixations``."""
        return rows_of(self.folder, "fixations")

    @cached_property
    def ledger(self) -> list[dict[str, str]]:
        """The rows of the ledger."""
        return read_csv(self.folder / "exclusions.csv")

    @cached_property
    def accounts(self) -> list[dict[str, str]]:
        """The rows of the accounts."""
        return read_csv(self.folder / "accounts.csv")

    def fates(self, who: str = "R1", trial: int = 1) -> list[str]:
        """What became of each fixation of a trial: the rule, or how long it lasts."""
        return [
            row["left_out_by"] or f"{row['duration_ms']:g}"
            for row in self.fixations
            if (row["participant"], row["trial"]) == (who, trial)
        ]

    def lost_trials(self) -> dict[tuple[str, int], str]:
        """Rule by which trials are left out."""
        return {
            (row["participant"], int(row["trial"])): row["rule"]
            for row in self.ledger
            if row["level"] == "trial"
        }

    def told(self, level: str, *columns: str) -> list[tuple[str, ...]]:
        """Some columns of the ledger's rows of one level."""
        return [tuple(row[c] for c in columns) for row in self.ledger if row["level"] == level]

    def account(self, unit: str, who: str = "(all)") -> dict[str, int]:
        """One row of the accounts as numbers, zeros left out."""
        (row,) = (r for r in self.accounts if (r["participant"], r["unit"]) == (who, unit))
        counts = {
            name: int(cell) for name, cell in row.items() if name not in ("participant", "unit")
        }
        return {name: count for name, count in counts.items() if count}

    def values(self, measure: str, region: str) -> dict[tuple[str, int], Any]:
        """An outcome of a region by reader and trial; the reason where there is none."""
        return {
            (r["participant"], r["trial"]): r["value"] if r["missing"] is None else r["missing"]
            for r in rows_of(self.folder, "outcomes")
            if (r["measure"], r["region"]) == (measure, region)
        }

    def trials(self) -> list[tuple[str, int]]:
        """The kept trials."""
        return [(row["participant"], row["trial"]) for row in rows_of(self.folder, "trials")]


def build(study_file: Path, workers: int = 1) -> Built:
    """Build a study."""
    result = etl.build(etl.load_study(study_file), workers=workers)
    return Built(result.folder, result.findings.lines(("warning", "note")))


def counted(rules: Sequence[str]) -> dict[str, int]:
    """How often each rule occurs."""
    return dict(Counter(rules))


def recorded_ms(trials: Sequence[Trial]) -> dict[tuple[str, int], float]:
    """How long each fixation lasts by the logs, by file and line."""
    found = {}
    for who in {t.who for t in trials}:
        rows = rows_to_log([t for t in trials if t.who == who])
        found |= {
            (f"logs/{who}.csv", line): float(row[6]) for line, row in enumerate(rows, start=2)
        }
    return found
