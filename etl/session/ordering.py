"""The fixations of readers in time order, trial by trial; trials recorded twice."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers import CanonicalLog
from etl.parsers.time_checks import DIFFERENCE_DIGITS
from etl.session.clock import tell_long_gaps, tell_overlapping_trials
from etl.session.ordered import OrderedFixations
from etl.session.recordings import Fault, Rows, find_recordings, first_faults

#: How far a fixation may reach into the next one. Onset and duration are each rounded to a
#: millisecond and recorders differ in whether the last sample counts (common practice, no source).
OVERLAP_TOLERATED_MS = 2.0


@dataclass(frozen=True, slots=True)
class TrialNames:
    """The trials of readers, for messages.

    Attributes
    ----------
    in_study : (trials,) bool array
        Whether each is part of the study.
    spelled : callable
        From a trial's index to its name, such as ``trial 7, session 2``.
    """

    in_study: NDArray[np.bool_]
    spelled: Callable[[int], str]


@dataclass(frozen=True, slots=True)
class ReaderLog:
    """The logs of one or more readers.

    Attributes
    ----------
    log : CanonicalLog
        Its rows, in the order of the files.
    file : (n,) int32 array
        Which file each row is from, as an index into ``shown``.
    shown : sequence of str
        The files' names for messages.
    trial : (n,) int64 array
        Index of each row's trial into the readers' trials.
    part : (n,) integer array
        A number for each reader and file: rows of one file are looked at reader by reader.
    """

    log: CanonicalLog
    file: NDArray[np.int32]
    shown: Sequence[str]
    trial: NDArray[np.int64]
    part: NDArray[np.integer]

    def place(self, row: int) -> tuple[str, int]:
        """File and line of a row."""
        return self.shown[int(self.file[row])], int(self.log.source_line[row])


def order_fixations(
    reader: ReaderLog, trials: TrialNames, repeated: str, findings: Findings
) -> OrderedFixations:
    """Bring fixations into time order and find trials that were recorded twice.

    Parameters
    ----------
    reader : ReaderLog
        The fixations as logged. Where they are several readers', their logs all hold numbers, or
        none does, and so with onsets, and with what logs say of recordings.
    trials : TrialNames
        The readers' trials, in the order of the tables.
    repeated : {"error", "first", "last"}
        What is done with a trial that was recorded more than once.
    findings : Findings
        Where fixations out of order, overlaps, repeated trials and trials that go on in another
        file are recorded.

    Returns
    -------
    OrderedFixations

    Notes
    -----
    Where the log numbers the fixations, the numbers give the order, otherwise the onsets do. Where
    another recording of a trial begins: :func:`etl.session.recordings.find_recordings`.
    """
    log = reader.log
    count = len(log)
    logged, by_trial = _by_trial(reader)
    trial = logged.trial
    begins = logged.begins()
    numbered = count > 0 and not np.isnan(log.number[0])
    found = find_recordings(logged)
    starts = found.starts
    mixed = _tell_faults(reader, trials, by_trial, first_faults(logged, found), findings)
    _notice_straddling(reader, trials, by_trial, starts | begins, findings)
    recording = np.cumsum(starts | begins)
    key = logged.number if numbered else logged.onset_ms
    rows = by_trial
    begins_recording = starts | begins
    if ((key[1:] < key[:-1]) & ~begins_recording[1:]).any():
        # Recordings count up in file order, so sorting by recording keeps trials together.
        order = np.lexsort((key, recording))
        rows, recording, trial = by_trial[order], recording[order], trial[order]
        begins_recording = np.ones(count, dtype=bool)
        begins_recording[1:] = recording[1:] != recording[:-1]
    overlapping = np.zeros(count, dtype=bool)
    # What is wrong with a trial's rows is told once.
    settled = starts | begins | mixed[logged.trial]
    in_order = numbered or _file_order_is_right(reader, by_trial, settled, findings)
    # Onsets that go back are sorted by now, and what overlaps then says nothing more.
    if in_order and count and not np.isnan(log.onset_ms[0]):
        told = begins_recording | mixed[trial]
        overlapping = _check_times(reader, rows, told, numbered, findings)
        tell_long_gaps(log, rows, told | ~trials.in_study[trial], reader.place, findings)
        tell_overlapping_trials(
            log, reader.part, reader.trial, reader.place, OVERLAP_TOLERATED_MS, findings
        )
    aside = _recordings_set_aside(
        reader,
        TrialNames(trials.in_study & ~mixed, trials.spelled),
        (rows, trial, begins_recording),
        repeated,
        findings,
    )
    first = np.flatnonzero(begins)
    number = np.arange(count) - np.repeat(first, np.diff(np.append(first, count))) + 1
    gap = np.zeros(count, dtype=bool)
    if numbered:
        own = log.number[rows]
        gap[1:] = (own[1:] - own[:-1] > 1) & ~begins_recording[1:]
    return OrderedFixations(rows, trial, number, aside, overlapping, rows != by_trial, gap)


def _by_trial(reader: ReaderLog) -> tuple[Rows, NDArray[np.int64]]:
    """The rows sorted by trial, and where each stands in the logs."""
    log, trial, by_trial = reader.log, reader.trial, np.arange(len(reader.trial))
    logged = Rows(
        by_trial,
        trial,
        reader.part,
        log.onset_ms,
        log.duration_ms,
        log.number,
        log.recording,
    )
    if (trial[1:] >= trial[:-1]).all():
        return logged, by_trial
    by_trial = np.argsort(trial, kind="stable")
    return logged.take(by_trial), by_trial


def _tell_faults(
    reader: ReaderLog,
    trials: TrialNames,
    by_trial: NDArray[np.int64],
    faults: dict[int, Fault],
    findings: Findings,
) -> NDArray[np.bool_]:
    """Record where rows of a trial contradict each other; which trials have such rows."""
    mixed = np.zeros(len(trials.in_study), dtype=bool)
    for at, fault in faults.items():
        row = int(by_trial[at])
        index = int(reader.trial[row])
        mixed[index] = True
        if not trials.in_study[index]:
            continue
        shown, line = reader.place(row)
        above = reader.place(int(by_trial[at - 1]))
        problem, expected, fix = _FAULTS[fault]
        findings.error(
            problem,
            path=shown,
            line=line,
            found=_with_number(trials.spelled(index), reader.log.number[row]),
            expected=f"{expected}; the row of this trial above it is {above[0]}:{above[1]}",
            fix=fix,
        )
    return mixed


_AGAIN = "if the trial was recorded a second time, tell the two apart by a session"
#: What is said of each fault: the problem, what was expected, what to do.
_FAULTS: dict[Fault, tuple[str, str, str]] = {
    "comes twice": (
        "the number comes twice in this trial",
        "each number once in a recording",
        "if the log holds both eyes, name the one to use in [logs.where]; remove a row that is "
        "there twice; " + _AGAIN,
    ),
    "falls back": (
        "the fixations of this trial go back again and again",
        "the fixations of a recording in order",
        f"sort the log by trial and time; {_AGAIN}",
    ),
    "alternates": (
        "rows of two trials alternate",
        "the rows of a recording one below the other",
        f"sort the log by trial and time, or correct the column of the trial; {_AGAIN}",
    ),
}


def _with_number(spelled: str, number: np.float64) -> str:
    """A trial, with the number of its fixation where the log has one."""
    return spelled if np.isnan(number) else f"{spelled}, fixation {number:g}"


def _notice_straddling(
    reader: ReaderLog,
    trials: TrialNames,
    by_trial: NDArray[np.int64],
    starts: NDArray[np.bool_],
    findings: Findings,
) -> None:
    """Note every trial that goes on in another file."""
    file = reader.part[by_trial]
    for at in (np.flatnonzero((file[1:] != file[:-1]) & ~starts[1:]) + 1).tolist():
        index = int(reader.trial[by_trial[at]])
        if trials.in_study[index]:
            shown, line = reader.place(int(by_trial[at]))
            before = reader.place(int(by_trial[at - 1]))
            if np.isnan(reader.log.number[by_trial[at]]):
                # Without numbers nothing tells a trial that goes on from one begun anew.
                findings.warning(
                    f"a trial of {before[0]} goes on here",
                    path=shown,
                    line=line,
                    found=trials.spelled(index),
                    fix="if it was begun anew there, tell the two apart by a session, or name the "
                    "column that numbers fixations as [logs.columns] fixation",
                )
                continue
            findings.note(
                f"a trial of {before[0]} goes on here",
                path=shown,
                line=line,
                found=trials.spelled(index),
            )


def _file_order_is_right(
    reader: ReaderLog,
    by_trial: NDArray[np.int64],
    starts: NDArray[np.bool_],
    findings: Findings,
) -> bool:
    """Whether, without numbers, no onset goes back within a recording; says where one does."""
    onset = reader.log.onset_ms[by_trial]
    falls = np.flatnonzero((onset[1:] < onset[:-1]) & ~starts[1:]) + 1
    for at in falls.tolist():
        shown, line = reader.place(int(by_trial[at]))
        findings.error(
            "the fixation begins before the one above it in the same trial",
            path=shown,
            line=line,
            found=f"onset {_ms(onset[at])} after {_ms(onset[at - 1])}",
            expected="onsets that never go back within a trial",
            fix="sort the log by onset; if the trial was started again, give it a session or a "
            "trial number of its own",
        )
    return not falls.size


def _check_times(
    reader: ReaderLog,
    rows: NDArray[np.int64],
    begins: NDArray[np.bool_],
    numbered: bool,  # noqa: FBT001
    findings: Findings,
) -> NDArray[np.bool_]:
    """Fixations must not overlap; which are reached into within what is tolerated."""
    log = reader.log
    onset = log.onset_ms[rows]
    end = onset + log.duration_ms[rows]
    over = np.where(begins[1:], 0.0, np.round(end[:-1] - onset[1:], DIFFERENCE_DIGITS))
    back = np.flatnonzero((onset[1:] < onset[:-1]) & ~begins[1:]) + 1
    if numbered:
        for at in back.tolist():
            shown, line = reader.place(int(rows[at]))
            findings.error(
                "the fixation begins before the one with the number before it",
                path=shown,
                line=line,
                found=f"onset {_ms(onset[at])} after {_ms(onset[at - 1])}",
                expected="onsets that never go back within a trial",
                fix="correct the numbers or the onsets; if the trial was started again, give it "
                "a session or a trial number of its own",
            )
    long = over > OVERLAP_TOLERATED_MS
    long[back - 1] = False
    for at in (np.flatnonzero(long) + 1).tolist():
        shown, line = reader.place(int(rows[at]))
        before = reader.place(int(rows[at - 1]))
        findings.error(
            "the fixation begins before the one before it is over",
            path=shown,
            line=line,
            found=f"onset {_ms(onset[at])}, {_ms(over[at - 1])} too early",
            expected=f"no overlap with {before[0]}:{before[1]} beyond {OVERLAP_TOLERATED_MS:g} ms, "
            "which is taken for rounding",
            fix="check that onset and duration are the right columns with the right units, and "
            "that only one eye is read ([logs.where])",
        )
    overlapping = np.zeros(len(rows), dtype=bool)
    overlapping[1:] = (over > 0) & (over <= OVERLAP_TOLERATED_MS)
    return overlapping


def _ms(time_ms: np.float64) -> str:
    """A time with all its digits: seven are usual where a recorder counts from its start."""
    return f"{np.format_float_positional(time_ms, precision=3, trim='-')} ms"


def _recordings_set_aside(
    reader: ReaderLog,
    trials: TrialNames,
    ordered: tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]],
    repeated: str,
    findings: Findings,
) -> NDArray[np.bool_]:
    """Which fixations belong to recordings of a trial that are not used."""
    rows, trial, begins_recording = ordered
    starts = np.flatnonzero(begins_recording)
    of_trial = trial[starts]
    again = np.bincount(of_trial, minlength=len(trials.in_study)) > 1
    again &= trials.in_study
    if not again.any():
        return np.zeros(len(rows), dtype=bool)
    if repeated == "error":
        for index in np.flatnonzero(again).tolist():
            own = starts[of_trial == index]
            shown, line = reader.place(int(rows[own[1]]))
            first = reader.place(int(rows[own[0]]))
            findings.error(
                "a trial is recorded a second time",
                path=shown,
                line=line,
                found=trials.spelled(index),
                expected=f"one recording of each trial; the first begins in {first[0]}:{first[1]}",
                fix='say which counts by [trials] repeated = "first" or "last", or tell the two '
                "apart by a session",
            )
        return np.zeros(len(rows), dtype=bool)
    # Recordings of a trial stand one after the other.
    used = np.full(len(again), -1, dtype=np.int64)
    places = np.arange(len(starts))
    if repeated == "first":
        used[of_trial[::-1]] = places[::-1]
    else:
        used[of_trial] = places
    which = np.cumsum(begins_recording) - 1
    return np.asarray(again[trial] & (which != used[trial]))
