"""How far the lines of trials can be trusted, and how that is counted."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

#: Where the classes begin into which the confidence of trials is counted; the last ends at 1.
CLASSES: Final = (0.0, 0.5, 0.8, 0.9, 0.95, 0.99)


@dataclass(frozen=True, slots=True, eq=False)
class LineTrust:
    """How far the lines of each trial can be trusted.

    Attributes
    ----------
    confidence : (trials,) float64 array
        Chance that the lines of the trial are right; NaN where none was told.
    sure : (trials,) bool array
        Whether that is enough.
    by_hand : (trials,) bool array
        Whether all lines of the trial were set by hand; its confidence is then 1.
    """

    confidence: NDArray[np.float64]
    sure: NDArray[np.bool_]
    by_hand: NDArray[np.bool_]

    def of(self, rows: NDArray[np.bool_] | slice) -> LineTrust:
        """Some of the trials."""
        return LineTrust(self.confidence[rows], self.sure[rows], self.by_hand[rows])

    @property
    def unsure(self) -> NDArray[np.bool_]:
        """(trials,) bool array: the trials that were judged and are not sure."""
        return np.isfinite(self.confidence) & ~self.sure


@dataclass(frozen=True, slots=True)
class LineTally:
    """Trials of several lines, counted by how far their lines can be trusted.

    Attributes
    ----------
    sure, unsure, by_hand : int
        Trials that are sure by the method, not sure, and set by hand.
    classes : tuple of int
        Trials not set by hand, by the class of :data:`CLASSES` their confidence is in.
    """

    sure: int = 0
    unsure: int = 0
    by_hand: int = 0
    classes: tuple[int, ...] = (0,) * len(CLASSES)

    @property
    def judged(self) -> int:
        """Trials of whose lines something is known."""
        return self.sure + self.unsure + self.by_hand

    def __add__(self, other: LineTally) -> LineTally:
        """Both together.

        Examples
        --------
        >>> both = LineTally(2, 1) + LineTally(1, 0, 1)
        >>> both.sure, both.unsure, both.by_hand, both.judged
        (3, 1, 1, 5)
        """
        return LineTally(
            self.sure + other.sure,
            self.unsure + other.unsure,
            self.by_hand + other.by_hand,
            tuple(a + b for a, b in zip(self.classes, other.classes, strict=True)),
        )


def tally(trust: LineTrust | None) -> LineTally:
    """Count trials.

    Parameters
    ----------
    trust : LineTrust or None
        None counts nothing.

    Returns
    -------
    LineTally

    Examples
    --------
    >>> flags = np.array([True, False, False])
    >>> counted = tally(LineTrust(np.array([0.97, 0.6, np.nan]), flags, flags & False))
    >>> counted.sure, counted.unsure, counted.classes
    (1, 1, (0, 1, 0, 0, 1, 0))
    """
    if trust is None:
        return LineTally()
    by_hand = np.isfinite(trust.confidence) & trust.by_hand
    told = np.isfinite(trust.confidence) & ~trust.by_hand
    place = np.searchsorted(CLASSES, trust.confidence[told], side="right") - 1
    return LineTally(
        int((told & trust.sure).sum()),
        int((told & ~trust.sure).sum()),
        int(by_hand.sum()),
        tuple(np.bincount(place, minlength=len(CLASSES)).tolist()),
    )
