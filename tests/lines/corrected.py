"""The 24 real trials with the lines that two trained correctors agreed on.

The data: Carr, Pescuma, Furlan, Ktori & Crepaldi (2022, doi:10.3758/s13428-021-01554-0), CC BY 4.0.
Looked for in ``shared/open_data/passages`` beside the checkout.
"""

from __future__ import annotations

import csv
import re
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from etl.lines import Lines, Passage, Positions

PASSAGES = Path(__file__).resolve().parents[3] / "shared" / "open_data" / "passages"
ABSENT = "the open data are not beside the checkout (../shared/open_data)"

#: From the data's description: first character's left edge, px a character, px between lines, the
#: first line's middle.
LEFT, WIDTH, HEIGHT, FIRST_MIDDLE = 360.0, 16.0, 64.0, 155.0


@dataclass(frozen=True, eq=False)
class Corrected:
    """One trial; lines count from 1, 0 was discarded by hand."""

    reader: str
    passage_name: str
    x_px: Positions
    y_px: Positions
    duration_ms: Positions
    line: Lines
    passage: Passage

    @property
    def name(self) -> str:
        """Reader and passage."""
        return f"{self.reader} {self.passage_name}"

    @property
    def kept(self) -> Lines:
        """The places of the fixations that were not discarded."""
        return np.flatnonzero(self.line).astype(np.int32)


def _rows(name: str, delimiter: str) -> list[dict[str, str]]:
    """A table of the data."""
    with (PASSAGES / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, delimiter=delimiter))


def _passage(content: str) -> Passage:
    """The places of a text's lines and words."""
    lines = content.replace("\r", "").split("\n")
    words = [(at, found) for at, line in enumerate(lines) for found in re.finditer(r"\S+", line)]
    return Passage(
        line_y_px=FIRST_MIDDLE + HEIGHT * np.arange(len(lines)),
        word_x_px=np.array([LEFT + WIDTH * (w.start() + w.end()) / 2 for _, w in words]),
        word_line=np.array([at for at, _ in words], dtype=np.int32),
        line_height_px=HEIGHT,
        width_px=WIDTH * max(map(len, lines)),
    )


def corrected_trials() -> Iterator[Corrected]:
    """All trials, in the order of the data."""
    passages = {row["item"]: _passage(row["text"]) for row in _rows("texts.csv", ",")}
    by_hand = _rows("lines_by_hand.tsv", "\t")
    own: dict[tuple[str, str], list[tuple[float, ...]]] = defaultdict(list)
    for row, hand in zip(_rows("fixations.tsv", "\t"), by_hand, strict=True):
        lasted = float(row["end_ms"]) - float(row["start_ms"])
        fixation = float(row["x_px"]), float(row["y_px"]), lasted, float(hand["line"])
        own[row["reader"], row["passage"]].append(fixation)
    for (reader, name), fixations in own.items():
        x, y, duration, line = np.array(fixations).T
        yield Corrected(reader, name, x, y, duration, line.astype(np.int32), passages[name])
