"""Where everything in the picture of a trial goes: text across, time down.

Time runs down in *stretches*. A stretch is a run of fixations on one line of the text; above each
stands that line with its regions, so that the eye finds the words right over the bars however long
the passage is. Within a stretch time is to scale; where nothing was fixated for long, it is cut.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import Piece, TracedFixation, TracedTrial

#: Sizes of the picture, in its own units (px of a screen at 100 %).
WIDTH: Final = 1200.0
PLOT_LEFT: Final = 96.0
PLOT_RIGHT: Final = 924.0
MARGIN: Final = 14.0
NAME_HEIGHT: Final = 14.0
LINE_BOX: Final = 30.0
ABOVE_BARS: Final = 18.0
BELOW_BARS: Final = 12.0
BETWEEN_STRETCHES: Final = 16.0
CUT: Final = 26.0
#: Room for fixations that have no place across.
GUTTER: Final = 64.0
#: Width of a letter of a region's name.
NAME_LETTER: Final = 6.4

#: Px for a millisecond: a usual fixation of 250 ms is 50 px long, and in long trials shorter, so
#: that the picture stays within some ten screens; never so short that the labels run together.
MOST_PER_MS: Final = 0.2
LEAST_PER_MS: Final = 0.08
LONG_PICTURE: Final = 7000.0
#: A time without fixations is cut where it is longer than this.
LONGEST_PAUSE_MS: Final = 600.0
#: How far beyond the text, in parts of its width, a fixation is still drawn at its place.
BEYOND_TEXT: Final = 0.08
#: Px of the picture for one of the screen, at most; a single word is not blown up.
MOST_ACROSS: Final = 1.5
#: How many rows the names of the regions may take.
NAME_ROWS: Final = 3

_STEPS_MS: Final = (50, 100, 200, 250, 500, 1000, 2000, 5000, 10_000, 20_000, 60_000)
_LEAST_BETWEEN_TICKS: Final = 44.0


class Across:
    """From px of the screen, or from regions, to places across the picture.

    Parameters
    ----------
    traced : TracedTrial
        The trial. Where its regions have no places, each gets a column as wide as any other.
    """

    def __init__(self, traced: TracedTrial) -> None:
        self.traced = traced
        # Of a trial that is no part of the study nothing is known but where the eyes were.
        self.by_px = bool(traced.pieces) or not traced.region_names
        nowhere = [f for f in traced.fixations if not self._has_place(f)]
        self.gutter = GUTTER if nowhere else 0.0
        left = PLOT_LEFT + self.gutter
        self.pieces = traced.pieces or self._columns(left)
        placed = [f.x_px for f in traced.fixations if f.placed]
        edges = [x for p in self.pieces for x in (p.left_px, p.right_px)]
        edges += [x for word in traced.words for x in (word.left_px, word.right_px)]
        edges = edges or [min(placed, default=0.0), max(placed, default=0.0) + 1.0]
        low, high = min(edges), max(edges)
        if self.by_px:
            reach = BEYOND_TEXT * (high - low)
            low = max(min([low, *placed]), low - reach)
            high = min(max([high, *placed]), high + reach)
        self.low, self.high = low, high
        room = PLOT_RIGHT - left - 2 * MARGIN
        self.scale = min(MOST_ACROSS, room / (high - low)) if self.by_px else 1.0
        self._origin = left + MARGIN if self.by_px else low

    def _has_place(self, fixation: TracedFixation) -> bool:
        """Whether a fixation has a place of its own, or the place of its region."""
        if self.by_px and fixation.placed:
            return True
        return fixation.region_order > 0

    def _columns(self, left: float) -> tuple[Piece, ...]:
        """Equal columns for regions that have no place on the screen."""
        count = len(self.traced.region_names)
        width = (PLOT_RIGHT - left) / max(1, count)
        return tuple(
            Piece(k + 1, 1, left + k * width, 0.0, left + (k + 1) * width, LINE_BOX)
            for k in range(count)
        )

    def at(self, x_px: float) -> float:
        """The place of a point of the screen."""
        return self._origin + (x_px - self.low) * self.scale

    def of(self, fixation: TracedFixation) -> tuple[float, int]:
        """The place of a fixation, and whether it lies beyond the picture: -1 left, 1 right."""
        if self.by_px and fixation.placed:
            x_px = min(max(fixation.x_px, self.low), self.high)
            return self.at(x_px), (fixation.x_px > self.high) - (fixation.x_px < self.low)
        if fixation.region_order:
            own = next(p for p in self.pieces if p.order == fixation.region_order)
            return self.at((own.left_px + own.right_px) / 2), 0
        return PLOT_LEFT + GUTTER / 2, 0


@dataclass(frozen=True, slots=True)
class Segment:
    """A time drawn to scale without a cut: from where down to where, from when until when."""

    top: float
    bottom: float
    start_ms: float
    end_ms: float


@dataclass(frozen=True, slots=True)
class Name:
    """The name of a region over one of its pieces: centre, row from the bottom, room for it."""

    piece: Piece
    x: float
    row: int
    room: float


@dataclass(slots=True)
class Stretch:
    """A run of fixations on one line.

    Attributes
    ----------
    line : int
        The line.
    fixations : list of TracedFixation
        The fixations, in time order.
    used : bool
        Whether they belong to the recording of the trial that is used.
    recording : int
        Which recording of the trial, from 1.
    zero_ms : float
        The onset from which time is counted.
    top, box_top, body_top, bottom : float
        Where names, line and bars begin, and where the bars end.
    segments : list of Segment
        The times.
    names : list of Name
        The names of the line's regions.
    """

    line: int
    fixations: list[TracedFixation]
    used: bool
    recording: int = 1
    zero_ms: float = 0.0
    top: float = 0.0
    box_top: float = 0.0
    body_top: float = 0.0
    bottom: float = 0.0
    segments: list[Segment] = field(default_factory=list)
    names: list[Name] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class Bar:
    """A fixation drawn: place across, top, bottom, and whether it lies beyond the picture."""

    fixation: TracedFixation
    x: float
    top: float
    bottom: float
    beyond: int


@dataclass(frozen=True, slots=True)
class Places:
    """Where everything goes.

    Attributes
    ----------
    across : Across
        Places across.
    per_ms : float
        Px for a millisecond.
    step_ms : int
        Time between two ticks.
    stretches : tuple of Stretch
        From the top.
    bars : tuple of Bar
        In time order.
    bottom : float
        Where the last stretch ends.
    """

    across: Across
    per_ms: float
    step_ms: int
    stretches: tuple[Stretch, ...]
    bars: tuple[Bar, ...]
    bottom: float


def place(traced: TracedTrial, top: float) -> Places:
    """Find a place for every fixation.

    Parameters
    ----------
    traced : TracedTrial
        The trial.
    top : float
        Where the first stretch begins.

    Returns
    -------
    Places
    """
    across = Across(traced)
    onsets = onsets_of(traced.fixations)
    stretches = _stretches(traced, onsets, across)
    times = [_times(stretch.fixations, onsets) for stretch in stretches]
    total_ms = sum(end - start for own in times for start, end in own)
    per_ms = min(MOST_PER_MS, max(LEAST_PER_MS, LONG_PICTURE / max(total_ms, 1.0)))
    step_ms = next((s for s in _STEPS_MS if s * per_ms >= _LEAST_BETWEEN_TICKS), _STEPS_MS[-1])
    bars: list[Bar] = []
    for stretch, own in zip(stretches, times, strict=True):
        stretch.top = top
        stretch.names = _names(traced, across, stretch.line)
        rows = 1 + max((name.row for name in stretch.names), default=0)
        stretch.box_top = top + rows * NAME_HEIGHT + 4
        stretch.body_top = stretch.box_top + LINE_BOX
        y = stretch.body_top + ABOVE_BARS
        for start, end in own:
            stretch.segments.append(Segment(y, y + (end - start) * per_ms, start, end))
            y = stretch.segments[-1].bottom + CUT
        stretch.bottom = y - CUT * bool(own) + BELOW_BARS
        top = stretch.bottom + BETWEEN_STRETCHES
        for fixation in stretch.fixations:
            x, beyond = across.of(fixation)
            onset_ms = onsets[fixation.number]
            segment = next(s for s in stretch.segments if s.start_ms <= onset_ms <= s.end_ms)
            begin = segment.top + (onset_ms - segment.start_ms) * per_ms
            bars.append(Bar(fixation, x, begin, begin + fixation.duration_ms * per_ms, beyond))
    return Places(across, per_ms, step_ms, tuple(stretches), tuple(bars), top - BETWEEN_STRETCHES)


def onsets_of(fixations: Sequence[TracedFixation]) -> dict[int, float]:
    """The onset of each fixation by its number; without onsets, durations end to end.

    Examples
    --------
    >>> nan = float("nan")
    >>> looks = [TracedFixation(n, nan, 200.0, 0.0, 0.0, 1, 1, 1, True, "", 1) for n in (1, 2)]
    >>> onsets_of(looks)
    {1: 0.0, 2: 200.0}
    """
    if all(f.onset_ms == f.onset_ms for f in fixations):
        return {f.number: f.onset_ms for f in fixations}
    onsets, clock_ms = {}, 0.0
    for fixation in fixations:
        onsets[fixation.number] = clock_ms
        # What was merged into another is part of that one's duration already.
        clock_ms += 0.0 if fixation.merged_into else fixation.duration_ms
    return onsets


def _stretches(traced: TracedTrial, onsets: dict[int, float], across: Across) -> list[Stretch]:
    """Runs of fixations on one line, of one recording."""
    first_line = min((piece.line for piece in across.pieces), default=1)
    known = {piece.line for piece in across.pieces}
    hosts = {f.merged_into for f in traced.fixations if f.merged_into}
    stretches: list[Stretch] = []
    before = -float("inf")
    for fixation in traced.fixations:
        used = fixation.left_out_by != "repeated"
        onset_ms = onsets[fixation.number]
        line = fixation.line if fixation.line in known else 0
        # Merging may put a fixation before one that stands before it; a recording goes on then.
        falls = onset_ms < before and fixation.number not in hosts
        before = onset_ms
        last = stretches[-1] if stretches else None
        if last is None or last.used != used or falls:
            recording = 1 if last is None else last.recording + 1
            stretches.append(Stretch(line, [fixation], used, recording))
        elif line and last.line and line != last.line:
            stretches.append(Stretch(line, [fixation], used, last.recording))
        else:
            last.fixations.append(fixation)
            last.line = last.line or line
    zeros: dict[int, float] = {}
    for stretch in stretches:
        first_ms = min(onsets[f.number] for f in stretch.fixations)
        zeros[stretch.recording] = min(first_ms, zeros.get(stretch.recording, first_ms))
    for stretch in stretches:
        stretch.line = stretch.line or first_line
        stretch.zero_ms = zeros[stretch.recording]
    return stretches or [Stretch(first_line, [], used=True)]


def _times(
    fixations: Sequence[TracedFixation], onsets: dict[int, float]
) -> list[tuple[float, float]]:
    """The times that fixations cover, long pauses cut out."""
    times: list[tuple[float, float]] = []
    for onset_ms, end_ms in sorted(
        (onsets[f.number], onsets[f.number] + f.duration_ms) for f in fixations
    ):
        if times and onset_ms - times[-1][1] <= LONGEST_PAUSE_MS:
            times[-1] = times[-1][0], max(times[-1][1], end_ms)
        else:
            times.append((onset_ms, end_ms))
    return times


def _names(traced: TracedTrial, across: Across, line: int) -> list[Name]:
    """The names over the pieces of a line, in as many rows as keep them apart."""
    ends = [-float("inf")] * NAME_ROWS
    names: list[Name] = []
    own = [piece for piece in across.pieces if piece.line == line]
    for piece in sorted(own, key=lambda p: (p.left_px, p.order)):
        left, right = across.at(piece.left_px), across.at(piece.right_px)
        x, wanted = (left + right) / 2, width_of(traced.region(piece.order)) * NAME_LETTER
        free = [row for row in range(NAME_ROWS) if ends[row] <= x - wanted / 2]
        if free:
            row, room = free[0], wanted
        else:
            row, room = 0, max(0.0, min(wanted, right - left))
            row = min(range(NAME_ROWS), key=lambda r: ends[r])
        ends[row] = x + room / 2 + NAME_LETTER
        names.append(Name(piece, x, row, room))
    return names
