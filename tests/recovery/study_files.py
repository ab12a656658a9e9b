"""A recovery study as files: logs in several dialects, region definitions, notes, study file."""

from __future__ import annotations

import gzip
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np

from tests.recovery.scanpaths import (
    LONGEST_MS,
    MERGE_WITHIN_PX,
    SCREEN_PX,
    SHORTEST_MS,
    Look,
    Scanpath,
    scanpath,
)
from tests.recovery.truth import CELLS, ITEMS, TRUTHS, Trial
from tests.simulator.draws import whole
from tests.simulator.layout import Grid, Layout, lay_out
from tests.simulator.writing import table, time

GRID = Grid(left_px=200, top_px=500, character_width_px=14, line_height_px=60)

OPENINGS = {"short": "Today", "long": "As the board by the gate says"}
CROPS = (
    ("ripe apples", "ripe lemons"), ("small pears", "small melons"), ("dark plums", "dark olives"),
    ("sour cherries", "sour limes"), ("last quinces", "last figs"), ("red currants", "red pepper"),
    ("fresh walnuts", "fresh coconuts"), ("yellow medlars", "yellow mangos"),
)  # fmt: skip
MANNERS = ("were quietly", "were slowly", "were again", "were already", "were gladly")
VERBS = ("sorted", "picked", "washed", "weighed", "peeled", "counted", "carried", "tasted",
         "pressed", "stored")  # fmt: skip
HELPERS = ("by the warden", "by two neighbours", "by the beekeepers", "by an old friend")
PLACES = ("near the shed", "under the trees", "behind the barn", "at the pump", "on the long table",
          "by the hedge", "in the kitchen")  # fmt: skip


@cache
def marked_text(item: int, notice: str, crop: str) -> str:
    """One version of an item, counted from 0, with its regions marked; the end lies in none.

    Examples
    --------
    >>> marked_text(0, "short", "usual")[:40]
    '{opening: Today} {crop: the ripe apples}'
    """
    parts = {
        "opening": OPENINGS[notice],
        "crop": "the " + CROPS[item % len(CROPS)][crop == "unusual"],
        "manner": MANNERS[item % len(MANNERS)],
        "verb": VERBS[item % len(VERBS)],
        "helper": HELPERS[item // len(VERBS) % len(HELPERS)],
        "place": PLACES[item % len(PLACES)],
    }
    return " ".join(f"{{{name}: {words}}}" for name, words in parts.items()) + " before noon."


@cache
def layout_of(item: str, notice: str, crop: str) -> Layout:
    """Where the words of a text stand; items are named from S01 on."""
    return lay_out(marked_text(int(item[1:]) - 1, notice, crop), GRID)


@dataclass(frozen=True, slots=True)
class Dialect:
    """One way in which a laboratory writes logs.

    ``facts_in_log`` puts conditions and times of the text into every row, with no trial list;
    ``end`` gives ends in place of durations; ``origin`` and ``y_axis`` are those of the study file.
    """

    delimiter: str = "\t"
    decimal: str = "."
    encoding: str = "utf-8"
    newline: str = "\n"
    unit: str = "ms"
    end: bool = False
    one_log: bool = False
    compressed: bool = False
    facts_in_log: bool = False
    origin: str = "top-left"
    y_axis: str = "down"


#: Studies take these in turn.
DIALECTS = (
    Dialect(),
    Dialect(delimiter=";", decimal=",", newline="\r\n", unit="s", end=True, facts_in_log=True),
    Dialect(one_log=True, encoding="utf-16", compressed=True, origin="centre", y_axis="up"),
    Dialect(delimiter=",", unit="s", one_log=True, facts_in_log=True, origin="bottom-left",
            y_axis="up"),
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Shown:
    """A trial as recorded: each fixation with its onset, and when the text came up and went."""

    trial: Trial
    looks: tuple[tuple[int, Look], ...]
    text_on_ms: int
    text_off_ms: int


def record(trials: Iterable[Trial], rng: np.random.Generator) -> list[Shown]:
    """Let the trials be read, each reader on one clock."""
    shown: list[Shown] = []
    clock_ms, reader = 0, ""
    for trial in trials:
        if trial.participant != reader:
            clock_ms, reader = whole(rng, 20_000, 90_000), trial.participant
        # Practice is recorded too; what was done there counts for nothing.
        outcomes = trial.outcomes or dict.fromkeys((t.outcome for t in TRUTHS), 0)
        layout = layout_of(trial.item, trial.notice, trial.crop)
        done = on_clock(trial, scanpath(outcomes, layout, rng), clock_ms, rng)
        shown.append(done)
        clock_ms = done.text_off_ms + whole(rng, 1_500, 4_000)
    return shown


def on_clock(trial: Trial, path: Scanpath, clock_ms: int, rng: np.random.Generator) -> Shown:
    """A scanpath with the times at which it happened."""
    timed = []
    for look in path.looks:
        timed.append((clock_ms, look))
        clock_ms += look.duration_ms + whole(rng, 15, 60)
    first = timed[1 if path.before_text else 0][0]
    last = timed[-1][0] if path.after_text else clock_ms
    return Shown(trial, tuple(timed), first - whole(rng, 0, 9), last - whole(rng, 1, 9))


def write_study(folder: Path, shown: Sequence[Shown], dialect: Dialect) -> None:
    """Write all that belongs to a study but its study file.

    Parameters
    ----------
    folder : Path
        Made where it is missing.
    shown : sequence of Shown
        All trials, reader by reader.
    dialect : Dialect
        How the logs are written.
    """
    logs = folder / "logs"
    logs.mkdir(parents=True, exist_ok=True)
    readers = dict.fromkeys(done.trial.participant for done in shown)
    ending = ".gz" if dialect.compressed else ".txt"
    for name in ["all"] if dialect.one_log else readers:
        own = [done for done in shown if name in {"all", done.trial.participant}]
        content = log_text(own, dialect).encode(dialect.encoding)
        if dialect.compressed:
            content = gzip.compress(content, compresslevel=1, mtime=0)
        (logs / (name + ending)).write_bytes(content)
    texts = [
        (f"S{item + 1:02d}", *cell, marked_text(item, *cell))
        for item in range(ITEMS)
        for cell in CELLS
    ]
    put(folder / "regions.csv", table(["item", "notice", "crop", "text"], texts))
    noted = [(d.trial.participant, d.trial.trial, "dropped key") for d in shown if d.trial.noted]
    put(folder / "notes.csv", table(["participant", "trial", "reason"], noted))
    if not dialect.facts_in_log:
        listed = [(d.trial.participant, d.trial.trial, *facts(d, dialect)) for d in shown]
        put(folder / "trials.csv", table(["reader", "number", *FACTS], listed))


def put(path: Path, text: str) -> None:
    """Write a text as it is."""
    path.write_text(text, encoding="utf-8", newline="")


FACTS = ("notice", "crop", "block", "text_on", "text_off")


def facts(done: Shown, dialect: Dialect) -> list[str]:
    """What is known of a trial; the order is that of ``FACTS``."""
    shown_at = (time(moment, dialect.unit) for moment in (done.text_on_ms, done.text_off_ms))
    block = "practice" if done.trial.practice else "main"
    return [done.trial.notice, done.trial.crop, block, *shown_at]


def log_text(shown: Iterable[Shown], dialect: Dialect) -> str:
    """A log with a row for each fixation."""
    header = ["reader", "number", "sentence", "start", "end" if dialect.end else "dur", "gx", "gy"]
    header += ["blink", *(FACTS if dialect.facts_in_log else ())]
    point = decimal_point(dialect.decimal)
    lines = [dialect.delimiter.join(header)]
    for done in shown:
        names = [done.trial.participant, str(done.trial.trial), done.trial.item]
        known = [point(cell) for cell in facts(done, dialect)] if dialect.facts_in_log else []
        for onset_ms, look in done.looks:
            second = look.duration_ms + (onset_ms if dialect.end else 0)
            numbers = [time(onset_ms, dialect.unit), time(second, dialect.unit)]
            numbers += [f"{number:.1f}" for number in as_recorded(look, dialect)]
            cells = [*names, *map(point, numbers), str(int(look.blink)), *known]
            lines.append(dialect.delimiter.join(cells))
    return dialect.newline.join(lines) + dialect.newline


def decimal_point(sign: str) -> Callable[[str], str]:
    """What writes a number with this decimal sign."""
    return lambda cell: cell.replace(".", sign)


def as_recorded(look: Look, dialect: Dialect) -> tuple[float, float]:
    """Where a fixation was, from the origin that the log counts from."""
    width, height = SCREEN_PX
    if dialect.origin == "centre":
        return look.x_px - width / 2, height / 2 - look.y_px
    return look.x_px, height - look.y_px if dialect.y_axis == "up" else look.y_px


RULES = f"""
[screening.fixations]
outside_text_time = true
off_screen = true
blink = "drop"
merge = {{ under_ms = {SHORTEST_MS}, within_px = {MERGE_WITHIN_PX} }}
under_ms = {SHORTEST_MS}
over_ms = {LONGEST_MS}
[screening.trials]
notes = "notes.csv"
"""


def study_text(dialect: Dialect, *, screened: bool = True, no_opportunity: str = "missing") -> str:
    """The study file.

    Parameters
    ----------
    dialect : Dialect
        How the logs are written.
    screened : bool
        Whether the study has its rules of screening.
    no_opportunity : str
        The key of the study file; "zero" plants the fault of taking every empty cell for a zero.

    Returns
    -------
    str
    """
    unit = f'unit = "{dialect.unit}"'
    second = (
        f'end = {{ column = "end", {unit} }}'
        if dialect.end
        else f'duration = {{ column = "dur", {unit} }}'
    )
    # A moment such as 83,312 is a decimal in seconds, or thousands: the study has to say which.
    decimal = 'decimal = ","\n' if dialect.decimal == "," else ""
    listed = "" if dialect.facts_in_log else 'table = "trials.csv"\nkeys = ["reader", "number"]\n'
    names = ", ".join(f'"{truth.outcome}"' for truth in TRUTHS)
    width, height = SCREEN_PX
    return f"""title = "Notices of a community orchard"
[logs]
files = ["logs/*"]
kind = "table"
{decimal}[logs.columns]
participant = "reader"
trial = "number"
item = "sentence"
onset = {{ column = "start", {unit} }}
{second}
x = {{ column = "gx", unit = "px" }}
y = {{ column = "gy", unit = "px" }}
blink = "blink"
[trials]
{listed}factors = ["notice", "crop"]
levels = {{ notice = ["short", "long"], crop = ["usual", "unusual"] }}
onset = "text_on"
offset = "text_off"
skip = {{ block = ["practice"] }}
[screen]
width_px = {width}
height_px = {height}
y_axis = "{dialect.y_axis}"
origin = "{dialect.origin}"
[regions]
file = "regions.csv"
kind = "marked_text"
vertical = "box"
[regions.layout]
left_px = {GRID.left_px}
top_px = {GRID.top_px}
character_width_px = {GRID.character_width_px}
line_height_px = {GRID.line_height_px}
space = "following"
{RULES if screened else ""}
[measures]
outcomes = [{names}]
no_opportunity = "{no_opportunity}"
[output]
formats = ["csv"]
contrasts = {{ notice = [-0.5, 0.5], crop = [-0.5, 0.5] }}
"""
