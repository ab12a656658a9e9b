"""What the methods are told of a text: lines and words of layouts, boxes and long stretches."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from etl.session.passages import is_right_to_left, passage_of
from etl.study.models import Layout
from tests.regions.reading import LAYOUT, Read, read_file


def read(folder: Path, kind: str, content: str, **options: object) -> Read:
    """A definition file read."""
    path = folder / "regions.csv"
    path.write_text(content, encoding="utf-8", newline="\n")
    return read_file(path, kind, **options)


def test_words_of_marked_text_are_those_of_the_text(tmp_path: Path) -> None:
    """Also those in no region, and each by itself where a region has several."""
    got = read(tmp_path, "marked_text", 'item,text\n1,"One {a: two six\nten} one"\n').library
    passage = passage_of(got, 0, Layout(**LAYOUT))
    assert passage.line_y_px.tolist() == [520, 560]
    assert passage.word_x_px.tolist() == [215, 255, 295, 215, 255]
    assert passage.word_line.tolist() == [0, 0, 0, 1, 1]
    assert (passage.line_height_px, passage.width_px) == (40, 110)


def test_blank_lines_make_no_line(tmp_path: Path) -> None:
    """Lines that carry text are told, at the heights they have."""
    got = read(tmp_path, "words", 'item,text\n1,"one\n\ntwo\nsix"\n').library
    passage = passage_of(got, 0, Layout(**LAYOUT))
    assert passage.line_y_px.tolist() == [520, 600, 640]
    assert passage.word_line.tolist() == [0, 1, 2]


def test_right_to_left_text_is_mirrored(tmp_path: Path) -> None:
    """In the mirror words ascend from where reading begins."""
    layout = {**LAYOUT, "direction": "rtl"}
    got = read(tmp_path, "words", 'item,text\n1,"one two\nsix"\n', layout=layout).library
    assert is_right_to_left(got, 0)
    passage = passage_of(got, 0, Layout(**layout))
    assert passage.word_x_px.tolist() == [-195, -155, -195]


BOXES = "item,region,order,left,top,right,bottom\n"


@pytest.mark.parametrize(
    ("rows", "mirrored"),
    [
        pytest.param("1,a,1,0,0,40,20\n1,b,2,40,0,90,20\n1,c,3,0,30,50,50\n", False, id="right"),
        pytest.param("1,a,1,50,0,90,20\n1,b,2,0,0,50,20\n1,c,3,50,30,90,50\n", True, id="left"),
        pytest.param("1,a,1,0,0,40,20\n1,b,2,0,30,40,50\n", False, id="one region a line"),
    ],
)
def test_direction_of_boxes_follows_from_their_order(
    tmp_path: Path, rows: str, *, mirrored: bool
) -> None:
    """The steps from one to the next on the same line say where reading goes."""
    assert is_right_to_left(read(tmp_path, "boxes", BOXES + rows).library, 0) == mirrored


def test_long_stretches_are_told_in_parts(tmp_path: Path) -> None:
    """A box as wide as the text is no word: its parts reach from end to end."""
    rows = "1,a,1,100,0,400,20\n1,b,2,100,30,160,50\n"
    passage = passage_of(read(tmp_path, "boxes", BOXES + rows).library, 0, None)
    assert passage.word_line.tolist() == [0] * 10 + [1]
    assert np.allclose(passage.word_x_px[:10], 100 + 30 * np.arange(10) + 15)
    assert passage.word_x_px[10] == 130
    assert (passage.line_height_px, passage.width_px) == (30, 300)
