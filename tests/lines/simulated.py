"""Readers of texts of several lines, made up by the phenomena of Carr et al. (2022).

The paper (doi:10.3758/s13428-021-01554-0) tries the methods on simulated trials: passages of 8 to
12 lines of up to 80 characters (16 px wide, lines 64 px apart), and one phenomenon at a time over a
range: noise (standard deviation 0 to 40 px), slope (-0.1 to 0.1 px per px), shift (-0.2 to 0.2 px
per px of distance from the first line), regressions within lines and between lines (probabilities
0 to 1). The ranges are quoted from memory; how a regression goes on is ours. What the paper leaves
out and real trials show is added here: drift over the trial, arcs, short undersweeps, fixations in
the middle of a return sweep, glances and looks off the text, arrivals from elsewhere, reading in
part and twice, constant offsets, and other layouts. Everything comes out of the generator that is
passed in.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from etl.lines.passage import Passage

Floats = NDArray[np.float64]
Integers = NDArray[np.int32]

LINE_HEIGHT_PX = 64.0
CHARACTER_PX = 16.0
#: The phenomena of the paper and the ranges it goes over.
PUBLISHED = {
    "noise_px": (0.0, 40.0),
    "slope": (-0.1, 0.1),
    "shift": (-0.2, 0.2),
    "within": (0.0, 1.0),
    "between": (0.0, 1.0),
}


@dataclass(frozen=True)
class Layout:
    """Where and how large the text is: lines of words of monospaced type."""

    line_count: int
    columns: int = 80
    character_px: float = CHARACTER_PX
    line_height_px: float = LINE_HEIGHT_PX
    left_px: float = 360.0
    top_px: float = 155.0


@dataclass(frozen=True)
class Manner:
    """How a made-up reader reads, and how far the tracker is off; every field 0 is an ideal trial.

    Lengths ending in ``_lines`` are shares of the line height. ``noise_px``, ``slope``, ``shift``,
    ``within`` and ``between`` are the phenomena of the paper; noise is for lines 64 px apart and
    goes with the line height. ``look`` is how many fixations one look off the text has.
    """

    noise_px: float = 5.0
    slope: float = 0.0
    shift: float = 0.0
    within: float = 0.0
    between: float = 0.0
    offset_lines: float = 0.0
    drift_lines: float = 0.0
    arc_lines: float = 0.0
    undersweep: float = 0.0
    mid_sweep: float = 0.0
    glances: float = 0.0
    arrivals: int = 0
    look: int = 0
    first_line: int = 0
    last_line: int | None = None
    readings: int = 1


@dataclass(frozen=True, eq=False)
class Trial:
    """One made-up trial: fixations in time order, and the line each truly belongs to (0: none)."""

    x_px: Floats
    y_px: Floats
    duration_ms: Floats
    line: Integers
    passage: Passage
    manner: Manner


def make_passage(rng: np.random.Generator, layout: Layout) -> Passage:
    """Words of one to twelve characters on every line; the last line is often short."""
    middles, lines = [], []
    for line in range(layout.line_count):
        length = layout.columns
        if line == layout.line_count - 1:
            length = int(layout.columns * rng.uniform(0.2, 1.0))
        column = 0
        while True:
            size = int(np.clip(rng.poisson(4.5) + 1, 1, 12))
            if column + size > length and column:
                break
            middles.append(layout.left_px + layout.character_px * (column + size / 2))
            lines.append(line)
            column += size + 1
    return Passage(
        line_y_px=layout.top_px + layout.line_height_px * np.arange(layout.line_count, dtype=float),
        word_x_px=np.array(middles),
        word_line=np.array(lines, dtype=np.int32),
        line_height_px=layout.line_height_px,
        width_px=layout.columns * layout.character_px,
    )


def _line_read(rng: np.random.Generator, own: Integers, within: float) -> Iterator[int]:
    """The words of a line that are fixated, with regressions to earlier ones of the same line."""
    for i, word in enumerate(own):
        if rng.random() < 0.25 and 0 < i < len(own) - 1:
            continue
        yield int(word)
        if i > 1 and rng.random() < within / 4:
            yield from own[int(rng.integers(0, i)) : i : 2].tolist()


def _words_read(rng: np.random.Generator, passage: Passage, manner: Manner) -> list[int]:
    """The words fixated, in order: line after line, after each perhaps a part of an earlier one."""
    last = len(passage.line_y_px) if manner.last_line is None else manner.last_line
    read: list[int] = []
    for _ in range(manner.readings):
        for line in range(manner.first_line, last):
            read += _line_read(rng, np.flatnonzero(passage.word_line == line), manner.within)
            if line > manner.first_line and rng.random() < manner.between:
                earlier = int(rng.integers(manner.first_line, line))
                own = np.flatnonzero(passage.word_line == earlier)
                start = int(rng.integers(0, len(own)))
                read += own[start : int(rng.integers(start, len(own))) + 1].tolist()
    return read


def _with_sweeps(
    rng: np.random.Generator, x: Floats, line: Integers, manner: Manner, passage: Passage
) -> tuple[Floats, Integers, Floats]:
    """Put in undersweeps and fixations in mid sweep: x, line (-1 is none) and height in lines."""
    rows: list[tuple[float, int, float]] = []
    for i in range(len(x)):
        if i and line[i] == line[i - 1] + 1 and x[i] < x[i - 1] - 0.5 * passage.width_px:
            if rng.random() < manner.mid_sweep:
                way = rng.uniform(0.3, 0.7)
                rows.append((x[i - 1] + way * (x[i] - x[i - 1]), -1, line[i] - 1 + way))
            elif rng.random() < manner.undersweep:
                short = rng.uniform(0.03, 0.1) * passage.width_px
                rows.append((x[i] + short, int(line[i]), float(line[i])))
        rows.append((x[i], int(line[i]), float(line[i])))
    where, lines, heights = zip(*rows, strict=True)
    return np.array(where), np.array(lines, dtype=np.int32), np.array(heights)


def _with_strays(
    rng: np.random.Generator,
    rows: tuple[Floats, Integers, Floats],
    manner: Manner,
    passage: Passage,
) -> tuple[Floats, Integers, Floats]:
    """Put in single glances away from what is read, and arrivals from elsewhere before line one."""
    x, line, height = (part.tolist() for part in rows)
    left, count = float(passage.word_x_px.min()), len(passage.line_y_px)
    away = np.flatnonzero(rng.random(len(x)) < manner.glances)[::-1]
    for i in away[away > 0]:
        # Nobody could tell a glance from reading that lands on the line that is being read.
        at = rng.uniform(-2.5, count + 1.5)
        if abs(at - height[i]) < 1.2 or abs(at - height[i - 1]) < 1.2:
            continue
        x.insert(i, left + rng.uniform(-0.1, 1.1) * passage.width_px)
        line.insert(i, -1)
        height.insert(i, at)
    if manner.look:
        # At a question under the text, most often when the text has been read.
        place = len(x) if rng.random() < 0.7 else int(rng.integers(1, len(x)))
        at = rng.choice([count + rng.uniform(0.6, 3.0), -rng.uniform(1.6, 4.0)], p=[0.8, 0.2])
        begins = left + rng.uniform(0, 0.7) * passage.width_px
        for i in range(manner.look):
            x.insert(place + i, begins + rng.uniform(0, 0.3) * passage.width_px)
            line.insert(place + i, -1)
            height.insert(place + i, at)
    for _ in range(manner.arrivals):
        x.insert(0, left + rng.uniform(0.2, 0.9) * passage.width_px)
        line.insert(0, -1)
        height.insert(0, rng.uniform(2.0, count))
    return np.array(x), np.array(line, dtype=np.int32), np.array(height)


def read(rng: np.random.Generator, passage: Passage, manner: Manner) -> Trial:
    """One trial of a made-up reader."""
    words = np.array(_words_read(rng, passage, manner), dtype=np.int64)
    line_height = passage.line_height_px
    x = passage.word_x_px[words] + rng.normal(0, passage.width_px / 100, len(words))
    rows = _with_sweeps(rng, x, passage.word_line[words], manner, passage)
    x, line, height = _with_strays(rng, rows, manner, passage)
    count = len(x)
    along = (x - passage.word_x_px.min()) / passage.width_px
    vertical = passage.line_y_px[0] + line_height * height
    vertical += rng.normal(0, 1, count) * manner.noise_px * line_height / LINE_HEIGHT_PX
    vertical += manner.slope * (x - passage.word_x_px.min())
    vertical += manner.shift * line_height * height
    vertical += manner.offset_lines * line_height
    vertical += manner.drift_lines * line_height * np.linspace(0, 1, count)
    vertical += manner.arc_lines * line_height * (1 - (2 * along - 1) ** 2)
    duration = np.round(rng.gamma(6.0, 38.0, count)) + 20
    duration = np.where(line < 0, np.round(rng.gamma(4.0, 28.0, count)) + 20, duration)
    return Trial(np.round(x), np.round(vertical), duration, line + np.int32(1), passage, manner)


def published_manner(rng: np.random.Generator, phenomenon: str) -> Manner:
    """One phenomenon anywhere in its published range; all others absent but a little noise."""
    low, high = PUBLISHED[phenomenon]
    noise = {} if phenomenon == "noise_px" else {"noise_px": rng.uniform(5, 15)}
    return Manner(**{**noise, phenomenon: rng.uniform(low, high)})


def published_mixture(rng: np.random.Generator) -> Manner:
    """All phenomena of the paper at once, each anywhere in its published range."""
    return Manner(**{name: rng.uniform(*ends) for name, ends in PUBLISHED.items()})


def mixed_manner(rng: np.random.Generator) -> Manner:
    """Everything at once, as a real trial may have it: mostly mild, at times severe."""
    severity = rng.choice([0.25, 0.5, 1.0], p=[0.4, 0.4, 0.2])

    def signed(most: float) -> float:
        return float(severity * rng.uniform(-most, most))

    return Manner(
        noise_px=rng.uniform(5, 12 + 28 * severity),
        slope=signed(0.1),
        shift=signed(0.2),
        within=severity * rng.uniform(0, 1),
        between=severity * rng.uniform(0, 1),
        offset_lines=signed(0.8),
        drift_lines=signed(0.6),
        arc_lines=signed(0.4),
        undersweep=rng.uniform(0, 0.6),
        mid_sweep=rng.choice([0.0, 0.05, 0.4], p=[0.6, 0.25, 0.15]),
        glances=rng.choice([0.0, 0.005, 0.02], p=[0.4, 0.4, 0.2]),
        arrivals=int(rng.choice([0, 1, 2, 3], p=[0.5, 0.3, 0.1, 0.1])),
        look=int(rng.choice([0, 1, 3, 8], p=[0.8, 0.05, 0.1, 0.05])),
    )


def in_part(rng: np.random.Generator, manner: Manner, line_count: int) -> Manner:
    """The same manner, but the text is read in part, or from the middle, or twice."""
    kind = rng.choice(["stops", "starts", "both", "twice"])
    first = int(rng.integers(1, line_count)) if kind in ("starts", "both") else 0
    last = int(rng.integers(first + 1, line_count + 1)) if kind in ("stops", "both") else None
    return replace(manner, first_line=first, last_line=last, readings=2 if kind == "twice" else 1)


def usual_layout(rng: np.random.Generator) -> Layout:
    """The layout of the paper's simulations."""
    return Layout(int(rng.integers(8, 13)))


def any_layout(rng: np.random.Generator) -> Layout:
    """Other numbers of lines, sizes of type, spacings and screens."""
    character = rng.uniform(7, 22)
    return Layout(
        line_count=int(rng.integers(2, 16)),
        columns=int(rng.integers(30, 100)),
        character_px=character,
        line_height_px=character * rng.uniform(1.8, 5.0),
        left_px=rng.uniform(0, 500),
        top_px=rng.uniform(0, 400),
    )


def published_trials(seed: int, phenomenon: str, count: int) -> Iterator[Trial]:
    """Trials with one phenomenon of the paper, over its whole range."""
    rng = np.random.default_rng([seed, sorted(PUBLISHED).index(phenomenon)])
    for _ in range(count):
        passage = make_passage(rng, usual_layout(rng))
        yield read(rng, passage, published_manner(rng, phenomenon))


def combined_trials(seed: int, count: int) -> Iterator[Trial]:
    """Trials with all phenomena of the paper at once, each over its whole range."""
    rng = np.random.default_rng([seed, len(PUBLISHED) + 1])
    for _ in range(count):
        passage = make_passage(rng, usual_layout(rng))
        yield read(rng, passage, published_mixture(rng))


def mixed_trials(seed: int, count: int) -> Iterator[Trial]:
    """Trials with everything at once; a third in other layouts, a fifth read in part or twice."""
    rng = np.random.default_rng([seed, len(PUBLISHED)])
    for _ in range(count):
        layout = any_layout(rng) if rng.random() < 1 / 3 else usual_layout(rng)
        manner = mixed_manner(rng)
        if rng.random() < 0.2:
            manner = in_part(rng, manner, layout.line_count)
        yield read(rng, make_passage(rng, layout), manner)


def trials_at(phenomenon: str, value: float, seed: int, count: int) -> Iterator[Trial]:
    """Trials with one phenomenon at one value and a little noise, for accuracy curves."""
    assert phenomenon in {field.name for field in fields(Manner)}
    # Seeds are whole numbers from 0 on.
    rng = np.random.default_rng(
        [seed, sorted(PUBLISHED).index(phenomenon), round(value * 1000) + 1000]
    )
    for _ in range(count):
        passage = make_passage(rng, usual_layout(rng))
        noise = {} if phenomenon == "noise_px" else {"noise_px": 10.0}
        yield read(rng, passage, Manner(**{**noise, phenomenon: value}))


def trials_together(share: float, seed: int, count: int) -> Iterator[Trial]:
    """Trials with all phenomena at this share of the ends of their ranges, of either sign."""
    rng = np.random.default_rng([seed, len(PUBLISHED), round(share * 1000)])
    for _ in range(count):
        passage = make_passage(rng, usual_layout(rng))
        ends = {name: rng.choice(both) if both[0] else both[1] for name, both in PUBLISHED.items()}
        yield read(rng, passage, Manner(**{name: share * end for name, end in ends.items()}))
