"""Points on laid-out text: edges, spaces, tolerance, several lines, both directions.

In all of these the first character's left edge is at x = 200, a character is 10 px wide, the first
line reaches from y = 500 to 540, the next one from 540 to 580.
"""

from __future__ import annotations

import pickle
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

NAN = float("nan")
Read = Callable[..., Any]

ONE_LINE = "item,text\n1,{a: The} {b: pear} fell {c: down}\n"
# Columns, with the space before a word: a 0-3, b 3-8, fell 8-13, c 13-18.

TWO_LINES = 'item,text\n1,"{a: The} {b: pear\nfell} {c: down}"\n'
# Line 1: a 0-3, b 3-8. Line 2: b 0-4, c 4-9.


def test_each_region_owns_its_characters_and_the_space_before(read: Read) -> None:
    """Points in the middle of each region, and in the word outside braces."""
    x = [201, 229, 231, 279, 281, 329, 331, 379, 381, 199]
    assert read("marked_text", ONE_LINE).orders([(x, 520) for x in x]) == [
        1, 1, 2, 2, 0, 0, 3, 3, 0, 0,
    ]  # fmt: skip


def test_space_before_can_be_given_to_the_word_before(read: Read) -> None:
    """With preceding, a: 0-4, b: 4-9, fell: 9-14, c: 14-18."""
    got = read("marked_text", ONE_LINE, layout={"space": "preceding"})
    x = [239, 241, 289, 291, 339, 341, 379, 381]
    assert got.orders([(x, 520) for x in x]) == [1, 2, 2, 0, 0, 3, 3, 0]


def test_point_on_an_edge_belongs_to_the_region_that_starts_there(read: Read) -> None:
    """Left edge in, right edge out, between neighbours the later; top in, bottom out."""
    points = [(200, 520), (230, 520), (280, 520), (330, 520), (380, 520), (205, 500), (205, 540)]
    assert read("marked_text", ONE_LINE).orders(points) == [1, 2, 0, 3, 0, 1, 0]


def test_right_to_left_text_runs_from_the_first_character_to_the_left(read: Read) -> None:
    """Character 0 covers 200 to 210; a: 180-210, b: 130-180, fell: 80-130, c: 30-80."""
    got = read("marked_text", ONE_LINE, layout={"direction": "rtl"})
    x = [209, 181, 179, 131, 129, 81, 79, 31, 29, 211]
    assert got.orders([(x, 520) for x in x]) == [1, 1, 2, 2, 0, 0, 3, 3, 0, 0]


def test_right_to_left_edge_belongs_to_the_region_that_starts_there(read: Read) -> None:
    """A right-to-left region starts at its right edge: that is in, the left edge is out."""
    got = read("marked_text", ONE_LINE, layout={"direction": "rtl"})
    x = [210, 180, 130, 80, 30]
    assert got.orders([(x, 520) for x in x]) == [1, 2, 0, 3, 0]


def test_text_of_one_line_needs_the_point_at_its_height(read: Read) -> None:
    """Above and below the line's box is outside, on no line."""
    got = read("marked_text", ONE_LINE)
    points = [(205, 499), (205, 500), (205, 539), (205, 541), (1000, 520)]
    assert got.orders(points) == [0, 1, 1, 0, 0]
    assert got.line_numbers(points) == [0, 1, 1, 0, 1]


def test_nearest_line_takes_a_point_of_one_line_from_any_height(read: Read) -> None:
    """With [lines] a text of one line takes every fixation to that line."""
    got = read("marked_text", ONE_LINE, lines=True)
    assert got.orders([(205, -900), (235, 9000)]) == [1, 2]
    assert got.line_numbers([(205, -900), (235, 9000), (0, 0)]) == [1, 1, 1]


def test_text_of_several_lines_takes_points_to_the_nearest_middle(read: Read) -> None:
    """The middles are at 520 and 560; 540 is as near to both, and goes to the later."""
    got = read("marked_text", TWO_LINES)
    points = [(235, -50), (235, 539.9), (235, 540), (235, 700), (245, 560), (285, 510)]
    assert got.line_numbers(points) == [1, 1, 2, 2, 2, 1]
    assert got.orders(points) == [2, 2, 2, 2, 3, 0]


def test_region_over_a_line_break_is_one_region(read: Read) -> None:
    """The second part of b starts line 2."""
    assert read("marked_text", TWO_LINES).orders([(275, 520), (205, 560)]) == [2, 2]


def test_blank_line_takes_height_but_no_fixation(read: Read) -> None:
    """Lines 1 and 3 carry words: middles 520 and 600; 560 is as near to both."""
    got = read("words", 'item,text\n1,"one\n\ntwo"\n')
    points = [(205, 559), (205, 560), (205, 561)]
    assert (got.orders(points), got.line_numbers(points)) == ([1, 2, 2], [1, 3, 3])
    assert got.library.texts[0].lines == 3


def test_trailing_line_break_makes_no_second_line(read: Read) -> None:
    """A text of one line stays one, whatever blank lines follow it in the cell."""
    got = read("words", 'item,text\n1,"one two\n"\n')
    assert got.orders([(205, 520), (205, 541)]) == [1, 0]


def test_only_x_decides_with_vertical_any(read: Read) -> None:
    """The height, known or not, does not matter."""
    got = read("marked_text", ONE_LINE, vertical="any")
    points = [(205, -900), (235, NAN), (1000, NAN), (NAN, 520)]
    assert (got.orders(points), got.line_numbers(points)) == ([1, 2, 0, 0], [1, 1, 1, 0])


def test_point_without_coordinate_is_outside_on_no_line(read: Read) -> None:
    """Missing and infinite coordinates never raise and never hit."""
    got = read("marked_text", TWO_LINES, tolerance_px=500)
    points = [(NAN, 520), (205, NAN), (NAN, NAN), (float("inf"), 520), (205, float("-inf"))]
    assert (got.orders(points), got.line_numbers(points)) == ([0] * 5, [0] * 5)


def test_point_on_no_text_is_outside(read: Read) -> None:
    """A trial whose text is unknown (-1) has no regions."""
    assert read("marked_text", ONE_LINE).orders([(205, 520)], text=-1) == [0]


def test_tolerance_takes_a_point_to_the_nearest_region(read: Read) -> None:
    """Regions a 200-230, b 230-280, c 330-380: 305 is as near to b as to c, and goes to c."""
    got = read("marked_text", ONE_LINE, tolerance_px=25)
    x = [174.9, 175, 190, 290, 304.9, 305, 320, 380, 405, 405.1]
    assert got.orders([(x, 520) for x in x]) == [0, 1, 1, 2, 2, 3, 3, 3, 3, 0]


def test_tolerance_is_measured_as_the_crow_flies(read: Read) -> None:
    """3 px to the left and 4 px above is 5 px away."""
    points = [(197, 496), (205, 495), (205, 545), (196, 495), (383, 544)]
    assert read("marked_text", ONE_LINE, tolerance_px=5).orders(points) == [1, 1, 1, 0, 3]


def test_point_taken_by_tolerance_is_on_the_line_of_its_region(read: Read) -> None:
    """Above the line's box, but taken to a region: on that region's line."""
    got = read("marked_text", ONE_LINE, tolerance_px=5)
    assert got.line_numbers([(205, 496), (205, 490)]) == [1, 0]


def test_tolerance_is_horizontal_where_the_line_is_known(read: Read) -> None:
    """On the nearest line only x decides: 10 px past b on line 1, 10 px past c on line 2."""
    got = read("marked_text", TWO_LINES, tolerance_px=10)
    points = [(290, 300), (290.1, 300), (300, 700), (300.1, 700), (190, 520)]
    assert got.orders(points) == [2, 0, 3, 0, 1]


def test_tolerance_right_to_left_mirrors(read: Read) -> None:
    """Regions b 130-180, c 30-80: 105 is as near to both, and goes to the later, c."""
    got = read("marked_text", ONE_LINE, tolerance_px=25, layout={"direction": "rtl"})
    x = [235, 235.1, 130, 105.1, 105, 30, 5, 4.9]
    assert got.orders([(x, 520) for x in x]) == [1, 0, 2, 2, 3, 3, 3, 0]


def test_without_tolerance_the_exclusive_edge_is_outside(read: Read) -> None:
    """A tolerance of 0 is off: at no distance at all the right edge is still outside."""
    assert read("marked_text", ONE_LINE, tolerance_px=0).orders([(380, 520)]) == [0]


def test_line_without_region_takes_its_points(read: Read) -> None:
    """Text outside braces is a line to be near to all the same."""
    got = read("marked_text", 'item,text\n1,"{a: one}\ntwo"\n', tolerance_px=5)
    assert (got.orders([(205, 560)]), got.line_numbers([(205, 560)])) == ([0], [2])


def test_words_are_regions_over_all_lines(read: Read) -> None:
    """w1, w2, … run on over line breaks, and keep their text."""
    got = read("words", 'item,text\n1,"The old pear\nfell {down}."\n')
    (text,) = got.library.texts
    assert text.regions == ("w1", "w2", "w3", "w4", "w5")
    assert text.region_texts == ("The", "old", "pear", "fell", "{down}.")
    assert got.orders([(205, 510), (235, 510), (275, 510), (205, 570), (245, 570)]) == [
        1, 2, 3, 4, 5,
    ]  # fmt: skip


def test_accent_written_apart_does_not_shift_what_follows(read: Read) -> None:
    """The decomposed word takes four columns, so the next one starts, with its space, at 240."""
    got = read("words", "item,text\n1,cafe\u0301 pear\n")
    assert got.orders([(239, 520), (240, 520)]) == [1, 2]


def test_texts_of_different_length_are_told_apart(read: Read) -> None:
    """Every point is looked up in its own text only."""
    got = read("words", 'item,text\n1,one\n2,"a b\nc d e f"\n3,one two three\n')
    library = got.library
    text = np.array([0, 1, 2, 1, 0, 2], dtype=np.int32)
    x = np.array([205, 265, 265, 235, 265, 205], dtype=np.float64)
    y = np.array([520, 560, 520, 520, 520, 520], dtype=np.float64)
    assert library.assign_points(text, x, y).order.tolist() == [1, 6, 2, 0, 0, 1]


def test_library_describes_its_texts(read: Read) -> None:
    """Names in order of first appearance; counts, offsets and codes per text in reading order."""
    content = 'item,spell,note,text\n7,x,n,{b: one} {a: two}\n\n8,y,n,"{a: one}\n{c: two}"\n'
    library = read("marked_text", content, wanted=("spell", "item")).library
    assert (library.keys, library.supplies) == (("item",), ("spell",))
    assert library.region_names == ("b", "a", "c")
    assert library.region_count.tolist() == [2, 2]
    assert library.region_offsets.tolist() == [0, 2, 4]
    assert library.region_code.tolist() == [0, 1, 1, 2]
    text = library.texts[1]
    assert (text.keys, text.facts, text.lines) == ({"item": "8"}, {"spell": "y"}, 2)
    assert (text.whole, text.path, text.line) == ("one\ntwo", "regions.csv", 4)


def test_text_is_found_by_its_key_values(read: Read) -> None:
    """Every key counts, in the order of the file's columns; no text is -1."""
    content = "cue,item,text\nearly,1,{a: x}\nlate,1,{a: y}\n"
    library = read("marked_text", content, known=("item", "cue")).library
    assert library.keys == ("cue", "item")
    assert [library.find(v) for v in (("late", "1"), ("early", "1"), ("1", "late"))] == [1, 0, -1]


def test_file_without_key_holds_the_text_of_every_trial(read: Read) -> None:
    """One text and no key column: each trial shows it."""
    assert read("marked_text", "text\n{a: x}\n").library.find(()) == 0


def test_library_survives_a_trip_to_another_process(read: Read) -> None:
    """Pickled and read back, it assigns the same."""
    library = read("marked_text", TWO_LINES).library
    again = pickle.loads(pickle.dumps(library))  # noqa: S301 - our own bytes
    text, x, y = np.zeros(3, dtype=np.int32), np.array([205.0, 245, 275]), np.full(3, 560.0)
    before, after = library.assign_points(text, x, y), again.assign_points(text, x, y)
    assert before.order.tolist() == after.order.tolist() == [2, 3, 3]


def test_no_points_give_no_regions(read: Read) -> None:
    """Empty arrays go through."""
    got = read("marked_text", ONE_LINE, tolerance_px=5).orders([])
    assert got == []


@pytest.mark.parametrize("dtype", [np.int8, np.int32, np.int64])
def test_text_index_may_be_any_integer(read: Read, dtype: type) -> None:
    """The index array's width is the caller's."""
    library = read("marked_text", ONE_LINE).library
    got = library.assign_points(np.zeros(1, dtype=dtype), np.array([205.0]), np.array([520.0]))
    assert (got.order.tolist(), got.order.dtype, got.line.dtype) == ([1], np.int32, np.int32)


@pytest.mark.parametrize("order", ["short last", "short first"])
def test_tolerance_before_a_text_is_measured_on_its_own_line(read: Read, order: str) -> None:
    """A point left of a text's first piece is near or far whatever text the file lists before."""
    long, short = '1,"aaa\nbbb\nccc"\n', "2,aaa\n"
    content = "item,text\n" + (long + short if order == "short last" else short + long)
    text = 1 if order == "short last" else 0
    got = read("words", content, tolerance_px=20)
    points = [(190, 520), (190, 555), (195, 598), (190, 481), (185, 486), (179, 520)]
    assert got.orders(points, text) == [1, 1, 0, 0, 0, 0]
