"""The picture: well-formed, complete, to scale, and what it marks is what the tables say."""

from __future__ import annotations

import itertools
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from dataclasses import replace

import pytest
from hypothesis import given, settings

from etl.report.trace_input import Removal, TracedTrial
from etl.report.trace_page import page
from etl.report.trace_picture import draw
from etl.report.trace_places import LONGEST_PAUSE_MS, place
from etl.report.trace_text import as_text
from tests.end_to_end.building import PROJECT
from tests.trace.random_trials import trials
from tests.trace.tracing import NAN, BuiltStudy, by_hand, worked_example

SVG = "{http://www.w3.org/2000/svg}"


def parsed(traced: TracedTrial) -> ET.Element:
    """The picture by an XML parser of its own."""
    return ET.fromstring(draw(traced))  # noqa: S314  (our own text)


def fixations_in(root: ET.Element) -> dict[int, ET.Element]:
    """The elements of fixations by number; none twice."""
    found = [e for e in root.iter() if "data-fixation" in e.attrib]
    by_number = {int(e.attrib["data-fixation"]): e for e in found}
    assert len(by_number) == len(found)
    return by_number


def bar_of(element: ET.Element) -> dict[str, float]:
    """Place and size of a fixation's bar."""
    (rect,) = element.findall(f"{SVG}rect")
    return {name: float(rect.attrib[name]) for name in ("x", "y", "width", "height")}


def words_in(element: ET.Element) -> str:
    """All text in an element but for what is shown on pointing only."""
    return " ".join("".join(part.itertext()) for part in element.iter(f"{SVG}text"))


def regressions_in(root: ET.Element) -> list[tuple[int, int]]:
    """The regressions that are marked."""
    return [
        (int(e.attrib["data-launch"]), int(e.attrib["data-landing"]))
        for e in root.iter()
        if "data-launch" in e.attrib
    ]


@settings(max_examples=100, deadline=None)
@given(traced=trials())
def test_any_trial_is_well_formed_and_complete(traced: TracedTrial) -> None:
    """Every fixation of any trial is in the picture once, with its durations."""
    found = fixations_in(parsed(traced))
    assert {n: float(e.attrib["data-duration-ms"]) for n, e in found.items()} == {
        f.number: f.duration_ms for f in traced.fixations
    }


@settings(max_examples=100, deadline=None)
@given(traced=trials())
def test_regressions_are_marked_if_and_only_if_they_are_some(traced: TracedTrial) -> None:
    """The rails are those of the table of regressions, in its order."""
    listed = [(r.launch, r.landing) for r in traced.regressions]
    assert regressions_in(parsed(traced)) == listed


@settings(max_examples=100, deadline=None)
@given(traced=trials())
def test_form_tells_kinds_of_fixation_apart(traced: TracedTrial) -> None:
    """First pass, later visit, outside and left out are classes of their own."""
    for number, element in fixations_in(parsed(traced)).items():
        fixation = traced.fixations[number - 1]
        kind = (
            "out"
            if not fixation.kept
            else "outside"
            if not fixation.region_order
            else ("first" if fixation.first_pass else "later")
        )
        assert element.attrib["class"] == f"fixation {kind}"
        assert (element.find(f"{SVG}path[@class='cross']") is not None) == (kind == "out")


def test_every_trial_of_the_sample_is_complete(study: BuiltStudy) -> None:
    """Pictures of the sample hold every fixation and every regression of the tables."""
    for key in study.trials[::20] if len(study.trials) > 100 else study.trials:
        traced = study.trace(*key)
        root = parsed(traced)
        assert fixations_in(root).keys() == {f.number for f in traced.fixations}
        assert regressions_in(root) == [(r.launch, r.landing) for r in traced.regressions]


def test_bars_stand_where_and_as_long_as_the_fixations() -> None:
    """Place across and length are one scale each: worked out from the numbers of the trial.

    Regions of 100 px from 100 to 600 px of the screen; the picture has 800 px of room for them
    (828 between its margins), so a px of the screen is 1.5, the most; 250 ms are 50.
    """
    traced = worked_example()
    found = fixations_in(parsed(traced))
    bars = {number: bar_of(element) for number, element in found.items()}
    centres = {number: bar["x"] + bar["width"] / 2 for number, bar in bars.items()}
    for fixation in traced.fixations:
        bar = bars[fixation.number]
        first = traced.fixations[0]
        assert centres[fixation.number] - centres[1] == pytest.approx(
            1.5 * (fixation.x_px - first.x_px), abs=0.02
        )
        assert bar["y"] - bars[1]["y"] == pytest.approx(
            0.2 * (fixation.onset_ms - first.onset_ms), abs=0.02
        )
        assert bar["height"] == pytest.approx(0.2 * fixation.duration_ms, abs=0.02)


def test_bars_stand_under_their_regions(orchard: BuiltStudy) -> None:
    """The bar of a fixation inside a region lies within that region's stripe."""
    for key in orchard.trials[:40]:
        traced = orchard.trace(*key)
        places = place(traced, 0.0)
        for bar in places.bars:
            if bar.fixation.region_order:
                (piece,) = (p for p in traced.pieces if p.order == bar.fixation.region_order)
                left, right = places.across.at(piece.left_px), places.across.at(piece.right_px)
                assert left <= bar.x <= right


def test_left_out_fixations_are_labelled_with_their_rule() -> None:
    """The rule stands beside the bar, and with limit and finding beside the picture."""
    traced = by_hand(
        [1, 2, 3],
        [200, 62, 900],
        3,
        left_out={2: Removal("under_ms", "80", "62"), 3: Removal("over_ms", "800", "900")},
    )
    root = parsed(traced)
    found = fixations_in(root)
    assert words_in(found[2]) == "2 under_ms"
    assert words_in(found[3]) == "3 over_ms"
    assert words_in(found[1]) == "1 200"
    everything = words_in(root)
    assert "2 left out: under_ms = 80, found 62" in everything
    assert "3 left out: over_ms = 800, found 900" in everything


def test_merged_fixation_names_its_host() -> None:
    """A merged fixation is labelled with the one that it went into."""
    traced = by_hand([1, 1], [200, 62], 3, left_out={2: Removal("merge", "under_ms = 80")})
    merged = replace(traced.fixations[1], merged_into=1)
    traced = replace(traced, fixations=(traced.fixations[0], merged))
    assert words_in(fixations_in(parsed(traced))[2]) == "2 merge, into 1"


def test_trial_left_out_says_so() -> None:
    """A banner names the rule of a trial that is left out, and its finding."""
    removal = Removal("answer_wrong", "true", "no")
    traced = by_hand([1, 2], [200, 200], 3, left_out={1: removal, 2: removal})
    root = parsed(replace(traced, removal=removal))
    assert "This trial is left out by answer_wrong = true (found no)" in words_in(root)


def test_region_names_and_units_stand_in_the_picture() -> None:
    """Names over the regions, milliseconds at the side, regressions with their regions."""
    words = words_in(parsed(worked_example()))
    for expected in ("when", "topic", "auxiliary", "verb", "object", "250 ms", "2,000 ms"):
        assert expected in words
    assert "R1 verb to auxiliary, ends 1st pass" in words
    assert "R2 auxiliary to topic" in words


def test_several_lines_have_a_stretch_each(passages: BuiltStudy) -> None:
    """Above each run of fixations on a line stands that line's number."""
    traced = passages.trace(*passages.trials[0])
    on_lines = [f.line for f in traced.fixations if f.line]
    runs = 1 + sum(a != b for a, b in itertools.pairwise(on_lines))
    strong = [
        "".join(e.itertext())
        for e in parsed(traced).iter(f"{SVG}text")
        if e.attrib.get("class") == "strong end"
    ]
    assert len(strong) == runs
    assert [int(label.removeprefix("▲ ").removeprefix("line ")) for label in strong][:3] == (
        list(dict.fromkeys(on_lines))[:3]
    )


def test_long_pause_is_cut_and_said() -> None:
    """Where nothing was fixated for long, the picture says how long instead of being empty."""
    traced = by_hand([1, 2], [200, 200], 2)
    late = replace(traced.fixations[1], onset_ms=traced.fixations[1].onset_ms + 5000)
    traced = replace(traced, fixations=(traced.fixations[0], late))
    assert LONGEST_PAUSE_MS < 5030
    assert "5,030 ms without a fixation, cut out" in words_in(parsed(traced))


def test_log_without_onsets_is_drawn_end_to_end() -> None:
    """Without onsets durations follow one another, and the picture says that."""
    traced = worked_example()
    bare = tuple(replace(fixation, onset_ms=NAN) for fixation in traced.fixations)
    root = parsed(replace(traced, fixations=bare))
    bars = [bar_of(element) for element in fixations_in(root).values()]
    for before, after in itertools.pairwise(bars):
        assert after["y"] == pytest.approx(before["y"] + before["height"], abs=0.02)
    assert "the log has no onsets" in words_in(root)


def test_other_recording_is_apart_and_marked() -> None:
    """Fixations of a recording that is not used stand in a stretch of their own."""
    removal = Removal("repeated", "last")
    traced = by_hand([1, 2, 1, 2], [200] * 4, 2, left_out={1: removal, 2: removal})
    again = tuple(
        replace(f, onset_ms=traced.fixations[f.number - 3].onset_ms) if f.number > 2 else f
        for f in traced.fixations
    )
    root = parsed(replace(traced, fixations=again))
    tops = {number: bar_of(element)["y"] for number, element in fixations_in(root).items()}
    assert tops[1] < tops[2] < tops[3] < tops[4]
    assert words_in(root).count("not used") == 1


@pytest.mark.parametrize("geometry", [True, False], ids=["coordinates", "none"])
def test_trial_without_a_text_is_drawn(*, geometry: bool) -> None:
    """Of a trial that is no part of the study the fixations are shown where they were."""
    removal = Removal("skip", "block = practice")
    traced = by_hand(
        [1, 3], [200, 180], 3, geometry=geometry, left_out=dict.fromkeys((1, 2), removal)
    )
    bare = replace(
        traced,
        region_names=(),
        region_texts=(),
        pieces=(),
        words=(),
        outcomes={},
        trial_outcomes={},
        removal=removal,
        fixations=tuple(replace(f, region_order=0, line=0) for f in traced.fixations),
    )
    root = parsed(bare)
    bars = [bar_of(element) for element in fixations_in(root).values()]
    assert (bars[0]["x"] < bars[1]["x"]) == geometry
    assert "This trial is left out by skip = block = practice" in words_in(root)
    assert [
        int(row[:4]) for row in as_text(bare, 80).splitlines() if row[:4].strip().isdigit()
    ] == [
        1,
        2,
    ]
    assert page(bare)


def test_fixation_far_off_is_drawn_at_the_edge_with_its_place() -> None:
    """A fixation far from the text does not squeeze the text; its true x is said."""
    traced = by_hand([1, 0, 2], [200, 200, 200], 3)
    far = replace(traced.fixations[1], x_px=-5000.0)
    traced = replace(traced, fixations=(traced.fixations[0], far, traced.fixations[2]))
    root = parsed(traced)
    assert "2 outside, at x = -5000 px" in words_in(root)
    assert bar_of(fixations_in(root)[2])["x"] > 0


HOSTILE = [
    "<script>alert(1)</script>",
    "\"quoted\" & 'so'",
    "🍐🌳",
    "ועץ",
    "a\x1b[31m\x00b",
    "]]>",
    "\ud800",
]


@pytest.mark.parametrize("name", HOSTILE, ids=ascii)
def test_names_from_the_study_appear_as_text(name: str) -> None:
    """Markup in names is text; what XML cannot hold is replaced; nothing else is lost."""
    traced = by_hand(
        [1, 2, 1],
        [200, 200, 200],
        2,
        names=[name, "b"],
        participant=name,
        item=name,
        factors={name: name},
        left_out={3: Removal("notes", name, name)},
    )
    root = parsed(traced)
    shown = re.sub("[\x00-\x1f\ud800-\udfff]", "\ufffd", name)
    assert shown in words_in(root)
    assert not list(root.iter(f"{SVG}script"))
    assert len(list(root.iter())) == len(list(parsed(replace(traced, item="plain")).iter()))


def test_right_to_left_text_is_drawn_from_the_right() -> None:
    """The words of right-to-left text start at their right ends and are marked so."""
    traced = by_hand([1, 2], [200, 200], 2)
    mirrored = replace(traced, right_to_left=True)
    words = [e for e in parsed(mirrored).iter(f"{SVG}text") if e.attrib.get("class") == "text"]
    plain = [e for e in parsed(traced).iter(f"{SVG}text") if e.attrib.get("class") == "text"]
    for one, other in zip(words, plain, strict=True):
        assert one.attrib["direction"] == "rtl"
        assert float(one.attrib["x"]) == pytest.approx(
            float(other.attrib["x"]) + float(other.attrib["textLength"]), abs=0.02
        )


def test_picture_has_a_title_a_description_and_a_role() -> None:
    """Those who cannot see the picture are told what it is."""
    root = parsed(worked_example())
    assert root.attrib["role"] == "img"
    named = root.attrib["aria-labelledby"].split()
    texts = {e.attrib["id"]: e.text for e in root.iter() if "id" in e.attrib}
    assert texts[named[0]] == "Fixations of participant P1, trial 7, item i01"
    assert "10 fixations, all kept; 3 regressive saccades; 5 regions" in (texts[named[1]] or "")


def test_picture_asks_for_nothing() -> None:
    """No script, no font, no picture, no address but the name space."""
    svg = draw(worked_example())
    assert re.findall(r"https?://[^\"' ]+", svg) == ["http://www.w3.org/2000/svg"]
    assert not re.search(r"url\(|@import|<script|<image|href=", svg)


def test_pictures_of_two_trials_share_no_id() -> None:
    """Many pictures can stand in one document."""
    one, other = worked_example(), replace(worked_example(), trial="8")
    ids = [re.findall(r' id="([^"]+)"', draw(traced)) for traced in (one, other)]
    assert ids[0]
    assert not set(ids[0]) & set(ids[1])


def test_no_label_stands_on_another(orchard: BuiltStudy) -> None:
    """Numbers beside bars are apart, in every trial looked at."""
    for key in orchard.trials[:60]:
        root = parsed(orchard.trace(*key))
        boxes = []
        for element in fixations_in(root).values():
            (label,) = element.findall(f"{SVG}text")
            x, y = float(label.attrib["x"]), float(label.attrib["y"])
            width = 6.0 * len("".join(label.itertext()))
            left = x - width if label.attrib["class"].endswith("end") else x
            boxes.append((left, left + width, y))
        for place_, (left, right, y) in enumerate(boxes):
            for other_left, other_right, other_y in boxes[place_ + 1 :]:
                apart = right <= other_left or other_right <= left or abs(y - other_y) >= 9
                assert apart, key


def test_same_trial_gives_the_same_bytes() -> None:
    """Another process, with another seed for hashes, draws the very same picture."""
    code = (
        "import sys; from tests.trace.tracing import worked_example; "
        "from etl.report.trace_picture import draw; "
        "sys.stdout.buffer.write(draw(worked_example()).encode())"
    )
    drawn = [
        subprocess.run(
            [sys.executable, "-c", code],
            cwd=PROJECT,
            env={"PYTHONHASHSEED": seed, "PYTHONPATH": str(PROJECT)},
            capture_output=True,
            check=True,
        ).stdout
        for seed in ("1", "2")
    ]
    assert drawn[0] == drawn[1] == draw(worked_example()).encode()
