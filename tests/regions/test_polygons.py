"""Polygons in Well-Known Text, against shapely's scalar predicates and hand-made boxes.

The standard is Simple Features (ISO 19125-1, OGC 06-103r4).
"""

from __future__ import annotations

import pickle
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
HEADER = "item\tregion\torder\twkt\n"

#: A square of 20 px cut by its diagonal from (0, 0) to (20, 20).
DIAGONAL = (
    HEADER
    + "1\ta\t1\tPOLYGON ((0 0, 20 20, 0 20, 0 0))\n"
    + "1\tb\t2\tPOLYGON ((0 0, 20 0, 20 20, 0 0))\n"
)

#: b starts at the end of line 1 and goes on at the start of line 2.
TWO_LINES = (
    HEADER
    + "1\ta\t1\tPOLYGON ((0 0, 30 0, 30 20, 0 20, 0 0))\n"
    + "1\tb\t2\tMULTIPOLYGON (((30 0, 60 0, 60 20, 30 20, 30 0)), "
    + "((0 30, 20 30, 20 50, 0 50, 0 30)))\n"
    + "1\tc\t3\tPOLYGON ((20 30, 60 30, 60 50, 20 50, 20 30))\n"
)


def test_point_on_a_shared_edge_goes_to_the_later_region(read: Read) -> None:
    """On the diagonal, the corners included."""
    points = [(5, 10), (10, 5), (10, 10), (0, 0), (20, 20)]
    assert read("wkt", DIAGONAL).orders(points) == [1, 2, 2, 2, 2]


def test_polygon_has_all_of_its_own_edges(read: Read) -> None:
    """A polygon is closed (ISO 19125): its outer edges, right and bottom too, are inside."""
    points = [(20, 10), (10, 20), (0, 10), (10, 0), (20.01, 10), (10, 20.01)]
    assert read("wkt", DIAGONAL).orders(points) == [2, 1, 1, 2, 0, 0]


def test_region_over_two_lines_is_one_multipolygon(read: Read) -> None:
    """Both parts are region b; the line is that of the part hit."""
    got = read("wkt", TWO_LINES)
    points = [(10, 10), (45, 10), (10, 40), (40, 40), (10, 25), (90, 10)]
    assert got.orders(points) == [1, 2, 2, 3, 0, 0]
    assert got.line_numbers(points) == [1, 1, 2, 2, 0, 0]


def test_nearest_line_looks_a_point_up_at_the_middle_of_its_line(read: Read) -> None:
    """Middles at 10 and 40: 25 is as near to both, and goes to the later line."""
    got = read("wkt", TWO_LINES, lines=True)
    points = [(10, -80), (45, 24.9), (10, 25), (40, 99), (90, 40)]
    assert got.orders(points) == [1, 2, 2, 3, 0]
    assert got.line_numbers(points) == [1, 1, 2, 2, 2]


def test_only_x_decides_with_vertical_any(read: Read) -> None:
    """At the middle, y = 10, the diagonal is crossed at x = 10."""
    got = read("wkt", DIAGONAL, vertical="any")
    assert got.orders([(9, 500), (10, 500), (11, float("nan")), (21, 10)]) == [1, 2, 2, 0]


def test_hole_is_outside_and_its_edge_inside(read: Read) -> None:
    """A polygon's inner ring cuts a hole."""
    wkt = "POLYGON ((0 0, 30 0, 30 30, 0 30, 0 0), (10 10, 20 10, 20 20, 10 20, 10 10))"
    got = read("wkt", HEADER + f"1\ta\t1\t{wkt}\n")
    assert got.orders([(5, 5), (15, 15), (10, 15)]) == [1, 0, 1]


def test_tolerance_reaches_from_the_true_outline(read: Read) -> None:
    """The corner of the triangle's bounding box is far from the triangle itself."""
    content = HEADER + "1\ta\t1\tPOLYGON ((0 0, 20 0, 0 20, 0 0))\n"
    points = [(19, 19), (13, 13), (14, 14), (-5, 10), (-5.1, 10)]
    # (13, 13) is (13 + 13 - 20) / sqrt(2) = 4.24 px from the edge x + y = 20, (14, 14) 5.66.
    assert read("wkt", content, tolerance_px=5).orders(points) == [0, 1, 0, 1, 0]


def test_equally_near_regions_leave_the_point_to_the_later(read: Read) -> None:
    """X = 25 is 5 px from both."""
    content = (
        HEADER
        + "1\tb\t2\tPOLYGON ((0 0, 20 0, 20 9, 0 9, 0 0))\n"
        + "1\ta\t1\tPOLYGON ((30 0, 50 0, 50 9, 30 9, 30 0))\n"
    )
    got = read("wkt", content, tolerance_px=5)
    assert got.orders([(25, 5), (25.1, 5), (24.9, 5)]) == [2, 1, 2]


@pytest.mark.parametrize(("overlap", "expected"), [("first", [1, 1, 2]), ("nearest", [1, 2, 2])])
def test_point_in_two_polygons_goes_where_the_study_says(
    read: Read, overlap: str, expected: list[int]
) -> None:
    """Boxes 0-20 and 10-40, centres at 10 and 25."""
    content = (
        HEADER
        + "1\ta\t1\tPOLYGON ((0 0, 20 0, 20 10, 0 10, 0 0))\n"
        + "1\tb\t2\tPOLYGON ((10 0, 40 0, 40 10, 10 10, 10 0))\n"
    )
    assert read("wkt", content, overlap=overlap).orders([(12, 5), (18, 5), (21, 5)]) == expected


def test_empty_part_of_a_multipolygon_is_ignored(read: Read) -> None:
    """Valid Well-Known Text, without a place on the screen."""
    wkt = "MULTIPOLYGON (((0 0, 20 0, 20 9, 0 9, 0 0)), EMPTY)"
    assert read("wkt", HEADER + f"1\ta\t1\t{wkt}\n", tolerance_px=1).orders([(5, 5)]) == [1]


def test_library_of_polygons_survives_a_trip_to_another_process(read: Read) -> None:
    """Pickled and read back, it assigns the same."""
    library = pickle.loads(pickle.dumps(read("wkt", TWO_LINES).library))  # noqa: S301
    got = library.assign_points(np.zeros(2, dtype=int), np.array([10.0, 45]), np.array([40.0, 10]))
    assert got.order.tolist() == [2, 2]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One folder for all examples."""
    return tmp_path_factory.mktemp("polygons")


@st.composite
def triangulations(draw: st.DrawFn) -> list[shapely.Polygon]:
    """Triangles that touch along whole edges, some left out, in any order."""
    corners = draw(
        st.lists(
            st.tuples(st.integers(0, 30), st.integers(0, 30)), min_size=4, max_size=9, unique=True
        )
    )
    triangles = shapely.delaunay_triangles(shapely.MultiPoint(corners))
    shapes = [s for s in triangles.geoms if s.area > 0]
    order = draw(st.permutations(range(len(shapes))))
    return [shapes[i] for i in order[: max(1, len(shapes) - draw(st.integers(0, 2)))]]


def rows_of(shapes: list[shapely.Polygon]) -> str:
    """A definition file of one text."""
    return HEADER + "".join(
        f"1\tr{i}\t{i}\t{shape.wkt}\n" for i, shape in enumerate(shapes, start=1)
    )


@settings(deadline=None, max_examples=50)
@given(shapes=triangulations(), tolerance_px=st.sampled_from([0, 2.5]))
def test_points_equal_shapely_one_by_one(
    folder: Path, shapes: list[shapely.Polygon], tolerance_px: float
) -> None:
    """The latest region that `intersects` the point, else the nearest by `distance`."""
    if not shapes:
        return
    path = folder / "triangles.tsv"
    path.write_text(rows_of(shapes), encoding="utf-8")
    got = read_file(path, "wkt", tolerance_px=tolerance_px)
    random = np.random.default_rng(len(shapes))
    points = np.concatenate([random.integers(-3, 34, (150, 2)), random.uniform(-3, 33, (50, 2))])
    expected = []
    for x, y in points.tolist():
        point = shapely.Point(x, y)
        hits = [i for i, shape in enumerate(shapes, start=1) if shape.intersects(point)]
        distance = {i: shape.distance(point) for i, shape in enumerate(shapes, start=1)}
        near = max(distance, key=lambda i: (-distance[i], i))
        reached = near if tolerance_px and distance[near] <= tolerance_px else 0
        expected.append(max(hits) if hits else reached)
    assert got.orders(points) == expected


def test_boxes_written_as_polygons_give_the_same_regions(folder: Path) -> None:
    """Away from edges, a rectangle in Well-Known Text is the box made by hand."""
    random = np.random.default_rng(7)
    boxes, polygons = "item,region,order,left,top,right,bottom\n", HEADER
    for text in range(5):
        for order in range(1, 7):
            left, top = 100 * order + int(random.integers(0, 30)), 50 * text
            right, bottom = left + int(random.integers(20, 70)), top + 40
            boxes += f"{text},r{order},{order},{left},{top},{right},{bottom}\n"
            polygons += (
                f"{text}\tr{order}\t{order}\tPOLYGON (({left} {top}, {right} {top}, "
                f"{right} {bottom}, {left} {bottom}, {left} {top}))\n"
            )
    (folder / "boxes.csv").write_text(boxes, encoding="utf-8")
    (folder / "polygons.tsv").write_text(polygons, encoding="utf-8")
    by_box = read_file(folder / "boxes.csv", "boxes", tolerance_px=3).library
    by_polygon = read_file(folder / "polygons.tsv", "wkt", tolerance_px=3).library
    assert by_box is not None
    assert by_polygon is not None
    text = random.integers(-1, 5, 4000)
    x, y = random.uniform(80, 760, 4000), random.uniform(-20, 270, 4000)
    one, other = by_box.assign_points(text, x, y), by_polygon.assign_points(text, x, y)
    assert one.order.tolist() == other.order.tolist()
    assert one.line.tolist() == other.line.tolist()


@pytest.mark.parametrize("tolerance_px", [0, 2.5])
def test_texts_at_the_same_place_do_not_meet(folder: Path, tolerance_px: float) -> None:
    """Of many texts shown at one place, a point is taken to regions of its own text only."""
    random = np.random.default_rng(3)
    texts = []
    for _ in range(40):
        corners = random.uniform(0, 30, (9, 2)).round(1)
        triangles = shapely.delaunay_triangles(shapely.MultiPoint(corners)).geoms
        texts.append([shape for shape in triangles if shape.area > 0][:-2])
    path = folder / "texts.tsv"
    path.write_text(
        HEADER
        + "".join(
            f"{text}\tr{i}\t{i}\t{shape.wkt}\n"
            for text, shapes in enumerate(texts)
            for i, shape in enumerate(shapes, start=1)
        ),
        encoding="utf-8",
    )
    library = read_file(path, "wkt", tolerance_px=tolerance_px).library
    assert library is not None
    text = random.integers(0, 40, 1000)
    # Every second point is a corner of a region of its text, which lies on edges exactly.
    points = np.array(
        [
            random.uniform(-4, 34, 2)
            if number % 2
            else texts[of][number % len(texts[of])].exterior.coords[0]
            for number, of in enumerate(text.tolist())
        ]
    )
    expected = []
    for of, (x, y) in zip(text.tolist(), points.tolist(), strict=True):
        point = shapely.Point(x, y)
        distance = {i: shape.distance(point) for i, shape in enumerate(texts[of], start=1)}
        hits = [i for i, shape in enumerate(texts[of], start=1) if shape.intersects(point)]
        near = max(distance, key=lambda i: (-distance[i], i))
        reached = near if tolerance_px and distance[near] <= tolerance_px else 0
        expected.append(max(hits) if hits else reached)
    assert library.assign_points(text, *points.T).order.tolist() == expected
