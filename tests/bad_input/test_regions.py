"""Region definitions that are wrong, or that do not fit the trials."""

import shutil
from pathlib import Path

from tests.bad_input.small_study import SmallStudy

TEXTS = (
    "item,text\npear,{who: The gardener} {verb: watered} it.\n"
    "plum,{who: The warden} {verb: cut} it.\n"
)
NUMBERED = "    fix: number the regions of each text 1, 2, 3, …"


def test_texts_and_polygons_build(study: SmallStudy) -> None:
    """The definitions that the other tests spoil are sound."""
    study.define_texts(TEXTS)
    assert study.run("build", "study.toml").exit_code == 0
    shutil.rmtree("out")
    again = SmallStudy.sound(study.folder)
    again.define_polygon("POLYGON ((0 0, 100 0, 100 50, 0 50, 0 0))")
    assert again.run("build", "study.toml").exit_code == 0


def test_missing_region_file(study: SmallStudy) -> None:
    """A missing region file is named as the study file names it."""
    Path("regions.csv").unlink()
    assert study.refusal() == (
        "regions.csv: there is no such file\n"
        "    fix: correct the name in the study file, or put the file there\n"
        "1 problem; nothing was written\n"
    )


def test_trial_without_a_text(study: SmallStudy) -> None:
    """A trial of the logs that finds no text names both files."""
    study.write("regions.csv", "item,region,order,left,top,right,bottom\npear,who,1,0,0,100,50\n")
    study.write(
        "logs/P02.tsv", Path("logs/P02.tsv").read_text(encoding="utf-8").replace("plum", "pear")
    )
    assert study.refusal() == (
        'logs/P01.tsv:5: the trial has no text in regions.csv; found "trial 2 of reader P01", '
        'expected a text for item "plum"\n'
        "    fix: add the text to regions.csv, correct the trial's facts, or name such trials in "
        "[trials] skip\n"
        "1 problem; nothing was written\n"
    )


def test_text_with_two_definitions(study: SmallStudy) -> None:
    """A text that a trial would find twice is refused with both lines."""
    study.define_texts(TEXTS + "pear,{who: He} {verb: slept}.\n")
    assert study.refusal() == (
        'regions.csv:4: a text is defined twice; found "item pear", expected one definition; line '
        "2 holds the other\n"
        "    fix: remove one of the two rows\n"
        "1 problem; nothing was written\n"
    )


def test_overlapping_boxes(study: SmallStudy) -> None:
    """With overlap = "error" no two boxes of a text have area in common."""
    study.change("regions.csv", "pear,verb,2,100", "pear,verb,2,90")
    assert study.refusal() == (
        'regions.csv:3: column "left": two regions of a text overlap; found "verb", expected no '
        'area in common with "who" in line 2 (item pear)\n'
        "    fix: correct the places, or say in the study file which region wins: overlap = "
        '"first" or "nearest" in [regions]\n'
        "1 problem; nothing was written\n"
    )


def test_marks_in_braces(study: SmallStudy) -> None:
    """An open brace, an empty name and a name used twice are all found in one run."""
    study.define_texts(
        "item,text\npear,{who: The gardener watered it.\nplum,{who: The warden} {: cut} it.\n"
        "nut,{who: It} {who: fell}.\n"
    )
    assert study.refusal() == (
        'regions.csv:2: column "text": a brace is never closed; found "{who: The gardener watered '
        "it.\", expected } after the region's text\n"
        "    fix: close the region with }; for a brace that is shown write {{ or }}\n"
        'regions.csv:3: column "text": a region has no name; found "{: cut} it.", expected {name: '
        "text}\n"
        "    fix: write a name before the colon\n"
        'regions.csv:4: column "text": a region is named twice in one text; found "{who: fell}.", '
        'expected a name other than "who"\n'
        "    fix: give every region of a text a name of its own\n"
        "3 problems; nothing was written\n"
    )


def test_unreadable_polygon(study: SmallStudy) -> None:
    """Well-Known Text that is none says what is wrong with it."""
    study.define_polygon("POLYGON ((0 0, 100 0, 100 50, 0 50)")
    said = study.refusal()
    # What the reader of Well-Known Text gives as the reason differs between its versions.
    assert said.startswith(
        'regions.csv:2: column "wkt": this cannot be read as Well-Known Text; found "POLYGON ((0 '
        '0, 100 0, 100 50, 0 50)", expected a POLYGON or MULTIPOLYGON ('
    )
    assert said.endswith(
        "    fix: correct the cell, for example POLYGON ((200 500, 284 500, 284 560, 200 560, 200 "
        "500))\n1 problem; nothing was written\n"
    )


def test_polygon_that_crosses_itself(study: SmallStudy) -> None:
    """An outline that crosses itself is refused with the place of the crossing."""
    study.define_polygon("POLYGON ((0 0, 100 50, 100 0, 0 50, 0 0))")
    assert study.refusal() == (
        'regions.csv:2: column "wkt": a region\'s polygon is not valid; found "POLYGON ((0 0, '
        '100 50, 100 0, 0 50, 0 0))", expected a simple outline (Self-intersection[50 25])\n'
        "    fix: list the corners in the order in which one walks around the region\n"
        "1 problem; nothing was written\n"
    )


def test_orders_with_a_gap_and_a_repeat(study: SmallStudy) -> None:
    """The orders of a text run 1, 2, 3 without a gap or a repeat."""
    study.change("regions.csv", "pear,verb,2", "pear,verb,3")
    study.change("regions.csv", "plum,verb,2", "plum,verb,1")
    assert study.refusal() == (
        'regions.csv:3: column "order": the orders of a text do not run from 1 without a gap; '
        'found "3", expected 2 for the region that comes next (item pear)\n'
        f"{NUMBERED} in reading order\n"
        'regions.csv:5: column "order": two regions of a text have the same order; found "1", '
        'expected an order other than that of "who" in line 4 (item plum)\n'
        f"{NUMBERED}\n"
        "2 problems; nothing was written\n"
    )


def test_picture_as_region_file(study: SmallStudy) -> None:
    """A picture of the regions is no definition of them."""
    study.write("regions.csv", b"\xff\xd8\xff\xe0\x00\x10JFIF")
    assert study.refusal() == (
        "regions.csv: this is no text file: it begins like a picture (JPEG); expected delimited "
        "text\n"
        "    fix: export the table as text; or name another file, or another pattern, in the study "
        "file\n"
        "1 problem; nothing was written\n"
    )
