"""What readers are compared by: each measure with its source and how it is computed."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import partial

from etl.report.reader_profile import ReaderNumbers
from etl.report.wording import number, percent

RAYNER = "Rayner 1998, doi:10.1037/0033-2909.124.3.372"


@dataclass(frozen=True, slots=True)
class Reader:
    """A reader with the account of trials.

    Attributes
    ----------
    numbers : ReaderNumbers
        From the worker.
    read, kept : int
        Trials of the study.
    left_out : str
        The rule on readers that left this one out; empty where none did.
    """

    numbers: ReaderNumbers
    read: int
    kept: int
    left_out: str


@dataclass(frozen=True, slots=True)
class Measure:
    """Something that readers are compared by.

    Attributes
    ----------
    key : str
        Its name in the page.
    title : str
        In a few words.
    how : str
        What it is computed from, in a sentence.
    value : callable
        From a reader; None where there is none.
    shown : callable
        A value in words.
    unit : str
        Of the axis.
    factor : float
        Turns a value into one on the axis.
    negative : bool
        Whether values below 0 make sense.
    published : tuple of float or None
        A published range, on the axis.
    remark : str
        What to bear in mind.
    """

    key: str
    title: str
    how: str
    value: Callable[[Reader], float | None]
    shown: Callable[[float | None], str]
    unit: str
    factor: float = 1.0
    negative: bool = False
    published: tuple[float, float] | None = None
    remark: str = ""


def _share(part: int, whole: int) -> float | None:
    """A share, where there is a whole."""
    return part / whole if whole else None


def _ms(value: float | None) -> str:
    """Milliseconds."""
    return number(value, 1, "ms")


_px = partial(number, digits=1, unit="px", signed=True)

MEASURES = (
    Measure(
        "duration",
        "Mean fixation duration",
        "All kept fixations of a reader, inside regions and outside.",
        lambda r: r.numbers.durations.mean_ms if r.numbers.durations else None,
        _ms,
        " ms",
        published=(200, 250),
    ),
    Measure(
        "spread",
        "Spread of fixation durations",
        "Standard deviation of the same fixations.",
        lambda r: r.numbers.durations.spread_ms if r.numbers.durations else None,
        _ms,
        " ms",
    ),
    Measure(
        "regressions",
        "Regressions",
        "Of the saccades from one region to another, the share that goes back to an earlier one.",
        lambda r: _share(r.numbers.back, r.numbers.back + r.numbers.forward),
        percent,
        "%",
        100,
        published=(10, 15),
        remark="The published range is for all saccades, also those within a region; where regions "
        "are longer than a word the two are not the same.",
    ),
    Measure(
        "skips",
        "Skips",
        "Of all values of first_pass_skip, the share that is 1.",
        lambda r: _share(r.numbers.skips, r.numbers.skip_chances),
        percent,
        "%",
        100,
        remark="No published range is drawn: it depends on how long the regions are.",
    ),
    Measure(
        "outside",
        "Outside every region",
        "Of a reader’s kept fixations, the share that lies in no region.",
        lambda r: _share(r.numbers.outside, r.numbers.fixations),
        percent,
        "%",
        100,
    ),
    Measure(
        "height",
        "Height on the line",
        "Median distance of fixations below the middle of their line, or of the nearest one where "
        "they are on none; negative is above.",
        lambda r: r.numbers.offset_px,
        _px,
        " px",
        negative=True,
    ),
    Measure(
        "drift",
        "Drift in the session",
        "How far down that distance moves from the first third of a reader’s kept trials to the "
        "last, medians of both; negative is up.",
        lambda r: r.numbers.drift_px,
        _px,
        " px",
        negative=True,
    ),
    Measure(
        "lost",
        "Trials lost",
        "Of the trials of the study that a reader read, the share that rules left out; readers who "
        "were left out themselves are not compared.",
        lambda r: None if r.left_out else _share(r.read - r.kept, r.read),
        percent,
        "%",
        100,
    ),
)

#: Compared only where some text has several lines and a method says how sure it is.
LINES = Measure(
    "lines",
    "Lines not sure",
    "Of a reader’s trials of several lines, the share whose lines are not sure.",
    lambda r: _share(r.numbers.lines.unsure, r.numbers.lines.judged),
    percent,
    "%",
    100,
)


def measures_of(readers: Iterable[ReaderNumbers]) -> tuple[Measure, ...]:
    """What the readers of a study are compared by.

    Parameters
    ----------
    readers : iterable of ReaderNumbers
        All of them.

    Returns
    -------
    tuple of Measure
        With the lines where anything is known of them.
    """
    return (*MEASURES, LINES) if any(reader.lines.judged for reader in readers) else MEASURES
