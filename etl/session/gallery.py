"""Which trials are most worth looking at, and why."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from etl.report import GalleryEntry, LineTrust, UnsureTrial
from etl.report.trace_picture import draw
from etl.screening.entries import Screened
from etl.screening.rules import CODE, LEFT_OUT_BY, TRIAL_RULES

if TYPE_CHECKING:
    from etl.session.reader import ReaderTables
    from etl.session.tracing import Tracer
    from etl.session.work import ReaderTask

#: How many trials are shown for each reason that is a matter of degree; of those not sure of their
#: lines, how many are drawn, and how many are named.
_BEST = 2
_UNSURE_DRAWN = 4
_UNSURE_NAMED = 24
_UNSURE = "lines not sure"
_DEGREES: Final = {
    "left out": "of all trials kept, {score:.0%} of its fixations were left out, the largest share",
    "outside": "of all trials kept, {score:.0%} of its fixations lie outside every region, the "
    "largest share",
    "regressions": "{score:.0f} regressive saccades, more than in any other trial",
    "fixations": "{score:.0f} kept fixations, more than in any other trial",
}


class Candidate(NamedTuple):
    """A trial worth looking at.

    Attributes
    ----------
    reason : str
        A rule for trials, or one of the reasons that are a matter of degree.
    score : float
        How much of it; of a rule always 1.
    participant : str
        The reader.
    trial : int
        Index of the trial among the reader's trials.
    """

    reason: str
    score: float
    participant: str
    trial: int

    def why(self, place: int) -> str:
        """Why it was chosen, in words; ``place`` counts those with the same reason, from 0."""
        if self.reason == _UNSURE:
            least = " the least sure of all:" if place == 0 else ""
            return f"not sure of its lines,{least} a confidence of {1 - self.score:.0%}"
        if self.reason in TRIAL_RULES:
            return f"the first trial that the rule {self.reason} left out"
        words = _DEGREES[self.reason].format(score=self.score)
        return (
            words
            if place == 0
            else words.replace("the largest", "the next").replace(
                "than in any other trial", "than in any but one"
            )
        )


def candidates(
    participants: Sequence[str],
    screened: Screened,
    outside: NDArray[np.bool_],
    regressions: NDArray[np.int64],
    trust: LineTrust | None = None,
) -> list[list[Candidate]]:
    """The trials of each reader that may be worth looking at: the utmost of each kind.

    Parameters
    ----------
    participants : sequence of str
        The readers.
    screened : Screened
        What was left out.
    outside : (n,) bool array
        Which kept fixations lie outside every region.
    regressions : (trials,) int64 array
        Regressive saccades of each trial; 0 where it is left out.
    trust : LineTrust, optional
        How far the lines of each trial can be trusted; absent where texts have no lines.

    Returns
    -------
    list of list of Candidate
        One a reader; trials are counted within the reader's.
    """
    codes, reader = screened.trial_codes(), screened.reader
    starts = np.searchsorted(reader, np.arange(len(participants)))
    found = _of_rules(participants, codes, reader, starts)
    if trust is not None:
        stops = [*starts[1:].tolist(), len(reader)]
        for place, (start, stop) in enumerate(zip(starts.tolist(), stops, strict=True)):
            found[place] += _unsure(participants[place], trust.of(slice(start, stop)))
    trial, width = screened.recorded.trial, len(codes)
    gone = screened.fixations.left_out
    read = np.maximum(np.bincount(trial, minlength=width), 1)
    kept = np.bincount(trial[gone < 0], minlength=width)
    scores = {
        "left out": np.bincount(trial[gone >= 0], minlength=width) / read,
        "outside": np.bincount(trial[outside], minlength=width) / np.maximum(kept, 1),
        "regressions": regressions.astype(np.float64),
        "fixations": kept.astype(np.float64),
    }
    for reason, score in scores.items():
        own = np.where(codes < 0, score, -1.0)
        most = np.maximum.reduceat(own, starts)
        # The first trial of each reader that has the most.
        best = np.flatnonzero((own == most[reader]) & (own > 0))
        first = np.flatnonzero(np.diff(reader[best], prepend=-1))
        for row in best[first].tolist():
            place = int(reader[row])
            within = row - int(starts[place])
            found[place].append(Candidate(reason, float(own[row]), participants[place], within))
    return found


def _of_rules(
    participants: Sequence[str],
    codes: NDArray[np.int8],
    reader: NDArray[np.int64],
    starts: NDArray[np.int64],
) -> list[list[Candidate]]:
    """For each reader the first trial that each rule for trials left out."""
    found: list[list[Candidate]] = [[] for _ in participants]
    rows = np.flatnonzero((codes >= CODE[TRIAL_RULES[0]]) & (codes <= CODE[TRIAL_RULES[-1]]))
    _, first = np.unique(reader[rows] * len(LEFT_OUT_BY) + codes[rows], return_index=True)
    for row in rows[first].tolist():
        place = int(reader[row])
        within = row - int(starts[place])
        rule = LEFT_OUT_BY[int(codes[row])]
        found[place].append(Candidate(rule, 1.0, participants[place], within))
    return found


def _unsure(participant: str, trust: LineTrust) -> list[Candidate]:
    """The trials of one reader that are not sure of their lines, the least sure first."""
    rows = np.flatnonzero(trust.unsure)
    rows = rows[np.argsort(trust.confidence[rows], kind="stable")][:_UNSURE_NAMED]
    return [
        Candidate(_UNSURE, 1 - float(trust.confidence[row]), participant, row)
        for row in rows.tolist()
    ]


class Choice:
    """Chooses among the candidates of all readers, in the order of the readers."""

    def __init__(self) -> None:
        self._best: dict[str, list[Candidate]] = {}

    def add(self, offered: Iterable[Candidate]) -> None:
        """Take in the candidates of one reader."""
        for one in offered:
            best = self._best.setdefault(one.reason, [])
            best.append(one)
            best.sort(key=lambda candidate: -candidate.score)  # stable: earlier readers first
            del best[_most(one.reason) :]

    def unsure(self, tasks: Mapping[str, ReaderTask], tracer: Tracer) -> Sequence[UnsureTrial]:
        """The trials least sure of their lines, the least sure first.

        Parameters
        ----------
        tasks : mapping of str to ReaderTask
            The work on each reader.
        tracer : Tracer
            Knows the names of trials.

        Returns
        -------
        sequence of UnsureTrial
        """
        named = []
        for one in self._best.get(_UNSURE, ()):
            key = tracer.key(tasks[one.participant].trials, one.trial)
            named.append(UnsureTrial(one.participant, key.session, key.trial, 1 - one.score))
        return named

    def chosen(self) -> Sequence[tuple[Candidate, str]]:
        """The trials to be shown, each once, with every reason why."""
        order = (_UNSURE, *_DEGREES, *TRIAL_RULES)
        reasons: dict[tuple[str, int], list[str]] = {}
        first: dict[tuple[str, int], Candidate] = {}
        for reason in order:
            for place, one in enumerate(self._best.get(reason, ())[:_UNSURE_DRAWN]):
                key = (one.participant, one.trial)
                first.setdefault(key, one)
                reasons.setdefault(key, []).append(one.why(place))
        return [(first[key], "; ".join(why)) for key, why in reasons.items()]


def _most(reason: str) -> int:
    """How many candidates are kept for a reason."""
    if reason == _UNSURE:
        return _UNSURE_NAMED
    return 1 if reason in TRIAL_RULES else _BEST


def drawn(
    chosen: Sequence[tuple[Candidate, str]],
    tasks: Mapping[str, ReaderTask],
    work: Callable[[ReaderTask], ReaderTables],
    tracer: Tracer,
) -> list[GalleryEntry]:
    """Draw the chosen trials.

    Parameters
    ----------
    chosen : sequence of (Candidate, str)
        From :meth:`Choice.chosen`.
    tasks : mapping of str to ReaderTask
        The work on each reader.
    work : callable
        Does that work again for the few readers concerned; their rows were not kept.
    tracer : Tracer
        Makes traced trials of the study.

    Returns
    -------
    list of GalleryEntry
        In the order of ``chosen``.
    """
    done: dict[str, ReaderTables] = {}
    entries = []
    for one, why in chosen:
        task = tasks[one.participant]
        if one.participant not in done:
            done[one.participant] = work(task)
        key = tracer.key(task.trials, one.trial)
        traced = tracer.traced(
            done[one.participant].batches,
            one.participant,
            key,
            int(task.trials.text[one.trial]),
            done[one.participant].trust,
        )
        entries.append(GalleryEntry(traced.heading, why, draw(traced), traced.heading))
    return entries
