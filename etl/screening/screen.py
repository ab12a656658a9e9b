"""Screening of readers: which fixations, trials and values are left out, and by which rule."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from etl.screening.merging import merge_short
from etl.screening.rules import CODE, FIXATION_RULES, READER_RULES, TRIAL_RULES, Limits

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Recorded:
    """The fixations of one or more readers as recorded, sorted by trial and time.

    Attributes
    ----------
    trial : (n,) int64 array
        Index into the readers' trials.
    from_start, from_end : (n,) int64 array
        Place in the recording, from 1, counted from either end.
    onset_ms, duration_ms : (n,) float64 array, milliseconds
    x_px, y_px : (n,) float64 array, pixels
    blink : (n,) bool array
        Whether a blink touches the fixation.
    left_out : (n,) int8 array
        Code of what left it out before screening; -1 where nothing did.
    undersweep : (n,) bool array, optional
        Whether a return sweep came down here short of the beginning of a line; None where nothing
        is known of lines.
    reader : (n,) int64 array, optional
        The reader of each, from 0; None where there is one.
    """

    trial: NDArray[np.int64]
    from_start: NDArray[np.int64]
    from_end: NDArray[np.int64]
    onset_ms: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    x_px: NDArray[np.float64]
    y_px: NDArray[np.float64]
    blink: Mask
    left_out: NDArray[np.int8]
    undersweep: Mask | None = None
    reader: NDArray[np.int64] | None = None


@dataclass(slots=True)
class FixationScreening:
    """Fixations after their rules.

    Attributes
    ----------
    left_out : (n,) int8 array
        Code of the first rule that left each out; -1 where kept.
    onset_ms, duration_ms : (n,) float64 array
        After merging.
    blink : (n,) bool array
        After merging.
    into : (n,) int64 array
        Index of the fixation that each was merged into; -1 where it was not.
    holds : dict of str to (n,) bool array
        For each rule that is on, the fixations it speaks against, whatever left them out.
    """

    left_out: NDArray[np.int8]
    onset_ms: NDArray[np.float64]
    duration_ms: NDArray[np.float64]
    blink: Mask
    into: NDArray[np.int64]
    holds: dict[str, Mask] = field(default_factory=dict)


def screen_fixations(
    recorded: Recorded,
    text_time_ms: tuple[NDArray[np.float64], NDArray[np.float64]],
    limits: Limits,
) -> FixationScreening:
    """Apply the rules for fixations, in order.

    Parameters
    ----------
    recorded : Recorded
        The fixations.
    text_time_ms : tuple of two (trials,) float64 arrays
        When each trial's text came up and went away, in log time; NaN where unknown.
    limits : Limits
        The study's rules.

    Returns
    -------
    FixationScreening
        What is kept, by which rule the rest is left out, and onsets and durations after merging.
    """
    came, went = text_time_ms
    screened = FixationScreening(
        recorded.left_out.copy(),
        recorded.onset_ms,
        recorded.duration_ms,
        recorded.blink,
        np.full(len(recorded.trial), -1, dtype=np.int64),
    )
    in_study = recorded.left_out < 0
    for rule in FIXATION_RULES:
        if not limits.on(rule):
            continue
        if rule == "merge":
            holds = _merge(recorded, screened, limits)
        elif rule == "outside_text_time":
            holds = (recorded.onset_ms < came[recorded.trial]) | (
                recorded.onset_ms > went[recorded.trial]
            )
        else:
            holds = _speaks_against(rule, recorded, screened, limits)
        holds &= in_study
        screened.holds[rule] = holds
        screened.left_out[holds & (screened.left_out < 0)] = CODE[rule]
    return screened


def _speaks_against(
    rule: str, recorded: Recorded, screened: FixationScreening, limits: Limits
) -> Mask:
    """The fixations against which one rule speaks."""
    if rule == "first":
        return recorded.from_start <= limits.first
    if rule == "last":
        return recorded.from_end <= limits.last
    if rule == "blink":
        return recorded.blink.copy()
    if rule == "undersweep":
        none = np.zeros(len(recorded.trial), dtype=bool)
        return none if recorded.undersweep is None else recorded.undersweep.copy()
    if rule == "under_ms":
        return screened.duration_ms < limits.under_ms
    if rule == "over_ms":
        return screened.duration_ms > limits.over_ms
    width, height = limits.screen_px
    x, y = recorded.x_px, recorded.y_px
    return (x < 0) | (x >= width) | (y < 0) | (y >= height)


def _merge(recorded: Recorded, screened: FixationScreening, limits: Limits) -> Mask:
    """Merge what is still in; the fixations that were merged into others."""
    rows = np.flatnonzero(screened.left_out < 0)
    merged = merge_short(
        recorded.trial[rows],
        recorded.onset_ms[rows],
        recorded.duration_ms[rows],
        (recorded.x_px[rows], _heights(recorded, rows)),
        recorded.blink[rows],
        (limits.merge_under_ms, limits.merge_within_px),
    )
    screened.onset_ms = recorded.onset_ms.copy()
    screened.duration_ms = recorded.duration_ms.copy()
    screened.blink = recorded.blink.copy()
    screened.onset_ms[rows] = merged.onset_ms
    screened.duration_ms[rows] = merged.duration_ms
    screened.blink[rows] = merged.blink
    gone = merged.into >= 0
    screened.into[rows[gone]] = rows[merged.into[gone]]
    holds = np.zeros(len(recorded.trial), dtype=bool)
    holds[rows[gone]] = True
    return holds


def _heights(recorded: Recorded, rows: NDArray[np.int64]) -> NDArray[np.float64]:
    """Y of some fixations; 0 for a reader none of whose has one, so that x alone decides."""
    y = recorded.y_px[rows]
    if recorded.reader is None or not np.isnan(y).any():
        return y
    reader = recorded.reader[rows]
    some = np.bincount(reader, ~np.isnan(y)) > 0
    return np.where(some[reader], y, 0.0)


@dataclass(frozen=True, slots=True)
class TrialQuantities:
    """What the rules for trials and readers look at, one value a trial.

    Attributes
    ----------
    in_study : (trials,) bool array
        Whether the trial is part of the study.
    noted : (trials,) bool array
        Whether the experimenter's notes leave it out.
    kept, outside : (trials,) int64 array
        Kept fixations, and those of them outside every region.
    duration_ms : (trials,) float64 array
        From the onset of the first to the end of the last kept fixation; 0 without any.
    blink_in_first_pass, no_first_pass : (trials,) bool array
        Whether a blink touches a first pass, or a first pass lacks, that the study asks for.
    answer : (trials,) float64 array
        1 right, 0 wrong, NaN where nothing was asked.
    cell : (trials,) int64 array, optional
        Which combination of the factors; None where no rule asks.
    reader : (trials,) int64 array
        The reader of each, from 0.
    readers : int
        How many readers there are.
    line_confidence : (trials,) float64 array, optional
        How sure the lines of the trial are, from 0 to 1; NaN where no method tells, None where none
        does for any trial.
    """

    in_study: Mask
    noted: Mask
    kept: NDArray[np.int64]
    outside: NDArray[np.int64]
    duration_ms: NDArray[np.float64]
    blink_in_first_pass: Mask
    no_first_pass: Mask
    answer: NDArray[np.float64]
    cell: NDArray[np.int64] | None
    reader: NDArray[np.int64]
    readers: int
    line_confidence: NDArray[np.float64] | None = None


@dataclass(frozen=True, slots=True)
class Verdict:
    """What rules say of trials, or of readers.

    Attributes
    ----------
    left_out : (m,) int8 array
        Code of the first rule against each; -1 where kept (or no part of the study).
    holds : dict of str to (m,) bool array
        For each rule that is on, what it speaks against.
    observed : dict of str to (m,) float64 array
        What each rule looked at.
    """

    left_out: NDArray[np.int8]
    holds: dict[str, Mask]
    observed: dict[str, NDArray[np.float64]]


def screen_trials(trials: TrialQuantities, limits: Limits) -> Verdict:
    """Apply the rules for trials, in order.

    Parameters
    ----------
    trials : TrialQuantities
        The trials after the rules for fixations.
    limits : Limits
        The study's rules.

    Returns
    -------
    Verdict
        Of the length of the trials.
    """
    with np.errstate(invalid="ignore"):
        share = np.where(trials.kept > 0, trials.outside / np.maximum(trials.kept, 1), 0.0)
    sure = trials.line_confidence
    if sure is None:
        sure = np.full(len(trials.kept), np.nan)
    low, high = limits.duration_ms
    against: dict[str, tuple[Mask, NDArray[np.float64]]] = {
        "notes": (trials.noted, trials.noted.astype(np.float64)),
        "fewest_fixations": (
            trials.kept < limits.fewest_fixations,
            trials.kept.astype(np.float64),
        ),
        # Not knowing speaks against nobody: NaN is under no limit.
        "line_confidence_under": (sure < limits.line_confidence_under, sure),
        "outside_share_over": (share > limits.outside_share_over, share),
        "duration_ms": (
            (trials.duration_ms < low) | (trials.duration_ms > high),
            trials.duration_ms,
        ),
        "blink_in_first_pass_of": (
            trials.blink_in_first_pass,
            trials.blink_in_first_pass.astype(np.float64),
        ),
        "no_first_pass_on": (trials.no_first_pass, trials.no_first_pass.astype(np.float64)),
        "answer_wrong": (trials.answer == 0, trials.answer),
    }
    return _judge({r: against[r] for r in TRIAL_RULES if limits.on(r)}, trials.in_study)


def screen_readers(trials: TrialQuantities, lost: Mask, noted: Mask, limits: Limits) -> Verdict:
    """Apply the rules for readers, in order.

    Parameters
    ----------
    trials : TrialQuantities
        The trials of the readers.
    lost : (trials,) bool array
        The trials that the rules for trials left out.
    noted : (readers,) bool array
        Whether the experimenter's notes leave each reader out.
    limits : Limits
        The study's rules.

    Returns
    -------
    Verdict
        Of the length of the readers. A share that cannot be computed, for want of trials or
        answers, speaks against nobody.
    """
    read = trials.in_study
    against: dict[str, tuple[Mask, NDArray[np.float64]]] = {}
    for rule in (rule for rule in READER_RULES if limits.on(rule)):
        if rule == "participant_notes":
            against[rule] = (noted, noted.astype(np.float64))
        elif rule == "correct_share_under":
            correct = _share(trials, trials.answer, read & ~np.isnan(trials.answer))
            against[rule] = (correct < limits.correct_share_under, correct)
        elif rule == "lost_trials_share_over":
            share = _share(trials, lost, read)
            against[rule] = (share > limits.lost_trials_share_over, share)
        else:
            fewest = _fewest_per_cell(trials, read, lost)
            against[rule] = (fewest < limits.fewest_trials_per_cell, fewest)
    return _judge(against, np.ones(trials.readers, dtype=bool))


def _share(
    trials: TrialQuantities, counted: NDArray[np.float64] | Mask, among: Mask
) -> NDArray[np.float64]:
    """For each reader the mean over some of the trials; NaN where there are none."""
    own = trials.reader[among]
    every = np.bincount(own, minlength=trials.readers)
    some = np.bincount(own, counted[among], minlength=trials.readers)
    return np.where(every > 0, some / np.maximum(every, 1), np.nan)


def _fewest_per_cell(trials: TrialQuantities, read: Mask, lost: Mask) -> NDArray[np.float64]:
    """For each reader the kept trials of the combination of factors that has the fewest.

    Of the combinations that the reader met; NaN for a reader without trials.
    """
    cell = np.zeros(len(read), dtype=np.int64) if trials.cell is None else trials.cell
    width = int(cell.max(initial=0)) + 1
    place = trials.reader * width + cell
    shape = (trials.readers, width)
    met = np.bincount(place[read], minlength=trials.readers * width).reshape(shape) > 0
    kept = np.bincount(place[read & ~lost], minlength=trials.readers * width).reshape(shape)
    fewest = np.where(met, kept, np.inf).min(axis=1)
    return np.where(np.isfinite(fewest), fewest, np.nan)


def _judge(against: dict[str, tuple[Mask, NDArray[np.float64]]], judged: Mask) -> Verdict:
    """Charge each thing to the first rule that speaks against it."""
    left_out = np.full(len(judged), -1, dtype=np.int8)
    holds: dict[str, Mask] = {}
    for rule, (speaks, _) in against.items():
        holds[rule] = speaks & judged
        left_out[holds[rule] & (left_out < 0)] = CODE[rule]
    return Verdict(left_out, holds, {rule: observed for rule, (_, observed) in against.items()})


def outlying(values: NDArray[np.float64], group: NDArray[np.int32], outlier_sd: float) -> Mask:
    """Which values lie far from the mean of their group.

    Parameters
    ----------
    values : (n,) float64 array
        NaN where missing.
    group : (n,) int32 array
        Which values belong together (a reader's values of one region), from 0.
    outlier_sd : float
        Sample standard deviations from the mean beyond which a value is set aside.

    Returns
    -------
    (n,) bool array
        False in groups of fewer than three values.

    Examples
    --------
    >>> values = np.array([200.0, 210.0, 190.0, 205.0, 195.0, 900.0])
    >>> outlying(values, np.zeros(6, dtype=np.int32), 2.0).tolist()
    [False, False, False, False, False, True]
    """
    there = ~np.isnan(values)
    present, own = values[there], group[there]
    width = int(group.max()) + 1 if len(group) else 0
    count = np.bincount(own, minlength=width)
    mean = np.bincount(own, present, minlength=width) / np.maximum(count, 1)
    apart = present - mean[own]
    spread = np.sqrt(np.bincount(own, apart**2, minlength=width) / np.maximum(count - 1, 1))
    far = np.zeros(len(values), dtype=bool)
    far[there] = (np.abs(apart) > outlier_sd * spread[own]) & (count[own] >= 3)
    return far
