"""Runs gathered into lines, from the longest run up and down."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from etl.lines.nearest import nearest_line
from etl.lines.passage import Lines, Passage, Positions, line_method
from etl.lines.runs import Flags, Numbers, first_of_runs, long_steps
from etl.lines.settings import MethodSettings, SliceSettings

#: Lines are looked for so many times as far up and down as the text has lines: noise may make more
#: lines than there are, and what lies still farther off is on none of them.
_FARTHEST = 2


@line_method
def slice_runs(
    x_px: Positions, y_px: Positions, passage: Passage, settings: MethodSettings
) -> Lines:
    """Gather runs into lines: the longest run first, then what lies beside, above and below it.

    Parameters
    ----------
    x_px, y_px : (n,) float64 arrays
        The fixations in time order.
    passage : Passage
        The text.
    settings : MethodSettings
        ``slice``: steps of more than 192 px across or 32 px up or down end a run; a run less than
        32 px from a line is on it, one from 32 to less than 90 px away on the line next to it.

    Returns
    -------
    (n,) int32 array
        The line of each fixation, from 0.

    Notes
    -----
    How far a run is from a line is the mean vertical distance of its fixations from those fixations
    of the line that are nearest to them in x, of equally near ones the leftmost; so lines may slope
    and bend. The run that goes farthest to the right is the first line. Then, again and again, the
    highest line and the lowest one so far take the runs that are on them, and those on the line
    above and below become the next highest and lowest; where there are none, a line is presumed
    there, a line's height away, so that lines that were not read are crossed. What is not taken
    within twice as many lines as the text has goes to the nearest of them. If there are more lines
    than in the text, the highest or the lowest, whichever has fewer fixations, joins its neighbour.
    If there are fewer, the highest is the line nearest to it, as far as that leaves lines for the
    others; the paper presumes that every line was read.

    Fails where noise breaks runs up and blurs lines, and where one wrong line pushes all lines
    beyond it off by one. O(n m log n).

    References
    ----------
    Glandorf & Schroeder (2021). Slice: an algorithm to assign fixations in multi-line texts.
    Procedia Computer Science, 192, doi:10.1016/j.procs.2021.09.069.

    Examples
    --------
    All of it 40 px too low, which the lines found do not depend on:

    >>> passage = Passage(np.array([100.0, 160.0]), np.array([50.0, 50.0]),
    ...                   np.array([0, 1], np.int32), 60.0, 400.0)
    >>> x_px = np.array([50.0, 200.0, 350.0, 50.0, 180.0])
    >>> y_px = np.array([140.0, 145.0, 142.0, 201.0, 204.0])
    >>> slice_runs(x_px, y_px, passage, MethodSettings()).tolist()
    [0, 0, 0, 1, 1]
    """
    limits = settings.slice
    first = first_of_runs(long_steps(x_px, y_px, limits.x_px, limits.y_px))
    # From the first line, so that means do not depend on where the text stands.
    top_px = passage.line_y_px[0]
    gathering = _Gathering(x_px, y_px - top_px, first)
    line_count = passage.line_y_px.size
    gathering.grow(limits, passage.line_height_px, line_count)
    lines = _fitted(gathering.line, gathering.sizes, line_count)
    own = np.repeat(lines, gathering.sizes)
    highest_px = (y_px - top_px)[own == 0].mean()
    spare = line_count - 1 - int(lines.max())
    begin = min(int(nearest_line(highest_px, passage.line_y_px - top_px)), spare)
    return (own + begin).astype(np.int32)


class _Gathering:
    """Runs, and the lines they have been taken to: 0 is that of the longest run, up is negative."""

    def __init__(self, x: Positions, y: Positions, first: Numbers) -> None:
        last = np.append(first[1:], x.size) - 1
        self.x, self.y, self.first = x, y, first
        self.sizes = last - first + 1
        self.line = np.zeros(first.size, dtype=np.int64)
        self.waiting = np.ones(first.size, dtype=np.bool_)
        self.waiting[(x[last] - x[first]).argmax()] = False
        #: The points that stand for lines without a run.
        self.presumed: dict[int, tuple[Positions, Positions]] = {}

    def _points(self, line: int) -> tuple[Positions, Positions]:
        """Where a line is."""
        on_it = np.repeat((self.line == line) & ~self.waiting, self.sizes)
        return (self.x[on_it], self.y[on_it]) if on_it.any() else self.presumed[line]

    def _below(self, line: int) -> Positions:
        """How far below a line each run is, on the mean."""
        x, y = self._points(line)
        there, which = np.unique(x, return_index=True)
        nearest = np.searchsorted((there[1:] + there[:-1]) / 2, self.x)
        return np.add.reduceat(self.y - y[which[nearest]], self.first) / self.sizes

    def grow(self, limits: SliceSettings, line_height_px: float, line_count: int) -> None:
        """Take every run to a line."""
        most = _FARTHEST * line_count
        reached = 0
        while self.waiting.any() and reached < most:
            for edge, way in ((-reached, -1), (reached, 1)):
                beyond = self._below(edge) * way
                on_it = self.waiting & (np.abs(beyond) < limits.within_px)
                on_next = self.waiting & (beyond >= limits.within_px) & (beyond < limits.next_px)
                if not on_next.any():
                    x, y = self._points(edge)
                    middle = np.array([x.mean()]), np.array([y.mean() + way * line_height_px])
                    self.presumed[edge + way] = middle
                self._take(on_it, edge)
                self._take(on_next, edge + way)
            reached += 1
        if self.waiting.any():
            lines = np.arange(-reached, reached + 1)
            off_px = np.abs([self._below(line) for line in lines.tolist()])
            nearest = lines[off_px.argmin(axis=0)]
            self.line = np.where(self.waiting, nearest, self.line)
            self.waiting[:] = False

    def _take(self, runs: Flags, line: int) -> None:
        """Put runs on a line."""
        self.line[runs] = line
        self.waiting &= ~runs


def _fitted(line: Numbers, sizes: NDArray[np.int64], line_count: int) -> Numbers:
    """Lines from 0, no more than the text has: the smaller of the outermost joins its neighbour."""
    line = line - line.min()
    fixations = np.bincount(line, sizes)
    low, high = 0, fixations.size - 1
    while high - low >= line_count:
        if fixations[low] < fixations[high]:
            fixations[low + 1] += fixations[low]
            low += 1
        else:
            fixations[high - 1] += fixations[high]
            high -= 1
    return np.clip(line, low, high) - low
