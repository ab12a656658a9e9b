"""Lines in what is shown of a trial: raw places, links to lines, doubts, corrections, sweeps."""

from __future__ import annotations

import math
import re
import xml.etree.ElementTree as ET
from dataclasses import replace
from pathlib import Path

import pytest

import etl
from etl.lines.consensus import REASONS
from etl.report.trace_glyphs import width_of
from etl.report.trace_input import TracedLines, TracedTrial
from etl.report.trace_line_table import lines_in_columns
from etl.report.trace_lines import WHY_ON_NONE, line_middles, nearest_line, tell_lines
from etl.report.trace_page import page
from etl.report.trace_picture import draw
from etl.report.trace_text import as_text
from etl.report.trace_words import explain
from tests.trace.tracing import NAN, BuiltStudy, by_hand, drifting, unsure_sample

SVG = "{http://www.w3.org/2000/svg}"


def overview_of(traced: TracedTrial) -> ET.Element:
    """The map of a picture, by an XML parser of its own."""
    root = ET.fromstring(draw(traced))  # noqa: S314  (our own text)
    (found,) = [e for e in root.iter(f"{SVG}g") if e.attrib.get("class") == "overview"]
    return found


def marks_in(overview: ET.Element) -> dict[int, ET.Element]:
    """The marks of a map by the number of the fixation."""
    return {int(e.attrib["data-mark"]): e for e in overview.iter() if "data-mark" in e.attrib}


def kinds(element: ET.Element) -> set[str]:
    """The classes of what an element holds."""
    return {part.attrib["class"] for part in element.iter() if "class" in part.attrib}


def height_of(mark: ET.Element) -> float:
    """Where a round mark, or a crossed one, is."""
    circle = mark.find(f"{SVG}circle")
    if circle is not None:
        return float(circle.attrib["cy"])
    d = mark.find(f"{SVG}path[@class='cross']").attrib["d"]
    _, y1, _, y2 = map(float, re.findall(r"[\d.]+", d)[:4])
    return (y1 + y2) / 2


def links_in(overview: ET.Element) -> list[tuple[str, float, float]]:
    """Kind, beginning and end of every link, of arrows with their tips."""
    legend = {e for g in overview.iter(f"{SVG}g") if g.get("class") == "map-legend" for e in g}
    found = []
    for path in overview.iter(f"{SVG}path"):
        kind = path.attrib["class"]
        if kind.startswith("link") and kind != "link-tip" and path not in legend:
            _, y1, _, y2 = map(float, re.findall(r"[\d.]+", path.attrib["d"]))
            found.append((kind, y1, y2 + (math.copysign(5, y2 - y1) if "moved" in kind else 0)))
    return found


def test_marks_stand_where_fixations_were_recorded() -> None:
    """Heights in the map are heights on the screen on one scale; only what is far off is not.

    A px of the screen would be 1.5, as across, but lines are never more than 64 apart.
    """
    marks = marks_in(overview_of(drifting()))
    assert marks.keys() == set(range(1, 11))
    first, scale = height_of(marks[1]), 64.0 / 60
    for number, y_px in ((2, 131.0), (4, 165.0), (6, 225.0), (10, 262.0)):
        assert height_of(marks[number]) - first == pytest.approx(scale * (y_px - 128), abs=0.02)


def test_links_lead_to_the_middle_of_the_assigned_line() -> None:
    """From a quarter of the distance between lines on; with an arrow past a nearer line.

    Of the lines at 130, 190 and 250 px, 15 px are a quarter: fixations 3, 4 and 6 are 20, 25 and 35
    px off theirs; for the last the third line is nearer.
    """
    overview = overview_of(drifting())
    marks = marks_in(overview)
    first = height_of(marks[1])
    at = {line: first + (middle - 128) * 64 / 60 for line, middle in ((1, 130), (2, 190))}
    assert links_in(overview) == [
        ("link", pytest.approx(height_of(marks[3])), pytest.approx(at[1], abs=0.02)),
        ("link", pytest.approx(height_of(marks[4])), pytest.approx(at[2], abs=0.02)),
        ("link moved", pytest.approx(height_of(marks[6])), pytest.approx(at[2], abs=0.02)),
    ]


def test_form_tells_what_is_known_of_a_line() -> None:
    """On no line a diamond, unsure a dashed outline, changed by hand a frame; else none of them."""
    marks = marks_in(overview_of(drifting()))
    special = {n: kinds(mark) & {"none", "doubt", "hand"} for n, mark in marks.items()}
    assert {n: own for n, own in special.items() if own} == {
        6: {"doubt"},
        7: {"none"},
        8: {"hand"},
    }
    assert "cross" in kinds(marks[10])


def test_bars_have_the_same_marks() -> None:
    """What stands around a mark in the map stands around the bar, too."""
    root = ET.fromstring(draw(drifting()))  # noqa: S314  (our own text)
    bars = {int(e.attrib["data-fixation"]): e for e in root.iter() if "data-fixation" in e.attrib}
    special = {n: kinds(bar) & {"none", "doubt", "hand"} for n, bar in bars.items()}
    assert {n: own for n, own in special.items() if own} == {
        6: {"doubt"},
        7: {"none"},
        8: {"hand"},
    }


def legend_of(traced: TracedTrial) -> str:
    """The words of the legend of a map."""
    overview = overview_of(traced)
    (legend,) = [g for g in overview.iter(f"{SVG}g") if g.get("class") == "map-legend"]
    return " | ".join("".join(e.itertext()) for e in legend.iter(f"{SVG}text"))


def test_legend_names_every_mark() -> None:
    """Each form that the map has is explained in words."""
    assert legend_of(drifting()) == (
        "where it was recorded | to its line, where that is 15 px or more off | to its line, which "
        "is not the nearest | on no line | line less than 90% sure | line changed by hand"
    )


def test_legend_is_silent_on_what_is_not_there() -> None:
    """A trial whose fixations lie on their lines has one kind of mark."""
    traced = drifting()
    calm = tuple(
        replace(f, y_px=traced.lines.middles_px[f.line], line_confidence=0.99, line_told=None)
        for f in traced.fixations
        if f.line
    )
    assert legend_of(replace(traced, fixations=calm)) == "where it was recorded"


def test_text_of_one_line_has_no_map() -> None:
    """The line stands over its fixations as it is."""
    assert 'class="overview"' not in draw(by_hand([1, 2], [200, 200], 2))


def test_notes_beside_the_picture_say_what_to_look_at() -> None:
    """Doubt, correction, undersweep and no line stand beside their bars."""
    root = ET.fromstring(draw(drifting()))  # noqa: S314  (our own text)
    notes = [
        "".join(e.itertext())
        for e in root.iter(f"{SVG}text")
        if e.attrib.get("class", "").startswith("note ")
    ]
    for expected in (
        "4 undersweep",
        "6 line 2 62% sure",
        "7 on no line: far off the text",
        "8 line 3 by hand, was line 2",
    ):
        assert expected in notes


def test_sentences_on_lines_as_a_whole() -> None:
    """All that is said of the lines of a trial, worked out by hand."""
    assert explain(drifting()).lines == (
        "told by consensus and by hand: taken for sure, since somebody has looked",
        "fixation 6, on line 2, is less than 90% sure",
        "one of 9 is on another line than the one nearest to the place recorded: fixation 6",
        (
            "recorded places lie, by their median, 1 px below the middle on line 1 and 2 px below "
            "the middle on line 3"
        ),
        "fixation 7 belongs to no line (off_text: far off the text)",
        (
            "set by hand (by_hand.csv): fixations 8 and 9; to another line than was told: 8 to "
            "line 3 from line 2"
        ),
        "2 return sweeps come down on fixations 4 and 8; undersweep: 4",
    )


@pytest.mark.parametrize(
    ("lines", "said"),
    [
        (
            TracedLines("consensus", {1: 130.0, 2: 190.0, 3: 250.0}, 0.9499),
            (
                "told by consensus, not sure: look at this trial; with a chance of 94% at least 97 "
                "in 100 fixations are on their right line"
            ),
        ),
        (
            TracedLines("consensus", {1: 130.0, 2: 190.0, 3: 250.0}, 0.99996, sure=True),
            (
                "told by consensus, sure; with a chance of 99% at least 97 in 100 fixations are on "
                "their right line"
            ),
        ),
        (
            TracedLines("slice", {1: 130.0, 2: 190.0, 3: 250.0}),
            "told by slice, which says nothing of how sure it is",
        ),
    ],
    ids=["not sure", "sure", "no confidence"],
)
def test_trial_says_whether_it_is_sure(lines: TracedLines, said: str) -> None:
    """The first sentence is the verdict; it stands over the map and on the terminal, too."""
    traced = drifting(lines=lines)
    alone = tuple(replace(f, line_told=None) for f in traced.fixations)
    traced = replace(traced, fixations=alone)
    assert tell_lines(traced)[0] == said
    assert f"Lines {said}" in "".join(overview_of(traced).itertext())
    assert re.sub(r"\s+", " ", said) in re.sub(r"\s+", " ", as_text(traced, 60))


def test_every_reason_for_no_line_has_words() -> None:
    """What a method may say is explained; nothing else is."""
    assert tuple(WHY_ON_NONE) == REASONS[1:]


def test_nothing_is_said_where_no_lines_were_told() -> None:
    """A sentence of one line has no section on lines, on the terminal or on a page."""
    traced = by_hand([1, 2], [200, 200], 2)
    assert explain(traced).lines == ()
    assert "Lines" not in as_text(traced, 80)
    assert "Lines" not in page(traced)


def test_table_on_the_terminal_as_a_whole() -> None:
    """Raw place, line, distance, confidence and letters of every fixation."""
    assert lines_in_columns(drifting(), 40) == [
        " n    x    y  line  off  sure",
        " 1  150  128     1   -2   99%",
        " 2  250  131     1    1   99%",
        " 3  350  150     1   20   99%",
        " 4  250  165     2  -25   99% U",
        " 5  120  185     2   -5   90%",
        " 6  250  225     2   35   62% ?",
        " 7  350  400  none        95%",
        " 8  130  248     3   -2  100% *R",
        " 9  150  252     3    2  100% *",
        "10  250  262     3   12   97% x",
    ]


@pytest.mark.parametrize("width", [40, 63, 80, 131])
def test_table_fits_the_terminal_and_has_every_fixation(unsure: BuiltStudy, width: int) -> None:
    """Down, then across; no line is wider than the terminal, no fixation is left out or twice."""
    for key in unsure.trials[::3]:
        traced = unsure.trace(*key)
        rows = lines_in_columns(traced, width)
        assert max(map(width_of, rows)) <= width
        cells = [cell for row in rows[1:] for cell in re.findall(r"(\d+) +-?\d+ +-?\d+ +\w+ ", row)]
        assert sorted(map(int, cells)) == [f.number for f in traced.fixations]


def test_part_of_an_explanation_has_the_verdict_only() -> None:
    """Who asks for one outcome is told whether lines are sure, and spared the table."""
    traced = drifting()
    part = as_text(traced, 80, explanation=explain(traced).only(["when"], ["fixated"]))
    assert "told by consensus and by hand" in part
    assert "off  sure" not in part
    assert "undersweep: 4" not in part


def test_unsure_trial_is_told_how_to_correct() -> None:
    """Where lines may be wrong the terminal names the option that helps; elsewhere it does not."""
    traced = drifting()
    assert "--lines FILE.csv" in as_text(traced, 80)
    calm = tuple(replace(f, line_confidence=0.99) for f in traced.fixations)
    assert "--lines" not in as_text(replace(traced, fixations=calm), 80)


def test_page_lists_every_fixation_with_its_line() -> None:
    """A table with a link to each bar; remarks in words."""
    text = page(drifting())
    rows = re.findall(r'<tr class="(?:unsure|told)">.*?</tr>', text)
    assert len(rows) == 10
    plain = [re.sub(r"(<[^>]+>)+", "|", row) for row in rows]
    assert plain[5].strip("|") == "6|250|225|2|35|62%|unsure"
    assert plain[7].strip("|") == "8|130|248|3|-2|100%|set by hand, was line 2; return sweep"
    ids = set(re.findall(r' id="([^"]+)"', text))
    assert set(re.findall(r'href="#([^"]+)"', text)) <= ids


def test_middles_follow_from_pieces_where_nothing_else_says_them() -> None:
    """Of a trial whose lines nobody told the map is drawn all the same."""
    traced = drifting()
    bare = replace(traced, lines=None)
    assert line_middles(bare) == traced.lines.middles_px
    assert marks_in(overview_of(bare)).keys() == set(range(1, 11))
    assert tell_lines(bare) == ()


def test_fixation_without_a_height_is_shown_on_its_line() -> None:
    """Where y is missing the mark is at the middle of the line, without a link."""
    traced = drifting()
    flat = (replace(traced.fixations[2], y_px=NAN), *traced.fixations[3:])
    overview = overview_of(replace(traced, fixations=flat))
    # The first link is that of fixation 4, to the second line.
    assert height_of(marks_in(overview)[3]) + 64 == pytest.approx(links_in(overview)[0][2])


@pytest.mark.parametrize(("y_px", "line"), [(159.9, 1), (160.0, 2), (-50.0, 1), (900.0, 3)])
def test_nearest_line(y_px: float, line: int) -> None:
    """Halfway between two lines the lower one begins."""
    traced = drifting()
    look = replace(traced.fixations[0], y_px=y_px)
    assert nearest_line(look, traced.lines.middles_px) == line


def test_trace_is_what_the_tables_say(study: BuiltStudy) -> None:
    """A trial traced by itself is the trial of the tables: places, lines, confidence, all."""
    for key in study.trials[:: max(1, len(study.trials) // 4)]:
        alone, built = etl.trace(study.study, *key), study.trace(*key)
        in_order = [
            replace(traced, outcomes=dict(sorted(traced.outcomes.items())), values_set_missing={})
            for traced in (alone, built)
        ]
        # What is missing is not equal to itself; as text it is.
        assert repr(in_order[0]) == repr(in_order[1])


def test_trial_left_out_for_its_lines_is_told_all_the_same(
    tmp_path: Path,
) -> None:
    """What the rule takes has no outcomes, but its lines, their confidence and a map."""
    study_file = unsure_sample(tmp_path)
    text = study_file.read_text(encoding="utf-8")
    rule = "\n[screening.trials]\nline_confidence_under = 0.92\n"
    study_file.write_text(text + rule, encoding="utf-8", newline="\n")
    traced = etl.trace(etl.load_study(study_file), "P33", "3")
    assert traced.removal is not None
    assert traced.removal.rule == "line_confidence_under"
    assert not traced.trial_outcomes
    assert tell_lines(traced)[0].startswith("told by consensus, not sure")
    marks = marks_in(overview_of(traced))
    assert marks.keys() == {fixation.number for fixation in traced.fixations}
    assert all("cross" in kinds(mark) for mark in marks.values())


def test_words_on_lines_are_true_of_the_tables(unsure: BuiltStudy) -> None:
    """Counts of fixations on another line than the nearest, and of unsure ones, counted anew."""
    doubtful, moved = 0, 0
    for key in unsure.trials:
        traced = unsure.trace(*key)
        told = " ".join(explain(traced).lines)
        away, on_line, doubt = 0, 0, 0
        for f in traced.fixations:
            # Lines are 80 px apart, the first from 120 px on; the text has as many as its pieces.
            lines = max(piece.line for piece in traced.pieces)
            near = min(max(math.floor((f.y_px - 120) / 80) + 1, 1), lines)
            on_line += f.line > 0
            away += f.line > 0 and f.line != near
            doubt += f.line_confidence < 0.9
        assert (f"{away} of {on_line} are" in told) == (away > 1)
        assert ("less than 90% sure" in told) == (doubt > 0)
        assert ("not sure: look" in told) == (traced.lines.confidence < 0.95)
        doubtful, moved = doubtful + doubt, moved + away
    assert doubtful > 5
    assert moved > 50
