"""Every fault of a definition file: its message, with file, line, what was found and what to do."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from etl.errors import Findings
from etl.regions import TrialWords, read_definitions
from etl.study.models import Regions

Read = Callable[..., Any]
BOXES = "item,region,order,left,top,right,bottom\n"
WKT = "item\tregion\torder\twkt\n"
LABELS = "label,region,order\n"
SQUARE = "POLYGON ((0 0, 9 0, 9 9, 0 9, 0 0))"


def said(got: Any) -> list[str]:
    """The lines of the message without the closing count; nothing was read."""
    assert got.library is None
    *lines, closing = got.text.split("\n")
    count = got.findings.count("error")
    assert closing == f"{count} problem{'' if count == 1 else 's'}; nothing was written"
    return lines


MARKED = [
    pytest.param(
        "{a: b",
        3,
        'a brace is never closed; found "{a: b", expected } after the region\'s text',
        "close the region with }; for a brace that is shown write {{ or }}",
        id="unclosed-brace",
    ),
    pytest.param(
        "x\n{a: b} c}",
        4,
        'a brace closes no region; found "}", expected { and a name before it',
        "open the region with {name: or remove the brace; for a brace that is shown write }}",
        id="stray-brace-on-the-second-line",
    ),
    pytest.param(
        "{a: b {c: d} e}",
        3,
        'a brace opens inside a region; found "{c: d} e}", '
        "expected } first, for regions do not nest",
        "close the region before with }; for a brace that is shown write {{",
        id="nested-brace",
    ),
    pytest.param(
        "x\n\n{pear}",
        5,
        'a region has no colon after its name; found "{pear}", expected {name: text}',
        "write the region's name and a colon after {; for a brace that is shown write {{",
        id="missing-colon-on-the-third-line",
    ),
    pytest.param(
        "{: pear}",
        3,
        'a region has no name; found "{: pear}", expected {name: text}',
        "write a name before the colon",
        id="empty-name",
    ),
    pytest.param(
        "{a: }",
        3,
        'a region has no text; found "{a: }", expected {name: text}',
        "write the region's text, or remove it",
        id="empty-text",
    ),
    pytest.param(
        "{a: x}\n{a: y}",
        4,
        'a region is named twice in one text; found "{a: y}", expected a name other than "a"',
        "give every region of a text a name of its own",
        id="named-twice",
    ),
    pytest.param(
        "no mark",
        3,
        'this text marks no region; found "no mark", expected at least one {name: text}',
        "mark the regions in the text: {name: text}",
        id="no-region",
    ),
    pytest.param(
        "{a: x\n\ty}",
        4,
        'a tab has no width of its own; found "\\t", '
        "expected characters of one width, and line breaks",
        "write as many spaces as the screen shows",
        id="tab-on-the-second-line",
    ),
    pytest.param(
        "{a: x\u2028y}",
        3,
        'a character has no place on a line; found "\\u2028", '
        "expected characters of one width, and line breaks",
        "remove the character; for a line break write \\n",
        id="line-separator",
    ),
    pytest.param(
        "{a: \u200b} {b: c}",
        3,
        'a region takes no room on the screen; found "a", '
        "expected at least one character that has a width",
        "write the region's text, or remove it",
        id="no-room",
    ),
]


@pytest.mark.parametrize(("cell", "line", "says", "fix"), MARKED)
def test_fault_of_a_marked_text(read: Read, cell: str, line: int, says: str, fix: str) -> None:
    """The line is that of the file, also inside a text that spans lines."""
    got = read("marked_text", f'item,text\n0,{{a: sound}}\n1,"{cell}"\n')
    assert said(got) == [f'regions.csv:{line}: column "text": {says}', f"    fix: {fix}"]


def test_line_counts_breaks_in_cells_to_the_left(read: Read) -> None:
    """A comment line, and a note over two lines before the text, move the line of the file."""
    got = read("marked_text", '# ours\nitem,note,text\n1,"a\nb","x\n{a: y"\n')
    assert said(got)[0].startswith('regions.csv:5: column "text": a brace is never closed')


def test_text_without_words(read: Read) -> None:
    """An empty text has nothing to read."""
    assert said(read("words", 'item,text\n1,pear\n2,"  "\n')) == [
        (
            'regions.csv:3: column "text": this text has no word; found "  ", '
            "expected at least one word"
        ),
        "    fix: write the text, or remove the row",
    ]


ROWS = [
    pytest.param(
        "boxes",
        BOXES + "1,a,1,zero,0,9,9\n",
        'regions.csv:2: column "left": this is no number; found "zero", expected a number in px',
        "correct the cell; decimals are written with a point",
        id="text-where-a-number-belongs",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,1_0,9,90\n",
        'regions.csv:2: column "top": this is no number; found "1_0", expected a number in px',
        "correct the cell; decimals are written with a point",
        id="digits-grouped-by-underscore",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,,9\n",
        'regions.csv:2: column "right": the cell is empty; found "", expected a number in px',
        "correct the cell; decimals are written with a point",
        id="empty-number",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,9,-inf\n",
        'regions.csv:2: column "bottom": this number is not finite; found "-inf", '
        "expected a number in px",
        "correct the cell; decimals are written with a point",
        id="infinite",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,NaN,9,9\n",
        'regions.csv:2: column "top": this number is not finite; found "NaN", '
        "expected a number in px",
        "correct the cell; decimals are written with a point",
        id="not-a-number",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,9,1e999\n",
        'regions.csv:2: column "bottom": this number is not finite; found "1e999", '
        "expected a number in px",
        "correct the cell; decimals are written with a point",
        id="too-large",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,9,0,9,9\n",
        'regions.csv:2: column "right": a box ends before it begins: right is not above left; '
        'found "9", expected more than left, which is 9',
        "correct the box; px count from the left and from the top of the screen",
        id="no-width",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,9,9,0\n",
        'regions.csv:2: column "bottom": a box ends before it begins: bottom is not above top; '
        'found "0", expected more than top, which is 9',
        "correct the box; px count from the left and from the top of the screen",
        id="upside-down",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,9,9\n1,b,3,9,0,18,9\n",
        'regions.csv:3: column "order": the orders of a text do not run from 1 without a gap; '
        'found "3", expected 2 for the region that comes next (item 1)',
        "number the regions of each text 1, 2, 3, … in reading order",
        id="gap",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,0,0,0,9,9\n",
        'regions.csv:2: column "order": the orders of a text do not run from 1 without a gap; '
        'found "0", expected 1 for the region that comes next (item 1)',
        "number the regions of each text 1, 2, 3, … in reading order",
        id="from-nought",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,9,9\n2,a,1,0,0,9,9\n1,b,1,9,0,18,9\n",
        'regions.csv:4: column "order": two regions of a text have the same order; '
        'found "1", expected an order other than that of "a" in line 2 (item 1)',
        "number the regions of each text 1, 2, 3, …",
        id="repeated-order",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1.5,0,0,9,9\n",
        'regions.csv:2: column "order": this order is no whole number; found "1.5", '
        "expected a whole number from 1",
        "number the regions of each text 1, 2, 3, … in reading order",
        id="order-between-numbers",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,first,0,0,9,9\n",
        'regions.csv:2: column "order": this is no number; found "first", '
        "expected a whole number from 1",
        "correct the cell; decimals are written with a point",
        id="order-in-words",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,9,9\n1,a,2,9,0,18,9\n",
        'regions.csv:3: column "region": a region is named twice in one text; found "a", '
        "expected each region once; line 2 holds the other (item 1)",
        "rename one of the two regions, or remove it",
        id="region-twice",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,,1,0,0,9,9\n",
        'regions.csv:2: column "region": a region has no name; found "", '
        "expected the name of the region",
        "fill in the cell, or remove the row",
        id="region-without-name",
    ),
    pytest.param(
        "boxes",
        BOXES + ",a,1,0,0,9,9\n",
        'regions.csv:2: column "item": a key is empty; found "", '
        "expected the item of the trials that show this text",
        "fill in the cell",
        id="empty-key",
    ),
    pytest.param(
        "boxes",
        BOXES + "1,a,1,0,0,10,9\n1,b,2,9,0,18,9\n",
        'regions.csv:3: column "left": two regions of a text overlap; found "b", '
        'expected no area in common with "a" in line 2 (item 1)',
        "correct the places, or say in the study file which region wins: "
        'overlap = "first" or "nearest" in [regions]',
        id="overlapping-boxes",
    ),
    pytest.param(
        "wkt",
        WKT + f"1\ta\t1\t{SQUARE}\n1\tb\t2\tPOLYGON ((8 8, 9 8, 9 9, 8 8))\n",
        'regions.csv:3: column "wkt": two regions of a text overlap; found "b", '
        'expected no area in common with "a" in line 2 (item 1)',
        "correct the places, or say in the study file which region wins: "
        'overlap = "first" or "nearest" in [regions]',
        id="overlapping-polygons",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOLYGON ((0 0, 9 9, 9 0, 0 9, 0 0))\n",
        'regions.csv:2: column "wkt": a region\'s polygon is not valid; '
        'found "POLYGON ((0 0, 9 9, 9 0, 0 9, 0 0))", '
        "expected a simple outline (Self-intersection[4.5 4.5])",
        "list the corners in the order in which one walks around the region",
        id="self-crossing",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOLYGON ((0 0, nan 9, 9 0, 0 0))\n",
        'regions.csv:2: column "wkt": a region\'s polygon is not valid; '
        'found "POLYGON ((0 0, nan 9, 9 0, 0 0))", '
        "expected a simple outline (Invalid Coordinate[nan 9])",
        "list the corners in the order in which one walks around the region",
        id="corner-not-a-number",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOINT (1 1)\n",
        'regions.csv:2: column "wkt": a POINT encloses no area; found "POINT (1 1)", '
        "expected a POLYGON or MULTIPOLYGON",
        "draw the region's outline; a region over two lines is one MULTIPOLYGON",
        id="point",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOLYGON EMPTY\n",
        'regions.csv:2: column "wkt": a region\'s polygon is empty; found "POLYGON EMPTY", '
        "expected a POLYGON or MULTIPOLYGON with corners",
        "list its corners, for example POLYGON ((200 500, 284 500, 284 560, 200 560, 200 500))",
        id="empty-polygon",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOLYGON Z ((0 0 1, 9 0 1, 9 9 1, 0 0 1))\n",
        'regions.csv:2: column "wkt": a region\'s polygon has more than x and y; '
        'found "POLYGON Z ((0 0 1, 9 0 1, 9 9 1, 0 0 1))", expected two numbers for each corner',
        "leave out heights and measures, for example "
        "POLYGON ((200 500, 284 500, 284 560, 200 560, 200 500))",
        id="three-dimensions",
    ),
    pytest.param(
        "wkt",
        WKT + "1\ta\t1\tPOLYGON ((0 0, 9 0\n",
        'regions.csv:2: column "wkt": this cannot be read as Well-Known Text; '
        'found "POLYGON ((0 0, 9 0", expected a POLYGON or MULTIPOLYGON '
        "(Expected word but encountered end of stream)",
        "correct the cell, for example POLYGON ((200 500, 284 500, 284 560, 200 560, 200 500))",
        id="unreadable",
    ),
    pytest.param(
        "labels",
        LABELS + "A,,1\n",
        'regions.csv:2: column "region": a region has no name; found "", '
        "expected the name of the region",
        "fill in the cell, or remove the row",
        id="label-without-region",
    ),
    pytest.param(
        "labels",
        LABELS + ",a,1\n",
        'regions.csv:2: column "label": a label has no name; found "", '
        "expected the name of the label",
        "fill in the cell, or remove the row",
        id="label-without-name",
    ),
    pytest.param(
        "labels",
        LABELS + "A,a,1\nB,b,2\nA,b,2\n",
        'regions.csv:4: column "label": a label is named twice in one text; found "A", '
        "expected each label once; line 2 holds the other (text without keys)",
        "rename one of the two labels, or remove it",
        id="label-twice",
    ),
    pytest.param(
        "labels",
        LABELS + "A,a,1\nB,a,2\n",
        'regions.csv:3: column "order": the labels of one region have different orders; '
        'found "2", expected 1, the order of "a" in line 2 (text without keys)',
        "give all labels of a region the same order",
        id="labels-disagree",
    ),
    pytest.param(
        "labels",
        LABELS + "A,a,1\nB,b,1\n",
        'regions.csv:3: column "order": two regions of a text have the same order; '
        'found "1", expected an order other than that of "a" in line 2 (text without keys)',
        "number the regions of each text 1, 2, 3, …",
        id="labels-repeat-an-order",
    ),
]


@pytest.mark.parametrize(("kind", "content", "says", "fix"), ROWS)
def test_fault_of_a_row(read: Read, kind: str, content: str, says: str, fix: str) -> None:
    """One fault, one message, nothing read."""
    assert said(read(kind, content)) == [says, f"    fix: {fix}"]


def test_faults_of_all_rows_are_listed_at_once(read: Read) -> None:
    """One run names every fault of the file."""
    got = read("boxes", BOXES + "1,a,1,x,0,9,y\n2,a,2,0,0,9,9\n3,a,1,9,9,0,0\n")
    assert [line.split(": ")[0:2] for line in said(got) if "fix" not in line] == [
        ["regions.csv:2", 'column "left"'],
        ["regions.csv:2", 'column "bottom"'],
        ["regions.csv:3", 'column "order"'],
        ["regions.csv:4", 'column "right"'],
        ["regions.csv:4", 'column "bottom"'],
    ]


def test_missing_column_names_what_is_there_and_the_nearest(read: Read) -> None:
    """A column under another name is offered."""
    there = 'found "item, regoin, order, left, top, right"'
    asked = 'expected region, order, left, top, right, bottom (regions of kind "boxes")'
    assert said(read("boxes", "item,regoin,order,left,top,right\n1,a,1,0,0,9\n")) == [
        f'regions.csv:1: there is no column "region"; {there}, {asked}',
        '    fix: rename column "regoin" to "region"',
        f'regions.csv:1: there is no column "bottom"; {there}, {asked}',
        '    fix: add a column "bottom"',
    ]


def test_file_without_rows(read: Read) -> None:
    """A header alone defines nothing."""
    assert said(read("words", "item,text\n")) == [
        "regions.csv:1: the file defines no text; expected at least one row below the header",
        "    fix: add the texts, or name another file in regions.file",
    ]


def test_empty_file(read: Read) -> None:
    """An empty file is refused, whatever the kind."""
    got = read("words", "")
    assert got.library is None
    assert "regions.csv" in got.text
    assert "empty" in got.text


def test_text_defined_twice_names_both_lines(read: Read) -> None:
    """Two rows with the same keys."""
    assert said(read("words", "item,text\n1,pear\n2,plum\n1,apple\n")) == [
        (
            'regions.csv:4: a text is defined twice; found "item 1", '
            "expected one definition; line 2 holds the other"
        ),
        "    fix: remove one of the two rows",
    ]


def test_text_defined_twice_points_to_columns_that_could_be_keys(read: Read) -> None:
    """A factor that the study does not name is no key: say so."""
    got = read("words", "item,cue,fit,text\n1,early,good,pear\n1,late,good,plum\n")
    assert said(got) == [
        (
            'regions.csv:3: a text is defined twice; found "item 1", '
            "expected one definition; line 2 holds the other"
        ),
        (
            "    fix: remove one of the two rows; if a further column tells the texts apart, "
            "name it in [trials] factors, so that it serves as a key "
            '(columns not used: "cue", "fit")'
        ),
    ]


def test_region_twice_points_to_columns_that_could_be_keys(read: Read) -> None:
    """Two texts fall into one where their key is not named."""
    content = (
        "item,cue,region,order,left,top,right,bottom\n1,early,a,1,0,0,9,9\n1,late,a,1,0,0,9,9\n"
    )
    assert said(read("boxes", content))[1] == (
        "    fix: rename one of the two regions, or remove it; if a further column tells the texts "
        "apart, name it in [trials] factors, so that it serves as a key "
        '(columns not used: "cue")'
    )


def test_faults_of_a_second_definition_are_listed_too(read: Read) -> None:
    """A text defined twice does not hide what else is wrong with it."""
    got = read("marked_text", "item,text\n1,{a: x}\n1,{a: y\n")
    assert [line.split(": ", 1)[1].split(";")[0] for line in said(got)[::2]] == [
        "a text is defined twice",
        'column "text": a brace is never closed',
    ]


def test_fact_that_differs_within_a_text(read: Read) -> None:
    """A fact that the file supplies is one for the whole text."""
    content = (
        "item,fit,region,order,left,top,right,bottom\n1,good,a,1,0,0,9,9\n1,bad,b,2,9,0,18,9\n"
    )
    assert said(read("boxes", content, wanted=("fit",))) == [
        (
            'regions.csv:3: column "fit": a fact differs between the rows of one text; '
            'found "bad", expected "good", as in line 2 (item 1)'
        ),
        "    fix: write the same value in all rows of a text",
    ]


@pytest.mark.parametrize(
    ("kind", "content", "line"),
    [
        ("words", 'item,text\n7,pear\n8,"one\ntwo"\n', 3),
        ("boxes", BOXES + "7,a,1,0,0,9,9\n8,a,1,0,0,9,9\n8,b,2,0,9,9,18\n", 3),
    ],
)
def test_only_x_cannot_decide_in_a_text_of_several_lines(
    read: Read, kind: str, content: str, line: int
) -> None:
    """The text is named."""
    assert said(read(kind, content, vertical="any")) == [
        (
            f'regions.csv:{line}: vertical = "any" is for texts of one line only; '
            'found "item 8: 2 lines", expected one line'
        ),
        '    fix: set vertical = "box" in [regions]',
    ]


def test_overlap_over_the_lines_of_a_region_is_named_once(read: Read) -> None:
    """Two regions that meet in two places are one fault."""
    two = "MULTIPOLYGON (((0 0, 9 0, 9 9, 0 9, 0 0)), ((0 20, 9 20, 9 29, 0 29, 0 20)))"
    assert read("wkt", WKT + f"1\ta\t1\t{two}\n1\tb\t2\t{two}\n").findings.count("error") == 1


def test_layout_is_needed_for_running_text(tmp_path: Any) -> None:
    """Without a layout nobody knows where the characters stand."""
    path = tmp_path / "regions.csv"
    path.write_text("item,text\n1,pear\n", encoding="utf-8")
    findings = Findings()
    read_definitions(
        Regions(file="regions.csv", kind="words"),
        None,
        path=path,
        shown="regions.csv",
        words=TrialWords(("item",), ()),
        findings=findings,
    )
    assert findings.lines() == [
        (
            'regions.layout: regions of kind "words" need a layout; '
            "expected left_px, top_px, character_width_px and line_height_px\n"
            "    fix: add [regions.layout] to the study file"
        )
    ]
