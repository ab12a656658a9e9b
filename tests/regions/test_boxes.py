"""Boxes: edges, overlap, rows, tolerance; against brute force and against shapely."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.regions.reading import read_file

Read = Callable[..., Any]
HEADER = "item,region,order,left,top,right,bottom\n"

TOUCHING = HEADER + "1,a,1,0,0,10,10\n1,b,2,10,0,20,10\n"
TOUCHING_RTL = HEADER + "1,a,1,10,0,20,10\n1,b,2,0,0,10,10\n"
STACKED = HEADER + "1,a,1,0,0,10,10\n1,b,2,0,10,10,20\n"
STACKED_UP = HEADER + "1,a,1,0,10,10,20\n1,b,2,0,0,10,10\n"
TWO_ROWS = HEADER + "1,a,1,0,0,40,30\n1,b,2,40,2,80,32\n1,c,3,0,50,60,80\n"
OVERLAPPING = HEADER + "1,a,1,0,0,20,10\n1,b,2,10,0,40,10\n"


def test_right_and_bottom_are_exclusive(read: Read) -> None:
    """Left and top edge in, right and bottom edge out, where no box touches."""
    points = [(0, 0), (0, 9.9), (10, 9.9), (20, 5), (15, 10), (0, 10)]
    assert read("boxes", TOUCHING).orders(points) == [1, 1, 2, 0, 0, 0]


@pytest.mark.parametrize(
    ("content", "point"),
    [
        pytest.param(TOUCHING, (10, 5), id="side-by-side"),
        pytest.param(TOUCHING_RTL, (10, 5), id="right-to-left"),
        pytest.param(STACKED, (5, 10), id="one-below"),
        pytest.param(STACKED_UP, (5, 10), id="one-above"),
    ],
)
def test_point_on_a_shared_edge_goes_to_the_later_region(
    read: Read, content: str, point: tuple[float, float]
) -> None:
    """Whichever side the later region is on."""
    assert read("boxes", content).orders([point]) == [2]


def test_rows_of_a_text_need_not_be_adjacent_nor_in_order(read: Read) -> None:
    """A text is the combination of its keys; order is the column, not the row."""
    content = HEADER + "1,b,2,10,0,20,10\n2,a,1,0,0,10,10\n1,a,1,0,0,10,10\n"
    got = read("boxes", content)
    assert [text.regions for text in got.library.texts] == [("a", "b"), ("a",)]
    assert (got.orders([(5, 5), (15, 5)]), got.orders([(15, 5)], text=1)) == ([1, 2], [0])


def test_boxes_of_two_texts_may_lie_in_one_place(read: Read) -> None:
    """Overlap is looked for within a text only."""
    content = HEADER + "1,a,1,0,0,10,10\n2,a,1,5,0,15,10\n"
    assert not read("boxes", content).findings.failed


def test_line_of_a_point_is_the_row_of_the_box_hit(read: Read) -> None:
    """Boxes at nearly one height are a row; outside the boxes there is no line."""
    got = read("boxes", TWO_ROWS)
    points = [(10, 10), (50, 10), (10, 60), (70, 60), (10, 40)]
    assert got.orders(points) == [1, 2, 3, 0, 0]
    assert got.line_numbers(points) == [1, 1, 2, 0, 0]
    assert got.library.texts[0].lines == 2


def test_nearest_line_takes_points_to_the_nearest_row(read: Read) -> None:
    """Row 1 shares 2-30, middle 16; row 2 is 50-80, middle 65; 40.5 is as near to both."""
    got = read("boxes", TWO_ROWS, lines=True)
    points = [(10, -99), (50, 40.4), (50, 40.5), (70, 60), (40, 31)]
    assert got.line_numbers(points) == [1, 1, 2, 2, 1]
    assert got.orders(points) == [1, 2, 3, 0, 2]


def test_boxes_that_barely_share_a_height_are_on_two_lines(read: Read) -> None:
    """Descenders reach into the next line: 2 px of 30 in common make no row."""
    got = read("boxes", HEADER + "1,a,1,0,0,40,30\n1,b,2,50,28,90,58\n", lines=True)
    assert got.line_numbers([(60, 28.9), (60, 29)]) == [1, 2]


def test_middle_of_a_row_is_that_of_the_height_its_boxes_share(read: Read) -> None:
    """A tall box does not move its line: 10-30 is shared, middle 20; with 60, half-way is 40."""
    content = HEADER + "1,a,1,0,0,40,30\n1,b,2,50,10,90,30\n1,c,3,0,50,40,70\n"
    assert read("boxes", content, lines=True).line_numbers([(5, 39.9), (5, 40)]) == [1, 2]


def test_nearest_centre_is_horizontal_where_the_line_is_known(read: Read) -> None:
    """Centres (10, 15) and (25, 40): from (19, 15) the second is nearer in x alone."""
    content = HEADER + "1,a,1,0,0,20,30\n1,b,2,10,10,40,70\n"
    got = read("boxes", content, overlap="nearest", lines=True)
    assert got.orders([(17.5, 15), (19, 15)]) == [1, 2]


def test_tolerance_on_a_row_is_horizontal(read: Read) -> None:
    """On the nearest row only x decides."""
    got = read("boxes", TWO_ROWS, lines=True, tolerance_px=5)
    assert got.orders([(65, 300), (65.1, 300), (85, -50), (60, 300)]) == [3, 0, 2, 3]


def test_only_x_decides_with_vertical_any(read: Read) -> None:
    """Y may be anything, or missing."""
    got = read("boxes", TOUCHING, vertical="any")
    assert got.orders([(5, 900), (10, float("nan")), (20, 5)]) == [1, 2, 0]


@pytest.mark.parametrize(
    ("overlap", "expected"),
    [("first", [1, 1, 1, 1, 2, 2]), ("nearest", [1, 1, 1, 2, 2, 2])],
)
def test_point_in_two_boxes_goes_where_the_study_says(
    read: Read, overlap: str, expected: list[int]
) -> None:
    """Centres at x = 10 and 25: 17.5 is as near to both, and goes to the earlier."""
    points = [(5, 5), (12, 5), (17.5, 5), (18, 5), (20, 5), (30, 5)]
    assert read("boxes", OVERLAPPING, overlap=overlap).orders(points) == expected


def test_first_goes_by_order_not_by_row(read: Read) -> None:
    """The earlier in order wins, wherever it stands in the file or on the screen."""
    content = HEADER + "1,b,2,0,0,20,10\n1,a,1,10,0,40,10\n"
    assert read("boxes", content, overlap="first").orders([(15, 5)]) == [1]


def test_tolerance_by_hand(read: Read) -> None:
    """Two boxes 10 px apart: the middle between them goes to the later one."""
    content = HEADER + "1,a,1,0,0,10,10\n1,b,2,20,0,30,10\n"
    points = [(15, 5), (14.9, 5), (33, 14), (34, 14), (10, 5), (-5, 5)]
    assert read("boxes", content, tolerance_px=5).orders(points) == [2, 1, 2, 0, 1, 1]


def test_box_of_the_whole_screen_without_key_serves_every_trial(read: Read) -> None:
    """A file without key columns holds one text."""
    got = read("boxes", "region,order,left,top,right,bottom\nleft,1,0,0,960,1080\n")
    assert (got.library.find(()), got.library.texts[0].region_texts) == (0, ("",))


Box = tuple[float, float, float, float]


def naive_region(boxes: list[Box], x: float, y: float, overlap: str, tolerance_px: float) -> int:
    """The region of one point among boxes in reading order, from the rules, one box at a time."""
    orders = range(1, len(boxes) + 1)
    own, edge, proper, distance = [], [], [], {}
    for order, (left, top, right, bottom) in zip(orders, boxes, strict=True):
        if left <= x < right and top <= y < bottom:
            own.append(order)
        if left <= x <= right and top <= y <= bottom:
            edge.append(order)
        if left < x < right and top < y < bottom:
            proper.append(order)
        off = (max(left - x, 0, x - right), max(top - y, 0, y - bottom))
        distance[order] = math.hypot(*off)
    if own and not proper and len(own) == 1:
        return max(edge)
    if own:
        centre = {
            order: math.hypot(
                x - (boxes[order - 1][0] + boxes[order - 1][2]) / 2,
                y - (boxes[order - 1][1] + boxes[order - 1][3]) / 2,
            )
            for order in own
        }
        return min(own) if overlap != "nearest" else min(own, key=lambda o: (centre[o], o))
    nearest = max(orders, key=lambda o: (-distance[o], o))
    return nearest if tolerance_px > 0 and distance[nearest] <= tolerance_px else 0


def written(folder: Path, boxes: list[Box]) -> Path:
    """A definition file of one text."""
    path = folder / "boxes.csv"
    rows = [f"1,r{i},{i},{','.join(map(str, box))}\n" for i, box in enumerate(boxes, start=1)]
    path.write_text(HEADER + "".join(rows), encoding="utf-8")
    return path


@st.composite
def grids_of_boxes(draw: st.DrawFn) -> list[Box]:
    """Boxes in cells of a grid, touching or not, in any order: never overlapping."""
    cells = draw(
        st.lists(
            st.tuples(st.integers(0, 4), st.integers(0, 3)), min_size=1, max_size=8, unique=True
        )
    )
    boxes = []
    for column, row in cells:
        right, bottom = draw(st.sampled_from([(10, 10), (10, 7), (6, 10)]))
        boxes.append((column * 10, row * 10, column * 10 + right, row * 10 + bottom))
    return boxes


@st.composite
def any_boxes(draw: st.DrawFn) -> list[Box]:
    """Boxes anywhere, overlapping or not."""
    side = st.integers(1, 15)
    at = st.integers(0, 30)
    corners = draw(st.lists(st.tuples(at, at, side, side), min_size=1, max_size=6))
    return [(x, y, x + width, y + height) for x, y, width, height in corners]


GRID = np.array([(x / 2, y / 2) for x in range(-12, 112) for y in range(-12, 92)])


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One folder for all examples."""
    return tmp_path_factory.mktemp("boxes")


@settings(deadline=None, max_examples=40)
@given(boxes=grids_of_boxes(), tolerance_px=st.sampled_from([0, 1, 2.5, 6]))
def test_every_half_pixel_equals_brute_force(
    folder: Path, boxes: list[Box], tolerance_px: float
) -> None:
    """Points inside, on edges, on corners and around, against one box at a time."""
    got = read_file(written(folder, boxes), "boxes", tolerance_px=tolerance_px)
    points = GRID[np.random.default_rng(len(boxes)).permutation(len(GRID))[:600]]
    expected = [naive_region(boxes, x, y, "error", tolerance_px) for x, y in points.tolist()]
    assert got.orders(points) == expected


@settings(deadline=None, max_examples=40)
@given(
    boxes=any_boxes(),
    overlap=st.sampled_from(["first", "nearest"]),
    tolerance_px=st.sampled_from([0, 3]),
)
def test_overlapping_boxes_equal_brute_force(
    folder: Path, boxes: list[Box], overlap: str, tolerance_px: float
) -> None:
    """However many boxes hold a point, the one that the rule names gets it."""
    path = written(folder, boxes)
    got = read_file(path, "boxes", overlap=overlap, tolerance_px=tolerance_px)
    points = GRID[np.random.default_rng(len(boxes)).permutation(len(GRID))[:600]]
    expected = [naive_region(boxes, x, y, overlap, tolerance_px) for x, y in points.tolist()]
    assert got.orders(points) == expected


@settings(deadline=None, max_examples=30)
@given(boxes=any_boxes())
def test_overlap_is_an_error_just_where_shapely_finds_common_area(
    folder: Path, boxes: list[Box]
) -> None:
    """Touching is no overlap (Simple Features, ISO 19125: `overlaps` needs common interior)."""
    got = read_file(written(folder, boxes), "boxes")
    shapes = [shapely.box(*box) for box in boxes]
    common = [a.intersection(b).area for i, a in enumerate(shapes) for b in shapes[:i]]
    assert got.findings.count("error") == sum(area > 0 for area in common)


@settings(deadline=None, max_examples=30)
@given(boxes=grids_of_boxes())
def test_points_properly_inside_are_those_that_shapely_contains(
    folder: Path, boxes: list[Box]
) -> None:
    """Shapely's scalar predicate `contains`, point by point."""
    got = read_file(written(folder, boxes), "boxes")
    shapes = [shapely.box(*box) for box in boxes]
    points = np.random.default_rng(len(boxes)).uniform(-5, 55, (200, 2))
    expected = [
        sum(i for i, shape in enumerate(shapes, start=1) if shape.contains(shapely.Point(x, y)))
        for x, y in points.tolist()
    ]
    assert got.orders(points) == expected
