"""What coordinates say of the screen and of where the text stood: proposals, not more."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from etl.drafting.columns import Floats

#: Common sizes of screens in pixels (common practice, no source), the smaller ones first.
_SCREENS = (
    (800, 600),
    (1024, 768),
    (1280, 720),
    (1280, 800),
    (1280, 1024),
    (1366, 768),
    (1440, 900),
    (1600, 900),
    (1600, 1200),
    (1680, 1050),
    (1920, 1080),
    (1920, 1200),
    (2560, 1440),
    (2560, 1600),
    (3840, 2160),
)


@dataclass(frozen=True, slots=True)
class Extent:
    """Where nearly all fixations lie.

    Attributes
    ----------
    left, right, top, bottom : float
        The bounds of 99 of 100 fixations, in the log's own unit.
    """

    left: float
    right: float
    top: float
    bottom: float

    @classmethod
    def of(cls, x: Floats, y: Floats) -> Extent | None:
        """The bounds of positions; None where there is none."""
        x, y = x[~np.isnan(x)], y[~np.isnan(y)]
        if not len(x) or not len(y):
            return None
        bounds = (*np.quantile(x, (0.005, 0.995)), *np.quantile(y, (0.005, 0.995)))
        return cls(*(float(bound) for bound in bounds))

    @property
    def centred(self) -> bool:
        """Whether positions are counted from the middle: they lie on both sides of zero alike."""
        across = self.left < -0.25 * self.right and self.right > 0
        down = self.top < 0 < self.bottom or abs(self.top + self.bottom) < 0.2 * self.right
        return across and down

    def screens(self) -> list[tuple[int, int]]:
        """The smallest common screens that hold all of it, three at most.

        Examples
        --------
        >>> Extent(0.0, 1905.0, 480.0, 560.0).screens()
        [(1920, 1080), (1920, 1200), (2560, 1440)]
        >>> Extent(-900.0, 900.0, -40.0, 40.0).screens()[0]
        (1920, 1080)
        """
        if self.centred:
            right = 2 * max(-self.left, self.right)
            bottom = 2 * max(-self.top, self.bottom)
        else:
            right, bottom = self.right, self.bottom
        return [size for size in _SCREENS if size[0] >= right and size[1] >= bottom][:3]
