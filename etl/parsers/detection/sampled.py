"""From gaze samples to the canonical fixations of a log."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pyarrow as pa
from numpy.typing import NDArray

from etl.errors import Findings
from etl.files import Coded
from etl.parsers.canonical import CanonicalLog, LogNote
from etl.parsers.detection.dispersion import fixation_windows
from etl.parsers.detection.sample_times import check_sample_times, sampling_interval_ms
from etl.parsers.detection.track import Spans, Track, piece_bounds
from etl.parsers.detection.velocity import saccade_samples

if TYPE_CHECKING:
    from etl.study.models import Samples

#: Digits after the point of a mean position, in px: the last bits of a sum differ between machines.
_MEAN_DIGITS = 6

#: No trial is begun and over within this time, in the middle of another one (our choice: half a
#: fixation of reading).
_SHORTEST_TRIAL_MS = 100.0


@dataclass(frozen=True, slots=True)
class SampleRows:
    """The gaze samples of a log, in the order of the file.

    Attributes
    ----------
    ids : dict of str to Coded
        ``participant``, ``trial`` and, where the log has them, ``session`` and ``item``.
    facts : dict of str to Coded
        Facts about trials that stand in the log, by the header's own name.
    time_ms : (n,) float64 array, milliseconds
        When each sample was taken.
    place_px : tuple of two (n,) float64 arrays, pixels
        x and y from the top left corner of the screen; NaN where the sample has no position.
    lines : (n,) int32 array
        Line of each row.
    blink : (n,) bool array
        Whether the log says that there was a blink; False throughout where it does not say.
    recording : (n,) int32 array or None
        As in :class:`~etl.parsers.canonical.CanonicalLog`; None where the log does not say.
    time_cells : tuple of str and (n,) pa.Array of text
        Header and cells of the column of times, for messages.
    """

    ids: dict[str, Coded]
    facts: dict[str, Coded]
    time_ms: NDArray[np.float64]
    place_px: tuple[NDArray[np.float64], NDArray[np.float64]]
    lines: NDArray[np.int32]
    blink: NDArray[np.bool_]
    recording: NDArray[np.int32] | None
    time_cells: tuple[str, pa.Array]

    def __len__(self) -> int:
        return len(self.lines)

    def runs(self) -> NDArray[np.int64]:
        """Which recording of a trial each sample is of: neighbouring rows of one trial are one."""
        begins = np.zeros(len(self), dtype=bool)
        columns = [coded.codes for coded in self.ids.values()]
        for column in columns if self.recording is None else [*columns, self.recording]:
            begins[1:] |= column[1:] != column[:-1]
        return np.cumsum(begins)


def log_of_samples(
    samples: SampleRows,
    settings: Samples,
    dispersion_px: float,
    note: LogNote,
    findings: Findings,
) -> CanonicalLog | None:
    """Find the fixations in gaze samples.

    Parameters
    ----------
    samples : SampleRows
        At least one, each counted among the lines of the note as ``"fixations"``.
    settings : Samples
        The study's ``[logs.samples]``.
    dispersion_px : float, pixels
        Its ``dispersion_px``, or its ``dispersion_deg`` in pixels; read by that method alone.
    note : LogNote
        Where it is counted what became of the samples.
    findings : Findings
        Where samples out of order, facts that vary within a trial, and trials without a fixation
        are recorded.

    Returns
    -------
    CanonicalLog or None
        None where an error was recorded.

    Notes
    -----
    Fixations are looked for in each recording of a trial by itself: neighbouring rows of one
    reader, session, trial, item and recording in one log; where a trial goes on in another log, no
    fixation reaches from the one into the other. A fixation begins with its first sample; it lasts
    until its last sample and one sampling interval more, as each sample stands for the time until
    the next; its place is the mean of its samples that have one; its line is that of its first
    sample. Where the log says when there was a blink, a blink touches the fixations in which it
    has samples; where it has none in any, the fixation before it and the one after it. Samples
    without a position alone are no blink.
    """
    run = samples.runs()
    before = findings.count("error")
    check_sample_times(
        samples.time_ms, run, samples.time_cells, samples.lines, note.shown, findings
    )
    _check_facts(samples, run, note, findings)
    _check_strays(samples, run, note, findings)
    if findings.count("error") > before:
        return None
    interval_ms = sampling_interval_ms(
        samples.time_ms, run, settings.frequency_hz, samples.lines, note.shown, findings
    )
    if interval_ms is None:
        return None
    track, row = Track.of(
        samples.time_ms, samples.place_px, run, interval_ms, settings.longest_gap_ms
    )
    spans, fate_of = _found(track, settings, dispersion_px)
    _count(samples, row, fate_of, note)
    note.interval_ms = interval_ms
    note.counts["fixations"] = len(spans)
    if not len(spans):
        findings.error(
            "no fixation is found in the samples of the log",
            path=note.shown,
            line=int(samples.lines[0]),
            where="logs.samples",
            expected=f"fixations of {settings.shortest_fixation_ms:g} ms or more",
            fix="check the units of onset, x and y in [logs.columns]; if the reader was not "
            "recorded, remove the log",
        )
        return None
    _tell_bare_trials(samples, run, track.run[spans.first], note, findings)
    first = row[spans.first]
    _tell_bare_readers(samples, first, note, findings)
    if findings.count("error") > before:
        return None
    x_px, y_px = _means(track.x_px, spans), _means(track.y_px, spans)
    begin = piece_bounds(run)[:-1][run[first]]
    absent = np.full(len(spans), np.nan)
    return CanonicalLog(
        {name: coded.take(first) for name, coded in samples.ids.items()},
        {name: coded.take(begin) for name, coded in samples.facts.items()},
        samples.time_ms[first],
        absent,
        track.lasting_ms(spans.first, spans.last),
        x_px,
        y_px,
        None,
        samples.lines[first],
        _touched(samples.blink, run, first, row[spans.last]),
        _recordings(samples, run, first),
    )


def _found(
    track: Track, settings: Samples, dispersion_px: float
) -> tuple[Spans, dict[str, NDArray[np.bool_]]]:
    """The fixations, and what became of the samples on the track."""
    if settings.method == "dispersion":
        spans = fixation_windows(track, dispersion_px, settings.shortest_fixation_ms)
        inside = spans.inside(len(track))
        return spans, {"samples in fixations": inside, "samples outside fixations": ~inside}
    moving = saccade_samples(track, settings.threshold_factor, settings.shortest_saccade_ms)
    resting = Spans.where(~moving, track.stretch)
    spans = resting.of_length(track, settings.shortest_fixation_ms)
    inside = spans.inside(len(track))
    return spans, {
        "samples in fixations": inside,
        "samples in saccades": moving,
        "samples of too short a fixation": ~moving & ~inside,
    }


def _count(
    samples: SampleRows,
    row: NDArray[np.int64],
    fate_of: dict[str, NDArray[np.bool_]],
    note: LogNote,
) -> None:
    """Count what became of every sample."""
    placed = np.zeros(len(samples), dtype=bool)
    placed[row] = True
    note.counts["samples"] = len(samples)
    rows_of = {"samples without a position": np.flatnonzero(~placed)}
    rows_of |= {fate: row[mask] for fate, mask in fate_of.items()}
    for fate, rows in rows_of.items():
        note.counts[fate] = len(rows)
        if rows.size:
            line = int(samples.lines[rows[0]])
            note.account.move("fixations", fate, len(rows), line)


def _check_facts(
    samples: SampleRows, run: NDArray[np.int64], note: LogNote, findings: Findings
) -> None:
    """Record the first sample of each trial at which a fact is not as in the trial's first row."""
    begin = piece_bounds(run)[:-1]
    for name, coded in samples.facts.items():
        differs = np.flatnonzero(coded.codes != coded.codes[begin][run])
        firsts = differs[np.flatnonzero(np.diff(run[differs], prepend=-1))]
        for row in firsts.tolist():
            first = int(begin[run[row]])
            findings.error(
                f"{name} varies within a trial",
                path=note.shown,
                line=int(samples.lines[row]),
                where=f'column "{name}"',
                found=coded.text(row),
                expected=f'"{coded.text(first)}" in all rows of {_trial(samples, row)}, as in '
                f"line {int(samples.lines[first])}",
                fix="correct the cells; if these are two trials, number them apart or name a "
                "session column",
            )


def _check_strays(
    samples: SampleRows, run: NDArray[np.int64], note: LogNote, findings: Findings
) -> None:
    """Record samples of another trial in the middle of one, which goes on at once."""
    bounds = piece_bounds(run)
    if len(bounds) < 4:
        return
    begin, last = bounds[:-1], bounds[1:] - 1
    same = np.ones(len(begin) - 2, dtype=bool)
    for coded in samples.ids.values():
        codes = coded.codes[begin]
        same &= codes[2:] == codes[:-2]
    away_ms = samples.time_ms[begin[2:]] - samples.time_ms[last[:-2]]
    soon = (away_ms >= 0) & (away_ms < _SHORTEST_TRIAL_MS)
    for place in np.flatnonzero(same & soon).tolist():
        row = int(begin[place + 1])
        findings.error(
            "rows of two trials alternate",
            path=note.shown,
            line=int(samples.lines[row]),
            found=_trial(samples, row),
            expected=f"{_trial(samples, int(begin[place]))}, as in the rows above and below",
            fix="sort the log by trial and time, or correct the column of the trial",
        )


def _trial(samples: SampleRows, row: int) -> str:
    """The trial of a row in words."""
    names = {name: coded.text(row) for name, coded in samples.ids.items()}
    return f"trial {names.get('trial', '')} of reader {names.get('participant', '')}"


def _tell_bare_trials(
    samples: SampleRows,
    run: NDArray[np.int64],
    run_of: NDArray[np.int64],
    note: LogNote,
    findings: Findings,
) -> None:
    """Warn of the recordings of trials in which no fixation is found."""
    begin = piece_bounds(run)[:-1]
    bare = np.ones(len(begin), dtype=bool)
    bare[run_of] = False
    note.counts["recordings of trials without a fixation"] = int(bare.sum())
    for row in begin[bare].tolist():
        findings.warning(
            "no fixation is found in the samples of a trial, which is therefore no part of the "
            "study",
            path=note.shown,
            line=int(samples.lines[row]),
            found=_trial(samples, row),
        )


def _tell_bare_readers(
    samples: SampleRows, first: NDArray[np.int64], note: LogNote, findings: Findings
) -> None:
    """Record readers of whom no fixation is found: most often a slip in a single row."""
    readers = samples.ids.get("participant")
    if readers is None:
        return
    for code in np.setdiff1d(readers.codes, readers.codes[first]).tolist():
        rows = np.flatnonzero(readers.codes == code)
        findings.error(
            "no fixation is found in the samples of a reader",
            path=note.shown,
            line=int(samples.lines[rows[0]]),
            found=f"{readers.values[code]}, {len(rows):,} sample{'' if len(rows) == 1 else 's'}",
            expected="a reader with fixations",
            fix="correct the reader's id; if nothing was recorded, leave the rows out by "
            "[logs.where], or remove the log",
        )


def _means(values: NDArray[np.float64], spans: Spans) -> NDArray[np.float64]:
    """Mean of each span; that of equal values is that value exactly."""
    first = values[spans.first]
    size = spans.last - spans.first + 1
    owner = np.repeat(np.arange(len(spans)), size)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(size) - size, size)
    beyond = values[spans.first[owner] + within] - first[owner]
    sums = np.add.reduceat(beyond, np.cumsum(size) - size)
    return np.asarray(np.round(first + sums / size, _MEAN_DIGITS))


def _touched(
    blink: NDArray[np.bool_],
    run: NDArray[np.int64],
    first: NDArray[np.int64],
    last: NDArray[np.int64],
) -> NDArray[np.bool_]:
    """Whether a blink touches each fixation; ``first`` and ``last`` are rows."""
    touched = np.zeros(len(first), dtype=bool)
    blinks = Spans.where(blink, run)
    if not len(blinks):
        return touched
    # The fixations in which a blink has samples are those from the first that ends in or after it
    # to the last that begins in or before it.
    begin = np.searchsorted(last, blinks.first)
    stop = np.searchsorted(first, blinks.last, side="right")
    between = begin >= stop
    change = np.zeros(len(first) + 1, dtype=np.int64)
    np.add.at(change, begin[~between], 1)
    np.add.at(change, stop[~between], -1)
    touched |= np.cumsum(change[:-1]) > 0
    own = run[blinks.first[between]]
    for neighbour in (begin[between] - 1, begin[between]):
        there = (neighbour >= 0) & (neighbour < len(first))
        there[there] = run[first[neighbour[there]]] == own[there]
        touched[neighbour[there]] = True
    return touched


def _recordings(
    samples: SampleRows, run: NDArray[np.int64], first: NDArray[np.int64]
) -> NDArray[np.int32]:
    """Which recording of a trial each fixation is of, where that must be said.

    Two recordings of a trial are known by what stands between them. Where no fixation was found in
    that, nothing stands between them any more.
    """
    if samples.recording is not None:
        return samples.recording[first]
    hidden = run[first[1:]] != run[first[:-1]]
    for coded in samples.ids.values():
        codes = coded.codes[first]
        hidden &= codes[1:] == codes[:-1]
    if hidden.any():
        return run[first].astype(np.int32)
    return np.full(len(first), -1, dtype=np.int32)
