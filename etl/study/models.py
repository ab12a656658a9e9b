"""The study file: one class per TOML table, keys in the order of the file.

What a key means stands in its description, which is also what an editor shows (JSON Schema) and
what the key reference prints. Rules that look at several keys are in :mod:`etl.study.rules`: they
are run even where some other key is wrong, so that one run lists every problem.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AfterValidator, ConfigDict, Field

from etl.study.columns import Column, PlaceColumn, PlainColumn, TimeColumn
from etl.study.contrasts import Contrast
from etl.study.lines import Lines
from etl.study.log_kinds import Bids, Eye, EyeColumns, LinePatterns, Samples
from etl.study.logs import Columns, Logs
from etl.study.screening import (
    FixationRules,
    Merge,
    ParticipantRules,
    Screening,
    TrialRules,
    ValueRules,
)
from etl.study.values import (
    CellTexts,
    FileName,
    Name,
    Names,
    Number,
    Switch,
    Table,
    WholeNumber,
    no_repeats,
)

__all__ = [
    "Bids",
    "Column",
    "Columns",
    "Eye",
    "EyeColumns",
    "Facts",
    "FixationRules",
    "Items",
    "Layout",
    "LinePatterns",
    "Lines",
    "Logs",
    "Measures",
    "Merge",
    "Output",
    "ParticipantRules",
    "Participants",
    "PlaceColumn",
    "PlainColumn",
    "Regions",
    "Samples",
    "Screen",
    "Screening",
    "StudyFile",
    "TimeColumn",
    "TrialRules",
    "Trials",
    "ValueRules",
]

#: No screen is larger; a bigger number is a slip in the unit.
MOST_PX = 100_000
MOST_CM = 10_000


class Facts(Table):
    """A table of facts that is joined to the trials."""

    table: FileName = Field(
        description="The file of facts (CSV, TSV or .xlsx, its sheet after a #), relative to the "
        "study file.",
        examples=["participants.csv"],
    )


class Participants(Facts):
    """Facts about readers, joined on participant."""

    model_config = ConfigDict(title="[participants]")


class Items(Facts):
    """Facts about texts, joined on item."""

    model_config = ConfigDict(title="[items]")


class Trials(Table):
    """Facts about trials, the design, and which trials belong to the study."""

    model_config = ConfigDict(title="[trials]")

    table: FileName | None = Field(
        default=None,
        description="The trial list (CSV, TSV or .xlsx, its sheet after a #), relative to the "
        "study file. Without it the facts are columns of the log.",
        examples=["trial_list.csv"],
    )
    keys: Names = Field(
        default=("participant", "trial"),
        min_length=1,
        description="The columns by which the trial list is joined to the logs.",
        examples=[["participant", "trial"]],
    )
    factors: Names = Field(
        default=(),
        description="The experimental factors: columns of any table of facts, of the log or of "
        "the region file.",
        examples=[["cue", "fit"]],
    )
    covariates: Names = Field(
        default=(),
        description="Facts that are carried along and are not part of the design.",
        examples=[["age"]],
    )
    levels: dict[Name, CellTexts] = Field(
        default={},
        description="The order of a factor's levels; the first is the reference.",
        examples=[{"cue": ["early", "late"]}],
    )
    repeated: Literal["error", "first", "last"] = Field(
        default="error",
        description="What to do with a trial that was recorded twice: stop, or take the first or "
        "the last recording.",
    )
    answer_correct: Name | None = Field(
        default=None,
        description="The column that says whether the reader's answer was correct.",
        examples=["answer_ok"],
    )
    onset: Name | None = Field(
        default=None,
        description="The column that says when the text came up, in log time.",
        examples=["t_text_on"],
    )
    offset: Name | None = Field(
        default=None,
        description="The column that says when the text went away, in log time.",
        examples=["t_text_off"],
    )
    skip: dict[Name, CellTexts] = Field(
        default={},
        description="Trials that are not part of the study: a column and the values that mark "
        "such trials. They are counted, and not screened.",
        examples=[{"block": ["practice"]}],
    )


class Screen(Table):
    """The screen. Needed for positions in degrees, off-screen rules and pictures."""

    model_config = ConfigDict(title="[screen]")

    width_px: WholeNumber = Field(gt=0, le=MOST_PX, description="Width in pixels.", examples=[1920])
    height_px: WholeNumber = Field(
        gt=0, le=MOST_PX, description="Height in pixels.", examples=[1080]
    )
    width_cm: Number | None = Field(
        default=None,
        gt=0,
        le=MOST_CM,
        description="Width in centimetres. Needed for positions in degrees.",
        examples=[53.0],
    )
    distance_cm: Number | None = Field(
        default=None,
        gt=0,
        le=MOST_CM,
        description="From the reader's eye to the screen, in centimetres. Needed for positions in "
        "degrees.",
        examples=[65.0],
    )
    y_axis: Literal["down", "up"] = Field(
        default="down",
        description='Which way y grows in the log. "up" with an origin at the bottom left, '
        '"down" with one at the top left, either with the centre.',
    )
    origin: Literal["top-left", "bottom-left", "centre"] = Field(
        default="top-left",
        description="Where the log's positions are counted from. Positions in degrees are always "
        'counted from the middle of the screen, so with them absent means "centre".',
    )


class Layout(Table):
    """Where the text stood on the screen, for regions given by the text itself."""

    model_config = ConfigDict(title="[regions.layout]")

    left_px: Number = Field(
        description="Left edge of the first character, in pixels from the left of the screen.",
        examples=[200],
    )
    top_px: Number = Field(
        description="Top of the first line's box, in pixels from the top of the screen.",
        examples=[500],
    )
    character_width_px: Number = Field(
        gt=0, description="Width of every character, in pixels.", examples=[14]
    )
    line_height_px: Number = Field(
        gt=0, description="From the top of a line to the top of the next, in pixels.", examples=[60]
    )
    space: Literal["following", "preceding"] = Field(
        default="following",
        description="Which word a space belongs to: the one that follows it or the one before.",
    )
    direction: Literal["ltr", "rtl"] = Field(
        default="ltr", description="The direction of reading: left to right, or right to left."
    )


class Regions(Table):
    """The regions of the texts, and how a fixation finds its region."""

    model_config = ConfigDict(title="[regions]")

    file: FileName = Field(
        description="The region definitions (CSV, TSV or .xlsx, its sheet after a #), relative to "
        "the study file.",
        examples=["regions.csv"],
    )
    kind: Literal["marked_text", "words", "boxes", "wkt", "labels"] = Field(
        description="How regions are defined: marked in the text, every word, boxes in px, "
        "polygons in Well-Known Text, or the labels that the log carries.",
        examples=["marked_text"],
    )
    vertical: Literal["box", "any"] = Field(
        default="box",
        description='Whether y matters: "box" for yes; with "any" only x decides (texts of one '
        "line).",
    )
    tolerance_px: Number = Field(
        default=0.0,
        ge=0,
        description="A fixation outside all regions but this close to one is taken to the "
        "nearest, in pixels.",
        examples=[20],
    )
    overlap: Literal["error", "first", "nearest"] = Field(
        default="error",
        description="What to do where regions overlap: stop, take the first in reading order, or "
        "the one whose middle is nearest.",
    )
    layout: Layout | None = Field(
        default=None,
        description='Where the text stood on the screen; for the kinds "marked_text" and "words".',
    )


class Measures(Table):
    """Which outcomes are computed, and by which conventions."""

    model_config = ConfigDict(title="[measures]")

    outcomes: Names = Field(
        default=("binary", "count", "duration"),
        min_length=1,
        description='Groups of outcomes ("binary", "count", "duration") and names of single ones.',
        examples=[["binary", "count"]],
    )
    outside: Literal["ignore", "interrupt"] = Field(
        default="ignore",
        description="A fixation outside every region is left out of the sequence, or interrupts "
        "the visit in progress.",
    )
    no_opportunity: Literal["missing", "zero"] = Field(
        default="missing",
        description="What an outcome is where the reader had no chance of it: missing with the "
        "reason, or 0.",
    )


Formats = Annotated[
    tuple[Literal["parquet", "csv"], ...],
    Field(min_length=1, json_schema_extra={"uniqueItems": True}),
    AfterValidator(no_repeats),
]


class Output(Table):
    """Where the tables go, and in which formats."""

    model_config = ConfigDict(title="[output]")

    folder: FileName = Field(
        default="out", description="The output folder, relative to the study file."
    )
    formats: Formats = Field(
        default=("parquet",),
        description="The formats in which each table is written.",
        examples=[["parquet", "csv"]],
    )
    contrasts: dict[Name, Contrast] = Field(
        default={},
        description="Factors that the tables hold as numbers too, in columns beside the factor. "
        'A factor is "treatment", "sum", "helmert" or "polynomial" coded, or by numbers of your '
        "own: one for each of its [trials] levels (column `cue_contrast`), or columns by name, "
        "each with a number for each level, one column less than there are levels.",
        examples=[{"cue": "sum"}],
    )
    centred: Names = Field(
        default=(),
        description="Covariates that the tables hold a second time less their mean (column "
        "`age_centred`). The mean is that over the trials of the study as read, before anything "
        "is left out.",
        examples=[["age"]],
    )
    pseudonyms: Switch = Field(
        default=False,
        description="Whether readers and logs go by keyed pseudonyms in all that is written. Whose "
        "they are is kept beside the study file, in a file that its owner alone may read.",
    )


class StudyFile(Table):
    """The whole study file."""

    model_config = ConfigDict(title="Study file")

    title: str = Field(
        default="", description="What the study is called.", examples=["Orchard study"]
    )
    logs: Logs = Field(description="The fixation logs: which files, and how they are written.")
    participants: Participants | None = Field(
        default=None, description="Facts about readers, joined on participant."
    )
    items: Items | None = Field(default=None, description="Facts about texts, joined on item.")
    trials: Trials = Field(
        default=Trials(),
        description="Facts about trials, the design, and which trials belong to the study.",
    )
    screen: Screen | None = Field(
        default=None,
        description="The screen. Needed for positions in degrees, off-screen rules and pictures.",
    )
    regions: Regions = Field(
        description="The regions of the texts, and how a fixation finds its region."
    )
    lines: Lines | None = Field(
        default=None,
        description="Which line of a text a fixation belongs to; for texts of several lines.",
    )
    screening: Screening | None = Field(
        default=None,
        description="What is left out, by rules in the order of their keys; each is off unless "
        "named.",
    )
    measures: Measures = Field(
        default=Measures(),
        description="Which outcomes are computed, and by which conventions.",
    )
    output: Output = Field(
        default=Output(), description="Where the tables go, and in which formats."
    )
