"""What the methods of line assignment can be told, with the published defaults.

The defaults are those of Carr, Pescuma, Furlan, Ktori & Crepaldi (2022), Behavior Research Methods,
54, 287-310, doi:10.3758/s13428-021-01554-0, and of ``slice`` those of Glandorf & Schroeder (2021),
Procedia Computer Science, 192, doi:10.1016/j.procs.2021.09.069. They are pixels of screens with
lines 64 px apart: where lines are nearer to each other or farther apart, scale them.
``attach``, ``cluster``, ``segment``, ``split`` and ``warp`` have nothing to set.
"""

from __future__ import annotations

from dataclasses import dataclass, field

#: The least and the greatest value that a fit may take.
Bounds = tuple[float, float]


@dataclass(frozen=True, slots=True)
class ChainSettings:
    """What ends a chain of fixations.

    Attributes
    ----------
    x_px : float
        A step across of more than this ends a run.
    y_px : float
        A step up or down of more than this ends a run.
    """

    x_px: float = 192.0
    y_px: float = 32.0


@dataclass(frozen=True, slots=True)
class MergeSettings:
    """What ends a sequence, and which sequences may be on one line.

    Attributes
    ----------
    y_px : float
        A step up or down of more than this ends a sequence.
    slope : float
        A line through two merged sequences must be less steep than this, in px down per px across.
    error_px : float
        The root mean square distance from that line must be less than this.
    """

    y_px: float = 32.0
    slope: float = 0.1
    error_px: float = 20.0


@dataclass(frozen=True, slots=True)
class RegressSettings:
    """Within which bounds sloping lines are fitted.

    Attributes
    ----------
    slope : tuple of two floats
        Slope, in px down per px across.
    offset_px : tuple of two floats
        How far all lines lie below the text where lines begin.
    sd_px : tuple of two floats
        Standard deviation of fixations about their lines.
    """

    slope: Bounds = (-0.1, 0.1)
    offset_px: Bounds = (-50.0, 50.0)
    sd_px: Bounds = (1.0, 20.0)


@dataclass(frozen=True, slots=True)
class SliceSettings:
    """What ends a run, and which runs are on one line or on the next.

    Attributes
    ----------
    x_px : float
        A step across of more than this ends a run.
    y_px : float
        A step up or down of more than this ends a run.
    within_px : float
        A run less than this above or below a line is on that line (in the paper ``w``).
    next_px : float
        A run farther off, but less than this, is on the line next to it (in the paper ``n``).
    """

    x_px: float = 192.0
    y_px: float = 32.0
    within_px: float = 32.0
    next_px: float = 90.0


@dataclass(frozen=True, slots=True)
class StretchSettings:
    """Within which bounds positions are stretched and moved.

    Attributes
    ----------
    scale : tuple of two floats
        Factor by which distances from the first line are multiplied.
    offset_px : tuple of two floats
        How far all fixations are moved down after that.
    """

    scale: Bounds = (0.9, 1.1)
    offset_px: Bounds = (-50.0, 50.0)


@dataclass(frozen=True, slots=True)
class MethodSettings:
    """The settings of all methods that have any.

    Attributes
    ----------
    chain : ChainSettings
        For ``chain``.
    merge : MergeSettings
        For ``merge``.
    regress : RegressSettings
        For ``regress``.
    slice : SliceSettings
        For ``slice``.
    stretch : StretchSettings
        For ``stretch``.
    """

    chain: ChainSettings = field(default_factory=ChainSettings)
    merge: MergeSettings = field(default_factory=MergeSettings)
    regress: RegressSettings = field(default_factory=RegressSettings)
    slice: SliceSettings = field(default_factory=SliceSettings)
    stretch: StretchSettings = field(default_factory=StretchSettings)
