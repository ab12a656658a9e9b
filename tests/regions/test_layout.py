"""Where characters stand: columns, spaces, edges, against a naive walk over the characters."""

from __future__ import annotations

import itertools
import math
import unicodedata
from types import SimpleNamespace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.regions.layout import columns, edge_px, lay_out, span_extent_px
from etl.regions.running_text import words_of


@pytest.mark.parametrize(
    ("line", "width"),
    [
        pytest.param("pear", 4, id="ascii"),
        pytest.param("café", 4, id="composed-accent"),
        pytest.param(unicodedata.normalize("NFD", "café"), 4, id="decomposed-accent"),
        pytest.param("a\u200bb\ufeffc\u2060d", 4, id="zero-width-characters"),
        pytest.param("שָׁלוֹם", 4, id="hebrew-points"),
        pytest.param("ไม้", 2, id="thai-marks-above"),
        pytest.param("梨の木", 3, id="wide-script-one-column-each"),
        pytest.param(unicodedata.normalize("NFD", "한글"), 2, id="decomposed-hangul"),
        pytest.param("🍐🍎", 2, id="emoji"),
        pytest.param("👩🏽\u200d🌾", 1, id="joined-emoji"),
        pytest.param("🇮🇹🇳🇱", 2, id="two-flags"),
        pytest.param("\u0600\u0661", 2, id="arabic-number-sign-is-drawn"),
        pytest.param("", 0, id="empty"),
    ],
)
def test_only_characters_with_a_width_take_room(line: str, width: int) -> None:
    """Marks, joiners and format characters stand on the character before them."""
    assert columns(line)[-1] == width


@pytest.mark.parametrize(
    ("text", "owners", "space", "expected"),
    [
        pytest.param("ab cd", "11022", "following", [(1, 1, 0, 2), (2, 1, 2, 5)], id="following"),
        pytest.param("ab cd", "11022", "preceding", [(1, 1, 0, 3), (2, 1, 3, 5)], id="preceding"),
        pytest.param("ab cd ef", "11000022", "following", [(1, 1, 0, 2), (2, 1, 5, 8)], id="gap"),
        pytest.param("ab cd ef", "11000022", "preceding", [(1, 1, 0, 3), (2, 1, 6, 8)], id="gap-p"),
        pytest.param("ab  cd", "110022", "following", [(1, 1, 0, 2), (2, 1, 2, 6)], id="two"),
        pytest.param("ab  cd", "110022", "preceding", [(1, 1, 0, 4), (2, 1, 4, 6)], id="two-p"),
        pytest.param("ab  cd", "110222", "following", [(1, 1, 0, 2), (2, 1, 2, 6)], id="half-own"),
        pytest.param("ab  cd", "111022", "following", [(1, 1, 0, 3), (2, 1, 3, 6)], id="half-2"),
        pytest.param("ab\ncd", "11022", "following", [(1, 1, 0, 2), (2, 2, 0, 2)], id="lines"),
        pytest.param("ab \ncd", "110022", "preceding", [(1, 1, 0, 3), (2, 2, 0, 2)], id="trailing"),
        pytest.param("ab \ncd", "110022", "following", [(1, 1, 0, 2), (2, 2, 0, 2)], id="trail-f"),
        pytest.param("  ab", "0011", "following", [(1, 1, 0, 4)], id="indented"),
        pytest.param("  ab", "0011", "preceding", [(1, 1, 2, 4)], id="indented-p"),
        pytest.param("ab\ncd", "11111", "following", [(1, 1, 0, 2), (1, 2, 0, 2)], id="two-lines"),
        pytest.param("ab \n cd", "0011111", "following", [(1, 2, 0, 3)], id="white-only-stretch"),
        pytest.param("abc", "011", "preceding", [(1, 1, 1, 3)], id="inside-a-word"),
    ],
)
def test_white_space_goes_to_one_neighbour(
    text: str, owners: str, space: str, expected: list[tuple[int, int, int, int]]
) -> None:
    """Space between words belongs to the word after it, or before it; inside a region its own."""
    spans, _ = lay_out(text, [int(owner) for owner in owners], space)  # type: ignore[arg-type]
    assert [(s.order, s.line, s.start, s.stop) for s in spans] == expected


def test_blank_lines_keep_their_number_but_carry_nothing() -> None:
    """A blank line takes its height; no fixation can belong to it."""
    _, lines = lay_out("\nab\n  \ncd\n", [0, 1, 1, 0, 0, 0, 0, 2, 2, 0], "following")
    assert lines == [2, 4]


@pytest.mark.parametrize(
    ("direction", "extent"),
    [("ltr", (220, 540, 250, 580)), ("rtl", (160, 540, 190, 580))],
)
def test_span_extent_by_hand(direction: str, extent: tuple[float, ...]) -> None:
    """Columns 2 to 5 of line 2; right to left, column 2 lies at 200 - 2 * 10 to 200 - 10."""
    layout = SimpleNamespace(
        left_px=200, top_px=500, character_width_px=10, line_height_px=40, direction=direction
    )
    (span,) = lay_out("x\nab cde", [0, 0, 0, 0, 0, 1, 1, 1], "preceding")[0]
    assert (span.start, span.stop) == (3, 6)
    assert (
        span_extent_px(layout, lay_out("\nabcde", [0, 0, 0, 1, 1, 1], "preceding")[0][0]) == extent
    )


@given(st.floats(0.1, 40), st.floats(-500, 500), st.sampled_from(["ltr", "rtl"]))
def test_neighbours_share_their_edge_exactly(width: float, left: float, direction: str) -> None:
    """One region's end is the next one's start, bit for bit, whatever the character width."""
    layout = SimpleNamespace(
        left_px=left, top_px=0, character_width_px=width, line_height_px=40, direction=direction
    )
    words = words_of("one of the pears")
    spans, _ = lay_out(words.text, words.owners, "following")
    extents = [span_extent_px(layout, span) for span in spans]
    ends, starts = (2, 0) if direction == "ltr" else (0, 2)
    for before, after in itertools.pairwise(extents):
        assert before[ends] == after[starts]


def naive_word_at(text: str, space: str, line: int, column: int) -> int:
    """Walk over the characters: the word at a column of a line, 0 for none."""
    order, found = 0, 0
    for number, content in enumerate(text.split("\n")):
        owners = []
        for i, character in enumerate(content):
            if character != " " and (i == 0 or content[i - 1] == " "):
                order += 1
            owners.append(order if character != " " else 0)
        if number != line or not 0 <= column < len(content):
            continue
        step = 1 if space == "following" else -1
        at = column
        while 0 <= at < len(content) and owners[at] == 0:
            at += step
        found = owners[at] if 0 <= at < len(content) else 0
    return found


@given(
    st.text(alphabet="ab \n", min_size=1, max_size=60),
    st.sampled_from(["following", "preceding"]),
    st.integers(0, 6),
    st.floats(-3.0, 20.0),
)
def test_word_spans_equal_a_walk_over_the_characters(
    text: str, space: str, line: int, column: float
) -> None:
    """The spans of words hold just the columns that a naive walk gives them."""
    words = words_of(text)
    spans, _ = lay_out(text, words.owners, space)  # type: ignore[arg-type]
    hits = [s.order for s in spans if s.line == line + 1 and s.start <= column < s.stop]
    expected = naive_word_at(text, space, line, math.floor(column))
    assert hits == ([expected] if expected else [])


def test_edge_is_computed_from_the_left_edge_of_the_first_character() -> None:
    """Right to left, the first character still has its left edge at ``left_px``."""
    layout = SimpleNamespace(left_px=200, character_width_px=10, direction="rtl")
    assert [edge_px(layout, column) for column in (0, 1, 2)] == [210, 200, 190]
