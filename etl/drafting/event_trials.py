"""With which lines of a log of events trials start and end."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.drafting.columns import share_of
from etl.drafting.event_names import PRACTICE, counts_trials, name_start, stand_apart
from etl.drafting.event_roles import EventRoles, Lines, Telling, has_word, lines_of
from etl.drafting.event_shapes import Shape
from etl.drafting.vocabulary import word_set, words_of

Places = NDArray[np.int64]

_START = word_set(
    """
    start starts started begin begins beginn beginnt anfang go on onset open opens an show shows
    debut inicio inizio 开始
    """
)
_END = word_set(
    """
    end ends ended stop stops stopped over done finish finished off aus out close closes ende endet
    schluss fin fine fim 结束
    """
)
_TRIAL = ("trial", "durchgang", "essai", "ensayo", "prova", "试次")
_NEARLY_ALL, _MOST = 0.9, 0.8
_LAST = np.iinfo(np.int64).max
#: Kinds of practice trials that start in words of their own are looked for so many times.
_MOST_KINDS = 3


def find_trials(lines: Lines, roles: EventRoles) -> None:
    """Find the lines with which trials start and end.

    Parameters
    ----------
    lines : Lines
        The lines.
    roles : EventRoles
        What they tell: fixations are known, starts and ends are recorded.
    """
    search = _Search(lines, roles, roles.fixation_lines(), _file_begins(lines))
    best_score, start = 0.0, None
    for shape in search.free():
        score = search.start_like(shape)
        if score > best_score:
            best_score, start = score, shape
    if start is None:
        return
    roles.starts = [Telling(start)]
    roles.starts += [Telling(s) for s in search.free() if s.is_like(start) and search.also(s)]
    search.add_orphans()
    search.find_ends()
    search.add_orphans()
    if len(roles.starts) > 1:
        search.find_ends()
    for telling in roles.starts:
        name_start(lines, telling, roles)
    stand_apart(lines, roles)


def _file_begins(lines: Lines) -> Places:
    """The first line of each log."""
    return np.concatenate(([0], np.flatnonzero(np.diff(lines.file)) + 1)).astype(np.int64)


@dataclass(slots=True)
class _Search:
    """Looks for lines with which trials start and end."""

    lines: Lines
    roles: EventRoles
    fixations: Places
    begins: Places

    def free(self) -> list[Shape]:
        """The shapes that mean nothing yet."""
        taken = self.roles.used()
        return [shape for shape in self.lines.shapes if not any(shape is one for one in taken)]

    def starts(self) -> Places:
        """Where trials start."""
        return lines_of([telling.shape for telling in self.roles.starts])

    def start_like(self, shape: Shape) -> float:
        """How much lines look as if a trial started with each of them."""
        own = np.asarray(shape.lines)
        if len(own) < 2 or len(own) > len(self.fixations):
            return 0.0
        filled = share_of(np.diff(np.searchsorted(self.fixations, own)) > 0)
        if filled < _NEARLY_ALL:
            return 0.0
        words = _words(shape)
        score = 0.3 * filled
        score += 0.6 * bool(words & _START) + 0.5 * has_word(shape, _TRIAL)
        score -= 1.0 * bool(words & _END)
        if any(counts_trials(self.lines, shape, place) for place in shape.variables()):
            score += 0.8
        # Practice may start in words of its own, but most logs begin with what all trials do.
        score -= 0.4 * bool(own[0] > self.fixations[0])
        return score if score >= 0.8 else 0.0

    def also(self, shape: Shape) -> bool:
        """Whether trials start with lines of a second shape too, and are not under way there."""
        own = np.asarray(shape.lines)
        every = np.union1d(self.starts(), own)
        at = np.searchsorted(every, own)
        fixated = np.searchsorted(self.fixations, np.append(every, _LAST))
        after = fixated[at + 1] > fixated[at]
        before = (at == 0) | (fixated[at] > fixated[np.maximum(at - 1, 0)])
        before |= self._first_of_log(own, every)
        return share_of(after) >= _NEARLY_ALL and share_of(before) >= _NEARLY_ALL

    def _first_of_log(self, own: Places, every: Places) -> NDArray[np.bool_]:
        """Whether lines are the first of their log among some lines."""
        at = np.searchsorted(every, own)
        earlier = every[np.maximum(at - 1, 0)]
        files = self.lines.file
        return np.asarray(files[earlier] != files[own])

    def orphans(self) -> tuple[Places, Places]:
        """The fixations before which no trial started, and the last line that closed one, if any.

        A trial is closed by a line with which one ends, and by the end of the log.
        """
        ends = lines_of([telling.shape for telling in self.roles.ends])
        bounds = np.unique(np.concatenate([self.begins, ends]))
        bound = bounds[np.searchsorted(bounds, self.fixations, side="right") - 1]
        starts = self.starts()
        at = np.searchsorted(starts, self.fixations) - 1
        started = np.where(at >= 0, starts[np.maximum(at, 0)], -1)
        alone = started < bound
        return self.fixations[alone], bound[alone]

    def add_orphans(self) -> None:
        """Find the lines with which those trials start that none is known of, as practice may."""
        for _ in range(_MOST_KINDS):
            fixations, bounds = self.orphans()
            if not len(fixations):
                return
            best_score, best = 0.0, None
            for shape in self.free():
                score = self._orphan_start(shape, fixations, bounds)
                if score > best_score:
                    best_score, best = score, shape
            if best is None:
                return
            self.roles.starts.append(Telling(best))

    def _orphan_start(self, shape: Shape, fixations: Places, bounds: Places) -> float:
        """How much lines look as if trials started with them that no other line starts."""
        own = np.asarray(shape.lines)
        words = _words(shape)
        if words & _END:
            return 0.0
        following = np.searchsorted(fixations, own)
        upcoming = np.append(fixations, _LAST)[following]
        next_own = np.append(own[1:], _LAST)
        starts = np.append(self.starts(), _LAST)
        next_start = starts[np.searchsorted(starts, own)]
        filled = share_of((upcoming < next_own) & (upcoming < next_start))
        at = np.searchsorted(own, fixations) - 1
        covered = share_of((at >= 0) & (own[np.maximum(at, 0)] >= bounds))
        if filled < _NEARLY_ALL or covered < _NEARLY_ALL:
            return 0.0
        score = 0.5 * bool(shape.variables()) + 0.6 * bool(words & _START)
        score += 0.5 * (has_word(shape, _TRIAL) or has_word(shape, PRACTICE))
        score += 0.5 * any(shape.is_like(telling.shape) for telling in self.roles.starts)
        return score if score >= 1.0 else 0.0

    def find_ends(self) -> None:
        """Find the lines with which trials end, of each kind of start."""
        self.roles.ends = []
        for telling in sorted(self.roles.starts, key=lambda one: -len(one.shape)):
            own = np.asarray(telling.shape.lines)
            if self._ended(own) >= _MOST:
                continue
            best_score, best = 0.0, None
            for shape in self.free():
                score = self._end_like(shape, telling.shape)
                if score > best_score:
                    best_score, best = score, shape
            if best is not None:
                self.roles.ends.append(Telling(best))

    def _ended(self, own: Places) -> float:
        """The share of some starts after which a trial ends before another one starts."""
        ends = lines_of([telling.shape for telling in self.roles.ends])
        starts = np.append(self.starts(), _LAST)
        next_start = starts[np.searchsorted(starts, own, side="right")]
        next_end = np.append(ends, _LAST)[np.searchsorted(ends, own)]
        return share_of(next_end < next_start)

    def _end_like(self, shape: Shape, kind: Shape) -> float:
        """How much lines look as if a trial of one kind ended with each of them."""
        own, starts = np.asarray(shape.lines), self.starts()
        trial = np.searchsorted(starts, own) - 1
        known = trial >= 0
        _, first = np.unique(trial[known], return_index=True)
        if len(first) < _NEARLY_ALL * known.sum():
            # Trials that start in words that are not known yet end after one that is known.
            bound = np.searchsorted(self.fixations, own)
            filled = np.diff(np.concatenate(([0], bound))) > 0
            if share_of(filled) < _NEARLY_ALL:
                return 0.0
        own, trial = own[known][first], trial[known][first]
        of_kind = np.isin(starts, kind.lines)
        if np.isin(np.flatnonzero(of_kind), trial).mean() < _MOST:
            return 0.0
        # After the last fixation of its trial: until the next one starts, or another one ends.
        fixated = np.append(self.fixations, _LAST)[np.searchsorted(self.fixations, own)]
        every = np.append(np.asarray(shape.lines), _LAST)
        next_start = np.append(starts, _LAST)[trial + 1]
        again = every[np.searchsorted(every, own, side="right")]
        if share_of((fixated >= next_start) | (again < next_start)) < _NEARLY_ALL:
            return 0.0
        return self._end_score(shape, kind)

    def _end_score(self, shape: Shape, kind: Shape) -> float:
        """How much lines that stand where trials end say so."""
        values = [p for p in shape.variables() if shape.kind(p) != "number"]
        alike = shape.words()[:1] == kind.words()[:1] and bool(shape.words())
        score = 1.0 * bool(_words(shape) & _END) + 0.4 * alike + 0.3 * (not shape.variables())
        counting = any(counts_trials(self.lines, shape, p) for p in shape.variables())
        score += 0.4 * counting - 0.1 * len(values)
        return score if score >= 0.4 else 0.0


def _words(shape: Shape) -> set[str]:
    """The words of a shape, folded."""
    return {word for text in shape.words() for word in words_of(text)}
