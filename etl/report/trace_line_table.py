"""Every fixation of a trial with its place and its line, as a table for terminal and page."""

from __future__ import annotations

import math
from typing import Final

from etl.report.trace_input import UNSURE_BELOW, TracedFixation, TracedTrial
from etl.report.trace_lines import confidence_text, line_facts, line_middles, off_px, sweep_label
from etl.report.trace_markup import text, wrapped

#: The columns: header on the terminal, header on a page.
_COLUMNS: Final = (
    ("n", "fixation"),
    ("x", "x (px)"),
    ("y", "y (px)"),
    ("line", "line"),
    ("off", "below its middle (px)"),
    ("sure", "confidence"),
)
_GAP: Final = "   "
#: What the last column on the terminal says in a letter.
KEY: Final = (
    "n fixation; x, y where it was recorded, px; off: px below the middle of its line, - above; "
    f"? less than {100 * UNSURE_BELOW:g}% sure; * set by hand; R return sweep; U undersweep; "
    "x left out"
)


def _px(value: float) -> str:
    """A whole number of pixels; empty where there is none."""
    return "" if math.isnan(value) else f"{round(value) + 0:d}"


def _cells(fixation: TracedFixation, middles_px: dict[int, float]) -> tuple[str, ...]:
    """The cells of one fixation."""
    return (
        str(fixation.number),
        _px(fixation.x_px),
        _px(fixation.y_px),
        str(fixation.line) if fixation.line else "none",
        _px(off_px(fixation, middles_px)),
        confidence_text(fixation.line_confidence),
    )


def _letters(fixation: TracedFixation) -> str:
    """What else is to be said, in letters."""
    sweep = {"undersweep": "U", "return sweep": "R"}.get(sweep_label(fixation), "")
    doubt = "?" if fixation.unsure else ""
    hand = "*" if fixation.by_hand else ""
    return f"{doubt}{hand}{sweep}{'' if fixation.kept else 'x'}"


def lines_in_columns(traced: TracedTrial, width: int) -> list[str]:
    r"""The table for a terminal: down, then across, in as many columns as there is room for.

    Parameters
    ----------
    traced : TracedTrial
        The trial.
    width : int
        Of the terminal, in characters; at least 40.

    Returns
    -------
    list of str
        Lines no longer than that; without any where no lines were told.

    Examples
    --------
    >>> from etl.report.trace_input import TracedLines
    >>> looks = tuple(TracedFixation(n, 0.0, 200.0, 40.0 * n, 172.5, 2, 1, 1, True, "P1.tsv", 2,
    ...                              line_confidence=0.62) for n in (1, 2))
    >>> trial = TracedTrial("P1", "", "7", "i", {}, ("who",), ("",), looks, (), {}, {},
    ...                     lines=TracedLines("consensus", {1: 130.0, 2: 190.0}))
    >>> print("\n".join(lines_in_columns(trial, 80)))
    n   x    y  line  off  sure     n   x    y  line  off  sure
    1  40  172     2  -18   62% ?   2  80  172     2  -18   62% ?
    """
    if traced.lines is None or not traced.fixations:
        return []
    middles_px = line_middles(traced)
    rows = [(_cells(f, middles_px), _letters(f)) for f in traced.fixations]
    heads = [head for head, _ in _COLUMNS]
    wide = [max(len(cells[k]) for cells, _ in [(heads, ""), *rows]) for k in range(len(heads))]
    letters = max(len(own) for _, own in rows)

    def spelled(cells: tuple[str, ...], own: str) -> str:
        row = "  ".join(f"{cell:>{w}}" for cell, w in zip(cells, wide, strict=True))
        return f"{row} {own:<{letters}}"

    head = spelled(tuple(heads), "")
    across = max(1, (width + len(_GAP)) // (len(head) + len(_GAP)))
    down = -(-len(rows) // across)
    across = -(-len(rows) // down)
    spelled_rows = [spelled(*row) for row in rows]
    out = [_GAP.join([head] * across).rstrip()]
    out += [_GAP.join(spelled_rows[start::down]).rstrip() for start in range(down)]
    return out


def lines_on_page(traced: TracedTrial, own: str) -> str:
    """The table for a page; each fixation leads to its bar in the picture.

    Parameters
    ----------
    traced : TracedTrial
        The trial.
    own : str
        What the ids of its bars begin with.

    Returns
    -------
    str
        Markup; empty where no lines were told.
    """
    if traced.lines is None or not traced.fixations:
        return ""
    middles_px = line_middles(traced)
    heads = [wrapped("th", {"scope": "col"}, [text(head)]) for _, head in _COLUMNS]
    heads.append(wrapped("th", {"scope": "col"}, ["remarks"]))
    rows = []
    for fixation in traced.fixations:
        number, *others = _cells(fixation, middles_px)
        link = wrapped("a", {"href": f"#{own}-f{number}"}, [number])
        cells = [wrapped("th", {"scope": "row"}, [link])]
        cells += [wrapped("td", {}, [text(cell)]) for cell in others]
        cells.append(wrapped("td", {}, [text("; ".join(_remarks(fixation)))]))
        rows.append(wrapped("tr", {"class": "unsure" if fixation.unsure else "told"}, cells))
    caption = wrapped("caption", {}, ["every fixation where it was recorded, and its line"])
    head = wrapped("thead", {}, [wrapped("tr", {}, heads)])
    return wrapped("table", {"class": "lines"}, [caption, head, wrapped("tbody", {}, rows)])


def _remarks(fixation: TracedFixation) -> list[str]:
    """What else is to be said, in words; the confidence has a column of its own."""
    told = [fact for fact in line_facts(fixation) if not fact.endswith("% sure")]
    if fixation.unsure:
        told.insert(0, "unsure")
    if not fixation.kept:
        told.append(f"left out by {fixation.left_out_by}")
    return told
