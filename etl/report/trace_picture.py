"""The picture of one trial, as an SVG of its own: the text across, time running down."""

from __future__ import annotations

import hashlib
from typing import Final

from etl.report.trace_glyphs import printable, shortened, width_of
from etl.report.trace_input import TracedFixation, TracedTrial
from etl.report.trace_links import links
from etl.report.trace_markup import number, tag, text, wrapped
from etl.report.trace_notes import notes
from etl.report.trace_overview import overview
from etl.report.trace_phrases import ms
from etl.report.trace_places import (
    LINE_BOX,
    NAME_HEIGHT,
    NAME_LETTER,
    PLOT_LEFT,
    PLOT_RIGHT,
    WIDTH,
    Bar,
    Name,
    Places,
    Stretch,
    place,
)
from etl.report.trace_style import STYLE

_HALF_BAR: Final = 5.0
_BESIDE_BAR: Final = 9.0
#: Width of a letter of a bar's label, and the height of its line.
_LABEL_LETTER: Final = 6.6
_LABEL_LINE: Final = 11.0
#: Of a monospaced letter the advance is 0.6 of the type's size (common practice, no source).
_ADVANCE: Final = 0.6
_LARGEST_TYPE: Final = 19.0
_LEGEND_TOP: Final = 78.0


def draw(traced: TracedTrial) -> str:
    """Draw a trial.

    Time runs down and is to scale; every fixation is a bar from its onset to its end, at its place
    under the line of text that it is on. A bar is filled in a first pass, hollow in a later visit,
    half as wide outside every region, and crossed out where it was left out, with the rule beside
    it. A saccade is a line; a regressive one is a pair of rails with an arrowhead and a name.

    Parameters
    ----------
    traced : TracedTrial
        The trial.

    Returns
    -------
    str
        An SVG document that needs nothing else: no script, no font, no request. The same trial
        gives the same bytes. Every fixation is one element with the attributes ``data-fixation``,
        ``data-onset-ms`` and ``data-duration-ms``, every regression one with ``data-launch`` and
        ``data-landing``.

    Examples
    --------
    >>> nan = float("nan")
    >>> look = TracedFixation(1, 0.0, 200.0, nan, nan, 0, 1, 1, True, "P1.tsv", 2)
    >>> trial = TracedTrial("P1", "", "7", "i01", {}, ("who", "verb"), ("", ""), (look,), (),
    ...                     {}, {})
    >>> picture = draw(trial)
    >>> picture.startswith('<svg xmlns="http://www.w3.org/2000/svg"'), 'data-fixation="1"' in picture
    (True, True)
    """
    own = identity(traced)
    head, top = _head(traced)
    over, top = overview(traced, top)
    places = place(traced, top)
    height = places.bottom + 24
    body = [
        tag("rect", {"class": "ground", "width": WIDTH, "height": height}),
        head,
        over,
        *(_ground(places, stretch) for stretch in places.stretches),
        links(traced, places),
        *(_line(traced, places, stretch) for stretch in places.stretches),
        _bars(traced, places, own),
        notes(traced, places),
    ]
    words = f"{traced.summary}. {_READING}"
    attributes = {
        "xmlns": "http://www.w3.org/2000/svg",
        "class": "trace-picture",
        "role": "img",
        "aria-labelledby": f"{own}-title {own}-desc",
        "viewBox": f"0 0 {number(WIDTH)} {number(height)}",
        "width": WIDTH,
        "height": height,
    }
    inner = [
        wrapped("title", {"id": f"{own}-title"}, [text(f"Fixations of {traced.heading}")]),
        wrapped("desc", {"id": f"{own}-desc"}, [text(words)]),
        f"<style>{STYLE}</style>",
        *body,
    ]
    return wrapped("svg", attributes, inner) + "\n"


_READING: Final = (
    "The text runs across and time runs down; each fixation is a bar from its onset to its end. "
    "Filled bars belong to a first pass, hollow ones to a later visit, narrow ones lie outside "
    "every region, crossed-out ones were left out. Double lines with an arrowhead are regressive "
    "saccades."
)


def identity(traced: TracedTrial) -> str:
    """A name for the trial that is fit for ids in a document with pictures of many trials."""
    key = "\0".join((traced.participant, traced.session, traced.trial))
    digest = hashlib.sha256(key.encode("utf-8", "surrogatepass")).hexdigest()
    return f"trace-{digest[:10]}"


def _head(traced: TracedTrial) -> tuple[str, float]:
    """Which trial it is, what it holds, and how to read the picture; and where that ends."""
    factors = " · ".join(f"{name} {level}" for name, level in traced.factors.items())
    title = traced.heading + (f" · {factors}" if factors else "")
    conventions = f"outside = {traced.outside}, no_opportunity = {traced.no_opportunity}"
    rows = [
        wrapped("text", {"class": "title", "x": 20, "y": 30}, [text(shortened(title, 110))]),
        wrapped("text", {"class": "muted", "x": 20, "y": 52}, [text(traced.summary)]),
        wrapped(
            "text", {"class": "muted end", "x": WIDTH - 20, "y": 52}, [text(conventions)]
        ),
    ]
    top = _LEGEND_TOP
    if traced.removal is not None:
        r = traced.removal
        limit = f" = {r.limit}" if r.limit else ""
        found = f" (found {r.observed})" if r.observed else ""
        words = f"This trial is left out by {r.rule}{limit}{found}: it has no outcomes."
        rows.append(
            tag("rect", {"class": "banner", "x": 20, "y": 64, "width": WIDTH - 40, "height": 26})
        )
        rows.append(
            wrapped("text", {"class": "strong", "x": 32, "y": 82}, [text(shortened(words, 150))])
        )
        top += 32
    return wrapped("g", {"class": "head"}, [*rows, _legend(top)]), top + 36


def _legend(top: float) -> str:
    """What the marks mean."""
    samples: list[str] = []
    x = 20.0
    for kind, label in (
        ("first", "first pass"),
        ("later", "later visit"),
        ("outside", "outside every region"),
        ("out", "left out, with its rule"),
    ):
        half = _HALF_BAR if kind != "outside" else _HALF_BAR / 2
        samples += [_bar_shape(kind, x + _HALF_BAR, half, top - 14, top + 4)]
        samples += [wrapped("text", {"class": "small", "x": x + 18, "y": top}, [text(label)])]
        x += 18 + width_of(label) * 6.3 + 28
    samples.append(tag("path", {"class": "saccade", "d": _path(x, top - 8, x + 34, top - 2)}))
    samples.append(wrapped("text", {"class": "small", "x": x + 42, "y": top}, [text("saccade")]))
    x += 42 + 7 * 6.3 + 28
    for kind in ("rail", "between-rails"):
        samples.append(tag("path", {"class": kind, "d": _path(x + 10, top - 4, x + 46, top - 7)}))
    tip = f"M{number(x)} {number(top - 3)} l11 -6 l1 10 z"
    samples.append(tag("path", {"class": "arrowhead", "d": tip}))
    words = "regression, numbered R1, R2, …"
    samples.append(wrapped("text", {"class": "small", "x": x + 54, "y": top}, [text(words)]))
    return wrapped("g", {"class": "legend"}, samples)


def _path(x1: float, y1: float, x2: float, y2: float) -> str:
    """A straight line."""
    return f"M{number(x1)} {number(y1)} L{number(x2)} {number(y2)}"


def _ground(places: Places, stretch: Stretch) -> str:
    """Behind the bars of a stretch: its regions as stripes, its times as lines."""
    parts: list[str] = []
    across = places.across
    for piece in (p for p in across.pieces if p.line == stretch.line):
        left, right = across.at(piece.left_px), across.at(piece.right_px)
        parity = "odd" if piece.order % 2 else "even"
        parts.append(
            tag(
                "rect",
                {
                    "class": f"stripe {parity}",
                    "x": left,
                    "y": stretch.body_top,
                    "width": right - left,
                    "height": stretch.bottom - stretch.body_top,
                },
            )
        )
    for segment in stretch.segments:
        start = segment.start_ms - stretch.zero_ms
        tick = -(-start // places.step_ms) * places.step_ms
        while tick <= segment.end_ms - stretch.zero_ms:
            y = segment.top + (tick - start) * places.per_ms
            parts.append(tag("path", {"class": "tick", "d": _path(PLOT_LEFT, y, PLOT_RIGHT, y)}))
            label = f"{tick:,.0f} ms"
            parts.append(
                wrapped("text", {"class": "time end", "x": PLOT_LEFT - 8, "y": y + 4}, [text(label)])
            )
            tick += places.step_ms
    for before, after in zip(stretch.segments, stretch.segments[1:], strict=False):
        parts += _cut(before.bottom, after.top, after.start_ms - before.end_ms)
    return wrapped("g", {"class": "ground-of-stretch"}, parts)


def _cut(top: float, bottom: float, pause_ms: float) -> list[str]:
    """Where time without fixations is cut out."""
    middle = (top + bottom) / 2
    zigzag = "".join(f"l{'6 -4' if k % 2 else '6 4'} " for k in range(int(PLOT_RIGHT - PLOT_LEFT) // 6))
    label = f"{pause_ms:,.0f} ms without a fixation, cut out"
    return [
        tag("path", {"class": "cut", "d": f"M{number(PLOT_LEFT)} {number(middle)} {zigzag.strip()}"}),
        wrapped(
            "text",
            {"class": "small halo middle", "x": (PLOT_LEFT + PLOT_RIGHT) / 2, "y": middle + 5},
            [text(label)],
        ),
    ]


def _line(traced: TracedTrial, places: Places, stretch: Stretch) -> str:
    """The line of text over a stretch, with its regions and their names."""
    across = places.across
    many = len({piece.line for piece in across.pieces}) > 1
    parts: list[str] = []
    for name in stretch.names:
        left, right = across.at(name.piece.left_px), across.at(name.piece.right_px)
        parity = "odd" if name.piece.order % 2 else "even"
        box = {
            "class": f"region {parity}",
            "x": left,
            "y": stretch.box_top,
            "width": right - left,
            "height": LINE_BOX,
        }
        parts.append(tag("rect", box))
        parts += _region_name(traced, stretch, name)
    for line in traced.lines:
        if line.number == stretch.line:
            parts.append(
                line_of_text(
                    line.text,
                    (across.at(line.left_px), across.at(line.right_px)),
                    stretch.box_top + LINE_BOX * 0.68,
                    right_to_left=traced.right_to_left,
                )
            )
    labels = [f"line {stretch.line}"] if many else []
    if not stretch.used:
        labels.append("not used")
    for row, label in enumerate(labels):
        y = stretch.box_top + LINE_BOX * 0.66 - 14 * (len(labels) - 1 - row)
        parts.append(
            wrapped("text", {"class": "strong end", "x": PLOT_LEFT - 8, "y": y}, [text(label)])
        )
    if across.gutter:
        words = "no position" if traced.pieces else "outside"
        x, y = PLOT_LEFT + across.gutter / 2, stretch.box_top + LINE_BOX * 0.62
        parts.append(wrapped("text", {"class": "small middle", "x": x, "y": y}, [text(words)]))
    return wrapped("g", {"class": "line"}, parts)


def _region_name(traced: TracedTrial, stretch: Stretch, name: Name) -> list[str]:
    """The name over a region, and a stroke down to it from an upper row."""
    full = traced.region(name.piece.order)
    y = stretch.box_top - 5 - NAME_HEIGHT * name.row
    shown = shortened(printable(full), int(name.room / NAME_LETTER + 0.01))
    parts = []
    if name.row:
        d = _path(name.x, y + 3, name.x, stretch.box_top)
        parts.append(tag("path", {"class": "lead", "d": d}))
    inner = [text(shown)]
    if shown != full:
        inner.insert(0, wrapped("title", {}, [text(full)]))
    parts.append(wrapped("text", {"class": "name middle", "x": name.x, "y": y}, inner))
    return parts


def line_of_text(
    words: str, ends: tuple[float, float], y: float, *, right_to_left: bool, largest: float = _LARGEST_TYPE
) -> str:
    """A line of text stretched between two ends, so that each letter stands where it stood."""
    left, right = ends
    letters = max(1, width_of(words))
    attributes: dict[str, str | float] = {
        "class": "text",
        "x": right if right_to_left else left,
        "y": y,
        "font-size": min(largest, (right - left) / letters / _ADVANCE),
        "textLength": right - left,
        "lengthAdjust": "spacingAndGlyphs",
    }
    if right_to_left:
        attributes["direction"] = "rtl"
    return wrapped("text", attributes, [text(words)])


def kind_of(fixation: TracedFixation) -> str:
    """How a fixation is drawn: ``out``, ``outside``, ``first`` or ``later``."""
    if not fixation.kept:
        return "out"
    if not fixation.region_order:
        return "outside"
    return "first" if fixation.first_pass else "later"


def _bar_shape(kind: str, x: float, half: float, top: float, bottom: float) -> str:
    """The bar itself, crossed out where it is left out."""
    shape = {
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
                "d": f"{_path(x - reach, middle - reach, x + reach, middle + reach)} "
                f"{_path(x - reach, middle + reach, x + reach, middle - reach)}",
            },
        )
    return tag("rect", shape) + cross


def _bars(traced: TracedTrial, places: Places, own: str) -> str:
    """All fixations, each with its number and its duration."""
    taken: list[tuple[float, float, float]] = [(b.x - 5, b.x + 5, b.top) for b in places.bars]
    parts = [_bar(traced, bar, own, taken) for bar in places.bars]
    return wrapped("g", {"class": "bars"}, parts)


def _bar(
    traced: TracedTrial, bar: Bar, own: str, taken: list[tuple[float, float, float]]
) -> str:
    """One fixation."""
    fixation = bar.fixation
    kind = kind_of(fixation)
    half = _HALF_BAR / 2 if kind == "outside" else _HALF_BAR
    attributes: dict[str, str | float] = {
        "class": f"fixation {kind}",
        "id": f"{own}-f{fixation.number}",
        "data-fixation": str(fixation.number),
        "data-duration-ms": ms(fixation.duration_ms),
    }
    if fixation.onset_ms == fixation.onset_ms:  # noqa: PLR0124  (NaN is not itself)
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
        _bar_shape(kind, bar.x, half, bar.top, bar.bottom),
        wrapped(
            "text",
            {"class": "label halo" + ("" if side > 0 else " end"), "x": x, "y": middle},
            [wrapped("tspan", {"class": "number"}, [text(str(fixation.number))]), text(f" {label}")],
        ),
    ]
    if bar.beyond:
        tip = bar.x + bar.beyond * 12
        d = f"M{number(tip)} {number(middle - 4)} l{-6 * bar.beyond} -5 l0 10 z"
        parts.append(tag("path", {"class": "beyond", "d": d}))
    return wrapped("g", attributes, parts)


def _is_free(
    taken: list[tuple[float, float, float]], left: float, right: float, y: float
) -> bool:
    """Whether a label would not stand on another one."""
    return all(
        right < t_left or left > t_right or abs(y - t_y) >= _LABEL_LINE
        for t_left, t_right, t_y in taken[-40:]
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
    if fixation.onset_ms == fixation.onset_ms:  # noqa: PLR0124  (NaN is not itself)
        parts.append(f"from {ms(fixation.onset_ms)} ms in log time")
    if fixation.placed:
        parts.append(f"x {ms(fixation.x_px)} px, y {ms(fixation.y_px)} px")
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
