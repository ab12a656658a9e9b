"""A study of passages that drift away from their lines, written for builds; the truth is known."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

import etl
from etl.session import Result
from tests.end_to_end.building import Row, rows_of, write

LEFT, TOP, CHARACTER, HEIGHT = 100, 100, 14, 64

#: Lines of an invented notice about a community orchard.
TEXT = (
    "The old ladder stands behind the shed where nobody has looked for it since",
    "the spring when the pears were tied up and the grass between the rows was",
    "left to grow for the bees that live in four white hives by the north wall",
    "near the pump so please walk on the far side of the path and keep the gate",
    "shut at night because the neighbours have geese and geese like young bark",
    "more than anything else they can find in this part of town at that hour of",
    "the day and whoever has seen a goose in a tree will know what it costs us",
)


@dataclass(frozen=True)
class Fixated:
    """A fixation and the truth about it: the line from 1, 0 for none, and the order of the word."""

    x_px: float
    y_px: float
    line: int
    order: int
    duration_ms: int = 220


def edge_px(column: int, *, right_to_left: bool = False) -> float:
    """Where a column of the text begins."""
    return LEFT + (1 - column if right_to_left else column) * CHARACTER


def words(lines: Sequence[str] = TEXT, *, right_to_left: bool = False) -> list[list[float]]:
    """The middle of each word of each line."""
    middles = []
    for line in lines:
        at, own = 0, []
        for word in line.split(" "):
            ends = (edge_px(column, right_to_left=right_to_left) for column in (at, at + len(word)))
            own.append(sum(ends) / 2)
            at += len(word) + 1
        middles.append(own)
    return middles


def read_through(
    seed: int,
    *,
    lines: Sequence[str] = TEXT,
    shift: float = 0.13,
    slope: float = 0.0,
    noise_px: float = 5.0,
    right_to_left: bool = False,
) -> list[Fixated]:
    """Every word read once, drifting off: ``shift`` px down per px of distance from line 1."""
    source = np.random.default_rng(seed)
    made, order = [], 0
    for number, own in enumerate(words(lines, right_to_left=right_to_left), start=1):
        for x in own:
            order += 1
            below = (number - 1) * HEIGHT
            y = TOP + HEIGHT / 2 + below * (1 + shift) + slope * abs(x - own[0])
            made.append(
                Fixated(
                    round(float(x + source.uniform(-6, 6)), 1),
                    round(float(y + source.normal(0, noise_px)), 1),
                    number,
                    order,
                )
            )
    return made


def region_file(lines: Sequence[str] = TEXT) -> str:
    """The text, every word a region."""
    return "item\ttext\n1\t" + "\\n".join(lines) + "\n"


def boxes_file(lines: Sequence[str] = TEXT, *, right_to_left: bool = False) -> str:
    """The same words as boxes."""
    rows, order = ["item\tregion\torder\tleft\ttop\tright\tbottom"], 0
    for number, line in enumerate(lines):
        at = 0
        for word in line.split(" "):
            order += 1
            ends = [edge_px(c, right_to_left=right_to_left) for c in (at, at + len(word))]
            at += len(word) + 1
            top = TOP + number * HEIGHT
            rows.append(
                f"1\tw{order}\t{order}\t{min(ends)}\t{top + 12}\t{max(ends)}\t{top + HEIGHT - 12}"
            )
    return "\n".join(rows) + "\n"


STUDY = """\
[logs]
files = ["logs/*.tsv"]
[logs.columns]
participant = "reader"
trial = "trial"
item = "item"
onset = "start"
duration = "dur"
x = "x"
y = "y"
[screen]
width_px = 1400
height_px = 900
[regions]
file = "regions.tsv"
kind = "words"
tolerance_px = 20
[regions.layout]
left_px = 100
top_px = 100
character_width_px = 14
line_height_px = 64
"""
LAYOUT = STUDY[STUDY.index("[regions.layout]") :]


@dataclass(frozen=True)
class Passages:
    """Trials by reader and trial, and the study file's text."""

    trials: Mapping[tuple[str, str], Sequence[Fixated]]
    study: str = STUDY
    regions: str = region_file()
    more: Mapping[str, str] | None = None

    def __add__(self, text: str) -> Passages:
        """The same with more in the study file."""
        return replace(self, study=self.study + text)

    def written(self, folder: Path) -> Path:
        """Write the study; gives its file."""
        rows: dict[str, list[str]] = {}
        for (reader, trial), fixations in self.trials.items():
            own = rows.setdefault(reader, ["reader\ttrial\titem\tstart\tdur\tx\ty"])
            onset = 1000
            for f in fixations:
                own.append(f"{reader}\t{trial}\t1\t{onset}\t{f.duration_ms}\t{f.x_px}\t{f.y_px}")
                onset += f.duration_ms + 30
        logs = {f"logs/{reader}.tsv": "\n".join(own) + "\n" for reader, own in rows.items()}
        files = {"study.toml": self.study, "regions.tsv": self.regions, **logs}
        return write(folder, {**files, **(self.more or {})})

    def built(self, folder: Path, *, workers: int = 1) -> Built:
        """Build the study."""
        study = etl.load_study(self.written(folder))
        result = etl.build(study, into=folder / "out", workers=workers)
        return Built(self, result, folder / "out")

    def refused(self, folder: Path) -> list[str]:
        """What a check finds to be errors."""
        findings = etl.check(etl.load_study(self.written(folder)))
        return [one.text() for one in findings if one.severity == "error"]


@dataclass(frozen=True)
class Built:
    """A built study and its truth."""

    made: Passages
    result: Result
    folder: Path

    @property
    def fixations(self) -> list[Row]:
        """The rows of the table of fixations."""
        return rows_of(self.folder, "fixations")

    @property
    def ledger(self) -> list[dict[str, str]]:
        """The rows of the ledger."""
        with (self.folder / "exclusions.csv").open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))

    def right(self, *, lines: bool = False) -> float:
        """The share of fixations whose region, or line, is the true one."""
        hits = []
        for row in self.fixations:
            truth = self.made.trials[row["participant"], str(row["trial"])][row["fixation"] - 1]
            got = (row["line"] or 0) if lines else (row["region_order"] or 0)
            hits.append(got == (truth.line if lines else truth.order))
        return float(np.mean(hits))
