"""What the lines of a log of events tell: which of them are fixations."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.drafting.columns import Pooled
from etl.drafting.event_shapes import Shape
from etl.drafting.meanings import Understanding, counted
from etl.drafting.structure import side_of
from etl.drafting.tables import UnderstoodTables, understand
from etl.drafting.vocabulary import word_set, words_of

_FIXATION = ("fix", "blick", "gaze", "注视")
_SACCADE = ("sac", "sak")
_NO_FIXATION = ("blink", "lid", "blinz", "sample", "pupil")
#: Words before two numbers that are a position (common practice, no source).
_POSITION = word_set(
    "pos position at xy loc location gaze place punkt ort bei point coord coords lieu en em a in"
)
#: Fixation lines are looked for among so many shapes, the most frequent ones.
_LOOKED_AT = 12
_LEAST_FIXATIONS = 5
#: A header that no log has: a place among trials, not a name.
_TRIAL_HEADER = "trial\0"


@dataclass(slots=True)
class Telling:
    """Lines that tell of a trial.

    Attributes
    ----------
    shape : Shape
        The lines.
    names : dict of int to str
        What the tokens that tell something are called.
    wide : dict of int to int
        For those that only together with a word before them tell trials apart, its place.
    """

    shape: Shape
    names: dict[int, str] = field(default_factory=dict)
    wide: dict[int, int] = field(default_factory=dict)

    def place(self, name: str) -> int | None:
        """The token of a name; None where there is none."""
        return next((place for place, own in self.names.items() if own == name), None)


@dataclass(slots=True)
class EventRoles:
    """What each shape of line was taken for.

    Attributes
    ----------
    fixation : Shape or None
        Lines that tell of fixations.
    more_fixations : list of Shape
        Others that do so in the same words.
    understood : UnderstoodTables or None
        What their numbers and words mean.
    groups : dict of int to str
        The headers under which the tokens of a fixation line were looked at, by place.
    starts, ends : list of Telling
        Lines with which trials start and end.
    blinks : list of Shape
        Lines that tell of blinks.
    facts, lasting : list of Telling
        Lines that tell something of a trial, or of all that follow.
    others : list of Shape
        All others.
    questions : dict of str to str
        What is asked of lines that start trials, by canonical name.
    """

    fixation: Shape | None = None
    more_fixations: list[Shape] = field(default_factory=list)
    understood: UnderstoodTables | None = None
    groups: dict[int, str] = field(default_factory=dict)
    starts: list[Telling] = field(default_factory=list)
    ends: list[Telling] = field(default_factory=list)
    blinks: list[Shape] = field(default_factory=list)
    facts: list[Telling] = field(default_factory=list)
    lasting: list[Telling] = field(default_factory=list)
    others: list[Shape] = field(default_factory=list)
    questions: dict[str, str] = field(default_factory=dict)

    def fixation_lines(self) -> NDArray[np.int64]:
        """Where all lines of fixations stand, ascending."""
        own = [] if self.fixation is None else [self.fixation, *self.more_fixations]
        return lines_of(own)

    def tellings(self) -> list[Telling]:
        """All lines that tell of trials."""
        return [*self.starts, *self.ends, *self.facts, *self.lasting]

    def used(self) -> list[Shape]:
        """The shapes of lines that tell something."""
        own = [] if self.fixation is None else [self.fixation]
        told = [telling.shape for telling in self.tellings()]
        return [*own, *self.more_fixations, *told, *self.blinks]

    def names(self) -> set[str]:
        """What lines tell of trials, by the names of groups."""
        return {name for telling in self.tellings() for name in telling.names.values()}


def lines_of(shapes: Sequence[Shape]) -> NDArray[np.int64]:
    """Where the lines of shapes stand, ascending."""
    return np.sort(np.array([line for shape in shapes for line in shape.lines], dtype=np.int64))


@dataclass(frozen=True)
class Lines:
    """The lines that were looked at.

    Attributes
    ----------
    names : tuple of str
        The names of the logs.
    file : (n,) int32 array
        Which log each line is from.
    shapes : list of Shape
        Their shapes, the most frequent first.
    """

    names: tuple[str, ...]
    file: NDArray[np.int32]
    shapes: list[Shape]

    def file_of(self, shape: Shape) -> NDArray[np.int32]:
        """Which log each line of a shape is from."""
        return np.asarray(self.file[np.asarray(shape.lines, dtype=np.int64)])


def find_fixations(lines: Lines) -> EventRoles:
    """Find the lines that tell of fixations.

    Parameters
    ----------
    lines : Lines
        The lines.

    Returns
    -------
    EventRoles
        Without a fixation where no lines look like it.
    """
    roles = EventRoles()
    best_score = 0.0
    for shape in [s for s in lines.shapes if len(s) >= _LEAST_FIXATIONS][:_LOOKED_AT]:
        if not shape.numbers() or has_word(shape, _SACCADE) or is_about(shape, _NO_FIXATION):
            continue
        groups = _headers(shape)
        understood = understand(_as_rows(lines, shape, groups))
        score = _fixation_like(understood.found, shape)
        if score > best_score:
            best_score = score
            roles.fixation, roles.groups, roles.understood = shape, groups, understood
    if roles.fixation is not None:
        needed = max(roles.groups, default=0)
        roles.more_fixations = [
            shape
            for shape in lines.shapes
            if shape is not roles.fixation
            and shape.is_like(roles.fixation)
            and len(shape.tokens) > needed
            and all(shape.kind(place) == roles.fixation.kind(place) for place in roles.groups)
        ]
    return roles


def understand_within_trials(lines: Lines, roles: EventRoles) -> None:
    """Look at the fixations again, now that it is known which belong to one trial.

    Parameters
    ----------
    lines : Lines
        The lines.
    roles : EventRoles
        What they tell; how fixations are understood is replaced.
    """
    shape = roles.fixation
    if shape is None or not roles.starts:
        return
    starts = lines_of([telling.shape for telling in roles.starts])
    trial = np.searchsorted(starts, np.asarray(shape.lines)).astype(np.int64)
    again = understand(_as_rows(lines, shape, roles.groups, trial))
    if not again.found.samples:
        roles.understood = again


def _fixation_like(found: Understanding, shape: Shape) -> float:
    """How much lines look as if they told of fixations."""
    if found.samples:
        return 0.0  # fixations are not searched for in lines
    timed = "duration" in found.meanings or {"onset", "end"} <= found.meanings.keys()
    placed = "x" in found.meanings or "label" in found.meanings or bool(found.eyes)
    clock = {"onset", "end"} & found.meanings.keys()
    if not timed or not (clock or has_word(shape, _FIXATION)):
        return 0.0
    return 1.0 + 1.0 * placed + 1.0 * has_word(shape, _FIXATION)


def has_word(shape: Shape, beginnings: Sequence[str]) -> bool:
    """Whether a word of a line begins in a certain way."""
    words = [word for text in shape.words() for word in words_of(text)]
    return any(word.startswith(tuple(beginnings)) for word in words)


def is_about(shape: Shape, beginnings: Sequence[str]) -> bool:
    """Whether the first word of a line begins in a certain way; others may be names of values."""
    place = shape.first_word()
    if place is None:
        return False
    first = [shape.tokens[place].text]
    if shape.sign_beside(place, 1) in ("=", ":"):
        # What it is about is the value of its first word, as in event=blink.
        after = (t for t in shape.tokens[place + 1 :] if t.kind not in ("blank", "sign"))
        first += [token.text for token in [next(after, None)] if token is not None]
    words = [word for text in first for word in words_of(text)]
    return any(word.startswith(tuple(beginnings)) for word in words)


def _headers(shape: Shape) -> dict[int, str]:
    """A name for each token that changes: the word before it, made unique.

    The time that a line begins with comes last: of two times that say the same, the other is meant.
    """
    names: dict[int, str] = {}
    first = shape.first_word() or 0
    places = sorted(shape.variables(), key=lambda place: place < first)
    pairs = _pairs(shape)
    for place in places:
        sides = shape.kind(place) != "number" and all(map(side_of, set(shape.cells[place])))
        glued = shape.tokens[place - 1] if place else None
        letters = glued.text if glued is not None and glued.kind == "sign" else ""
        own = "eye" if sides else pairs.get(place) or shape.word_before(place)
        own = letters if letters.isalpha() and shape.kind(place) == "number" else own
        name = own or ("time" if place < first else "value")
        number, taken = 2, set(names.values())
        unique = name
        while unique in taken:
            unique, number = f"{name} {number}", number + 1
        names[place] = unique
    return names


def _pairs(shape: Shape) -> Mapping[int, str]:
    """Names for two numbers, and no third, that follow a word for positions: x and y."""
    names: dict[int, str] = {}
    run: list[int] = []
    word = ""
    for place, token in [*enumerate(shape.tokens), (len(shape.tokens), None)]:
        if token is not None and token.kind in ("blank", "sign"):
            continue
        if token is not None and token.kind == "number":
            run.append(place)
            continue
        if len(run) == 2 and set(words_of(word)) & _POSITION:
            names |= {run[0]: f"{word} x", run[1]: f"{word} y"}
        run, word = [], "" if token is None else token.text
    return names


def _as_rows(
    lines: Lines, shape: Shape, headers: dict[int, str], trial: NDArray[np.int64] | None = None
) -> Pooled:
    """The lines of a shape as rows of a table, with the trial that each belongs to."""
    own = {headers[place]: shape.cells[place] for place in headers}
    if trial is not None:
        own = {_TRIAL_HEADER: [str(number) for number in trial.tolist()], **own}
    table = pa.table({name: pa.array(cells, pa.string()) for name, cells in own.items()})
    file = lines.file_of(shape)
    comma = any("," in c for p in headers if shape.kind(p) == "number" for c in shape.cells[p])
    present = np.unique(file)
    renumbered = np.searchsorted(present, file).astype(np.int32)
    names = tuple(lines.names[code] for code in present.tolist())
    return Pooled(names, tuple(own), table, renumbered, tuple("," if comma else "." for _ in names))


def told_of(shape: Shape) -> str:
    """How many lines there are of a shape, with one of them."""
    return f"{counted(len(shape), 'line')}, such as: {shape.sample}"
