"""Fixations in the picture of a trial: bars, their labels, and what is shown on pointing at one."""

from __future__ import annotations

from typing import Final

from etl.report.trace_glyphs import width_of
from etl.report.trace_input import TracedFixation, TracedTrial
from etl.report.trace_lines import line_facts
from etl.report.trace_marks import diamond, line_marks
from etl.report.trace_markup import number, straight, tag, text, wrapped
from etl.report.trace_phrases import ms
from etl.report.trace_places import PLOT_RIGHT, Bar, Places

HALF_BAR: Final = 5.0
_BESIDE_BAR: Final = 9.0
#: Width of a letter of a bar's label, and the height of its line.
_LABEL_LETTER: Final = 6.6
_LABEL_LINE: Final = 11.0
#: How many labels back one may still be in the way.
_NEAR: Final = 40


def kind_of(fixation: TracedFixation) -> str:
    """How a fixation is drawn: ``out``, ``outside``, ``first`` or ``later``."""
    if not fixation.kept:
        return "out"
    if not fixation.region_order:
        return "outside"
    return "first" if fixation.first_pass else "later"


def bar_shape(kind: str, x: float, half: float, top: float, bottom: float) -> str:
    """The bar itself, crossed out where it is left out."""
    shape: dict[str, str | float] = {
        "class": f"bar {kind}",
        "x": x - half,
        "y": top,
        "width": 2 * half,
        "height": bottom - top,
    }
    cross = ""
    if kind == "out":
        middle, reach = (top + bottom) / 2, 4.0
        cross = tag(
            "path",
            {
                "class": "cross",
                "d": f"{straight(x - reach, middle - reach, x + reach, middle + reach)} "
                f"{straight(x - reach, middle + reach, x + reach, middle - reach)}",
            },
        )
    return tag("rect", shape) + cross


def bars(traced: TracedTrial, places: Places, own: str) -> str:
    """All fixations, each with its number and its duration."""
    taken: list[tuple[float, float, float]] = [(b.x - 5, b.x + 5, b.top) for b in places.bars]
    parts = [_bar(traced, bar, own, taken) for bar in places.bars]
    return wrapped("g", {"class": "bars"}, parts)


def _bar(traced: TracedTrial, bar: Bar, own: str, taken: list[tuple[float, float, float]]) -> str:
    """One fixation."""
    fixation = bar.fixation
    kind = kind_of(fixation)
    half = HALF_BAR / 2 if kind == "outside" else HALF_BAR
    attributes: dict[str, str | float] = {
        "class": f"fixation {kind}",
        "id": f"{own}-f{fixation.number}",
        "data-fixation": str(fixation.number),
        "data-duration-ms": ms(fixation.duration_ms),
    }
    if fixation.onset_ms == fixation.onset_ms:
        attributes["data-onset-ms"] = ms(fixation.onset_ms)
    label = _label(traced, fixation)
    plain = f"{fixation.number} {label}"
    reach = width_of(plain) * _LABEL_LETTER
    middle = (bar.top + bar.bottom) / 2 + 4
    on_right = _is_free(taken, bar.x + _BESIDE_BAR, bar.x + _BESIDE_BAR + reach, middle)
    side = 1 if bar.beyond < 0 or (on_right and bar.beyond == 0) else -1
    if side > 0 and bar.x + reach > PLOT_RIGHT + 4:
        side = -1
    x = bar.x + side * _BESIDE_BAR
    ends = (x, x + reach) if side > 0 else (x - reach, x)
    taken.append((*ends, middle))
    parts = [
        wrapped("title", {}, [text(_hint(traced, fixation))]),
        bar_shape(kind, bar.x, half, bar.top, bar.bottom),
        wrapped(
            "text",
            {"class": "label halo" + ("" if side > 0 else " end"), "x": x, "y": middle},
            [
                wrapped("tspan", {"class": "number"}, [str(fixation.number)]),
                text(f" {label}"),
            ],
        ),
    ]
    marks = line_marks(fixation, (bar.x, middle - 4), (half, (bar.bottom - bar.top) / 2))
    if traced.lines is not None and not fixation.line:
        marks.append(diamond(bar.x, middle - 4))
    if marks:
        parts.insert(2, wrapped("g", {"class": "line-marks"}, marks))
    if bar.beyond:
        tip = bar.x + bar.beyond * 12
        d = f"M{number(tip)} {number(middle - 4)} l{-6 * bar.beyond} -5 l0 10 z"
        parts.append(tag("path", {"class": "beyond", "d": d}))
    return wrapped("g", attributes, parts)


def _is_free(taken: list[tuple[float, float, float]], left: float, right: float, y: float) -> bool:
    """Whether a label would not stand on another one."""
    return all(
        right < t_left or left > t_right or abs(y - t_y) >= _LABEL_LINE
        for t_left, t_right, t_y in taken[-_NEAR:]
    )


def _label(traced: TracedTrial, fixation: TracedFixation) -> str:
    """What stands beside a bar after its number: its duration, or the rule that left it out."""
    duration = ms(round(fixation.duration_ms))
    if fixation.kept:
        return duration
    if traced.removal is not None and fixation.left_out_by == traced.removal.rule:
        return duration
    if fixation.merged_into:
        return f"{fixation.left_out_by}, into {fixation.merged_into}"
    return fixation.left_out_by


def _hint(traced: TracedTrial, fixation: TracedFixation) -> str:
    """All that is known of a fixation, shown when it is pointed at."""
    parts = [f"fixation {fixation.number}", f"{ms(fixation.duration_ms)} ms"]
    if fixation.onset_ms == fixation.onset_ms:
        parts.append(f"from {ms(fixation.onset_ms)} ms in log time")
    if fixation.placed:
        parts.append(f"x {ms(fixation.x_px)} px, y {ms(fixation.y_px)} px")
    if traced.lines is not None:
        parts.append(f"line {fixation.line}" if fixation.line else "no line")
        parts += line_facts(fixation)
    if fixation.region_order:
        visit = f", visit {fixation.visit}" if fixation.visit else ""
        first = ", first pass" if fixation.first_pass else ""
        parts.append(f"on {traced.region(fixation.region_order)}{visit}{first}")
    elif fixation.kept:
        parts.append("outside every region")
    if not fixation.kept:
        into = f" {fixation.merged_into}" if fixation.merged_into else ""
        parts.append(f"merged into{into}" if into else f"left out by {fixation.left_out_by}")
    parts.append(f"{fixation.source_file}:{fixation.source_line}")
    return "; ".join(parts)
