"""Definitions with one region a row: boxes, polygons in Well-Known Text, labels of the log."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
import shapely
from numpy.typing import NDArray

from etl.regions.geometry import Shape, overlapping_pairs, shape_of_rows
from etl.regions.sources import (
    Draft,
    Group,
    Source,
    Text,
    number_in,
    order_in,
    orders_run_through,
)

SIDES = ("left", "top", "right", "bottom")

#: What a shape of a text is made of: its rows in reading order, and their polygons.
Polygons = NDArray[Any]


def texts_of_boxes(source: Source, *, may_overlap: bool) -> list[Draft]:
    """Read texts whose regions are boxes, one a row.

    Parameters
    ----------
    source : Source
        A file with the columns ``region``, ``order``, ``left``, ``top``, ``right``, ``bottom``.
    may_overlap : bool
        Whether regions may have area in common; where not, those that have are errors.

    Returns
    -------
    list of Draft
        The texts that could be understood; what is wrong is recorded in the source's findings.
    """
    columns = {side: source.cells.texts(side) for side in SIDES}

    def box_in(row: int) -> Any:
        return _box_in(source, row, [columns[side][row] for side in SIDES])

    return _texts_of_shapes(source, box_in, "left", _shape_of_boxes, may_overlap=may_overlap)


def texts_of_polygons(source: Source, *, may_overlap: bool) -> list[Draft]:
    """Read texts whose regions are polygons, one a row, in Well-Known Text.

    Parameters
    ----------
    source : Source
        A file with the columns ``region``, ``order``, ``wkt``.
    may_overlap : bool
        Whether regions may have area in common; where not, those that have are errors.

    Returns
    -------
    list of Draft
        The texts that could be understood; what is wrong is recorded in the source's findings.

    References
    ----------
    ISO 19125-1:2004, Simple feature access, part 1 (OGC 06-103r4): Well-Known Text, and what
    makes a polygon valid.
    """
    cells = source.cells.texts("wkt")

    def polygon_in(row: int) -> Any:
        return _polygon_in(source, row, cells[row])

    return _texts_of_shapes(source, polygon_in, "wkt", _shape_of_polygons, may_overlap=may_overlap)


def texts_of_labels(source: Source) -> list[Draft]:
    """Read texts whose regions are labels that the log carries, one label a row.

    Parameters
    ----------
    source : Source
        A file with the columns ``label``, ``region``, ``order``.

    Returns
    -------
    list of Draft
        The texts that could be understood; what is wrong is recorded in the source's findings.
    """
    labels = source.cells.texts("label")
    regions = source.cells.texts("region")
    cells = source.cells.texts("order")
    drafts = []
    for group in source.groups():
        sound = True
        row_of_label: dict[str, int] = {}
        row_of_region: dict[str, int] = {}
        orders: dict[int, int] = {}
        for row in group.rows:
            named = _is_named(source, row, "region", regions[row])
            named &= _is_label(source, row, labels[row])
            order = order_in(source, row, cells[row])
            if not named or order is None:
                sound = False
                continue
            twice = row_of_label.setdefault(labels[row], row)
            if twice != row:
                sound = False
                _named_twice(source, group, row, twice, "label", labels[row])
                continue
            first = row_of_region.setdefault(regions[row], row)
            if first == row:
                orders[row] = order
            elif first in orders and orders[first] != order:
                sound = False
                source.error(
                    "the labels of one region have different orders",
                    row=row,
                    column="order",
                    found=str(order),
                    expected=f'{orders[first]}, the order of "{regions[row]}" in line '
                    f"{source.line(first)} ({source.name_of(group.values)})",
                    fix="give all labels of a region the same order",
                )
        facts = source.facts_of(group)
        if not sound or not orders_run_through(source, group, regions, orders):
            continue
        order_of = {regions[row]: order for row, order in orders.items()}
        in_order = tuple(sorted(order_of, key=lambda name: order_of[name]))
        drafts.append(
            Draft(
                _text(source, group, facts, in_order, lines=0),
                labels={labels[row]: order_of[regions[row]] for row in group.rows},
            )
        )
    return drafts


def _texts_of_shapes(
    source: Source,
    shape_in: Callable[[int], Any],
    column: str,
    shape_of: Callable[[Polygons], Shape],
    *,
    may_overlap: bool,
) -> list[Draft]:
    """Texts from rows that hold a region's name, its order and its shape."""
    regions = source.cells.texts("region")
    cells = source.cells.texts("order")
    drafts = []
    for group in source.groups():
        row_of_region: dict[str, int] = {}
        orders: dict[int, int] = {}
        polygons: dict[int, Any] = {}
        sound = True
        for row in group.rows:
            named = _is_named(source, row, "region", regions[row])
            order, polygon = order_in(source, row, cells[row]), shape_in(row)
            twice = row_of_region.setdefault(regions[row], row) if named else row
            if twice != row:
                _named_twice(source, group, row, twice, "region", regions[row])
            if not named or order is None or polygon is None or twice != row:
                sound = False
                continue
            orders[row], polygons[row] = order, polygon
        facts = source.facts_of(group)
        if not sound or not orders_run_through(source, group, regions, orders):
            continue
        rows = sorted(orders, key=lambda row: orders[row])
        shapes = np.array([polygons[row] for row in rows], dtype=object)
        if not may_overlap and _overlap(source, group, rows, regions, shapes, column):
            continue
        shape = shape_of(shapes)
        text = _text(
            source, group, facts, tuple(regions[row] for row in rows), lines=len(shape.lines)
        )
        drafts.append(Draft(text, shape))
    return drafts


def _text(
    source: Source, group: Group, facts: Mapping[str, str], regions: tuple[str, ...], *, lines: int
) -> Text:
    """A text that is known by its regions' names only."""
    return Text(
        keys=dict(zip(source.keys, group.values, strict=True)),
        facts=dict(facts),
        regions=regions,
        region_texts=("",) * len(regions),
        whole="",
        lines=lines,
        path=source.cells.shown,
        line=source.line(group.rows[0]),
    )


def _is_named(source: Source, row: int, column: str, name: str) -> bool:
    """Whether a name is there; says so where it is not."""
    if not name:
        source.error(
            f"a {column} has no name",
            row=row,
            column=column,
            found=name,
            expected=f"the name of the {column}",
            fix="fill in the cell, or remove the row",
        )
    return bool(name)


def _is_label(source: Source, row: int, label: str) -> bool:
    """Whether a label is there and can occur in a log; says so where not."""
    if not label or label not in source.missing:
        return _is_named(source, row, "label", label)
    source.error(
        f'the label "{label}" is a mark for no value too, so no fixation can have it',
        row=row,
        column="label",
        found=label,
        expected="a label that is not in [logs] missing",
        fix=f'take "{label}" out of [logs] missing of the study file, or rename the label here and '
        "in the logs",
    )
    return False


def _named_twice(
    source: Source, group: Group, row: int, first: int, column: str, name: str
) -> None:
    """Record that a region or a label stands twice in one text."""
    source.error(
        f"a {column} is named twice in one text",
        row=row,
        column=column,
        found=name,
        expected=f"each {column} once; line {source.line(first)} holds the other "
        f"({source.name_of(group.values)})",
        fix=source.way_out_of_twice(f"rename one of the two {column}s, or remove it"),
    )


def _overlap(
    source: Source,
    group: Group,
    rows: Sequence[int],
    regions: Sequence[str],
    polygons: Polygons,
    column: str,
) -> bool:
    """Whether regions of a text overlap; says which."""
    pairs = overlapping_pairs(*_parts(polygons))
    for pair in pairs:
        first, second = sorted(rows[order - 1] for order in pair)
        source.error(
            "two regions of a text overlap",
            row=second,
            column=column,
            found=regions[second],
            expected=f'no area in common with "{regions[first]}" in line {source.line(first)} '
            f"({source.name_of(group.values)})",
            fix="correct the places, or say in the study file which region wins: "
            'overlap = "first" or "nearest" in [regions]',
        )
    return bool(pairs)


def _box_in(source: Source, row: int, cells: Sequence[str]) -> Any:
    """A box as a polygon; None where a problem was recorded."""
    sides = [
        number_in(source, row, side, cell, "a number in px")
        for side, cell in zip(SIDES, cells, strict=True)
    ]
    sound = None not in sides
    for start, end in ((0, 2), (1, 3)):
        low, high = sides[start], sides[end]
        if low is not None and high is not None and high <= low:
            sound = False
            source.error(
                f"a box ends before it begins: {SIDES[end]} is not above {SIDES[start]}",
                row=row,
                column=SIDES[end],
                found=cells[end],
                expected=f"more than {SIDES[start]}, which is {cells[start]}",
                fix="correct the box; px count from the left and from the top of the screen",
            )
    if not sound:
        return None
    return shapely.box(*sides)


def _polygon_in(source: Source, row: int, cell: str) -> Any:
    """A polygon from Well-Known Text; None where a problem was recorded."""

    def wrong(problem: str, expected: str, fix: str) -> None:
        source.error(problem, row=row, column="wkt", found=cell, expected=expected, fix=fix)

    example = "for example POLYGON ((200 500, 284 500, 284 560, 200 560, 200 500))"
    try:
        with np.errstate(invalid="ignore"):  # a coordinate "nan" is found below
            shape = shapely.from_wkt(cell, on_invalid="raise")
    except shapely.errors.GEOSException as why:
        # The reader puts the kind of fault before the reason: "ParseException: Expected …".
        reason = str(why).partition(": ")[2] or str(why)
        wrong(
            "this cannot be read as Well-Known Text",
            f"a POLYGON or MULTIPOLYGON ({reason})",
            f"correct the cell, {example}",
        )
        return None
    kind = shapely.get_type_id(shape)
    if kind not in {shapely.GeometryType.POLYGON, shapely.GeometryType.MULTIPOLYGON}:
        wrong(
            f"a {shape.geom_type.upper()} encloses no area",
            "a POLYGON or MULTIPOLYGON",
            "draw the region's outline; a region over two lines is one MULTIPOLYGON",
        )
    elif shape.is_empty:
        wrong(
            "a region's polygon is empty",
            "a POLYGON or MULTIPOLYGON with corners",
            f"list its corners, {example}",
        )
    elif _has_more_than_two_dimensions(shape):
        wrong(
            "a region's polygon has more than x and y",
            "two numbers for each corner",
            f"leave out heights and measures, {example}",
        )
    elif not shapely.is_valid(shape):
        wrong(
            "a region's polygon is not valid",
            f"a simple outline ({shapely.is_valid_reason(shape)})",
            "list the corners in the order in which one walks around the region",
        )
    else:
        return shape
    return None


def _has_more_than_two_dimensions(shape: Any) -> bool:
    """Whether corners carry heights or measures."""
    # Measures came to shapely after 2.0; an older one refuses to read them.
    has_measure = getattr(shapely, "has_m", None)
    return bool(shapely.has_z(shape)) or (has_measure is not None and bool(has_measure(shape)))


def _shape_of_boxes(polygons: Polygons) -> Shape:
    """The shape of a text of boxes, in reading order."""
    return shape_of_rows(shapely.bounds(polygons), np.arange(1, len(polygons) + 1, dtype=np.int32))


def _shape_of_polygons(polygons: Polygons) -> Shape:
    """The shape of a text of polygons, in reading order; a part of a region is a piece."""
    parts, orders = _parts(polygons)
    return shape_of_rows(shapely.bounds(parts), orders, parts)


def _parts(polygons: Polygons) -> tuple[Polygons, NDArray[np.int32]]:
    """The parts of regions in reading order, and the order of each part's region."""
    parts, owner = shapely.get_parts(polygons, return_index=True)
    full = ~shapely.is_empty(parts)  # a valid MULTIPOLYGON may have an EMPTY part
    return parts[full], (owner[full] + 1).astype(np.int32)
