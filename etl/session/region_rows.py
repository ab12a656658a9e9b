"""The regions of all texts as plain rows, for the table of regions."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from etl.handoff.regions_table import RegionRow
from etl.regions.layout import columns

if TYPE_CHECKING:
    from etl.regions import RegionLibrary
    from etl.regions.geometry import Geometry

Box = tuple[float, float, float, float]


def region_rows(library: RegionLibrary) -> list[RegionRow]:
    """Every region of every text.

    Parameters
    ----------
    library : RegionLibrary
        The texts of a study.

    Returns
    -------
    list of RegionRow
        Text by text in the order of the definitions, each in reading order.
    """
    places = None if library.geometry is None else _places(library.geometry, library.region_offsets)
    labels = _labels(library)
    rows = []
    for number, text in enumerate(library.texts):
        first = int(library.region_offsets[number])
        keys = tuple(text.keys[name] for name in library.keys)
        for order, (name, said) in enumerate(zip(text.regions, text.region_texts, strict=True), 1):
            lines, box = ((), None) if places is None else places[first + order - 1]
            rows.append(
                RegionRow(
                    keys,
                    name,
                    order,
                    said,
                    _width(said) if said else None,
                    lines,
                    box,
                    labels.get((number, order), ()),
                )
            )
    return rows


def _width(said: str) -> int:
    r"""Characters that a text takes on the screen, all of its lines together.

    >>> _width("two pears\nfell")
    13
    """
    return sum(columns(line)[-1] for line in said.split("\n"))


def _places(
    geometry: Geometry, region_offsets: NDArray[np.int64]
) -> list[tuple[tuple[int, ...], Box | None]]:
    """The lines of each region of each text, and the box around it."""
    pieces = np.diff(geometry.text_offsets)
    region = np.repeat(region_offsets[:-1], pieces) + geometry.orders - 1
    low = np.full((2, region_offsets[-1]), np.inf)
    high = np.full((2, region_offsets[-1]), -np.inf)
    for side in range(2):
        np.minimum.at(low[side], region, geometry.extents_px[side])
        np.maximum.at(high[side], region, geometry.extents_px[side + 2])
    lines: list[dict[int, None]] = [{} for _ in range(int(region_offsets[-1]))]
    for at, line in zip(region.tolist(), geometry.piece_lines.tolist(), strict=True):
        lines[at][line] = None
    boxes = np.concatenate([low, high]).T.tolist()
    return [
        (tuple(own), (box[0], box[1], box[2], box[3]))
        for own, box in zip(lines, boxes, strict=True)
    ]


def _labels(library: RegionLibrary) -> dict[tuple[int, int], tuple[str, ...]]:
    """The labels that stand for each region, by text and order."""
    if library.labels is None:
        return {}
    names = list(library.labels.codes)
    found: dict[tuple[int, int], tuple[str, ...]] = {}
    for place, order in zip(
        library.labels.places.tolist(), library.labels.orders.tolist(), strict=True
    ):
        text, code = divmod(place, len(names))
        found[text, order] = (*found.get((text, order), ()), names[code])
    return found
