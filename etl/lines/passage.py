"""Where the lines and words of a text are, and what every method of line assignment is."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import wraps

import numpy as np
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.lines.settings import MethodSettings

Positions = NDArray[np.float64]
Lines = NDArray[np.int32]


@dataclass(frozen=True, slots=True, eq=False)
class Passage:
    """The lines of a text and its words, in px, y down.

    Attributes
    ----------
    line_y_px : (m,) float64 array
        The middle of each line, from the top.
    word_x_px : (w,) float64 array
        The middle of each word, in reading order.
    word_line : (w,) int32 array
        The line of each word, from 0.
    line_height_px : float
        The distance between the middles of neighbouring lines.
    width_px : float
        The extent of the words, from the leftmost edge to the rightmost.

    Raises
    ------
    FaultError
        If there is no line or no word, lines do not go down, words do not go from line to line, a
        word is on none of the lines, or a position is not finite.

    Examples
    --------
    Two lines of two words:

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 250.0, 50.0, 250.0]),
    ...                   np.array([0, 0, 1, 1], np.int32), 60.0, 400.0)
    >>> passage.word_y_px.tolist()
    [100.0, 100.0, 160.0, 160.0]
    """

    line_y_px: Positions
    word_x_px: Positions
    word_line: Lines
    line_height_px: float
    width_px: float

    def __post_init__(self) -> None:
        lines, words = self.line_y_px, self.word_x_px
        if not lines.size or not words.size:
            raise FaultError("passage: must have lines and words")
        if words.shape != self.word_line.shape or lines.ndim != 1 or words.ndim != 1:
            raise FaultError("passage: word_x_px and word_line must be as long as each other")
        sizes = np.array([self.line_height_px, self.width_px])
        if not all(np.isfinite(values).all() for values in (lines, words, sizes)):
            raise FaultError("passage: positions must be finite")
        if (np.diff(lines) <= 0).any() or (sizes <= 0).any():
            raise FaultError("passage: line_y_px must go down, and sizes must be above 0")
        if (np.diff(self.word_line) < 0).any():
            raise FaultError("passage: word_line must be in reading order")
        if self.word_line[0] < 0 or self.word_line[-1] >= lines.size:
            raise FaultError("passage: word_line must name lines from 0")

    @property
    def word_y_px(self) -> Positions:
        """The middle of each word's line."""
        return self.line_y_px[self.word_line]

    @property
    def begin_x_px(self) -> float:
        """Where lines begin: the leftmost middle of a word."""
        return float(self.word_x_px.min())

    @property
    def mirrored(self) -> Passage:
        """The passage with x turned about 0: the sign of every x changes.

        The methods take lines to be read from left to right. For a text read from right to left,
        give them ``-x_px`` of the fixations and the mirrored passage; the lines they find are those
        of the text as it is. No method looks at where x is 0.
        """
        return replace(self, word_x_px=-self.word_x_px)


Method = Callable[[Positions, Positions, Passage, MethodSettings], Lines]


def line_method(rule: Method) -> Method:
    """Make a rule of line assignment safe for any number of fixations and lines.

    Parameters
    ----------
    rule : Method
        Takes at least one fixation, with finite positions, and at least two lines.

    Returns
    -------
    Method
        The same for any number of each: of one line all fixations are on line 0. Raises FaultError
        where x and y are not as long as each other or a position is not finite.
    """

    @wraps(rule)
    def safe(x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings) -> Lines:
        x_px, y_px = np.asarray(x_px, dtype=np.float64), np.asarray(y_px, dtype=np.float64)
        if x_px.ndim != 1 or x_px.shape != y_px.shape:
            raise FaultError("fixations: x_px and y_px must be as long as each other")
        if not (np.isfinite(x_px).all() and np.isfinite(y_px).all()):
            raise FaultError("fixations: positions must be finite")
        if not x_px.size or passage.line_y_px.size == 1:
            return np.zeros(x_px.size, dtype=np.int32)
        return rule(x_px, y_px, passage, settings).astype(np.int32)

    return safe
