"""One trial for the terminal: a drawing in characters, and the explanation under it."""

from __future__ import annotations

from dataclasses import astuple, dataclass
from typing import Final

from etl.report.trace_glyphs import printable, shortened, width_of
from etl.report.trace_input import TracedFixation, TracedTrial
from etl.report.trace_line_table import KEY, lines_in_columns
from etl.report.trace_phrases import ms
from etl.report.trace_places import Across, Places, Stretch, onsets_of, place
from etl.report.trace_words import Explanation, Statement, explain

#: Narrower than this no drawing is of use; a terminal that is wraps the lines.
NARROWEST: Final = 40
#: Regions' names stand beside the track from this width on, onsets from this one on.
_WITH_NAMES: Final = 60
_WITH_ONSETS: Final = 76
_NAME: Final = 22


@dataclass(frozen=True, slots=True)
class Marks:
    """The characters of the drawing."""

    first: str
    later: str
    outside: str
    out: str
    edge: str
    left: str
    right: str
    rail: str
    from_right: str
    from_left: str
    ellipsis: str


DRAWN: Final = Marks("█", "▒", "·", "×", "│", "◀", "▶", "═", "╝", "╚", "…")
PLAIN: Final = Marks("#", "o", ".", "x", "|", "<", ">", "=", "'", "'", "~")

#: What is said where lines may be wrong.
_TO_CORRECT: Final = (
    "To correct lines, add --lines FILE.csv to this command: it writes them into a table to edit."
)
#: What stands for typographic characters where the terminal has plain ones only; one for one.
_PLAIN_QUOTES: Final = str.maketrans({"“": '"', "”": '"', "…": "~"})


def as_text(
    traced: TracedTrial,
    width: int,
    *,
    encoding: str = "utf-8",
    explanation: Explanation | None = None,
) -> str:
    r"""Draw a trial in characters and explain it.

    Parameters
    ----------
    traced : TracedTrial
        The trial.
    width : int
        Columns of the terminal; taken for 40 where less.
    encoding : str
        What the terminal can show. Where that is not all of the marks, plain ones take their
        place; characters of names and texts that it lacks become question marks.
    explanation : Explanation, optional
        The part to be shown; the whole where absent.

    Returns
    -------
    str
        Lines of at most ``width`` columns: across the regions, down the fixations; a full block is
        a first pass, a shaded one a later visit, a dot outside every region, a cross left out. A
        regression is a rail from the place left to an arrowhead beside the landing.

    Examples
    --------
    >>> from etl.report.trace_input import Regression
    >>> nan = float("nan")
    >>> looks = tuple(TracedFixation(n, nan, 200.0, nan, nan, 0, k, 1, n != 3, "P1.tsv", n + 1)
    ...               for n, k in enumerate((1, 2, 1), start=1))
    >>> trial = TracedTrial("P1", "", "7", "i01", {}, ("who", "verb"), ("", ""), looks,
    ...                     (Regression(2, 3, True),), {}, {})
    >>> print("\n".join(as_text(trial, 60, encoding="ascii").splitlines()[4:8]))
       n    ms |who         |verb       |
       1   200 |     #      |           | who
       2   200 |            |     #     | verb
       3   200 |     o<==========='     | R1 who
    """
    width = max(width, NARROWEST)
    marks = DRAWN if _can_show(encoding) else PLAIN
    said = explanation or explain(traced)
    lines = [*_head(traced, width), "", *_Drawing(traced, width, marks).lines(), ""]
    if said.lines:
        lines += _lines(traced, said, width)
    lines += _words(said, width)
    text = "\n".join(line.rstrip() for line in lines).rstrip() + "\n"
    if marks is PLAIN:
        text = text.translate(_PLAIN_QUOTES)
    return text.encode(encoding, "replace").decode(encoding)


def _can_show(encoding: str) -> bool:
    """Whether an encoding has all the marks of the drawing."""
    try:
        "".join(astuple(DRAWN)).encode(encoding)
    except UnicodeEncodeError:
        return False
    return True


def _head(traced: TracedTrial, width: int) -> list[str]:
    """Which trial, and what it holds."""
    factors = ", ".join(f"{name} {level}" for name, level in traced.factors.items())
    heads = [traced.heading + (f" ({factors})" if factors else "")]
    heads.append(traced.summary)
    sources = dict.fromkeys(fixation.source_file for fixation in traced.fixations)
    if sources:
        rows = [fixation.source_line for fixation in traced.fixations]
        heads.append(f"from {', '.join(sources)}, lines {min(rows)} to {max(rows)}")
    return [line for head in heads for line in wrapped_text(head, width)]


class _Drawing:
    """The drawing in characters."""

    def __init__(self, traced: TracedTrial, width: int, marks: Marks) -> None:
        self.traced, self.width, self.marks = traced, width, marks
        self.places: Places = place(traced, 0.0)
        self.across: Across = self.places.across
        self.onsets = onsets_of(traced.fixations)
        self.with_onsets = width >= _WITH_ONSETS
        self.with_names = width >= _WITH_NAMES
        self.margin = 11 + 9 * self.with_onsets
        self.track = width - self.margin - (_NAME + 1 if self.with_names else 0)
        edges = [self.across.at(x) for p in self.across.pieces for x in (p.left_px, p.right_px)]
        edges += [bar.x for bar in self.places.bars]
        self.ends = min(edges, default=0.0), max(edges, default=0.0)
        self.columns = {bar.fixation.number: self._column(bar.x) for bar in self.places.bars}
        self.landing_from = {r.landing: r.launch for r in traced.regressions}
        self.named = {r.landing: k for k, r in enumerate(traced.regressions, start=1)}

    def _column(self, x: float) -> int:
        """The column of the track for a place across."""
        low, high = self.ends
        share = (x - low) / (high - low) if high > low else 0.0
        # Halves go up, and what rounding left a hair below a half with them: on every system alike.
        return int(share * (self.track - 1) + 0.5 + 1e-6)

    def lines(self) -> list[str]:
        """All lines of the drawing."""
        out: list[str] = []
        for stretch in self.places.stretches:
            out += self._header(stretch)
            out += [self._row(fixation, stretch) for fixation in stretch.fixations]
        legend = self.marks
        out.append("")
        words = (
            f"{legend.first} first pass   {legend.later} later visit   {legend.outside} outside "
            f"every region   {legend.out} left out   {legend.left}{legend.rail}{legend.rail}"
            f"{legend.from_right} regression"
        )
        return out + wrapped_text(words, self.width)

    def _cells(self, line: int) -> list[tuple[int, int, str]]:
        """First and last column of each region on a line, and its name."""
        across = self.across
        return [
            (
                self._column(across.at(piece.left_px)),
                self._column(across.at(piece.right_px)),
                self.traced.region(piece.order),
            )
            for piece in sorted(across.pieces, key=lambda p: (p.left_px, p.order))
            if piece.line == line
        ]

    def _empty(self, line: int) -> list[str]:
        """A track with the edges of the regions."""
        track = [" "] * self.track
        for left, right, _ in self._cells(line):
            track[left] = track[right] = self.marks.edge
        return track

    def _header(self, stretch: Stretch) -> list[str]:
        """The names of the regions over the track."""
        track = self._empty(stretch.line)
        for left, right, name in self._cells(stretch.line):
            room = right - left - 1
            shown = shortened(printable(name), room, self.marks.ellipsis) if room > 0 else ""
            # A wide character takes two columns: it stands in the first, the second is empty.
            column = left + 1
            for character in shown:
                wide = width_of(character)
                if wide == 0:
                    track[column - 1] += character
                    continue
                track[column] = character
                if wide == 2:
                    track[column + 1] = ""
                column += wide
        many = len({piece.line for piece in self.across.pieces}) > 1
        head = f"{'n':>4} {'ms':>5} "
        if self.with_onsets:
            head = f"{'n':>4} {'from ms':>8} {'ms':>5} "
        label = f"line {stretch.line}" if many else ""
        if not stretch.used:
            label = "not used"
        row = head + "".join(track)
        lines = [f"{row} {label}"] if self.with_names or not label else [label, row]
        return lines if stretch is self.places.stretches[0] else ["", *lines]

    def _row(self, fixation: TracedFixation, stretch: Stretch) -> str:
        """One fixation."""
        marks = self.marks
        track = self._empty(stretch.line)
        column = self.columns[fixation.number]
        launch = self.landing_from.get(fixation.number)
        if launch is not None:
            self._rail(track, column, self.columns[launch])
        if not fixation.kept:
            track[column] = marks.out
        elif not fixation.region_order:
            track[column] = marks.outside
        else:
            track[column] = marks.first if fixation.first_pass else marks.later
        head = f"{fixation.number:>4} {ms(round(fixation.duration_ms)):>5} "
        if self.with_onsets:
            onset = self.onsets[fixation.number] - stretch.zero_ms
            head = f"{fixation.number:>4} {onset:>8,.0f} {ms(round(fixation.duration_ms)):>5} "
        head = f"{head:<{self.margin}}"
        row = head + "".join(track)
        return f"{row} {self._where(fixation)}" if self.with_names else row

    def _rail(self, track: list[str], landing: int, launch: int) -> None:
        """A regression on the row of its landing."""
        marks, step = self.marks, 1 if launch > landing else -1
        for column in range(landing + step, launch, step):
            track[column] = marks.rail
        if launch != landing:
            track[launch] = marks.from_right if step > 0 else marks.from_left
        head = landing + step
        if 0 <= head < len(track):
            track[head] = marks.left if step > 0 else marks.right

    def _where(self, fixation: TracedFixation) -> str:
        """What stands beside the track."""
        if fixation.merged_into:
            words = f"{fixation.left_out_by}, into {fixation.merged_into}"
        elif not fixation.kept:
            words = f"left out: {fixation.left_out_by}"
        else:
            order = fixation.region_order
            words = self.traced.region(order)
            own = self.traced.region_texts[order - 1].strip() if order else ""
            # Of a passage, the word says more than its number; a region of many words is named.
            if own and " " not in own:
                words += f" “{own}”"
        if fixation.number in self.named:
            words = f"R{self.named[fixation.number]} {words}"
        return shortened(printable(words), _NAME, self.marks.ellipsis)


def _lines(traced: TracedTrial, said: Explanation, width: int) -> list[str]:
    """What is said of lines, and every fixation with its own where all is to be told."""
    lines = ["Lines"]
    for sentence in said.lines:
        lines += wrapped_text(sentence, width, first="  ", rest="    ")
    if said.whole:
        lines += ["", *lines_in_columns(traced, width), *wrapped_text(KEY, width)]
    sure = traced.lines is None or traced.lines.sure
    if not sure or any(fixation.unsure for fixation in traced.fixations):
        lines += wrapped_text(_TO_CORRECT, width)
    return [*lines, ""]


def _words(said: Explanation, width: int) -> list[str]:
    """The explanation."""
    lines: list[str] = []
    if said.left_out:
        lines += ["Left out, or aside"]
        for sentence in said.left_out:
            lines += wrapped_text(sentence, width, first="  ", rest="    ")
        lines.append("")
    for region in said.regions:
        if region.statements:
            own = f" “{region.text.strip()}”" if region.text.strip() else ""
            lines += wrapped_text(f"`{region.name}` (region {region.order}){own}", width)
            lines += _statements(region.statements, width)
    if said.trial:
        lines += ["The trial"]
        lines += _statements(said.trial, width)
    return lines


def _statements(statements: tuple[Statement, ...], width: int) -> list[str]:
    """What is said of outcomes, one after the other."""
    lines: list[str] = []
    for statement in statements:
        words = f"{statement.measure}: {statement.sentence}"
        lines += wrapped_text(words, width, first="  ", rest="    ")
    return [*lines, ""]


def wrapped_text(words: str, width: int, *, first: str = "", rest: str = "") -> list[str]:
    """A text broken into lines of a width, counted in columns of a terminal.

    Examples
    --------
    >>> wrapped_text("the ripe plum", 9, first="- ", rest="  ")
    ['- the', '  ripe', '  plum']
    """
    lines: list[str] = []
    line, indent = first, first
    for word in printable(words).split(" "):
        rest_of_word = word
        glue = "" if line == indent else " "
        if width_of(line) + width_of(glue + rest_of_word) <= width:
            line += glue + rest_of_word
            continue
        if line != indent:
            lines.append(line)
            line = indent = rest
        while width_of(line) + width_of(rest_of_word) > width:
            fits = _fitting(rest_of_word, width - width_of(line))
            lines.append(line + rest_of_word[:fits])
            line = indent = rest
            rest_of_word = rest_of_word[fits:]
        line += rest_of_word
    return [*lines, line]


def _fitting(word: str, room: int) -> int:
    """How many characters of a word fit; one at least, so that there is an end."""
    fits = 0
    while fits < len(word) and width_of(word[: fits + 1]) <= room:
        fits += 1
    return max(1, fits)
