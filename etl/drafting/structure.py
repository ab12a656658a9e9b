"""How the rows of logs hang together: which are fixations, of which eye, in which trial."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.drafting.columns import Pooled, PooledColumn, share_of
from etl.drafting.meanings import NAMED, Meaning, Understanding, counted, shortened
from etl.drafting.vocabulary import likeness, word_set, words_of

#: How eyes are named in cells (common practice, no source).
_LEFT = word_set("l left le links gauche g izquierda izquierdo i sinistra sx esquerda os 左")
_RIGHT = word_set("r right re rechts droite d derecha derecho destra dx direita od 右")
#: A column that sorts rows into kinds has few values, one of which begins like this.
_FIXATION_BEGINS = ("fix", "注视", "blickfix")
_MOST_KINDS = 12
#: A trial has at least this many rows on average; a column that changes more often numbers
#: something else.
_LEAST_ROWS = 1.5
#: Of the rows at which a number changes, at most this share may fall back (the next reader).
_MOST_FALLS = 0.2
_ENOUGH = 0.75
_CLOSE = 0.15


@dataclass(frozen=True)
class Structure:
    """The rows that are fixations, and which of them belong together.

    Attributes
    ----------
    rows : Pooled
        The rows.
    run : (n,) int64 array
        Which recording of a trial each row belongs to; of a log as a whole where no column says.
    group : (n,) int64 array
        The same, apart for each eye.
    """

    rows: Pooled
    run: NDArray[np.int64]
    group: NDArray[np.int64]

    def constant(self, column: PooledColumn) -> bool:
        """Whether a column is the same in all rows of a trial, but for the odd slip."""
        changed = np.diff(column.coded.codes) != 0
        within = np.diff(self.run) == 0
        broken = len(np.unique(self.run[1:][changed & within]))
        return broken <= 0.01 * (int(self.run[-1]) + 1) if len(self.run) else False


def find_structure(pooled: Pooled, found: Understanding) -> Structure:
    """Find out which rows are fixations, and which column tells eyes and trials apart.

    Parameters
    ----------
    pooled : Pooled
        All rows.
    found : Understanding
        Where it is recorded.

    Returns
    -------
    Structure
    """
    rows = _only_fixations(pooled, found)
    eye = _find_eye(rows, found)
    run = _runs(rows, reader_codes(rows))
    trial = _find_trial(rows, run, found)
    if trial is not None:
        run = _runs(rows, reader_codes(rows), rows.columns[trial].coded.codes)
    group = run
    if eye is not None and len(found.eye_values) > 1:
        codes = rows.columns[eye].coded.codes.astype(np.int64)
        group = run * (int(codes.max(initial=0)) + 2) + codes + 1
    return Structure(rows, run, group)


def side_of(text: str) -> str:
    """Which eye a word names: ``"left"``, ``"right"``, or empty."""
    word = text.casefold()
    if word in _LEFT:
        return "left"
    return "right" if word in _RIGHT else ""


def _only_fixations(pooled: Pooled, found: Understanding) -> Pooled:
    """The rows that are fixations, where a column says that others are something else."""
    for header in sorted(pooled.headers, key=lambda one: -likeness(one, "event")):
        column = pooled.columns[header]
        values = column.distinct
        if column.numeric or not 2 <= len(values) <= _MOST_KINDS:
            continue
        fixations = [v for v in values if v.casefold().startswith(_FIXATION_BEGINS)]
        if len(fixations) != 1:
            continue
        mask = column.coded.among(fixations)
        if not 0 < mask.sum() < len(mask):
            continue
        others = [value for value in values if value not in fixations]
        found.where = (header, fixations[0])
        found.remarks.append(
            f'column "{header}" says what a row is: "{fixations[0]}" in {int(mask.sum()):,} rows, '
            f"{shortened(others)} in the other {int((~mask).sum()):,}"
        )
        return pooled.only(mask)
    return pooled


def _find_eye(rows: Pooled, found: Understanding) -> str | None:
    """The column that says which eye a row is of."""
    best, best_score = None, 0.0
    for header, column in rows.columns.items():
        values = column.distinct
        named = likeness(header, "eye")
        if not 1 <= len(values) <= 3:
            continue
        sides = [side_of(value) for value in values]
        if all(sides) or (named >= NAMED and set(values) <= {"0", "1", "2", "B", "both"}):
            # Unnamed, it must differ from row to row, or it may as well say which hand answered.
            unlike = sum(np.diff(column.coded.codes) != 0) > len(column.coded) / 10
            score = named + 0.5 * bool(all(sides) and unlike and len(values) == 2)
            if score > best_score:
                best, best_score = header, score
    if best is None or best_score < NAMED:
        return None
    column = rows.columns[best]
    counts = {text: int(column.coded.among([text]).sum()) for text in column.distinct}
    told = " and ".join(f'"{eye}" in {counted(n, "row")}' for eye, n in counts.items())
    found.meanings["eye"] = Meaning(best, f"its cells name eyes: {told}")
    if len(counts) > 1:
        found.eye_values = counts
    return best


def _runs(rows: Pooled, *codes: NDArray[np.int32] | None) -> NDArray[np.int64]:
    """Number the stretches of rows in which log and columns stay the same."""
    change = np.zeros(len(rows), dtype=bool)
    for own in (rows.file, *codes):
        if own is not None:
            change[1:] |= own[1:] != own[:-1]
    return np.cumsum(change).astype(np.int64)


def reader_codes(rows: Pooled) -> NDArray[np.int32] | None:
    """The column that is called like the reader, where it stays the same for long.

    Parameters
    ----------
    rows : Pooled
        The rows.

    Returns
    -------
    (n,) int32 array or None
        Its codes; None where there is no such column.
    """
    named = [(likeness(one, "participant"), one) for one in rows.headers]
    for score, header in sorted(named, key=lambda pair: -pair[0]):
        codes = rows.columns[header].coded.codes
        if score >= NAMED and share_of(np.diff(codes) != 0) < 0.05:
            return codes
    return None


@dataclass(frozen=True, slots=True)
class _TrialLike:
    """How much a column looks as if it told trials apart."""

    header: str
    score: float
    named: float
    evidence: str


def _find_trial(rows: Pooled, run: NDArray[np.int64], found: Understanding) -> str | None:
    """The column that tells trials apart."""
    judged = [
        one
        for header, column in rows.columns.items()
        if (one := _judge_trial(column, run, header)) is not None
    ]
    judged.sort(key=lambda one: -one.score)
    if not judged or judged[0].score < _ENOUGH:
        found.questions["trial"] = "which column tells one trial of a reader from the next?"
        return None
    best = judged[0]
    rivals = [one for one in judged[1:] if best.score - one.score < _CLOSE]
    if best.named < NAMED and rivals:
        told = shortened([best.header, *(one.header for one in rivals)])
        found.questions["trial"] = (
            f"which column tells one trial of a reader from the next? It may be one of {told}"
        )
        return None
    found.meanings["trial"] = Meaning(best.header, best.evidence)
    for header in rows.headers:
        if header != best.header and likeness(header, "trial") == 1.0 and best.named < NAMED:
            found.remarks.append(
                f'column "{header}" is called like a trial, but its cells do not behave like one'
            )
    return best.header


def _judge_trial(column: PooledColumn, run: NDArray[np.int64], header: str) -> _TrialLike | None:
    """Judge a column by its cells, then by its name."""
    codes = column.coded.codes
    start = np.diff(run) != 0
    change = np.diff(codes) != 0
    begins = np.concatenate(([True], start | change))
    stretches = int(begins.sum())
    length = len(codes) / max(stretches, 1)
    within = change & ~start
    named = max(likeness(header, "trial"), 0.4 * likeness(header, "item"))
    named -= 0.6 * max(likeness(header, one) for one in ("participant", "session", "label", "eye"))
    if length < _LEAST_ROWS or column.absent > 0.05 * len(codes):
        return None
    if not within.any():
        # One trial a log, or a column that says nothing of trials.
        several = len(column.distinct) > 1 or int(run[-1]) == 0
        if named < NAMED or not several:
            return None
        return _TrialLike(
            header,
            0.4 + named,
            named,
            "the header says trial, and it is the same in all rows of a log",
        )
    told = f"{stretches:,} trials of {length:.0f} rows on average"
    if column.numeric and column.whole and not np.isnan(column.numbers).any():
        moved = np.diff(column.numbers)[within]
        forward, by_one = share_of(moved > 0), share_of(moved == 1)
        if 1 - forward <= _MOST_FALLS:
            content = 0.6 + 0.2 * by_one + 0.2 * (length >= 3)
            evidence = f"its number goes up from trial to trial: {told}"
            return _TrialLike(header, content + named, named, evidence)
    # Names: each stands in one stretch of rows of a reader.
    keys = run[begins] * (len(column.coded.values) + 1) + codes[begins] + 1
    once = len(np.unique(keys)) / stretches
    if once < 0.9:
        return None
    evidence = f"the rows of each of its values stand together: {told}"
    return _TrialLike(header, 0.4 * once + named, named, evidence)


def all_words(headers: Mapping[str, object]) -> set[str]:
    """Every word that stands in a header."""
    return {word for header in headers for word in words_of(header)}
