"""Where the trials of a log of events begin and end."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers.event_lines import Places

#: A place behind every line.
_NEVER = np.iinfo(np.int64).max


@dataclass(frozen=True, slots=True)
class TrialSpans:
    """The lines between which each trial lies.

    Attributes
    ----------
    starts : (n,) int64 array
        The place of the line with which each trial starts, ascending.
    ends : (n,) int64 array
        The place of the line with which it ends; behind every line where it does not.
    """

    starts: Places
    ends: Places

    def __len__(self) -> int:
        return len(self.starts)

    def trial_of(self, lines: Places) -> Places:
        """The trial that started last before each line, or in it; -1 before all trials."""
        return np.searchsorted(self.starts, lines, side="right") - 1

    def within(self, lines: Places) -> NDArray[np.bool_]:
        """Whether each line lies within a trial."""
        trial = self.trial_of(lines)
        ends = np.append(self.ends, 0)
        return (trial >= 0) & (lines < ends[trial])

    def unfinished(self) -> Places:
        """The trials that do not end."""
        return np.flatnonzero(self.ends == _NEVER)


def trial_spans(starts: Places, ends: Places, shown: str, findings: Findings) -> TrialSpans:
    """Match the lines with which trials end to those with which they start.

    Parameters
    ----------
    starts, ends : (n,) and (m,) int64 array
        The places of those lines, ascending.
    shown : str
        The log's name for messages.
    findings : Findings
        Where an end without a start is recorded.

    Returns
    -------
    TrialSpans

    Examples
    --------
    >>> spans = trial_spans(np.array([2, 8]), np.array([6]), "P01.log", Findings())
    >>> spans.within(np.array([1, 3, 7, 9])).tolist(), spans.unfinished().tolist()
    ([False, True, False, True], [1])
    """
    own = np.searchsorted(starts, ends, side="right") - 1
    first = np.ones(len(ends), dtype=bool)
    first[1:] = own[1:] != own[:-1]
    ending = np.full(len(starts), _NEVER, dtype=np.int64)
    sound = first & (own >= 0)
    ending[own[sound]] = ends[sound]
    for place, trial in zip(ends[~sound].tolist(), own[~sound].tolist(), strict=True):
        above = "no trial starts above it" if trial < 0 else "the last one above it"
        if trial >= 0:
            above = f"the one that starts in line {starts[trial] + 1} "
            above += f"ended in line {ending[trial] + 1}"
        findings.error(
            "a trial ends that has not started",
            path=shown,
            line=place + 1,
            expected=f"the start of a trial first; {above}",
            fix="look for the line with which the trial starts; or correct trial_start or "
            "trial_end in [logs.patterns]",
        )
    return TrialSpans(starts, ending)


def tell_unfinished(
    spans: TrialSpans,
    trials: tuple[NDArray[np.int64], Callable[[int], str | None]],
    shown: str,
    findings: Findings,
    *,
    keep: bool,
) -> None:
    """Record every trial that does not end and does not start again later.

    Parameters
    ----------
    spans : TrialSpans
        The trials.
    trials : tuple of (n,) int64 array and callable
        A number for each trial that is the same where the trial is, -1 where it is not known; and
        from a trial to its name, None where it is not known.
    shown : str
        The log's name for messages.
    findings : Findings
        Where they are recorded.
    keep : bool
        Whether such trials are kept, and only noted.
    """
    names, spelled = trials
    last = {name: trial for trial, name in enumerate(names.tolist())}
    for trial in spans.unfinished().tolist():
        name = int(names[trial])
        if name >= 0 and last[name] > trial:
            continue
        line = int(spans.starts[trial]) + 1
        if keep:
            findings.note(
                "a trial does not end and is kept", path=shown, line=line, found=spelled(trial)
            )
            continue
        following = spans.starts[trial + 1 : trial + 2].tolist()
        before = f"the next one starts in line {following[0] + 1}" if following else "the log ends"
        cut = "" if following else "; it may be cut short"
        findings.error(
            "a trial starts and does not end",
            path=shown,
            line=line,
            found=spelled(trial),
            expected=f"its end before {before}{cut}",
            fix='copy the log again; if trials may break off, add unfinished = "keep" to '
            "[logs.patterns]",
        )
