"""Small texts and readings of them, for the methods of line assignment."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from hypothesis import strategies as st

from etl.lines import METHODS, Lines, MethodSettings, Passage, Positions

DEFAULTS = MethodSettings()
#: The first line's middle, the distance between lines, and the words' middles on every line.
TOP, LINE_HEIGHT = 100, 64
WORDS_X = (100, 200, 300, 400)


def text(lines: int, words_x: Sequence[float] = WORDS_X, height: float = LINE_HEIGHT) -> Passage:
    """A text whose lines all have words at the same places."""
    return Passage(
        TOP + height * np.arange(lines, dtype=np.float64),
        np.tile(np.array(words_x, dtype=np.float64), lines),
        np.repeat(np.arange(lines, dtype=np.int32), len(words_x)),
        float(height),
        float(max(words_x) - min(words_x) + 80),
    )


def found(
    method: str,
    passage: Passage,
    fixations: Sequence[tuple[float, float]],
    settings: MethodSettings = DEFAULTS,
) -> list[int]:
    """The lines that a method finds for fixations given as (x, y)."""
    x, y = np.array(fixations, dtype=np.float64).reshape(-1, 2).T
    lines = METHODS[method](x, y, passage, settings)
    assert lines.dtype == np.int32
    return lines.tolist()


@dataclass(frozen=True)
class Trial:
    """A text and what was read of it."""

    passage: Passage
    x_px: Positions
    y_px: Positions
    line: Lines

    def lines(self, method: str) -> list[int]:
        """The lines that a method finds."""
        return METHODS[method](self.x_px, self.y_px, self.passage, DEFAULTS).tolist()

    def right(self, method: str) -> float:
        """The share of fixations for which a method finds the line that was read."""
        return float(np.mean(self.line == self.lines(method)))


def read_through(
    seed: int,
    *,
    lines: int = 8,
    noise_px: float = 10.0,
    slope: float = 0.0,
    shift: float = 0.0,
    skipping: float = 0.25,
) -> Trial:
    """Every line read once from left to right, in whole pixels.

    Slope is in px down per px across, shift in px down per px of distance from the first line.
    """
    source = np.random.default_rng(seed)
    passage = text(lines, tuple(range(100, 1100, 90)))
    word_line, word_x = passage.word_line, passage.word_x_px
    ends = np.isin(word_x, (word_x.min(), word_x.max()))
    fixated = ends | (source.random(word_x.size) > skipping)
    line, x = word_line[fixated], word_x[fixated]
    below = passage.line_y_px[line] - TOP
    y = TOP + below * (1 + shift) + slope * (x - passage.begin_x_px)
    y = y + source.normal(0, noise_px, x.size)
    return Trial(passage, np.round(x + source.normal(0, 10, x.size)), np.round(y), line)


def any_fixations(most: int = 40) -> st.SearchStrategy[list[tuple[float, float]]]:
    """Fixations on, beside and far off a text: whole pixels often, and often the same ones."""
    x = st.integers(-300, 1500).map(float) | st.floats(-1e4, 1e4)
    y = st.sampled_from([100.0, 132.0, 164.0]) | st.integers(-100, 800).map(float)
    return st.lists(st.tuples(x, y | st.floats(-1e4, 1e4)), max_size=most)
