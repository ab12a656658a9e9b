"""Small logs whose meaning is known: reading made up from a seed, under any headers."""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True)
class Fixated:
    """One fixation of a trial."""

    participant: str
    trial: int
    item: str
    number: int
    onset_ms: int
    duration_ms: int
    x_px: float
    y_px: float
    blink: int

    @property
    def end_ms(self) -> int:
        """When it ended."""
        return self.onset_ms + self.duration_ms


def reading(participant: str = "P01", trials: int = 12, lines: int = 1) -> list[Fixated]:
    """The fixations of a reader: steps to the right, steps back, return sweeps."""
    draw = random.Random(participant)
    found = []
    clock = 50_000 + draw.randrange(5000)
    for trial in range(1, trials + 1):
        clock += 4000
        number = 0
        for line in range(lines):
            x = 200.0
            while x < 1300:
                number += 1
                lasted = int(min(max(draw.gauss(215, 60), 60), 600))
                y = 500 + 60 * line + draw.gauss(0, 8)
                blink = int(draw.random() < 0.03)
                found.append(
                    Fixated(
                        participant,
                        trial,
                        f"text{1 + (trial * 5) % 7}",
                        number,
                        clock,
                        lasted,
                        round(x, 1),
                        round(y, 1),
                        blink,
                    )
                )
                clock += lasted + draw.randrange(20, 40)
                x += draw.choice((110, 130, 95, 160, 150, -120))
                x = max(x, 200.0)
    return found


#: What stands in a column of each name.
CELLS = {
    "participant": lambda f: f.participant,
    "trial": lambda f: str(f.trial),
    "item": lambda f: f.item,
    "fixation": lambda f: str(f.number),
    "onset": lambda f: str(f.onset_ms),
    "onset_s": lambda f: f"{f.onset_ms / 1000:.3f}",
    "duration": lambda f: str(f.duration_ms),
    "duration_s": lambda f: f"{f.duration_ms / 1000:.3f}",
    "duration_us": lambda f: str(1000 * f.duration_ms),
    "end": lambda f: str(f.end_ms),
    "x": lambda f: f"{f.x_px:.1f}",
    "y": lambda f: f"{f.y_px:.1f}",
    "x_deg": lambda f: f"{(f.x_px - 960) / 40:.4f}",
    "y_deg": lambda f: f"{(f.y_px - 540) / 40:.4f}",
    "blink": lambda f: str(f.blink),
    "pupil": lambda f: str(1200 + 37 * (f.number % 11)),
    "amplitude": lambda f: f"{1 + f.number % 5}.5",
    "area": lambda f: f"area {1 + int(f.x_px) // 300}",
    "block": lambda f: "first" if f.trial < 7 else "second",
}


def table(rows: Sequence[Fixated], columns: Mapping[str, str], delimiter: str = "\t") -> str:
    """Rows under headers: for each header the name of what stands in its column."""
    lines = [delimiter.join(columns)]
    lines += [delimiter.join(CELLS[name](row) for name in columns.values()) for row in rows]
    return "\n".join(lines) + "\n"


def write_readers(
    folder: Path, columns: Mapping[str, str], *, readers: int = 3, lines: int = 1
) -> Path:
    """Write a log a reader into a folder."""
    for number in range(1, readers + 1):
        rows = reading(f"P{number:02}", lines=lines)
        put(folder / f"P{number:02}.tsv", table(rows, columns))
    return folder


def put(path: Path, text: str) -> Path:
    """Write a text in UTF-8 with plain line ends."""
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text, encoding="utf-8", newline="\n")
    return path
