"""The table ``[lines]``: which line of a text a fixation belongs to.

The methods are published under these names by Carr, Pescuma, Furlan, Ktori & Crepaldi (2022),
doi:10.3758/s13428-021-01554-0, and ``slice`` by Glandorf & Schroeder (2021),
doi:10.1016/j.procs.2021.09.069; so are the values that hold where nothing is stated.
"""

from __future__ import annotations

from typing import Annotated, Final, Literal

from pydantic import AfterValidator, ConfigDict, Field

from etl.study.values import FileName, Number, Table, refusal

LineMethod = Literal[
    "consensus",
    "attach",
    "chain",
    "cluster",
    "merge",
    "regress",
    "segment",
    "slice",
    "split",
    "stretch",
    "warp",
    "nearest",
    "none",
]

#: The methods that have something to set, each in a table of its own name.
WITH_SETTINGS: Final = ("chain", "merge", "regress", "slice", "stretch")


def _from_low_to_high(bounds: tuple[float, float]) -> tuple[float, float]:
    """Refuse bounds between which nothing lies."""
    if bounds[0] >= bounds[1]:
        raise refusal(
            "nothing lies between these bounds",
            expected="the lower bound, then the upper one",
            fix="correct the two numbers",
        )
    return bounds


def _above_zero(bounds: tuple[float, float]) -> tuple[float, float]:
    """Refuse bounds that reach down to 0."""
    if bounds[0] <= 0:
        raise refusal(
            "the lower bound is not above 0",
            expected="two numbers above 0",
            fix="correct the lower bound",
        )
    return bounds


Bounds = Annotated[tuple[Number, Number], AfterValidator(_from_low_to_high)]
BoundsAboveZero = Annotated[Bounds, AfterValidator(_above_zero)]

_ACROSS = "A step across of more than this ends a run of fixations on one line, in pixels."
_UP_OR_DOWN = "A step up or down of more than this ends such a run, in pixels."


class Chain(Table):
    """What ends a chain of fixations."""

    model_config = ConfigDict(title="[lines.chain]")

    x_px: Number = Field(default=192.0, gt=0, description=_ACROSS, examples=[192])
    y_px: Number = Field(default=32.0, gt=0, description=_UP_OR_DOWN, examples=[32])


class MergeSequences(Table):
    """What ends a sequence of fixations, and which sequences may be on one line."""

    model_config = ConfigDict(title="[lines.merge]")

    y_px: Number = Field(default=32.0, gt=0, description=_UP_OR_DOWN, examples=[32])
    slope: Number = Field(
        default=0.1,
        gt=0,
        description="A line through two merged sequences must be less steep than this, in pixels "
        "down per pixel across.",
        examples=[0.1],
    )
    error_px: Number = Field(
        default=20.0,
        gt=0,
        description="The root mean square distance from that line must be less than this, in "
        "pixels.",
        examples=[20],
    )


class Regress(Table):
    """Within which bounds sloping lines are fitted."""

    model_config = ConfigDict(title="[lines.regress]")

    slope: Bounds = Field(
        default=(-0.1, 0.1),
        description="Least and greatest slope of the lines, in pixels down per pixel across.",
        examples=[[-0.1, 0.1]],
    )
    offset_px: Bounds = Field(
        default=(-50.0, 50.0),
        description="How far at least and at most they lie below the text, in pixels.",
        examples=[[-50, 50]],
    )
    sd_px: BoundsAboveZero = Field(
        default=(1.0, 20.0),
        description="Least and greatest standard deviation of fixations about their lines, in "
        "pixels.",
        examples=[[1, 20]],
    )


class Slice(Table):
    """What ends a run of fixations, and which runs are on one line or on the next."""

    model_config = ConfigDict(title="[lines.slice]")

    x_px: Number = Field(default=192.0, gt=0, description=_ACROSS, examples=[192])
    y_px: Number = Field(default=32.0, gt=0, description=_UP_OR_DOWN, examples=[32])
    within_px: Number = Field(
        default=32.0,
        gt=0,
        description="A run less than this above or below a line is on that line, in pixels.",
        examples=[32],
    )
    next_px: Number = Field(
        default=90.0,
        gt=0,
        description="A run farther off, but less than this, is on the line next to it, in pixels.",
        examples=[90],
    )


class Stretch(Table):
    """Within which bounds fixations are stretched and moved."""

    model_config = ConfigDict(title="[lines.stretch]")

    scale: BoundsAboveZero = Field(
        default=(0.9, 1.1),
        description="By how much at least and at most distances from the first line are "
        "multiplied.",
        examples=[[0.9, 1.1]],
    )
    offset_px: Bounds = Field(
        default=(-50.0, 50.0),
        description="How far at least and at most fixations are moved down after that, in pixels.",
        examples=[[-50, 50]],
    )


class Lines(Table):
    """Which line of a text a fixation belongs to."""

    model_config = ConfigDict(title="[lines]")

    method: LineMethod = Field(
        default="consensus",
        description='How it is told: by all published methods together ("consensus"), by a single '
        'one of them, by the line whose middle is nearest ("nearest"), or by the region in which '
        'the fixation lies ("none"; for boxes and polygons). Texts of several lines are read by '
        "consensus also where the study file says nothing.",
        examples=["consensus"],
    )
    corrections: FileName | None = Field(
        default=None,
        description="Lines set by hand: a table (CSV, TSV or .xlsx, its sheet after a #), relative "
        "to the study file, with the columns participant, trial, fixation and line, and session "
        "where readers came more than once. Line 0 is no line.",
        examples=["line_corrections.csv"],
    )
    chain: Chain = Field(
        default=Chain(), description="Settings of the method chain, for lines 64 px apart."
    )
    merge: MergeSequences = Field(
        default=MergeSequences(), description="Settings of the method merge, for lines 64 px apart."
    )
    regress: Regress = Field(
        default=Regress(), description="Settings of the method regress, for lines 64 px apart."
    )
    slice: Slice = Field(
        default=Slice(), description="Settings of the method slice, for lines 64 px apart."
    )
    stretch: Stretch = Field(
        default=Stretch(), description="Settings of the method stretch, for lines 64 px apart."
    )
