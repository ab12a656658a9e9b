"""What the lines of a log of events tell: which is a fixation, where trials start and end."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.drafting.columns import Pooled, share_of
from etl.drafting.event_shapes import Shape
from etl.drafting.meanings import Understanding, counted
from etl.drafting.structure import side_of
from etl.drafting.tables import UnderstoodTables, understand
from etl.drafting.vocabulary import sounds_like, word_set, words_of

_START = word_set(
    """
    start starts started begin begins beginn beginnt anfang go onset debut inicio inizio 开始
    """
)
_END = word_set(
    """
    end ends ended stop stops stopped over done finish finished ende endet schluss fin fine
    fim 结束
    """
)
_TRIAL = ("trial", "durchgang", "essai", "ensayo", "prova", "试次")
_FIXATION = ("fix", "blick", "gaze", "注视")
_SACCADE = ("sac", "sak")
_NO_FIXATION = ("blink", "lid", "blinz", "sample", "pupil")
_BLINK = ("blink", "lid", "blinz", "clign", "parpade", "pisca", "眨")
#: Names that only the line of a fixation can give.
_OF_FIXATIONS = frozenset(("onset", "fixation", "duration", "end", "x", "y", "label", "blink"))
#: Fixation lines are looked for among so many shapes, the most frequent ones.
_LOOKED_AT = 12
_LEAST_FIXATIONS = 5
_NEARLY_ALL = 0.9


@dataclass(slots=True)
class EventRoles:
    """What each shape of line was taken for.

    Attributes
    ----------
    fixation : Shape or None
        Lines that tell of fixations.
    understood : UnderstoodTables or None
        What their numbers and words mean.
    groups : dict of int to str
        The headers under which the tokens of a fixation line were looked at, by place.
    start, end : Shape or None
        Lines with which trials start and end.
    trial, item : int or None
        Which tokens of the starting line name the trial and the text.
    blinks : list of Shape
        Lines that tell of blinks.
    facts, lasting : list of tuple of Shape, int and str
        Lines that tell something of a trial, or of all that follow: the token and its name.
    ignored : list of Shape
        All others.
    """

    fixation: Shape | None = None
    understood: UnderstoodTables | None = None
    groups: dict[int, str] = field(default_factory=dict)
    start: Shape | None = None
    end: Shape | None = None
    trial: int | None = None
    item: int | None = None
    blinks: list[Shape] = field(default_factory=list)
    facts: list[tuple[Shape, int, str]] = field(default_factory=list)
    lasting: list[tuple[Shape, int, str]] = field(default_factory=list)
    ignored: list[Shape] = field(default_factory=list)


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


def find_fixations(lines: Lines) -> EventRoles:
    """Find the lines that tell of fixations, and from them where trials start and end.

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
        numbers = [p for p in shape.variables() if shape.tokens[p].kind == "number"]
        if not numbers or _has_word(shape, _SACCADE) or _is_about(shape, _NO_FIXATION):
            continue
        groups = _headers(shape)
        understood = understand(_as_rows(lines, shape, groups))
        score = _fixation_like(understood.found, shape)
        if score > best_score:
            best_score = score
            roles.fixation, roles.groups, roles.understood = shape, groups, understood
    if roles.fixation is not None:
        _find_trials(lines, roles)
        _understand_within_trials(lines, roles)
        _find_the_rest(lines, roles)
    return roles


def _fixation_like(found: Understanding, shape: Shape) -> float:
    """How much lines look as if they told of fixations."""
    if found.samples:
        return 0.0  # fixations are not searched for in lines
    timed = "duration" in found.meanings or "end" in found.meanings
    placed = "x" in found.meanings or "label" in found.meanings or bool(found.eyes)
    if not timed or not ("onset" in found.meanings or _has_word(shape, _FIXATION)):
        return 0.0
    return 1.0 + 1.0 * placed + 1.0 * _has_word(shape, _FIXATION)


def _has_word(shape: Shape, beginnings: Sequence[str]) -> bool:
    """Whether a word of a line begins in a certain way."""
    words = [word for text in shape.words() for word in words_of(text)]
    return any(word.startswith(tuple(beginnings)) for word in words)


def _is_about(shape: Shape, beginnings: Sequence[str]) -> bool:
    """Whether the first word of a line begins in a certain way; others may be names of values."""
    words = [word for text in shape.words()[:1] for word in words_of(text)]
    return any(word.startswith(tuple(beginnings)) for word in words)


def _headers(shape: Shape) -> dict[int, str]:
    """A name for each token that changes: the word before it, made unique."""
    names: dict[int, str] = {}
    for place in shape.variables():
        if shape.tokens[place].kind != "number" and all(map(side_of, set(shape.cells[place]))):
            name = "eye"
        else:
            name = shape.word_before(place) or "value"
        number, taken = 2, set(names.values())
        unique = name
        while unique in taken:
            unique, number = f"{name} {number}", number + 1
        names[place] = unique
    return names


def _as_rows(
    lines: Lines, shape: Shape, headers: dict[int, str], trial: NDArray[np.int64] | None = None
) -> Pooled:
    """The lines of a shape as rows of a table, with the trial that each belongs to."""
    own = {headers[place]: shape.cells[place] for place in headers}
    if trial is not None:
        own = {_TRIAL_HEADER: [str(number) for number in trial.tolist()], **own}
    table = pa.table({name: pa.array(cells, pa.string()) for name, cells in own.items()})
    file = lines.file[np.asarray(shape.lines)]
    comma = any(
        "," in c for p in headers if shape.tokens[p].kind == "number" for c in shape.cells[p]
    )
    present = np.unique(file)
    renumbered = np.searchsorted(present, file).astype(np.int32)
    names = tuple(lines.names[code] for code in present.tolist())
    return Pooled(names, tuple(own), table, renumbered, tuple("," if comma else "." for _ in names))


#: A header that no log has: a place among trials, not a name.
_TRIAL_HEADER = "trial\0"


def _find_trials(lines: Lines, roles: EventRoles) -> None:
    """The lines with which trials start and end."""
    assert roles.fixation is not None  # noqa: S101
    fixations = np.asarray(roles.fixation.lines)
    best_score = 0.0
    for shape in lines.shapes:
        score = _start_like(lines, shape, fixations, roles)
        if score > best_score:
            best_score, roles.start = score, shape
    if roles.start is None:
        return
    _name_trial(lines, roles)
    starts = np.asarray(roles.start.lines)
    best_score = 0.0
    for shape in lines.shapes:
        score = _end_like(shape, starts, fixations, roles)
        if score > best_score:
            best_score, roles.end = score, shape


def _start_like(
    lines: Lines, shape: Shape, fixations: NDArray[np.int64], roles: EventRoles
) -> float:
    """How much lines look as if a trial started with each of them."""
    own = np.asarray(shape.lines)
    if shape is roles.fixation or len(own) < 2 or len(own) > len(fixations):
        return 0.0
    after = np.searchsorted(fixations, own)
    filled = share_of(np.diff(after) > 0)
    if filled < _NEARLY_ALL or own[0] > fixations[0]:
        return 0.0
    words = {word for text in shape.words() for word in words_of(text)}
    score = 0.3 * filled
    score += 0.6 * bool(words & _START) + 0.5 * _has_word(shape, _TRIAL) - 1.0 * bool(words & _END)
    if any(_counts_trials(lines, shape, place) for place in shape.variables()):
        score += 0.8
    return score if score >= 0.8 else 0.0


def _counts_trials(lines: Lines, shape: Shape, place: int) -> bool:
    """Whether a number grows by about one from line to line of a log."""
    cells = shape.cells[place]
    if shape.tokens[place].kind != "number" or not all(cell.isdigit() for cell in cells):
        return False
    numbers = np.array([int(cell) for cell in cells])
    within = np.diff(lines.file[np.asarray(shape.lines)]) == 0
    moved = np.diff(numbers)[within]
    if not moved.size:
        return len(numbers) > 0 and bool((numbers <= len(numbers) * 10).all())
    by_one, grows = share_of(moved == 1), share_of(moved > 0)
    return by_one >= 0.5 and grows >= 0.8


def _name_trial(lines: Lines, roles: EventRoles) -> None:
    """Which tokens of the starting line name the trial and the text."""
    shape = roles.start
    assert shape is not None  # noqa: S101
    counting = [p for p in shape.variables() if _counts_trials(lines, shape, p)]
    named = [p for p in counting if _says(shape, p, _TRIAL)]
    roles.trial = next(iter(named or counting), None)
    words = [
        place
        for place in shape.variables()
        if shape.tokens[place].kind in ("word", "quoted", "rest") and place != roles.trial
    ]
    if roles.trial is None and words:
        each = [p for p in words if len(set(shape.cells[p])) > len(shape) // 2]
        roles.trial = next((p for p in words if _says(shape, p, _TRIAL)), next(iter(each), None))
    from_words = ("text", "item", "sent", "satz", "stim", "passage", "note", "phrase", "frase")
    roles.item = next((p for p in words if _says(shape, p, from_words)), None)
    if roles.item is None:
        several = [p for p in words if p != roles.trial and len(set(shape.cells[p])) > 4]
        roles.item = several[0] if len(several) == 1 else None


def _says(shape: Shape, place: int, beginnings: Sequence[str]) -> bool:
    """Whether the word before a token begins in a certain way."""
    return any(word.startswith(tuple(beginnings)) for word in words_of(shape.word_before(place)))


def _end_like(
    shape: Shape, starts: NDArray[np.int64], fixations: NDArray[np.int64], roles: EventRoles
) -> float:
    """How much lines look as if a trial ended with each of them."""
    own = np.asarray(shape.lines)
    if shape in (roles.fixation, roles.start) or len(own) < 0.8 * len(starts):
        return 0.0
    trial = np.searchsorted(starts, own) - 1
    once = len(np.unique(trial)) >= _NEARLY_ALL * len(own) and len(own) <= len(starts)
    if not once or (trial < 0).any():
        return 0.0
    # After the last fixation of its trial, and before the next trial starts.
    following = np.searchsorted(fixations, own)
    next_start = np.append(starts, np.iinfo(np.int64).max)[trial + 1]
    upcoming = np.append(fixations, np.iinfo(np.int64).max)[following]
    if share_of(upcoming >= next_start) < _NEARLY_ALL:
        return 0.0
    words = {word for text in shape.words() for word in words_of(text)}
    assert roles.start is not None  # noqa: S101
    alike = shape.words()[:1] == roles.start.words()[:1] and bool(shape.words())
    score = 1.0 * bool(words & _END) + 0.4 * alike + 0.3 * (not shape.variables())
    return score if score >= 0.4 else 0.0


def _understand_within_trials(lines: Lines, roles: EventRoles) -> None:
    """Look at the fixations again, now that it is known which belong to one trial."""
    shape = roles.fixation
    if shape is None or roles.start is None:
        return
    trial = np.searchsorted(np.asarray(roles.start.lines), np.asarray(shape.lines))
    rows = _as_rows(lines, shape, roles.groups, trial.astype(np.int64))
    again = understand(rows)
    if not again.found.samples:
        roles.understood = again


def _find_the_rest(lines: Lines, roles: EventRoles) -> None:
    """Blinks, facts about trials, and lines that mean nothing here."""
    taken = [roles.fixation, roles.start, roles.end]
    starts = np.asarray([] if roles.start is None else roles.start.lines)
    names: set[str] = set()
    for shape in lines.shapes:
        if any(shape is one for one in taken):
            continue
        if _is_about(shape, _BLINK) and not _has_word(shape, _SACCADE):
            roles.blinks.append(shape)
            continue
        fact = _fact_in(shape)
        home = None if fact is None or fact[1] in names else _home(shape, starts, lines, roles)
        if fact is None or home is None:
            roles.ignored.append(shape)
        else:
            names.add(fact[1])
            home.append((shape, *fact))


def _home(
    shape: Shape, starts: NDArray[np.int64], lines: Lines, roles: EventRoles
) -> list[tuple[Shape, int, str]] | None:
    """Whether lines tell of the trial they stand in, of those to come, or of none."""
    own = np.asarray(shape.lines)
    if not len(starts):
        return None
    if own[0] < starts[0]:
        # Before the first trial: it tells of what comes, and may be told anew.
        return roles.lasting if len(own) <= len(starts) + len(lines.names) else None
    once = len(np.unique(np.searchsorted(starts, own))) == len(own)
    return roles.facts if once else None


def _fact_in(shape: Shape) -> tuple[int, str] | None:
    """The token that ends a line, where the word before it is the name of a fact."""
    variables = shape.variables()
    if not variables or variables[-1] != len(shape.tokens) - 1 - _closing(shape):
        return None
    place = variables[-1]
    word = shape.word_before(place)
    words = words_of(word)
    meant = sounds_like(word, ("participant", "session")) if len(words) == 1 else None
    name = meant if meant is not None else "_".join(words)
    if name in _OF_FIXATIONS:
        return None
    alone = [p for p in variables[:-1] if shape.tokens[p].kind != "number"]
    if not name or not name.replace("_", "").isalnum() or name[0].isdigit() or alone:
        return None
    return place, name


def _closing(shape: Shape) -> int:
    """How many signs, such as brackets, close a line."""
    count = 0
    for token in reversed(shape.tokens):
        if token.kind != "sign":
            break
        count += 1
    return count


def told_of(shape: Shape) -> str:
    """How many lines there are of a shape, with one of them."""
    return f"{counted(len(shape), 'line')}, such as: {shape.sample}"
