"""The picture of one trial, as an SVG of its own: the text across, time running down."""

from __future__ import annotations

import hashlib
from typing import Final

from etl.report.trace_bars import HALF_BAR, bar_shape, bars
from etl.report.trace_glyphs import printable, shortened, width_of
from etl.report.trace_input import TracedTrial
from etl.report.trace_links import links
from etl.report.trace_markup import number, straight, tag, text, wrapped
from etl.report.trace_notes import notes
from etl.report.trace_overview import overview, words_of
from etl.report.trace_places import (
    LINE_BOX,
    NAME_HEIGHT,
    NAME_LETTER,
    PLOT_LEFT,
    PLOT_RIGHT,
    WIDTH,
    Name,
    Places,
    Stretch,
    place,
)
from etl.report.trace_style import STYLE

_TYPE: Final = 19.0
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
    >>> from etl.report.trace_input import TracedFixation
    >>> nan = float("nan")
    >>> look = TracedFixation(1, 0.0, 200.0, nan, nan, 0, 1, 1, True, "P1.tsv", 2)
    >>> trial = TracedTrial("P1", "", "7", "i01", {}, ("who", "verb"), ("", ""), (look,), (),
    ...                     {}, {})
    >>> picture = draw(trial)
    >>> picture.startswith('<svg xmlns="http'), 'data-fixation="1"' in picture
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
        *_lines(traced, places),
        bars(traced, places, own),
        notes(traced, places),
    ]
    words = f"{traced.summary}. {_READING}"
    attributes: dict[str, str | float] = {
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
    key = f"{traced.participant}\0{traced.session}\0{traced.trial}"
    digest = hashlib.sha256(key.encode("utf-8", "surrogatepass")).hexdigest()
    return f"trace-{digest[:10]}"


def _head(traced: TracedTrial) -> tuple[str, float]:
    """Which trial it is, what it holds, and how to read the picture; and where that ends."""
    factors = " · ".join(f"{name} {level}" for name, level in traced.factors.items())
    title = traced.heading + (f" · {factors}" if factors else "")
    clock = (
        "the log has no onsets: durations are drawn end to end"
        if any(f.onset_ms != f.onset_ms for f in traced.fixations)
        else "time counts from the first fixation"
    )
    conventions = f"{clock}; outside = {traced.outside}, no_opportunity = {traced.no_opportunity}"
    rows = [
        wrapped("text", {"class": "title", "x": 20, "y": 30}, [text(shortened(title, 110))]),
        wrapped("text", {"class": "muted", "x": 20, "y": 52}, [text(traced.summary)]),
        wrapped("text", {"class": "muted end", "x": WIDTH - 20, "y": 52}, [text(conventions)]),
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
        half = HALF_BAR if kind != "outside" else HALF_BAR / 2
        samples += [bar_shape(kind, x + HALF_BAR, half, top - 14, top + 4)]
        samples += [wrapped("text", {"class": "small", "x": x + 18, "y": top}, [text(label)])]
        x += 18 + width_of(label) * 6.3 + 28
    samples.append(tag("path", {"class": "saccade", "d": straight(x, top - 8, x + 34, top - 2)}))
    samples.append(wrapped("text", {"class": "small", "x": x + 42, "y": top}, [text("saccade")]))
    x += 42 + 7 * 6.3 + 28
    for kind in ("rail", "between-rails"):
        samples.append(
            tag("path", {"class": kind, "d": straight(x + 10, top - 4, x + 46, top - 7)})
        )
    tip = f"M{number(x)} {number(top - 3)} l11 -6 l1 10 z"
    samples.append(tag("path", {"class": "arrowhead", "d": tip}))
    words = "regression, numbered R1, R2, …"
    samples.append(wrapped("text", {"class": "small", "x": x + 54, "y": top}, [text(words)]))
    return wrapped("g", {"class": "legend"}, samples)


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
            parts.append(tag("path", {"class": "tick", "d": straight(PLOT_LEFT, y, PLOT_RIGHT, y)}))
            label: dict[str, str | float] = {"class": "time end", "x": PLOT_LEFT - 8, "y": y + 4}
            parts.append(wrapped("text", label, [text(f"{tick:,.0f} ms")]))
            tick += places.step_ms
    for before, after in zip(stretch.segments, stretch.segments[1:], strict=False):
        parts += _cut(before.bottom, after.top, after.start_ms - before.end_ms)
    return wrapped("g", {"class": "ground-of-stretch"}, parts)


def _cut(top: float, bottom: float, pause_ms: float) -> list[str]:
    """Where time without fixations is cut out."""
    middle = (top + bottom) / 2
    teeth = range(int(PLOT_RIGHT - PLOT_LEFT) // 6)
    zigzag = " ".join("l6 -4" if tooth % 2 else "l6 4" for tooth in teeth)
    label = f"{pause_ms:,.0f} ms without a fixation, cut out"
    return [
        tag("path", {"class": "cut", "d": f"M{number(PLOT_LEFT)} {number(middle)} {zigzag}"}),
        wrapped(
            "text",
            {"class": "small halo middle", "x": (PLOT_LEFT + PLOT_RIGHT) / 2, "y": middle + 5},
            [text(label)],
        ),
    ]


def _lines(traced: TracedTrial, places: Places) -> list[str]:
    """The lines of text; one to which the eyes come back from further down is marked."""
    before = [0, *(stretch.line for stretch in places.stretches)]
    return [
        _line(traced, places, stretch, back=stretch.line < last)
        for last, stretch in zip(before, places.stretches, strict=False)
    ]


def _line(traced: TracedTrial, places: Places, stretch: Stretch, *, back: bool) -> str:
    """The line of text over a stretch, with its regions and their names."""
    across = places.across
    many = len({piece.line for piece in across.pieces}) > 1
    parts: list[str] = []
    for name in stretch.names:
        left, right = across.at(name.piece.left_px), across.at(name.piece.right_px)
        parity = "odd" if name.piece.order % 2 else "even"
        box: dict[str, str | float] = {
            "class": f"region {parity}",
            "x": left,
            "y": stretch.box_top,
            "width": right - left,
            "height": LINE_BOX,
        }
        parts.append(tag("rect", box))
        parts += _region_name(traced, stretch, name)
    parts += words_of(traced, across, stretch.line, stretch.box_top + LINE_BOX * 0.68, _TYPE)
    labels = [f"{'▲ ' if back else ''}line {stretch.line}"] if many else []
    if not stretch.used:
        labels.append("not used")
    for row, label in enumerate(labels):
        y = stretch.box_top + LINE_BOX * 0.66 - 14 * (len(labels) - 1 - row)
        parts.append(
            wrapped("text", {"class": "strong end", "x": PLOT_LEFT - 8, "y": y}, [text(label)])
        )
    if across.gutter:
        words = "no position" if across.by_px else "outside"
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
        d = straight(name.x, y + 3, name.x, stretch.box_top)
        parts.append(tag("path", {"class": "lead", "d": d}))
    inner = [text(shown)]
    if shown != full:
        inner.insert(0, wrapped("title", {}, [text(full)]))
    parts.append(wrapped("text", {"class": "name middle", "x": name.x, "y": y}, inner))
    return parts
