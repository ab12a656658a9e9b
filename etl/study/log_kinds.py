"""Tables of ``[logs]`` for logs of lines, of the open standard, of two eyes, and of samples."""

from __future__ import annotations

import re
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, ConfigDict, Field

from etl.study.columns import PlaceColumn, PlainColumn, TimeColumn
from etl.study.values import CellText, CellTexts, Name, Number, Table, refusal


def _listed(value: Any) -> Any:
    """A pattern alone as a list of one."""
    return (value,) if isinstance(value, str) else value


def _sound(pattern: str) -> str:
    """Refuse a pattern that is no regular expression."""
    try:
        re.compile(pattern)
    except (re.error, RecursionError, OverflowError) as error:
        raise refusal(
            f"this is no regular expression: {error}",
            expected="a regular expression with named groups",
            fix=r"""write for example fixation = '^fix (?P<onset>\d+) (?P<duration>\d+)'""",
        ) from None
    return pattern


LinePattern = Annotated[str, Field(min_length=1), AfterValidator(_sound)]
LinePatternList = Annotated[
    tuple[LinePattern, ...],
    BeforeValidator(_listed),
    Field(json_schema_extra={"anyOf": [{"type": "string"}, {"type": "array"}]}),
]


class LinePatterns(Table):
    """What the lines of a log of events say: patterns that are searched in each line."""

    model_config = ConfigDict(title="[logs.patterns]")

    trial_start: LinePatternList = Field(
        default=(),
        description="A trial starts: a regular expression that is searched in each line, or a "
        "list of them. Its named groups say what is known: participant, session, trial, item, and "
        "facts by any other name.",
        examples=[[r"^trial (?P<trial>\d+) begins, text (?P<item>\S+)$"]],
    )
    trial_end: LinePatternList = Field(
        default=(),
        description="A trial ends. Named groups are facts of the trial that ends.",
        examples=[["^trial ends$"]],
    )
    fixation: LinePatternList = Field(
        default=(),
        description="A fixation is over. Its named groups are onset, end or duration, x, y, and "
        "where the line has them fixation, label, eye and blink.",
        examples=[[r"^fixated (?P<onset>\d+) (?P<end>\d+) at (?P<x>[0-9.]+) (?P<y>[0-9.]+)$"]],
    )
    blink: LinePatternList = Field(
        default=(),
        description="A blink. It touches the fixations that it overlaps; where it has groups "
        "onset and end (or duration) that lie between two fixations of a trial, and where it has "
        "none, it touches the fixation before and the one after it. A group eye says whose.",
        examples=[[r"^blink (?P<onset>\d+) (?P<end>\d+)$"]],
    )
    facts: LinePatternList = Field(
        default=(),
        description="A line that tells of the trial under way or, before the first trial, of the "
        "whole log. Its named groups are facts, or participant, session, trial, item.",
        examples=[[r"^reader: (?P<participant>\S+)$", r"^cue = (?P<cue>\w+)$"]],
    )
    ignore: LinePatternList = Field(
        default=(),
        description="Lines that mean nothing here. They are counted.",
        examples=[["^calibration", "^sample "]],
    )
    other: Literal["error", "ignore"] = Field(
        default="error",
        description="What to do with lines that no pattern fits: stop, or count them.",
    )
    unfinished: Literal["error", "keep"] = Field(
        default="error",
        description="What to do with a trial that starts and does not end, where trial_end is "
        "given: stop, or keep its fixations. One that starts again is a second recording.",
    )

    def every(self) -> dict[str, tuple[str, ...]]:
        """The patterns by what their lines say, in the order in which they are tried."""
        names = ("fixation", "blink", "trial_start", "trial_end", "facts", "ignore")
        return {name: getattr(self, name) for name in names}


class EyeColumns(Table):
    """The columns of one eye, where a row holds both."""

    model_config = ConfigDict(title="[logs.eye.columns]")

    onset: TimeColumn | None = Field(default=None, description="As in [logs.columns].")
    duration: TimeColumn | None = Field(default=None, description="As in [logs.columns].")
    end: TimeColumn | None = Field(default=None, description="As in [logs.columns].")
    x: PlaceColumn | None = Field(default=None, description="As in [logs.columns].")
    y: PlaceColumn | None = Field(default=None, description="As in [logs.columns].")
    label: PlainColumn | None = Field(default=None, description="As in [logs.columns].")
    blink: PlainColumn | None = Field(default=None, description="As in [logs.columns].")


class Eye(Table):
    """Which eye counts, where both were recorded."""

    model_config = ConfigDict(title="[logs.eye]")

    use: CellText | None = Field(
        default=None,
        description="The eye that counts, as the logs spell it, for every reader of whom nothing "
        "else is said.",
        examples=["R"],
    )
    column: Name | None = Field(
        default=None,
        description="The column of the reader table ([participants]) that says which eye counts.",
        examples=["better_eye"],
    )
    readers: dict[Name, CellText] = Field(
        default={},
        description="The eye that counts for single readers; goes before column and use.",
        examples=[{"P02": "L"}],
    )
    columns: dict[Name, EyeColumns] = Field(
        default={},
        description="The columns of each eye, where a row holds both eyes. Without it each row "
        "is of one eye, which the column eye of [logs.columns] names.",
        examples=[{"L": {"x": "left_x"}, "R": {"x": "right_x"}}],
    )


class Samples(Table):
    """How fixations are found, where the log holds gaze samples."""

    model_config = ConfigDict(title="[logs.samples]")

    method: Literal["engbert_kliegl", "dispersion"] = Field(
        description="How fixations are found: between saccades that the velocity shows (Engbert & "
        "Kliegl 2003), or by the dispersion of neighbouring samples (I-DT of Salvucci & Goldberg "
        "2000).",
        examples=["engbert_kliegl"],
    )
    threshold_factor: Number = Field(
        default=6.0,
        gt=0,
        description="engbert_kliegl: a saccade is faster than this many median-based standard "
        "deviations of the velocity.",
    )
    shortest_saccade_ms: Number = Field(
        default=12.0, gt=0, description="engbert_kliegl: a saccade lasts at least this long."
    )
    dispersion_px: Number | None = Field(
        default=None,
        gt=0,
        description="dispersion: the extent in x and the extent in y of a fixation add up to at "
        "most this many pixels.",
        examples=[40],
    )
    dispersion_deg: Number | None = Field(
        default=None,
        gt=0,
        description="dispersion: the same in degrees of visual angle, at the middle of the screen.",
        examples=[1.0],
    )
    shortest_fixation_ms: Number = Field(
        default=50.0,
        ge=0,
        description="What is shorter is no fixation. 100 is the paper's own for dispersion.",
    )
    longest_gap_ms: Number = Field(
        default=0.0,
        ge=0,
        description="Samples without a position for no longer than this do not end a fixation.",
    )
    frequency_hz: Number | None = Field(
        default=None,
        gt=0,
        description="Samples a second. Found out from the times of the samples when absent.",
        examples=[1000],
    )


class Bids(Table):
    """How recordings of the Brain Imaging Data Structure are read."""

    model_config = ConfigDict(title="[logs.bids]")

    fixation: CellTexts = Field(
        default=("fixation",),
        description="The trial_type of a fixation in the events of the recording.",
    )
    blink: CellTexts = Field(
        default=("blink",),
        description="The trial_type of a blink, where blinks have rows of their own.",
    )
    trials: dict[Name, CellTexts] = Field(
        default={},
        description="Which rows of the events of the task are trials: a column and the values of "
        "which a row must have one. All rows when absent.",
        examples=[{"trial_type": ["reading"]}],
    )
    duration_unit: Literal["ms", "s", "us"] | None = Field(
        default=None,
        description="The unit of the durations of fixations, where the sidecar does not say it.",
    )
    onset_unit: Literal["ms", "s", "us"] | None = Field(
        default=None,
        description="The unit of the recording's time stamps, where the sidecar does not say it.",
    )
