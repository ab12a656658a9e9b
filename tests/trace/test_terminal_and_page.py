"""A trial on the terminal and on a page of its own."""

from __future__ import annotations

import html.parser
import itertools
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import Removal, TracedTrial
from etl.report.trace_page import page
from etl.report.trace_text import as_text, wrapped_text
from etl.report.trace_words import explain
from tests.trace.random_trials import trials
from tests.trace.tracing import BuiltStudy, by_hand, worked_example

DRAWN = """\
participant P1, trial 7, item i01 (cue early)
10 fixations, all kept; 3 regressive saccades; 5 regions
from logs/P1.tsv, lines 2 to 11

   n    ms |when  |topic |auxil~|verb  |object|
   1   200 |   #  |      |      |      |      | when "xxxxxxxxx"
   2   180 |      |   #  |      |      |      | topic "xxxxxxxxx"
   3   220 |      |   #  |      |      |      | topic "xxxxxxxxx"
   4   250 |      |      |      |   #  |      | verb "xxxxxxxxx"
   5   190 |      |      |   o<====='  |      | R1 auxiliary "xxxxxxx~
   6   210 |      |   o<====='  |      |      | R2 topic "xxxxxxxxx"
"""


def rows_of(text: str) -> list[str]:
    """The rows of the drawing that are about fixations."""
    return [line for line in text.splitlines() if re.match(r" *\d+ +[\d,.]+ ", line)]


@settings(max_examples=150, deadline=None)
@given(traced=trials(), width=st.integers(20, 160), encoding=st.sampled_from(["utf-8", "ascii"]))
def test_nothing_is_wider_than_the_terminal(traced: TracedTrial, width: int, encoding: str) -> None:
    """Every line fits; a terminal of less than 40 columns is taken for one of 40."""
    text = as_text(traced, width, encoding=encoding)
    assert max(width_of(line) for line in text.splitlines()) <= max(40, width)
    text.encode(encoding)


@settings(max_examples=100, deadline=None)
@given(traced=trials())
def test_every_fixation_has_its_row_and_every_mark_its_form(traced: TracedTrial) -> None:
    """One row a fixation, in time order, with the mark of its kind; rails for regressions only."""
    drawing = as_text(traced, 100, explanation=explain(traced).only(["nothing"], []))
    rows = rows_of(drawing)
    assert [int(row[:4]) for row in rows] == [f.number for f in traced.fixations]
    landings = {r.landing for r in traced.regressions}
    for row, fixation in zip(rows, traced.fixations, strict=True):
        mark = (
            "×"
            if not fixation.kept
            else "·"
            if not fixation.region_order
            else ("█" if fixation.first_pass else "▒")
        )
        assert row[20:77].count(mark) == 1
        assert ("◀" in row) == (fixation.number in landings)


def test_plain_drawing_as_a_whole() -> None:
    """What a terminal without line drawing shows, character for character."""
    text = as_text(worked_example(), 70, encoding="ascii")
    assert text.startswith(DRAWN)


def test_left_out_fixation_names_its_rule() -> None:
    """The rule stands in the row."""
    traced = by_hand([1, 2], [200, 62], 2, left_out={2: Removal("under_ms", "80", "62")})
    assert rows_of(as_text(traced, 80))[1].endswith("left out: under_ms")


def test_explanation_is_all_there(orchard: BuiltStudy) -> None:
    """Every sentence of the explanation stands under the drawing, whatever the width."""
    traced = orchard.trace(*orchard.trials[0])
    squeezed = re.sub(r"\s+", "", as_text(traced, 50))
    said = explain(traced)
    for statement in (*said.trial, *(s for region in said.regions for s in region.statements)):
        assert re.sub(r"\s+", "", statement.sentence) in squeezed


@pytest.mark.parametrize("width", [40, 61, 100])
def test_lines_of_a_passage_have_headers(passages: BuiltStudy, width: int) -> None:
    """Each run on a line begins with that line's number and its regions."""
    traced = passages.trace(*passages.trials[0])
    on_lines = [f.line for f in traced.fixations if f.line]
    runs = 1 + sum(a != b for a, b in itertools.pairwise(on_lines))
    text = as_text(traced, width).split("\nLines\n")[0]
    assert len(re.findall(r"(?:^| )line \d+$", text, re.MULTILINE)) == runs


def test_terminal_is_not_commanded() -> None:
    """Control characters in names never reach the terminal."""
    traced = by_hand([1, 2], [200, 200], 2, names=["a\x1b[2J", "b\x07"], item="i\r\x9b")
    assert not re.search(r"[\x00-\x09\x0b-\x1f\x7f-\x9f]", as_text(traced, 80))


def test_wide_names_keep_the_columns() -> None:
    """Characters of two columns do not shift the edges of regions."""
    plain = as_text(by_hand([1, 2], [200, 200], 2, names=["abcd", "ef"]), 80).splitlines()[4]
    wide = as_text(by_hand([1, 2], [200, 200], 2, names=["梨樹", "🍐"]), 80).splitlines()[4]
    edges = [
        [width_of(line[:at]) for at, c in enumerate(line) if c == "│"] for line in (plain, wide)
    ]
    assert edges[0] == edges[1]


@settings(max_examples=300, deadline=None)
@given(
    words=st.lists(st.text("ab梨\u0301", min_size=1, max_size=30), min_size=1, max_size=8),
    width=st.integers(8, 30),
)
def test_wrapping_loses_nothing_and_keeps_to_the_width(words: list[str], width: int) -> None:
    """Broken into lines, also within long words, a text is still the same text."""
    lines = wrapped_text(" ".join(words), width, first="  ", rest="    ")
    assert "".join(line.strip() for line in lines).replace(" ", "") == "".join(words)
    assert max(width_of(line) for line in lines) <= width


class _Page(html.parser.HTMLParser):
    """Collects ids, links, tags and cells of a page."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.ids: set[str] = set()
        self.links: list[str] = []
        self.tags: list[str] = []
        self.texts: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note an element."""
        self.tags.append(tag)
        found = dict(attrs)
        if found.get("id"):
            self.ids.add(found["id"] or "")
        if found.get("href"):
            self.links.append(found["href"] or "")

    def handle_data(self, data: str) -> None:
        """Note a text."""
        self.texts.append(data)


def test_page_holds_picture_and_every_sentence() -> None:
    """Under the picture stands every sentence of the explanation."""
    traced = worked_example()
    read = _Page(page(traced))
    said = explain(traced)
    assert read.tags.count("svg") == 1
    sentences = [s.sentence for region in said.regions for s in region.statements]
    assert set(sentences) | {s.sentence for s in said.trial} <= set(read.texts)


def test_links_of_a_page_lead_somewhere() -> None:
    """Fixations named beside an outcome are links to their bars; none leaves the page."""
    read = _Page(page(worked_example()))
    assert read.links
    assert all(link.startswith("#") and link[1:] in read.ids for link in read.links)


@pytest.mark.parametrize("name", ["<script>alert(1)</script>", "</style><b>", '" onload="x'])
def test_markup_in_names_is_text_on_the_page(name: str) -> None:
    """Names never become elements or attributes."""
    hostile = by_hand([1, 2, 1], [200] * 3, 2, names=[name, "b"], item=name)
    plain = by_hand([1, 2, 1], [200] * 3, 2, names=["a", "b"], item="i")
    assert sorted(_Page(page(hostile)).tags) == sorted(_Page(page(plain)).tags)
    assert any(name in text for text in _Page(page(hostile)).texts)
