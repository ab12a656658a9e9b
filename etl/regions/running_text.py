"""Definitions that hold the text itself: regions marked in braces, or every word a region."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from etl.regions.geometry import Line, Shape
from etl.regions.layout import NO_PLACE, Space, Span, lay_out, line_extent_px, span_extent_px
from etl.regions.marked_text import MarkedText, parse_marked_text, screen_text
from etl.regions.sources import Draft, Group, Source, Text

if TYPE_CHECKING:
    from etl.study.models import Layout

WORD = re.compile(r"\S+")


def texts_laid_out(source: Source, kind: str, layout: Layout) -> list[Draft]:
    """Read one text per row and lay it out.

    Parameters
    ----------
    source : Source
        A file with a column ``text``.
    kind : {"marked_text", "words"}
        Whether regions are marked in braces, or every word is one.
    layout : Layout
        Where the text stands on the screen.

    Returns
    -------
    list of Draft
        The texts that could be understood; what is wrong is recorded in the source's findings.
    """
    cells = source.raw("text")
    before = _line_breaks_before_text(source)
    drafts = []
    for group in source.groups():
        first = group.rows[0]
        marked = _read_cell(source, kind, first, cells[first], before[first])
        for row in group.rows[1:]:
            source.error(
                "a text is defined twice",
                row=row,
                found=source.name_of(group.values),
                expected=f"one definition; line {source.line(first)} holds the other",
                fix=source.way_out_of_twice("remove one of the two rows"),
            )
            _read_cell(source, kind, row, cells[row], before[row])
        if marked is not None and len(group.rows) == 1:
            draft = _drafted(source, group, marked, layout)
            if draft is not None:
                drafts.append(draft)
    return drafts


def words_of(text: str) -> MarkedText:
    r"""Make every word of a text a region, ``w1``, ``w2``, … over all of its lines.

    Words are split at white space of any kind, no-break spaces included.

    Examples
    --------
    >>> words = words_of("two pears\nfell")
    >>> words.names, words.region_texts
    (['w1', 'w2', 'w3'], ['two', 'pears', 'fell'])
    >>> words.owners
    [1, 1, 1, 0, 2, 2, 2, 2, 2, 0, 3, 3, 3, 3]
    """
    words = MarkedText(text=text, owners=[0] * len(text))
    for order, match in enumerate(WORD.finditer(text), start=1):
        start, stop = match.span()
        words.owners[start:stop] = [order] * (stop - start)
        words.names.append(f"w{order}")
        words.region_texts.append(match.group())
    return words


def _line_breaks_before_text(source: Source) -> list[int]:
    """For each row the line breaks in cells to the left of its text."""
    left = [name for name in source.cells.header[: source.cells.position("text") - 1] if name]
    columns = [source.raw(name) for name in left]
    return [
        sum(_normal(cell).count("\n") for cell in row) for row in zip(*columns, strict=True)
    ] or [0] * len(source.cells)


def _normal(cell: str) -> str:
    r"""A cell with every line break as ``\n``."""
    return cell.replace("\r\n", "\n").replace("\r", "\n")


def _read_cell(
    source: Source, kind: str, row: int, cell: str, line_breaks: int
) -> MarkedText | None:
    """The regions of a cell; None where a problem was recorded."""
    usable = True
    for match in NO_PLACE.finditer(_normal(cell)):
        usable = False
        tab = match.group() == "\t"
        source.error(
            "a tab has no width of its own" if tab else "a character has no place on a line",
            row=row,
            column="text",
            found=match.group(),
            expected="characters of one width, and line breaks",
            fix="write as many spaces as the screen shows"
            if tab
            else "remove the character; for a line break write \\n",
            line_breaks=line_breaks + _normal(cell).count("\n", 0, match.start()),
        )
    marked = parse_marked_text(cell) if kind == "marked_text" else words_of(screen_text(cell))
    for fault in marked.problems:
        source.error(
            fault.problem,
            row=row,
            column="text",
            found=fault.found,
            expected=fault.expected,
            fix=fault.fix,
            line_breaks=line_breaks + fault.line_breaks,
        )
    if not marked.names and not marked.problems:
        source.error(
            "this text has no word",
            row=row,
            column="text",
            found=cell,
            expected="at least one word",
            fix="write the text, or remove the row",
            line_breaks=line_breaks,
        )
    return marked if usable and marked.names and not marked.problems else None


def _drafted(source: Source, group: Group, marked: MarkedText, layout: Layout) -> Draft | None:
    """The laid-out text; None where a problem was recorded."""
    space: Space = "preceding" if layout.space == "preceding" else "following"
    spans, lines = lay_out(marked.text, marked.owners, space)
    roomless = set(range(1, len(marked.names) + 1)) - {span.order for span in spans}
    for order in sorted(roomless):
        source.error(
            "a region takes no room on the screen",
            row=group.rows[0],
            column="text",
            found=marked.names[order - 1],
            expected="at least one character that has a width",
            fix="write the region's text, or remove it",
        )
    if roomless:
        return None
    text = Text(
        keys=dict(zip(source.keys, group.values, strict=True)),
        facts=source.facts_of(group),
        regions=tuple(marked.names),
        region_texts=tuple(marked.region_texts),
        whole=marked.text,
        lines=lines[-1],
        path=source.cells.shown,
        line=source.line(group.rows[0]),
    )
    return Draft(text, _shape(spans, lines, layout))


def _shape(spans: Sequence[Span], lines: Sequence[int], layout: Layout) -> Shape:
    """The rectangles of a text's spans, and its lines."""
    extents = [line_extent_px(layout, number) for number in lines]
    return Shape(
        np.array([span_extent_px(layout, span) for span in spans], dtype=np.float64),
        np.array([span.order for span in spans], dtype=np.int32),
        np.array([span.line for span in spans], dtype=np.int32),
        tuple(
            Line(number, top, bottom, (top + bottom) / 2)
            for number, (top, bottom) in zip(lines, extents, strict=True)
        ),
    )
