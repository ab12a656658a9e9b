"""Gaze samples of the open standard (BIDS): their clock, and where the eye was in a fixation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.errors import Findings
from etl.parsers.bids_sidecars import TIME_UNITS, Sidecar
from etl.parsers.bids_tables import Headerless
from etl.parsers.time_checks import in_ms

Floats = NDArray[np.float64]

#: Columns that a recording of the eyes must have (BIDS 1.11 schema,
#: ``rules.tabular_data.physio.PhysioEyeTracking``).
RECORDING_COLUMNS = ("timestamp", "x_coordinate", "y_coordinate")
#: How far the step of the time stamps may be from the sampling frequency: a wrong unit is off by
#: a factor of 1000, time stamps rounded to whole ms by less than 3, a recorder's own drift by far
#: less (our choice).
_FARTHEST_FACTOR = 10.0
#: How near a step must be to a unit to be taken for it: the square root of the factor that lies
#: between two units.
_UNIT_FACTOR = 1000.0**0.5
#: Digits of a time in ms, and of a position in px, that are kept: dust of binary fractions goes.
DIGITS = 6


@dataclass(frozen=True, slots=True)
class SampleClock:
    """When the samples of a recording were taken.

    Attributes
    ----------
    time_ms : (n,) float64 array, milliseconds
        In the recording's own clock; never goes back.
    unit : {"s", "ms", "us"}
        The unit of the recording's time stamps.
    """

    time_ms: Floats
    unit: str

    @property
    def step_ms(self) -> float:
        """The usual time from a sample to the next; 0 where there is one sample only."""
        return typical_step(self.time_ms)

    def holds(self, onset_ms: Floats) -> NDArray[np.bool_]:
        """Whether times lie in the recording, a sample more or less."""
        first, last = self.time_ms[0] - self.step_ms, self.time_ms[-1] + self.step_ms
        return np.asarray((onset_ms >= first) & (onset_ms <= last))


def typical_step(times: Floats) -> float:
    """The usual step of times that never go back: the median, or where that is 0 the mean.

    Parameters
    ----------
    times : (n,) float64 array
        In any unit.

    Returns
    -------
    float
        In that unit; 0.0 for fewer than two times.

    Examples
    --------
    >>> typical_step(np.array([0.0, 2.0, 4.0, 90.0]))
    2.0
    """
    if len(times) < 2:
        return 0.0
    steps = np.diff(times)
    return float(np.median(steps)) or float(steps.mean())


def read_clock(
    stamps: Floats,
    table: Headerless,
    sidecar: Sidecar,
    stated: str | None,
    frequency_hz: float,
    findings: Findings,
) -> SampleClock | None:
    """The clock of a recording, from its time stamps.

    Parameters
    ----------
    stamps : (n,) float64 array
        The column ``timestamp``; NaN where missing.
    table : Headerless
        The recording.
    sidecar : Sidecar
        What is said of it.
    stated : {"s", "ms", "us"} or None
        The unit that the study states, where the sidecar is silent.
    frequency_hz : float
        Samples a second.
    findings : Findings
        Where stamps that are missing or go back, and a unit that contradicts the sampling
        frequency, are recorded.

    Returns
    -------
    SampleClock or None
        None where a problem was recorded. Where neither sidecar nor study says the unit, it is
        the one by which the step of the stamps is that of the sampling frequency.
    """
    shown = table.text.shown
    absent = np.flatnonzero(np.isnan(stamps))
    back = np.flatnonzero(np.diff(stamps) < 0) + 1
    for rows, problem, expected in (
        (absent, "the sample has no time stamp", "a number"),
        (back, "the time stamp is before the one above it", "time stamps that never go back"),
    ):
        for row in rows.tolist():
            findings.error(
                problem,
                path=shown,
                line=row + 1,
                where='column "timestamp"',
                found=None if np.isnan(stamps[row]) else _spelled(stamps[row]),
                expected=expected,
                fix="repair the recording, or copy it again",
            )
    before = findings.count("error")
    said = sidecar.unit("timestamp", TIME_UNITS, findings)
    if absent.size or back.size or findings.count("error") > before:
        return None
    steps = {unit: float(in_ms(np.array([typical_step(stamps)]), unit)[0]) for unit in _UNITS}
    ratio = {unit: step * frequency_hz / 1000 for unit, step in steps.items()}
    unit = said or stated or next((u for u in _UNITS if _near(ratio[u], _UNIT_FACTOR)), None)
    if unit is None or (len(stamps) > 1 and not _near(ratio[unit], _FARTHEST_FACTOR)):
        path, line = sidecar.place("timestamp")
        findings.error(
            "the time stamps do not go with the sampling frequency",
            path=path,
            line=line,
            where="timestamp.Units",
            found=f"steps of {typical_step(stamps):g} {unit or 'in no unit that is said'}",
            expected=f"steps of {1000 / frequency_hz:g} ms, at {frequency_hz:g} samples a second",
            fix='give the unit of the time stamps, "timestamp": {"Units": "…"}, or correct '
            "SamplingFrequency",
        )
        return None
    return SampleClock(in_ms(stamps, unit), unit)


_UNITS = ("ms", "s", "us")


def _near(ratio: float, factor: float) -> bool:
    """Whether a ratio is 1, give or take a factor."""
    return 1 / factor < ratio < factor


def _spelled(number: float) -> str:
    """A number with all its digits."""
    return np.format_float_positional(number, trim="-")


def mean_positions(
    time_ms: Floats, x: Floats, y: Floats, onset_ms: Floats, end_ms: Floats
) -> tuple[Floats, Floats]:
    """Where the eye was in each fixation: the mean of its samples.

    Parameters
    ----------
    time_ms : (n,) float64 array, milliseconds
        When each sample was taken; never goes back.
    x, y : (n,) float64 array
        Where the eye was; a sample without x or without y counts for neither.
    onset_ms, end_ms : (m,) float64 array, milliseconds
        When each fixation began and ended. The sample at its onset belongs to it, the one at its
        end does not: that one may be the first of what follows.

    Returns
    -------
    x, y : (m,) float64 array
        In the unit of the samples, rounded to a millionth; NaN where no sample has a position.

    Examples
    --------
    >>> time_ms = np.array([0.0, 2.0, 4.0, 6.0])
    >>> x, y = np.array([10.0, 20.0, np.nan, 90.0]), np.array([5.0, 7.0, 6.0, 9.0])
    >>> mean_positions(time_ms, x, y, np.array([0.0, 4.0]), np.array([6.0, 6.0]))
    (array([15., nan]), array([ 6., nan]))
    """
    first = np.searchsorted(time_ms, onset_ms, "left")
    beyond = np.searchsorted(time_ms, end_ms, "left")
    known = ~(np.isnan(x) | np.isnan(y))
    # Sums from each bound to the next; every second one is of what lies between two fixations.
    bounds = np.column_stack([first, beyond]).ravel()
    filled = beyond > first

    def sums(values: Floats) -> Floats:
        padded = np.append(np.where(known, values, 0.0), 0.0)
        return np.where(filled, np.add.reduceat(padded, bounds)[::2], 0.0)

    count = sums(np.ones(len(x)))
    count[count == 0] = np.nan
    return np.round(sums(x) / count, DIGITS), np.round(sums(y) / count, DIGITS)
