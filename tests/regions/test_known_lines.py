"""Points whose line is known before they are looked up: on it only x decides.

As in the other tests of laid-out text the first character's left edge is at x = 200, a character is
10 px wide, the first line reaches from y = 500 to 540, the next one from 540 to 580.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from etl.errors import FaultError

NAN = float("nan")
Read = Callable[..., Any]

TWO_LINES = 'item,text\n1,"{a: The} {b: pear\nfell} {c: down}"\n'
# Line 1: a 0-3, b 3-8. Line 2: b 0-4, c 4-9.
BLANK_BETWEEN = 'item,text\n1,"one\n\ntwo"\n2,"one\ntwo\nsix"\n'
BOXES = (
    "item,region,order,left,top,right,bottom\n"
    "1,a,1,0,0,40,20\n1,b,2,40,0,90,20\n1,c,3,0,40,50,60\n1,d,4,50,40,90,60\n"
)
POLYGONS = (
    "item,region,order,wkt\n"
    '1,a,1,"POLYGON ((0 0, 40 0, 40 20, 0 20, 0 0))"\n'
    '1,b,2,"POLYGON ((0 40, 50 40, 50 60, 0 60, 0 40))"\n'
)


def assigned(
    got: Any, points: list[tuple[float, float]], lines: list[int], text: int = 0
) -> tuple[list[int], list[int]]:
    """Orders and lines of points on lines that are known."""
    x, y = np.array(points, dtype=np.float64).T
    of_text = np.full(len(x), text, dtype=np.int32)
    found = got.library.assign_points(of_text, x, y, np.array(lines, dtype=np.int32))
    return found.order.tolist(), found.line.tolist()


def test_point_is_looked_up_on_its_line_whatever_its_height(read: Read) -> None:
    """The line given decides, not the nearest one."""
    got = read("marked_text", TWO_LINES)
    points = [(205, 510), (205, 570), (255, -900), (255, 9000)]
    assert assigned(got, points, [2, 1, 2, 1]) == ([2, 1, 3, 2], [2, 1, 2, 1])


def test_point_on_no_line_is_outside(read: Read) -> None:
    """Also in the middle of a region."""
    got = read("marked_text", TWO_LINES)
    assert assigned(got, [(205, 520), (205, 520)], [0, 1]) == ([0, 1], [0, 1])


def test_point_of_which_nothing_is_known_is_looked_up_as_ever(read: Read) -> None:
    """-1 is the same as no line given."""
    got = read("marked_text", TWO_LINES)
    points = [(235, 530), (235, 545), (205, 900)]
    free = (got.orders(points), got.line_numbers(points))
    assert assigned(got, points, [-1, -1, -1]) == free == ([2, 2, 2], [1, 2, 2])


def test_point_beside_its_line_is_taken_within_the_tolerance(read: Read) -> None:
    """On both sides of the text, measured along the line alone."""
    got = read("marked_text", TWO_LINES, tolerance_px=15)
    points = [(190, 0), (184, 0), (294, 0), (306, 0)]
    assert assigned(got, points, [2] * 4) == ([2, 0, 3, 0], [2, 2, 2, 2])


def test_right_to_left_text_is_looked_up_from_the_right(read: Read) -> None:
    """Line 2 begins at x = 210 and goes to the left."""
    got = read("marked_text", TWO_LINES, layout={"direction": "rtl"})
    points = [(205, 0), (165, 0), (205, 0)]
    assert assigned(got, points, [2, 2, 1]) == ([2, 3, 1], [2, 2, 1])


def test_lines_are_named_by_their_numbers(read: Read) -> None:
    """A blank line counts, so that the second line with text may be line 3."""
    got = read("words", BLANK_BETWEEN)
    assert assigned(got, [(205, 0), (205, 0)], [3, 1]) == ([2, 1], [3, 1])
    assert assigned(got, [(205, 0), (205, 0)], [3, 2], text=1) == ([3, 2], [3, 2])


@pytest.mark.parametrize(("line", "text"), [(2, 0), (4, 1), (9, 0)])
def test_line_that_a_text_does_not_have_is_a_fault(read: Read, line: int, text: int) -> None:
    """Blank ones have no number that a fixation could be on."""
    got = read("words", BLANK_BETWEEN)
    with pytest.raises(FaultError, match="a line that its text does not have"):
        assigned(got, [(205, 0)], [line], text)


def test_boxes_are_looked_up_on_the_line(read: Read) -> None:
    """Between the rows, and within another one."""
    got = read("boxes", BOXES)
    points = [(45, 30), (45, 50), (45, 10), (95, 50)]
    assert assigned(got, points, [1, 1, 2, 2]) == ([2, 2, 3, 0], [1, 1, 2, 2])


def test_polygons_are_looked_up_at_the_middle_of_the_line(read: Read) -> None:
    """As where the nearest line is asked for."""
    got = read("wkt", POLYGONS)
    assert assigned(got, [(45, 10), (45, 900), (35, NAN)], [2, 1, 1]) == ([2, 0, 1], [2, 1, 1])


def test_point_on_a_known_line_needs_no_height(read: Read) -> None:
    """Without y it is in the region at its x, without x on the line alone."""
    got = read("marked_text", TWO_LINES)
    assert assigned(got, [(205, NAN), (NAN, 520)], [2, 2]) == ([2, 0], [2, 2])
