"""The pieces of which regions are made, their lines, and all texts' pieces in flat arrays.

A *piece* is one rectangle or one polygon of a region: a region that runs over two lines has two.
A *line* of a text is a row of pieces. Pieces lie sorted by text, then line, then reading position,
so that the pieces of a text, and those of one of its lines, are stretches of the same arrays.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int32]
Offsets = NDArray[np.int64]

#: Two shapes are on one line where they share more than this part of the lower one's height
#: (letters with descenders reach into the next line; a half is the natural border).
SHARED_HEIGHT = 0.5

#: Common area in px² from which on two polygons overlap. Edges that were computed to touch may
#: cross by rounding; a millionth of a pixel is far below that of any real overlap.
OVERLAP_PX2 = 1e-6


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a text: its number from 1 (top), the extent of its box and its middle, in px."""

    number: int
    top_px: float
    bottom_px: float
    middle_px: float


@dataclass(frozen=True, slots=True)
class Shape:
    """The geometry of one text.

    Attributes
    ----------
    extents_px : (p, 4) float64 array
        Left, top, right, bottom of each piece, sorted by line, then reading position.
    orders : (p,) int32 array
        The order of each piece's region, from 1.
    piece_lines : (p,) int32 array
        The number of each piece's line.
    lines : tuple of Line
        The lines that carry text, from the top.
    polygons : (p,) object array or None
        A polygon per piece, where pieces are no rectangles.
    """

    extents_px: Floats
    orders: Integers
    piece_lines: Integers
    lines: tuple[Line, ...]
    polygons: NDArray[Any] | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Geometry:
    """The shapes of T texts in flat arrays: P pieces, S lines.

    Attributes
    ----------
    extents_px : (4, P) float64 array
        Left, top, right and bottom of each piece.
    centres_px : (2, P) float64 array
        Centre of each piece, x and y: of a polygon its centroid.
    orders : (P,) int32 array
        The order of each piece's region in its text.
    piece_lines : (P,) int32 array
        The number of each piece's line in its text.
    line_offsets : (T + 1,) int64 array
        Where the lines of each text start.
    line_numbers : (S,) int32 array
        Number of each line in its text, from 1.
    line_tops_px, line_bottoms_px, line_middles_px : (S,) float64 arrays
        Extent and middle of each line; middles ascend within a text.
    piece_offsets : (S + 1,) int64 array
        Where the pieces of each line start.
    polygons : (P,) object array or None
        A polygon per piece, where pieces are no rectangles.
    """

    extents_px: Floats
    centres_px: Floats
    orders: Integers
    piece_lines: Integers
    line_offsets: Offsets
    line_numbers: Integers
    line_tops_px: Floats
    line_bottoms_px: Floats
    line_middles_px: Floats
    piece_offsets: Offsets
    polygons: NDArray[Any] | None = field(default=None)

    @property
    def line_counts(self) -> Offsets:
        """(T,) int64 array: how many lines each text has."""
        return np.diff(self.line_offsets)

    @property
    def text_offsets(self) -> Offsets:
        """(T + 1,) int64 array: where the pieces of each text start."""
        return self.piece_offsets[self.line_offsets]


def gather(shapes: Sequence[Shape]) -> Geometry:
    """Put the shapes of all texts into flat arrays.

    Parameters
    ----------
    shapes : sequence of Shape
        One per text; at least one.

    Returns
    -------
    Geometry
    """
    lines = [line for shape in shapes for line in shape.lines]
    counts = [
        int(np.count_nonzero(shape.piece_lines == line.number))
        for shape in shapes
        for line in shape.lines
    ]
    extents = np.concatenate([shape.extents_px for shape in shapes]).T.copy()
    polygons = None
    centres = np.stack([(extents[0] + extents[2]) / 2, (extents[1] + extents[3]) / 2])
    outlines = [shape.polygons for shape in shapes if shape.polygons is not None]
    if outlines:
        polygons = np.concatenate(outlines)
        middles = shapely.centroid(polygons)
        centres = np.stack([shapely.get_x(middles), shapely.get_y(middles)])
    return Geometry(
        extents_px=extents,
        centres_px=centres,
        orders=np.concatenate([shape.orders for shape in shapes]).astype(np.int32),
        piece_lines=np.concatenate([shape.piece_lines for shape in shapes]).astype(np.int32),
        line_offsets=offsets_of([len(shape.lines) for shape in shapes]),
        line_numbers=np.array([line.number for line in lines], dtype=np.int32),
        line_tops_px=np.array([line.top_px for line in lines], dtype=np.float64),
        line_bottoms_px=np.array([line.bottom_px for line in lines], dtype=np.float64),
        line_middles_px=np.array([line.middle_px for line in lines], dtype=np.float64),
        piece_offsets=offsets_of(counts),
        polygons=polygons,
    )


def offsets_of(counts: Sequence[int]) -> Offsets:
    """(n + 1,) int64 array of where each of n stretches starts, from their lengths.

    Examples
    --------
    >>> offsets_of([2, 0, 3]).tolist()
    [0, 2, 2, 5]
    """
    return np.concatenate([[0], np.cumsum(counts, dtype=np.int64)]).astype(np.int64)


def rows_of(extents_px: Floats) -> tuple[Integers, tuple[Line, ...]]:
    """Find the lines on which shapes stand, from their vertical extents.

    Shapes are taken from the top by their middles. A shape joins the line being built where it
    shares more than half of the height (its own or the line's, whichever is less) with what all
    shapes of the line have in common; otherwise it begins the next line.

    Parameters
    ----------
    extents_px : (p, 4) float64 array
        Left, top, right and bottom of each shape.

    Returns
    -------
    numbers : (p,) int32 array
        The line of each shape, from 1.
    lines : tuple of Line
        The lines: box around all of its shapes, middle of what they have in common.

    Examples
    --------
    >>> boxes = np.array([[0, 0, 9, 10], [0, 12, 9, 22], [9, 1, 18, 11.0]])
    >>> numbers, lines = rows_of(boxes)
    >>> numbers.tolist(), [line.middle_px for line in lines]
    ([1, 2, 1], [5.5, 17.0])
    """
    tops, bottoms = extents_px[:, 1], extents_px[:, 3]
    rows: list[list[int]] = []
    common: list[tuple[float, float]] = []
    for i in np.argsort((tops + bottoms) / 2, kind="stable").tolist():
        top, bottom = float(tops[i]), float(bottoms[i])
        if rows:
            high, low = max(top, common[-1][0]), min(bottom, common[-1][1])
            least = min(bottom - top, common[-1][1] - common[-1][0])
            if low - high > SHARED_HEIGHT * least:
                rows[-1].append(i)
                common[-1] = (high, low)
                continue
        rows.append([i])
        common.append((top, bottom))
    # The middle of what shapes have in common lies between the least and the greatest of their own
    # middles, so rows come out in the order of theirs.
    numbers = np.zeros(len(extents_px), dtype=np.int32)
    lines = []
    for number, (row, shared) in enumerate(zip(rows, common, strict=True), start=1):
        numbers[row] = number
        box = (float(tops[row].min()), float(bottoms[row].max()))
        lines.append(Line(number, *box, sum(shared) / 2))
    return numbers, tuple(lines)


def shape_of_rows(
    extents_px: Floats, orders: Integers, polygons: NDArray[Any] | None = None
) -> Shape:
    """The shape of a text whose lines follow from where its pieces are.

    Parameters
    ----------
    extents_px : (p, 4) float64 array
        Left, top, right and bottom of each piece.
    orders : (p,) int32 array
        The order of each piece's region.
    polygons : (p,) object array, optional
        The pieces, where they are no rectangles.

    Returns
    -------
    Shape
        Its pieces sorted by line, then order.
    """
    numbers, lines = rows_of(extents_px)
    by = np.lexsort((orders, numbers))
    return Shape(
        extents_px[by],
        orders[by],
        numbers[by],
        lines,
        None if polygons is None else polygons[by],
    )


def overlapping_pairs(polygons: NDArray[Any], orders: Integers) -> list[tuple[int, int]]:
    """Find the regions of one text that have area in common.

    Parameters
    ----------
    polygons : (p,) object array
        The pieces of the text's regions.
    orders : (p,) int32 array
        The order of each piece's region.

    Returns
    -------
    list of (int, int)
        The orders of each overlapping pair of regions, the lower first, sorted, each pair once.
        Shapes that only touch do not overlap.

    Examples
    --------
    >>> boxes = shapely.box([0, 10, 15], 0, [10, 20, 30], 10)
    >>> overlapping_pairs(boxes, np.array([1, 2, 3], dtype=np.int32))
    [(2, 3)]
    """
    first, second = shapely.STRtree(polygons).query(polygons)
    below = orders[first] < orders[second]
    first, second = first[below], second[below]
    areas = shapely.area(shapely.intersection(polygons[first], polygons[second]))
    over = areas > OVERLAP_PX2
    pairs = zip(orders[first[over]].tolist(), orders[second[over]].tolist(), strict=True)
    return sorted(set(pairs))
