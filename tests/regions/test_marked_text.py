"""Regions marked in the text itself: what belongs to a region, and what is no mark at all."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.regions.marked_text import parse_marked_text, screen_text


def owned(cell: str) -> str:
    """A text with the order of each character's region below it."""
    marked = parse_marked_text(cell)
    assert not marked.problems
    assert len(marked.text) == len(marked.owners)
    return marked.text + "|" + "".join(map(str, marked.owners))


@pytest.mark.parametrize(
    ("cell", "expected"),
    [
        pytest.param("{a: the} {b: pear} fell", "the pear fell|1110222200000", id="plain"),
        pytest.param("{a:the}{b:  pear}", "the pear|11122222", id="only-one-space-dropped"),
        pytest.param("{a: the }pear", "the pear|11110000", id="space-inside-is-own"),
        pytest.param("{{x}} {a: {{y}}}", "{x} {y}|0000111", id="doubled-braces-are-shown"),
        pytest.param("{a: he said: go}", "he said: go|11111111111", id="later-colons-are-text"),
        pytest.param("{ a b : go}", "go|11", id="name-is-trimmed"),
        pytest.param("{a: x}\\n{b: y}", "x\ny|102", id="spelled-line-break"),
        pytest.param("{a: x\r\ny}", "x\ny|111", id="windows-line-break-inside-region"),
        pytest.param("{a:\ny}", "\ny|11", id="line-break-right-after-colon"),
        pytest.param("{a: back\\slash}", "back\\slash|1111111111", id="lone-backslash-is-text"),
    ],
)
def test_marks_take_no_room_and_text_keeps_its_region(cell: str, expected: str) -> None:
    """Braces, names and one space after the colon vanish; everything else is shown."""
    assert owned(cell) == expected


def test_names_and_own_texts_come_in_order_of_appearance() -> None:
    """Order is order of appearance."""
    marked = parse_marked_text("{who: She} {verb: watered} them")
    assert (marked.names, marked.region_texts) == (["who", "verb"], ["She", "watered"])


@pytest.mark.parametrize(
    ("cell", "problems"),
    [
        pytest.param("a {b: c", [("a brace is never closed", "{b: c", 0)], id="unclosed"),
        pytest.param("{a: b} c}", [("a brace closes no region", "}", 0)], id="stray"),
        pytest.param(
            "{a: b {c: d} e}", [("a brace opens inside a region", "{c: d} e}", 0)], id="nested"
        ),
        pytest.param(
            "{a: b {c: d}", [("a brace opens inside a region", "{c: d}", 0)], id="forgotten-close"
        ),
        pytest.param(
            "{pear}", [("a region has no colon after its name", "{pear}", 0)], id="no-colon"
        ),
        pytest.param(
            "{pear\nfell: x}",
            [("a region has no colon after its name", "{pear", 0)],
            id="no-colon-on-the-line",
        ),
        pytest.param(
            "{pear\\nfell: x}",
            [("a region has no colon after its name", "{pear\\nfell: x}", 0)],
            id="spelled-line-break-in-name",
        ),
        pytest.param("{ : pear}", [("a region has no name", "{ : pear}", 0)], id="empty-name"),
        pytest.param("x\ny {a: }", [("a region has no text", "{a: }", 1)], id="empty-text"),
        pytest.param("x {a:  \\n }", [("a region has no text", "{a:  \\n }", 0)], id="only-space"),
        pytest.param(
            "{a: x}\n\n{a: y}",
            [("a region is named twice in one text", "{a: y}", 2)],
            id="named-twice",
        ),
        pytest.param("pear", [("this text marks no region", "pear", 0)], id="no-region"),
        pytest.param("", [("this text marks no region", "", 0)], id="empty-cell"),
        pytest.param(
            "{a: x}}\n{b: y}",
            [("a brace opens inside a region", "{b: y}", 1)],
            id="doubled-brace-does-not-close",
        ),
        pytest.param(
            "} {a} {b: x",
            [
                ("a brace closes no region", "} {a} {b: x", 0),
                ("a region has no colon after its name", "{a} {b: x", 0),
                ("a brace is never closed", "{b: x", 0),
            ],
            id="all-at-once",
        ),
    ],
)
def test_fault_is_named_with_the_line_it_stands_on(
    cell: str, problems: list[tuple[str, str, int]]
) -> None:
    """Every fault of a text is found, each with its excerpt and the line breaks before it."""
    found = [(p.problem, p.found, p.line_breaks) for p in parse_marked_text(cell).problems]
    assert found == problems


def test_spelled_line_break_does_not_move_the_line_of_the_file() -> None:
    """Only real line breaks in the cell count towards the line of the file."""
    (problem,) = parse_marked_text("x\\ny\n{a x}").problems
    assert problem.line_breaks == 1


@given(st.text(alphabet="ab :{}\\n\n", max_size=40))
def test_any_cell_gives_regions_or_a_fault(cell: str) -> None:
    """Whatever the cell holds, it is understood in full or a fault is named."""
    marked = parse_marked_text(cell)
    assert len(marked.text) == len(marked.owners)
    if not marked.problems:
        assert sorted(set(marked.owners) - {0}) == list(range(1, len(marked.names) + 1))


@given(
    st.lists(
        st.tuples(st.sampled_from(["region", "outside"]), st.text("ab{} ", min_size=1)),
        min_size=1,
        max_size=8,
    )
)
def test_marked_text_reads_back_what_was_written(parts: list[tuple[str, str]]) -> None:
    """Writing regions with doubled braces and reading them gives the same text and owners."""
    cell, text, owners, order = "", "", [], 0
    for what, part in parts:
        escaped = part.replace("{", "{{").replace("}", "}}")
        if what == "region" and part.strip() and not part.endswith("}"):
            order += 1
            cell += f"{{r{order}: {escaped}}}"
            owners += [order] * len(part)
        elif part.startswith("}") or part.endswith("{"):
            # A doubled brace next to a single one is read from the left: keep them apart.
            cell, text = f"{cell} {escaped} ", f"{text} {part} "
            owners += [0] * (len(part) + 2)
            continue
        else:
            cell += escaped
            owners += [0] * len(part)
        text += part
    if order:
        marked = parse_marked_text(cell)
        assert (marked.problems, marked.text, marked.owners) == ([], text, owners)


@pytest.mark.parametrize(
    ("cell", "expected"),
    [("a\\nb", "a\nb"), ("a\r\nb\rc\nd", "a\nb\nc\nd"), ("{a: b}", "{a: b}")],
    ids=["spelled", "every-system", "braces-are-plain"],
)
def test_plain_cell_keeps_all_but_line_breaks(cell: str, expected: str) -> None:
    """In a plain text only line breaks are rewritten."""
    assert screen_text(cell) == expected


def test_names_of_regions_are_composed() -> None:
    """A name is the same however its letters with accents are written."""
    assert parse_marked_text("{mu\u0308hle: The mill}").names == ["m\u00fchle"]
