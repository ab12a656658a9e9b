"""Tables of ``[logs]`` for logs of lines, of the open standard, of two eyes, and of samples."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, ConfigDict, Field

from etl.study.columns import PlaceColumn, PlainColumn, TimeColumn
from etl.study.line_patterns import SearchedPattern
from etl.study.pattern_reading import searched_pattern, sound_pattern
from etl.study.values import CellText, CellTexts, Name, Number, Table


def _listed(value: Any) -> Any:
    """A pattern alone as a list of one."""
    return (value,) if isinstance(value, str) else value


LinePattern = Annotated[str, Field(min_length=1), AfterValidator(sound_pattern)]
#: What a line can be, in the order in which patterns are tried.
LINE_KINDS = ("fixation", "blink", "trial_start", "trial_end", "facts", "lasting", "ignore")
#: The keys of their patterns, for rules that need all of them to be sound.
LINE_KEYS = tuple(f"logs.patterns.{kind}" for kind in LINE_KINDS)
#: Those whose groups tell of fixations or of their trials.
GROUPED_LINES = tuple(kind for kind in LINE_KINDS if kind not in ("blink", "ignore"))
LinePatternList = Annotated[
    tuple[LinePattern, ...],
    BeforeValidator(_listed),
    Field(json_schema_extra={"anyOf": [{"type": "string"}, {"type": "array"}]}),
]


class LinePatterns(Table):
    r"""What the lines of a log of events say: regular expressions that each describe a line.

    A pattern describes the whole of a line, but for blanks at its end: what does not matter is
    ``.*``. What is written here is Python's grammar without what would let a pattern run away on a
    long line. ``\w`` is a letter, mark or digit of any script, ``\d`` one of the digits 0 to 9.
    """

    model_config = ConfigDict(title="[logs.patterns]")

    trial_start: LinePatternList = Field(
        default=(),
        description="A trial starts: a regular expression that describes the whole of such a line "
        "(.* stands for what does not matter), or a list of them. Its named groups say what is "
        "known: participant, session, trial, item, and facts by any other name. In this and all "
        r"other patterns \d and \b know ASCII alone, \w the letters and digits of any script; a "
        "pattern can neither look ahead or back nor repeat what a group found.",
        examples=[[r"^trial (?P<trial>\d+) begins, text (?P<item>\S+)$"]],
    )
    trial_end: LinePatternList = Field(
        default=(),
        description="A trial ends. Named groups are facts of the trial that ends. Fixations after "
        "it and before the next start belong to no trial; they are counted and set aside. Without "
        "it a trial lasts until the next one starts.",
        examples=[["^trial ends$"]],
    )
    fixation: LinePatternList = Field(
        default=(),
        description="A fixation is over. Its named groups are onset, end or duration, x, y, and "
        "where the line has them fixation, label, eye and blink; or what [logs.columns] calls "
        "them. With [logs.samples] it is the line of a gaze sample.",
        examples=[[r"^fixated (?P<onset>\d+) (?P<end>\d+) at (?P<x>[0-9.]+) (?P<y>[0-9.]+)$"]],
    )
    blink: LinePatternList = Field(
        default=(),
        description="A blink, of the trial within which its line stands. Where it has groups onset "
        "and end (or duration) it touches the fixations that it overlaps in time; one that "
        "overlaps none, and one that has no such groups, touches the fixation before it and the "
        "one after it. A group eye says whose.",
        examples=[[r"^blink (?P<onset>\d+) (?P<end>\d+)$"]],
    )
    facts: LinePatternList = Field(
        default=(),
        description="A line that tells of a trial: of the one under way, or of the one that ended "
        "last where none is; before the first trial, of the whole log. Its named groups are facts, "
        "or participant, session, trial, item. What a trial says twice must be the same.",
        examples=[[r"^reader: (?P<participant>\S+)$", r"^cue = (?P<cue>\w+)$"]],
    )
    lasting: LinePatternList = Field(
        default=(),
        description="A line that tells of all trials that start after it, until another one says "
        "it anew: the block, or what is said of a trial before it starts. Groups as in facts.",
        examples=[[r"^block: (?P<block>\w+)$"]],
    )
    ignore: LinePatternList = Field(
        default=(),
        description="Lines that mean nothing here; they are counted. Unlike all others, these "
        "patterns are searched anywhere in a line. A line is taken by the first pattern that fits "
        "it: fixation, blink, trial_start, trial_end, facts, lasting, ignore.",
        examples=[["^calibration", "^sample "]],
    )
    other: Literal["error", "ignore"] = Field(
        default="error",
        description="What to do with lines that no pattern fits: stop, or count them. A line that "
        "begins like those of a pattern and goes on otherwise stops in either case.",
    )
    unfinished: Literal["error", "keep"] = Field(
        default="error",
        description="What to do with a trial that starts and does not end, where trial_end is "
        "given: stop, or keep its fixations. One that starts again later is a second recording.",
    )

    def every(self) -> dict[str, tuple[SearchedPattern, ...]]:
        """The patterns by what their lines say, in the order in which they are tried."""
        return {name: tuple(map(searched_pattern, getattr(self, name))) for name in LINE_KINDS}


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
        "Kliegl 2003, doi:10.1016/S0042-6989(03)00084-1), or by the dispersion of neighbouring "
        "samples (I-DT of Salvucci & Goldberg 2000, doi:10.1145/355017.355028).",
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
        description="What is shorter is no fixation; each sample lasts until the next. 100 is the "
        "paper's own for dispersion.",
    )
    longest_gap_ms: Number = Field(
        default=0.0,
        ge=0,
        description="A hole in the record (samples without a position, or none at all) that is no "
        "longer than this does not end a fixation.",
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
        description="The trial_type of a blink, where blinks have rows of their own. A row of any "
        "kind that is not 0 in the column blink tells of one too.",
    )
    ignore: CellTexts = Field(
        default=("saccade",),
        description="The trial_type of events that mean nothing here. They are counted; an event "
        "of any other type stops the build.",
    )
    trials: dict[Name, CellTexts] = Field(
        default={},
        description="Which rows of the events of the task are trials: a column and the values of "
        "which a row must have one. All rows when absent.",
        examples=[{"trial_type": ["reading"]}],
    )
    duration_unit: Literal["ms", "s", "us"] | None = Field(
        default=None,
        description="The unit of the durations of fixations, where the sidecar does not say it. "
        "Absent, it is the second, as in the standard, unless that would be absurd.",
    )
    onset_unit: Literal["ms", "s", "us"] | None = Field(
        default=None,
        description="The unit of the recording's time stamps, where the sidecar does not say it. "
        "Absent, it is the one by which they go with the sampling frequency.",
    )
    first_row: Literal[0, 1] = Field(
        default=0,
        description="The number of the recording's first row, where events are placed by rows "
        '(OnsetSource "n/a").',
    )
