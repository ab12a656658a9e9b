"""What the methods of line assignment are told of a text: its lines, and where its words are."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from etl.errors import FaultError
from etl.lines import Passage
from etl.regions import RegionLibrary
from etl.regions.geometry import Geometry
from etl.regions.layout import columns, edge_px

if TYPE_CHECKING:
    from etl.study.models import Layout

#: What is wider than so many lines are apart is no word but a stretch of text (writing without
#: blanks, or a region of many words), and is told as parts about as wide as words (our choice: a
#: word of six letters with its blank is about as wide as lines are apart).
WIDEST_WORD_LINES, PART_LINES = 4.0, 1.0


class _Stretch(NamedTuple):
    """A word, or a region's piece: the place of its line from 0, and where it begins and ends."""

    line: int
    left_px: float
    right_px: float


def passage_of(library: RegionLibrary, text: int, layout: Layout | None) -> Passage:
    """Say where lines and words of a text are.

    Parameters
    ----------
    library : RegionLibrary
        The texts of the study; with geometry.
    text : int
        Index of a text of several lines.
    layout : Layout or None
        Where laid-out texts stand; None for boxes and polygons, of which each counts as a word.

    Returns
    -------
    Passage
        Mirrored where the text is read from right to left.
    """
    geometry = _geometry_of(library)
    first, stop = geometry.line_offsets[text : text + 2].tolist()
    middles = geometry.line_middles_px[first:stop]
    if layout is None:
        stretches = _pieces(geometry, first, stop)
    else:
        places = {n: i for i, n in enumerate(geometry.line_numbers[first:stop].tolist())}
        stretches = list(_words(library.texts[text].whole, layout, places))
    height_px = float(np.median(np.diff(middles)))
    words = [part for stretch in stretches for part in _parts(stretch, height_px)]
    mirrored = is_right_to_left(library, text)
    words.sort(key=lambda word: (word.line, -word.right_px if mirrored else word.left_px))
    passage = Passage(
        middles,
        np.array([(word.left_px + word.right_px) / 2 for word in words]),
        np.array([word.line for word in words], dtype=np.int32),
        height_px,
        max(word.right_px for word in words) - min(word.left_px for word in words),
    )
    return passage.mirrored if mirrored else passage


def is_right_to_left(library: RegionLibrary, text: int) -> bool:
    """Whether a text is read from right to left.

    Parameters
    ----------
    library : RegionLibrary
        The texts of the study; with geometry.
    text : int
        Index of a text.

    Returns
    -------
    bool
        As the layout says; of boxes and polygons, whether on most steps from one to the next of
        the same line reading goes to the left.
    """
    geometry = _geometry_of(library)
    if library.manner is None or library.manner.laid_out:
        return library.manner is not None and library.manner.right_to_left
    own = slice(*geometry.text_offsets[text : text + 2].tolist())
    by = np.lexsort((geometry.orders[own], geometry.piece_lines[own]))
    same = np.diff(geometry.piece_lines[own][by]) == 0
    steps_px = np.diff(geometry.centres_px[0, own][by])[same]
    return bool((steps_px < 0).sum() > (steps_px > 0).sum())


def _geometry_of(library: RegionLibrary) -> Geometry:
    """The places of a study's regions."""
    if library.geometry is None:
        raise FaultError("regions known by labels were asked for lines")
    return library.geometry


def _pieces(geometry: Geometry, first: int, stop: int) -> list[_Stretch]:
    """The pieces of regions on some lines."""
    left, _, right, _ = geometry.extents_px
    return [
        _Stretch(slot - first, float(left[piece]), float(right[piece]))
        for slot in range(first, stop)
        for piece in range(*geometry.piece_offsets[slot : slot + 2].tolist())
    ]


def _words(whole: str, layout: Layout, places: dict[int, int]) -> Iterator[_Stretch]:
    """The words of a laid-out text; its lines are numbered from 1, blank ones included."""
    for number, line in enumerate(whole.split("\n"), start=1):
        if number not in places:
            continue
        at = columns(line)
        for found in re.finditer(r"\S+", line):
            start, end = (edge_px(layout, at[place]) for place in found.span())
            if start != end:
                yield _Stretch(places[number], min(start, end), max(start, end))


def _parts(stretch: _Stretch, height_px: float) -> Iterator[_Stretch]:
    """A word as it is, or a long stretch in parts."""
    width_px = stretch.right_px - stretch.left_px
    count = 1
    if width_px > WIDEST_WORD_LINES * height_px:
        count = math.ceil(width_px / (PART_LINES * height_px))
    for part in range(count):
        yield _Stretch(
            stretch.line,
            stretch.left_px + width_px * part / count,
            stretch.left_px + width_px * (part + 1) / count,
        )
