"""The samples that have a position, and spans of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from etl.parsers.time_checks import DIFFERENCE_DIGITS

#: A difference of times of neighbours above this many sampling intervals is a hole in the record:
#: at least one sample is missing, whatever the jitter of the clock (our choice).
HOLE_INTERVALS = 1.5


def piece_bounds(labels: NDArray[np.int64]) -> NDArray[np.int64]:
    """Where each piece of equal neighbours begins, and where the last one ends.

    Parameters
    ----------
    labels : (n,) int64 array
        At least 0.

    Returns
    -------
    (pieces + 1,) int64 array
        Of no labels, a single 0.

    Examples
    --------
    >>> piece_bounds(np.array([0, 0, 4, 5, 5])).tolist()
    [0, 2, 3, 5]
    """
    changes = np.flatnonzero(labels[1:] != labels[:-1]) + 1
    ends = [0, len(labels)] if len(labels) else [0]
    return np.concatenate([ends[:1], changes, ends[1:]]).astype(np.int64)


@dataclass(frozen=True, slots=True)
class Track:
    """The samples that have a position, of one recording of a trial after the other.

    Attributes
    ----------
    time_ms : (n,) float64 array, milliseconds
        Ascending within a run.
    x_px, y_px : (n,) float64 array, pixels
        Never NaN.
    run : (n,) int64 array
        Which recording of a trial; non-decreasing.
    stretch : (n,) int64 array
        Which unbroken stretch; non-decreasing. A stretch ends with its run, and at every hole
        that is longer than a fixation may last through.
    after_hole : (n,) bool array
        Whether a hole lies right before the sample that its stretch lasts through.
    interval_ms : float, milliseconds
        From one sample to the next.
    """

    time_ms: NDArray[np.float64]
    x_px: NDArray[np.float64]
    y_px: NDArray[np.float64]
    run: NDArray[np.int64]
    stretch: NDArray[np.int64]
    after_hole: NDArray[np.bool_]
    interval_ms: float

    def __len__(self) -> int:
        return len(self.time_ms)

    @classmethod
    def of(
        cls,
        time_ms: NDArray[np.float64],
        place_px: tuple[NDArray[np.float64], NDArray[np.float64]],
        run: NDArray[np.int64],
        interval_ms: float,
        longest_gap_ms: float = 0.0,
    ) -> tuple[Track, NDArray[np.int64]]:
        """Leave out the samples without a position and see where the record breaks.

        Parameters
        ----------
        time_ms : (samples,) float64 array, milliseconds
            When each sample was taken; ascending within a run.
        place_px : tuple of two (samples,) float64 arrays, pixels
            x and y; a sample of which one is NaN has no position.
        run : (samples,) int64 array
            Which recording of a trial; non-decreasing.
        interval_ms : float, milliseconds
            From one sample to the next.
        longest_gap_ms : float, milliseconds
            A hole that is no longer than this does not break a stretch. A hole is as long as the
            samples that are missing in it would have lasted, whether they stand in the log
            without a position or do not stand there at all.

        Returns
        -------
        track : Track
        row : (n,) int64 array
            Which of the samples each one on the track is.

        Examples
        --------
        >>> time_ms = np.array([0.0, 4.0, 8.0, 12.0, 20.0])
        >>> x_px = np.array([1.0, np.nan, 1.0, 1.0, 1.0])
        >>> run = np.zeros(5, dtype=np.int64)
        >>> track, row = Track.of(time_ms, (x_px, x_px), run, 4.0)
        >>> track.stretch.tolist(), row.tolist()
        ([0, 1, 1, 2], [0, 2, 3, 4])
        >>> Track.of(time_ms, (x_px, x_px), run, 4.0, 4.0)[0].stretch.tolist()
        [0, 0, 0, 0]
        """
        x_px, y_px = place_px
        row = np.flatnonzero(~(np.isnan(x_px) | np.isnan(y_px)))
        time, own = time_ms[row], run[row]
        breaks = np.zeros(len(row), dtype=bool)
        after_hole = np.zeros(len(row), dtype=bool)
        step = np.diff(time)
        same = own[1:] == own[:-1]
        hole = same & ((step > HOLE_INTERVALS * interval_ms) | (np.diff(row) > 1))
        short = np.round(step - interval_ms, DIFFERENCE_DIGITS) <= longest_gap_ms
        tolerated = short & (longest_gap_ms > 0)
        after_hole[1:] = hole & tolerated
        breaks[1:] = ~same | (hole & ~tolerated)
        stretch = np.cumsum(breaks)
        return cls(time, x_px[row], y_px[row], own, stretch, after_hole, interval_ms), row

    def lasting_ms(self, first: NDArray[np.int64], last: NDArray[np.int64]) -> NDArray[np.float64]:
        """How long spans of samples last: each sample stands for one sampling interval.

        Parameters
        ----------
        first, last : (spans,) int64 array
            The first and the last sample of each span.

        Returns
        -------
        (spans,) float64 array, milliseconds
            From the first sample to the last and one sampling interval more, to the microsecond.
        """
        lasting = self.time_ms[last] - self.time_ms[first] + self.interval_ms
        return np.asarray(np.round(lasting, DIFFERENCE_DIGITS))


@dataclass(frozen=True, slots=True)
class Spans:
    """Spans of neighbouring samples on a track.

    Attributes
    ----------
    first, last : (spans,) int64 array
        The first and the last sample of each, in time order; spans do not overlap.
    """

    first: NDArray[np.int64]
    last: NDArray[np.int64]

    def __len__(self) -> int:
        return len(self.first)

    @classmethod
    def where(cls, mask: NDArray[np.bool_], stretch: NDArray[np.int64]) -> Spans:
        """The longest spans of samples for which something holds, none beyond its stretch.

        Parameters
        ----------
        mask : (n,) bool array
            Whether it holds.
        stretch : (n,) int64 array
            Which unbroken stretch each sample is in.

        Returns
        -------
        Spans

        Examples
        --------
        >>> holds = np.array([True, True, False, True, True])
        >>> spans = Spans.where(holds, np.array([0, 0, 0, 0, 1]))
        >>> spans.first.tolist(), spans.last.tolist()
        ([0, 3, 4], [1, 3, 4])
        """
        joined = mask[1:] & mask[:-1] & (stretch[1:] == stretch[:-1])
        edge = np.ones(1, dtype=bool)
        first = np.flatnonzero(mask & np.concatenate([edge, ~joined])[: len(mask)])
        last = np.flatnonzero(mask & np.concatenate([~joined, edge])[: len(mask)])
        return cls(first, last)

    def of_length(self, track: Track, shortest_ms: float) -> Spans:
        """Those that last at least so long.

        Parameters
        ----------
        track : Track
            The samples.
        shortest_ms : float, milliseconds
            The shortest that is kept.

        Returns
        -------
        Spans
        """
        kept = track.lasting_ms(self.first, self.last) >= shortest_ms
        return Spans(self.first[kept], self.last[kept])

    def inside(self, length: int) -> NDArray[np.bool_]:
        """Whether each of so many samples is in a span.

        Parameters
        ----------
        length : int
            How many samples there are.

        Returns
        -------
        (length,) bool array
        """
        change = np.zeros(length + 1, dtype=np.int64)
        change[self.first] += 1
        change[self.last + 1] -= 1
        return np.cumsum(change[:-1]) > 0
