"""Point to region, for whole arrays of points at once.

Nothing here loops over points, trials or texts: the loops are over the steps of a binary search,
or over the rank of a piece among the pieces that a point may lie in. Of boxes these are all of its
text or line, of which there are few and which cost next to nothing to look at; of polygons, those
that a tree over all texts finds near it.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Literal

import numpy as np
import shapely
from numpy.typing import NDArray

from etl.regions.geometry import Floats, Geometry, Integers, Offsets
from etl.regions.line_search import last_at_or_before, nearest_line, numbered_line

Overlap = Literal["error", "first", "nearest"]
Flags = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Manner:
    """How points are taken to regions.

    Attributes
    ----------
    only_x : bool
        Only x decides: texts of one line, y is not looked at (``vertical = "any"``).
    nearest_line : bool
        Every point is first taken to the nearest line, in texts of one line too.
    laid_out : bool
        Pieces are stretches of laid-out text: side by side on a line, never overlapping.
    right_to_left : bool
        The direction of laid-out text.
    tolerance_px : float
        How far outside a region a point may be to be taken to it; 0 is off.
    overlap : {"error", "first", "nearest"}
        Which region gets a point inside several.
    """

    only_x: bool
    nearest_line: bool
    laid_out: bool
    right_to_left: bool
    tolerance_px: float
    overlap: Overlap


@dataclass(frozen=True, slots=True, eq=False)
class Assigned:
    """Where points were taken.

    Attributes
    ----------
    order : (n,) int32 array
        The order of each point's region in its text, from 1; 0 outside every region.
    line : (n,) int32 array
        The number of each point's line, from 1 (top); 0 on no line.
    """

    order: Integers
    line: Integers


@dataclass(slots=True)
class _Points:
    """Points that have coordinates, with the stretch of pieces each may lie in."""

    x: Floats
    y: Floats
    text: Offsets
    first: Offsets
    stop: Offsets
    on_line: Flags  # only x on a line that is known already decides

    def only(self, chosen: NDArray[np.int64]) -> _Points:
        return _Points(
            self.x[chosen],
            self.y[chosen],
            self.text[chosen],
            self.first[chosen],
            self.stop[chosen],
            self.on_line[chosen],
        )


def assign(
    geometry: Geometry,
    manner: Manner,
    text: NDArray[np.integer],
    x_px: Floats,
    y_px: Floats,
    line: Integers | None = None,
) -> Assigned:
    """Take points to the regions of their texts.

    Parameters
    ----------
    geometry : Geometry
        The pieces and lines of T texts.
    manner : Manner
        How points are taken to regions.
    text : (n,) integer array
        The text each point was made on, from 0; -1 for none.
    x_px, y_px : (n,) float64 arrays
        Where it is, y down. NaN: no coordinate.
    line : (n,) int32 array, optional
        The line of each point where it is known, numbered as the text's lines are; 0 for none, -1
        where it is not known. On a known line only x decides.

    Returns
    -------
    Assigned
        A point without a coordinate that is needed, or without a text, is outside, on line 0 if
        its line is not known.

    Raises
    ------
    FaultError
        If a text has no line of the number given.
    """
    order = np.zeros(len(text), dtype=np.int32)
    given = np.full(len(text), -1, dtype=np.int32) if line is None else line
    # A point whose line is known is on it, also where it has no coordinate to be looked up by.
    number = np.where((text >= 0) & (given > 0), given, 0).astype(np.int32)
    usable = (text >= 0) & np.isfinite(x_px) & (given != 0)
    if not manner.only_x:
        usable &= np.isfinite(y_px) | (given > 0)
    at = np.flatnonzero(usable)
    texts, x, y = text[at].astype(np.int64), x_px[at], y_px[at]
    known_line = given[at] > 0
    by_line = np.full(len(geometry.line_counts), manner.nearest_line or manner.only_x)
    if manner.laid_out:
        by_line |= geometry.line_counts > 1
    on_line = by_line[texts] | known_line
    slot = geometry.line_offsets[texts]
    if not manner.only_x:
        rows = np.flatnonzero(on_line & ~known_line)
        slot[rows] = nearest_line(geometry, texts[rows], y[rows])
    rows = np.flatnonzero(known_line)
    slot[rows] = numbered_line(geometry, texts[rows], given[at][rows])
    points = _Points(
        x,
        y,
        texts,
        np.where(on_line, geometry.piece_offsets[slot], geometry.text_offsets[texts]),
        np.where(on_line, geometry.piece_offsets[slot + 1], geometry.text_offsets[texts + 1]),
        on_line,
    )
    if manner.laid_out:
        in_band = (geometry.line_tops_px[slot] <= y) & (y < geometry.line_bottoms_px[slot])
        piece = _along_lines(geometry, manner, points, in_band | on_line)
        known = on_line | in_band
    else:
        if geometry.polygons is not None:
            # On a known line a point is looked up where it meets the line's middle.
            points.y = np.where(on_line, geometry.line_middles_px[slot], y)
        piece = _among_shapes(geometry, manner, points)
        known = on_line
    inside = piece >= 0
    order[at] = np.where(inside, geometry.orders[piece], 0)
    of_piece = np.where(inside, geometry.piece_lines[piece], 0)
    number[at] = np.where(known, geometry.line_numbers[slot], of_piece)
    return Assigned(order, number)


def _along_lines(geometry: Geometry, manner: Manner, points: _Points, level: Flags) -> Offsets:
    """The piece of laid-out text that each point is taken to, or -1.

    ``level``: the point is at the height of its line, or was taken there.
    """
    left, top, right, bottom = geometry.extents_px
    # Along the reading direction a piece reaches from its start up to, not including, its end:
    # a point on an edge belongs to the region that starts there.
    start, end, along = (
        (-right, -left, -points.x)
        if manner.right_to_left
        else (
            left,
            right,
            points.x,
        )
    )
    if not len(start):
        return np.full(len(along), -1, dtype=np.int64)
    before = last_at_or_before(start, points.first, points.stop, along)
    has_before = before >= points.first
    safe = np.maximum(before, 0)
    inside = level & has_before & (along < end[safe])
    piece = np.where(inside, before, -1)
    if manner.tolerance_px > 0:
        rest = np.flatnonzero(~inside & (points.first < points.stop))
        near, has_near = safe[rest], has_before[rest]
        after = before[rest] + 1
        has_after = after < points.stop[rest]
        after = np.minimum(after, len(start) - 1)
        u = along[rest]
        y = points.y[rest]
        # Before a text's first piece, `near` is a piece of the text before: not one to measure by.
        own = np.where(has_near, near, after)
        off = np.maximum(np.maximum(top[own] - y, y - bottom[own]), 0.0)
        off = np.where(points.on_line[rest], 0.0, off)
        to_near = np.where(has_near, np.hypot(np.maximum(u - end[near], 0.0), off), np.inf)
        to_after = np.where(has_after, np.hypot(start[after] - u, off), np.inf)
        best = np.where(to_after <= to_near, after, near)
        within = np.minimum(to_after, to_near) <= manner.tolerance_px
        piece[rest] = np.where(within, best, -1)
    return piece


def _among_shapes(geometry: Geometry, manner: Manner, points: _Points) -> Offsets:
    """The box or polygon that each point is taken to, or -1."""
    choice = _Choice(geometry, manner, len(points.x))
    for at, near in _candidates(geometry, manner, points):
        choice.offer(at, points.only(at), near)
    piece = choice.decided()
    if manner.tolerance_px > 0:
        rest = np.flatnonzero(piece < 0)
        piece[rest] = _nearest_shape(geometry, manner, points.only(rest))
    return piece


def _candidates(
    geometry: Geometry, manner: Manner, points: _Points
) -> Iterator[tuple[NDArray[np.int64], Offsets]]:
    """One piece after the other that points may lie in: which points, and which piece of each."""
    if geometry.polygons is None:
        for rank in range(int((points.stop - points.first).max(initial=0))):
            at = np.flatnonzero(points.first + rank < points.stop)
            yield at, points.first[at] + rank
        return
    aside, tree = _tree(geometry, manner.tolerance_px)
    at, piece = tree.query(shapely.points(points.x + aside * points.text, points.y))
    own = (points.first[at] <= piece) & (piece < points.stop[at])
    at, piece = at[own], piece[own]
    order = np.lexsort((piece, at))
    at, piece = at[order], piece[order]
    rank = np.arange(len(at)) - np.searchsorted(at, at)
    for wanted in range(int(rank.max(initial=-1)) + 1):
        chosen = rank == wanted
        yield at[chosen], piece[chosen]


@lru_cache(maxsize=1)
def _tree(geometry: Geometry, tolerance_px: float) -> tuple[float, Any]:
    """A tree over the frames of all pieces, and how far aside each text is moved in it.

    Texts are shown at the same place, so that each must be moved to where no other is. Frames are
    wider than the pieces by the tolerance, and by a pixel: moving costs digits.
    """
    left, top, right, bottom = geometry.extents_px
    wider = tolerance_px + 1.0
    aside = float(right.max() - left.min()) + 2 * wider
    moved = aside * np.repeat(np.arange(len(geometry.line_counts)), np.diff(geometry.text_offsets))
    frames = shapely.box(left + moved - wider, top - wider, right + moved + wider, bottom + wider)
    return aside, shapely.STRtree(frames)


class _Choice:
    """Decides between the shapes that hold a point, as they are offered one by one.

    A shape *holds* a point inside it or on its edge. Of a box, the right and the bottom edge are
    not its own: a point there belongs to it only where another box's own edge touches it there.
    A point on edges alone goes to the latest region that holds it; a point properly inside a
    region is where ``overlap`` decides.
    """

    def __init__(self, geometry: Geometry, manner: Manner, count: int) -> None:
        self.geometry = geometry
        self.first = manner.overlap != "nearest"
        self.proper = np.zeros(count, dtype=bool)  # properly inside a shape
        self.owners = np.zeros(count, dtype=np.int32)  # shapes that hold it as their own
        self.chosen = np.full(count, -1, dtype=np.int64)  # by `overlap`, among the owners
        self.score = np.full(count, np.inf)
        self.latest = np.full(count, -1, dtype=np.int64)  # among all that hold it
        self.latest_order = np.zeros(count, dtype=np.int32)

    def offer(self, at: NDArray[np.int64], points: _Points, piece: Offsets) -> None:
        """Offer one piece to each of some points."""
        holds, own, proper = (
            _held_by_boxes(self.geometry, points, piece)
            if self.geometry.polygons is None
            else _held_by_polygons(self.geometry, points, piece)
        )
        held = np.flatnonzero(holds)
        at, piece, own, proper = at[held], piece[held], own[held], proper[held]
        order = self.geometry.orders[piece]
        later = order > self.latest_order[at]
        self.latest[at[later]] = piece[later]
        self.latest_order[at[later]] = order[later]
        self.proper[at] |= proper
        self.owners[at] += own
        score = order.astype(np.float64)
        if not self.first:
            x_off = points.x[held] - self.geometry.centres_px[0, piece]
            y_off = points.y[held] - self.geometry.centres_px[1, piece]
            score = np.hypot(x_off, np.where(points.on_line[held], 0.0, y_off))
        chosen = self.chosen[at]
        tied = (score == self.score[at]) & (chosen >= 0)
        earlier = order < self.geometry.orders[np.maximum(chosen, 0)]
        better = own & ((score < self.score[at]) | (tied & earlier))
        self.chosen[at[better]] = piece[better]
        self.score[at[better]] = score[better]

    def decided(self) -> Offsets:
        """The piece of each point, or -1."""
        if self.geometry.polygons is None:
            # Two boxes that own one point overlap; touching boxes never both own it.
            by_overlap = self.proper | (self.owners > 1)
        else:
            by_overlap = self.proper
        return np.where(self.owners == 0, -1, np.where(by_overlap, self.chosen, self.latest))


def _held_by_boxes(
    geometry: Geometry, points: _Points, piece: Offsets
) -> tuple[Flags, Flags, Flags]:
    """Whether each box holds its point, holds it as its own, has it properly inside."""
    left, top, right, bottom = geometry.extents_px[:, piece]
    x, y, free = points.x, points.y, points.on_line
    holds = (left <= x) & (x <= right) & (free | ((top <= y) & (y <= bottom)))
    own = holds & (x < right) & (free | (y < bottom))
    proper = own & (left < x) & (free | (top < y))
    return holds, own, proper


def _held_by_polygons(
    geometry: Geometry, points: _Points, piece: Offsets
) -> tuple[Flags, Flags, Flags]:
    """Whether each polygon holds its point (as its own, always), has it properly inside."""
    assert geometry.polygons is not None  # noqa: S101 - the caller has looked
    left, top, right, bottom = geometry.extents_px[:, piece]
    x, y = points.x, points.y
    holds = (left <= x) & (x <= right) & (top <= y) & (y <= bottom)
    near = np.flatnonzero(holds)
    proper = np.zeros(len(x), dtype=bool)
    polygons = geometry.polygons[piece[near]]
    holds[near] = shapely.intersects_xy(polygons, x[near], y[near])
    proper[near] = shapely.contains_xy(polygons, x[near], y[near])
    return holds, holds, proper


def _nearest_shape(geometry: Geometry, manner: Manner, points: _Points) -> Offsets:
    """The nearest shape within the tolerance, of equally near ones the latest; or -1."""
    best = np.full(len(points.x), -1, dtype=np.int64)
    best_distance = np.full(len(points.x), np.inf)
    best_order = np.zeros(len(points.x), dtype=np.int32)
    for at, piece in _candidates(geometry, manner, points):
        some = points.only(at)
        left, top, right, bottom = geometry.extents_px[:, piece]
        x_off = np.maximum(np.maximum(left - some.x, some.x - right), 0.0)
        y_off = np.maximum(np.maximum(top - some.y, some.y - bottom), 0.0)
        if geometry.polygons is None:
            y_off = np.where(some.on_line, 0.0, y_off)
        distance = np.hypot(x_off, y_off)
        if geometry.polygons is not None:
            near = np.flatnonzero(distance <= manner.tolerance_px)
            where = shapely.points(some.x[near], some.y[near])
            distance[near] = shapely.distance(geometry.polygons[piece[near]], where)
        order = geometry.orders[piece]
        tied = (distance == best_distance[at]) & (order > best_order[at])
        better = (distance <= manner.tolerance_px) & ((distance < best_distance[at]) | tied)
        best[at[better]] = piece[better]
        best_distance[at[better]] = distance[better]
        best_order[at[better]] = order[better]
    return best
