"""The table of regions has every region of every text, with its words and where it lies."""

from __future__ import annotations

import re
from collections import defaultdict
from pathlib import Path

import pytest

import etl
from etl.session.region_rows import region_rows
from tests.end_to_end.building import PROJECT, rows_of, write
from tests.handoff.codebook_building import Described, described, levels_in, planned
from tests.handoff.codebook_building import rows_of as csv_rows

STUDY = """
[logs]
files = ["log.csv"]
kind = "table"
[logs.columns]
participant = "who"
trial = "trial"
item = "text"
fixation = "n"
duration = "dur"
{place}
[trials]
factors = ["cue"]
levels = {{ cue = ["late", "early"] }}
[regions]
file = "regions.csv"
kind = "{kind}"
{layout}
"""
LAYOUT = """
[regions.layout]
left_px = 100
top_px = 50
character_width_px = 10.5
line_height_px = 40
"""
LABELLED = "who,trial,text,cue,n,dur,area\nA,1,7,late,1,200,a\nA,1,7,late,2,210,b\n"
PLACED = "who,trial,text,cue,n,dur,x,y\nA,1,7,late,1,200,105,60\nA,1,7,late,2,210,150,60\n"

Cells = dict[str, str | None]


def regions_of(folder: Path, kind: str, definitions: str) -> list[Cells]:
    """The table of regions of a study by hand, without what is empty."""
    by_label, laid_out = kind == "labels", kind in ("words", "marked_text")
    text = STUDY.format(
        kind=kind,
        place='label = "area"' if by_label else 'x = "x"\ny = "y"',
        layout=LAYOUT if laid_out else "",
    )
    log = LABELLED if by_label else PLACED
    files = {"study.toml": text, "log.csv": log, "regions.csv": definitions}
    study = described(write(folder, files), folder / "o")
    return [
        {name: cell for name, cell in row.items() if cell is not None}
        for row in csv_rows(study.folder / "regions.csv")
    ]


def test_words_have_their_text_and_their_box(tmp_path: Path) -> None:
    """Two words on two lines: each a region, the space before a word its own."""
    assert regions_of(tmp_path, "words", 'item,text\n7,"old pears\nfell"\n') == [
        {
            "item": "7",
            "region": "w1",
            "region_order": "1",
            "region_text": "old",
            "region_characters": "3",
            "region_lines": "1",
            "left_px": "100",
            "top_px": "50",
            "right_px": "131.5",
            "bottom_px": "90",
        },
        {
            "item": "7",
            "region": "w2",
            "region_order": "2",
            "region_text": "pears",
            "region_characters": "5",
            "region_lines": "1",
            "left_px": "131.5",
            "top_px": "50",
            "right_px": "194.5",
            "bottom_px": "90",
        },
        {
            "item": "7",
            "region": "w3",
            "region_order": "3",
            "region_text": "fell",
            "region_characters": "4",
            "region_lines": "2",
            "left_px": "100",
            "top_px": "90",
            "right_px": "142",
            "bottom_px": "130",
        },
    ]


def test_marked_region_over_two_lines_is_one_row(tmp_path: Path) -> None:
    """Its text keeps the break, both lines are named, and the box encloses both."""
    definitions = 'item,text\n7,"{a: old} {b: pears\nfell} down"\n'
    _, second = regions_of(tmp_path, "marked_text", definitions)
    assert second == {
        "item": "7",
        "region": "b",
        "region_order": "2",
        "region_text": "pears\nfell",
        "region_characters": "9",
        "region_lines": "1 2",
        "left_px": "100",
        "top_px": "50",
        "right_px": "194.5",
        "bottom_px": "130",
    }


def test_boxes_have_places_and_no_text(tmp_path: Path) -> None:
    """What the definitions do not hold is empty; rows come in reading order."""
    definitions = (
        "item,cue,region,order,left,top,right,bottom\n"
        "7,late,second,2,140,50,180.5,90\n7,late,first,1,100,50,140,90\n"
    )
    first, second = regions_of(tmp_path, "boxes", definitions)
    assert first["region"] == "first"
    assert second == {
        "item": "7",
        "cue": "late",
        "region": "second",
        "region_order": "2",
        "region_lines": "1",
        "left_px": "140",
        "top_px": "50",
        "right_px": "180.5",
        "bottom_px": "90",
    }


def test_polygon_in_two_parts_has_one_box(tmp_path: Path) -> None:
    """The box goes around both parts, which stand on two lines."""
    parts = "((100 50, 200 50, 200 90, 100 90, 100 50)), ((90 95, 120 95, 120 130, 90 130, 90 95))"
    definitions = f'item,region,order,wkt\n7,all,1,"MULTIPOLYGON ({parts})"\n'
    (row,) = regions_of(tmp_path, "wkt", definitions)
    assert row == {
        "item": "7",
        "region": "all",
        "region_order": "1",
        "region_lines": "1 2",
        "left_px": "90",
        "top_px": "50",
        "right_px": "200",
        "bottom_px": "130",
    }


def test_labels_of_a_region_are_listed(tmp_path: Path) -> None:
    """Labels may have blanks and bars; the cell can be taken apart again."""
    definitions = "item,label,region,order\n7,a,one,1\n7,a | 2,one,1\n7,b,two,2\n"
    one, two = regions_of(tmp_path, "labels", definitions)
    assert levels_in(one.pop("region_labels")) == ["a", "a | 2"]
    assert one == {"item": "7", "region": "one", "region_order": "1"}
    assert two["region_labels"] == "b"


@pytest.mark.parametrize(
    ("more", "item", "cue"),
    [
        ("", "integer", "category"),
        ("practice,late,c,c,1\n", "text", "category"),
        ("8,none,c,c,1\n", "integer", "text"),
    ],
    ids=["as in the trials", "a text with a name", "a level that no trial has"],
)
def test_keys_have_the_type_of_all_their_values(
    tmp_path: Path, more: str, item: str, cue: str
) -> None:
    """A text that no trial shows stands there, too, and its keys must fit their columns."""
    definitions = f"item,cue,label,region,order\n7,late,a,a,1\n7,late,b,b,2\n{more}"
    regions_of(tmp_path, "labels", definitions)
    rows = csv_rows(tmp_path / "o" / "codebook.csv")
    types = {row["column"]: row["type"] for row in rows if row["table"] == "regions"}
    assert (types["item"], types["cue"]) == (item, cue)


def test_texts_without_keys_have_rows_all_the_same(tmp_path: Path) -> None:
    """One text for all trials: regions are told apart by their order alone."""
    rows = regions_of(tmp_path, "labels", "label,region,order\na,a,1\nb,b,2\n")
    assert [(row["region"], row["region_order"]) for row in rows] == [("a", "1"), ("b", "2")]


def test_every_word_of_a_passage_is_there(passages_described: Described) -> None:
    """The words of each text, split at white space, are its regions in order."""
    definitions = csv_rows(PROJECT / "region_definitions" / "passages.csv")
    words: defaultdict[str | None, list[str | None]] = defaultdict(list)
    for row in csv_rows(passages_described.folder / "regions.csv"):
        words[row["item"]].append(row["region_text"])
    assert words == {row["item"]: re.split(r"\s+", str(row["text"])) for row in definitions}


def test_fixations_lie_in_the_boxes_of_their_regions(orchard_described: Described) -> None:
    """Texts of one line: a fixation on a region is within the box that the table gives."""
    boxes = {
        (row["item"], row["cue"], row["fit"], row["region_order"]): row
        for row in csv_rows(orchard_described.folder / "regions.csv")
    }
    facts = {
        (row["participant"], row["trial"]): (row["item"], row["cue"], row["fit"])
        for row in rows_of(orchard_described.folder, "trials")
    }
    seen = 0
    for row in rows_of(orchard_described.folder, "fixations"):
        trial = facts.get((row["participant"], row["trial"]))
        if trial is None or row["region_order"] is None:
            continue
        box = boxes[(*trial, str(row["region_order"]))]
        assert box["region"] == row["region"]
        for axis, low, high in (("x_px", "left_px", "right_px"), ("y_px", "top_px", "bottom_px")):
            assert float(str(box[low])) <= row[axis] < float(str(box[high]))
        seen += 1
    assert seen > 9000


def test_outcomes_find_their_region(orchard_described: Described) -> None:
    """By item, factors and order, each row of outcomes has one row of regions, of its name."""
    names = {
        (row["item"], row["cue"], row["fit"], row["region_order"]): row["region"]
        for row in csv_rows(orchard_described.folder / "regions.csv")
    }
    for row in rows_of(orchard_described.folder, "outcomes_wide"):
        assert names[row["item"], row["cue"], row["fit"], str(row["region_order"])] == row["region"]


def test_as_many_rows_as_the_texts_have_regions(any_described: Described) -> None:
    """No region is lost and none is there twice."""
    library = any_described.plan.library
    rows = csv_rows(any_described.folder / "regions.csv")
    keys = [(*(row[key] for key in library.keys), row["region_order"]) for row in rows]
    assert len(set(keys)) == len(rows) == int(library.region_count.sum())


def test_text_from_right_to_left_has_its_box_from_the_left(tmp_path: Path) -> None:
    """The left edge is the lesser number in either direction."""
    text = STUDY.format(
        kind="words", place='x = "x"\ny = "y"', layout=LAYOUT + 'direction = "rtl"\n'
    )
    files = {"study.toml": text, "log.csv": PLACED, "regions.csv": "item,text\n7,ab cde\n"}
    plan, _ = planned(etl.load_study(write(tmp_path, files)))
    assert [row.box_px for row in region_rows(plan.library)] == [
        (89.5, 50.0, 110.5, 90.0),
        (47.5, 50.0, 89.5, 90.0),
    ]
