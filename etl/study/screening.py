"""The tables ``[screening.…]``: what is left out, and by which limits.

Keys stand in the order in which the rules are applied. A rule that is absent or false is off.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Annotated, Any, Literal

from pydantic import (
    BeforeValidator,
    ConfigDict,
    Field,
    GetJsonSchemaHandler,
    ValidationInfo,
    field_validator,
)
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from etl.study.values import FileName, Number, SomeNames, Switch, Table, WholeNumber, refusal

#: No recording has more fixations, no design more trials; a bigger number is a slip.
MOST_COUNTED = 100_000


class Rules(Table):
    """Rules of one level, each off unless the study names it."""

    @field_validator("*", mode="before")
    @classmethod
    def _false_is_off(cls, given: Any, key: ValidationInfo) -> Any:
        """Take false as the absence of a rule that has a limit; a switch knows it anyway."""
        has_limit = key.field_name is not None and cls.model_fields[key.field_name].default is None
        return None if given is False and has_limit else given

    @classmethod
    def __get_pydantic_json_schema__(
        cls, core_schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Let the schema accept false in place of a limit, as the validator does."""
        reference = handler(core_schema)
        properties = handler.resolve_ref_schema(reference)["properties"]
        for name, field in cls.model_fields.items():
            if field.default is None:
                limit = properties[name]
                said = {key: limit.pop(key) for key in ("description", "examples") if key in limit}
                properties[name] = {"anyOf": [limit, {"const": False}], **said}
        return reference

    def on(self) -> Iterator[str]:
        """Name the keys of the rules that are on, in order of application."""
        for name in type(self).model_fields:
            limit = getattr(self, name)
            if limit is not None and limit is not False:  # a limit of 0 is a limit
                yield name


class Merge(Table):
    """Which short fixations are merged into a neighbour; one of the three distances is needed."""

    model_config = ConfigDict(title="[screening.fixations.merge]")

    under_ms: Number = Field(
        gt=0,
        description="The duration below which a fixation is merged, in milliseconds.",
        examples=[80],
    )
    within_px: Number | None = Field(
        default=None,
        gt=0,
        description="How near the previous or next fixation must be, in pixels.",
        examples=[14],
    )
    within_deg: Number | None = Field(
        default=None,
        gt=0,
        description="The same in degrees of visual angle; needs [screen] with its size in "
        "centimetres.",
        examples=[0.5],
    )
    within_characters: Number | None = Field(
        default=None,
        gt=0,
        description="The same in widths of a character; needs [regions.layout].",
        examples=[1],
    )


class FixationRules(Rules):
    """Rules that leave out or merge single fixations, in this order."""

    model_config = ConfigDict(title="[screening.fixations]")

    outside_text_time: Switch = Field(
        default=False,
        description="Leave out a fixation that begins before the text came up or after it went "
        "away; needs trials.onset or trials.offset. Off when absent.",
        examples=[True],
    )
    off_screen: Switch = Field(
        default=False,
        description="Leave out a fixation that is not on the screen; needs [screen]. Off when "
        "absent.",
        examples=[True],
    )
    first: WholeNumber | None = Field(
        default=None,
        ge=1,
        le=MOST_COUNTED,
        description="Leave out so many fixations at the beginning of a trial as recorded. Off "
        "when absent or false.",
        examples=[1],
    )
    last: WholeNumber | None = Field(
        default=None,
        ge=1,
        le=MOST_COUNTED,
        description="Leave out so many fixations at the end of a trial as recorded. Off when "
        "absent or false.",
        examples=[1],
    )
    blink: Literal["drop"] | None = Field(
        default=None,
        description="Leave out a fixation that a blink touches; needs logs.columns.blink. Off "
        "when absent or false.",
        examples=["drop"],
    )
    undersweep: Literal["drop"] | None = Field(
        default=None,
        description="Leave out a fixation on which a return sweep came down short of the beginning "
        "of a line, where the next saccade goes on towards it; before merging, so that it is "
        "merged into no other. Needs texts of several lines; in others it leaves nothing out. Off "
        "when absent or false.",
        examples=["drop"],
    )
    merge: Merge | None = Field(
        default=None,
        description="Merge a short fixation into the nearer of its two neighbours in time, where "
        "one is near enough. Off when absent or false.",
        examples=[{"under_ms": 80, "within_px": 14}],
    )
    under_ms: Number | None = Field(
        default=None,
        gt=0,
        description="Leave out a fixation shorter than this, in milliseconds, after merging. Off "
        "when absent or false.",
        examples=[80],
    )
    over_ms: Number | None = Field(
        default=None,
        gt=0,
        description="Leave out a fixation longer than this, in milliseconds, after merging. Off "
        "when absent or false.",
        examples=[800],
    )


def _two_numbers(given: Any) -> Any:
    """Refuse what is no pair, in words that fit whatever it is."""
    if not isinstance(given, (list, tuple)) or len(given) != 2:
        raise refusal(
            "this is no range",
            expected="two numbers in square brackets, the lower first",
            fix="write for example duration_ms = [500, 30000]",
        )
    return given


_Bound = Annotated[Number, Field(ge=0)]
Range = Annotated[tuple[_Bound, _Bound], BeforeValidator(_two_numbers)]


class TrialRules(Rules):
    """Rules that leave out whole trials, in this order."""

    model_config = ConfigDict(title="[screening.trials]")

    notes: FileName | None = Field(
        default=None,
        description="A table of trials to leave out (CSV, TSV or .xlsx: participant, session where "
        "the "
        "logs have it, trial, reason), relative to the study file; rows without a trial are about "
        "readers. Off when absent or false.",
        examples=["notes.csv"],
    )
    fewest_fixations: WholeNumber | None = Field(
        default=None,
        ge=1,
        le=MOST_COUNTED,
        description="Leave out a trial with fewer kept fixations than this. Off when absent or "
        "false.",
        examples=[3],
    )
    line_confidence_under: Number | None = Field(
        default=None,
        ge=0,
        le=1,
        description="Leave out a trial whose lines are less sure than this, from 0 to 1: how "
        "likely it is that at least 97 in 100 of its fixations are on their right line. Needs "
        'texts of several lines and lines.method = "consensus"; a trial of another text is not '
        "judged. Off when absent or false.",
        examples=[0.9],
    )
    outside_share_over: Number | None = Field(
        default=None,
        ge=0,
        le=1,
        description="Leave out a trial of whose kept fixations more than this share, from 0 to "
        "1, are outside every region. Off when absent or false.",
        examples=[0.3],
    )
    duration_ms: Range | None = Field(
        default=None,
        description="Leave out a trial that lasted less than the first or more than the second, "
        "in milliseconds from the onset of its first kept fixation to the end of its last; needs "
        "logs.columns.onset. Off when absent or false.",
        examples=[[500, 30000]],
    )
    blink_in_first_pass_of: SomeNames | None = Field(
        default=None,
        description="Leave out a trial with a blink in the first pass on any of these regions; "
        "needs logs.columns.blink. Off when absent or false.",
        examples=[["verb"]],
    )
    no_first_pass_on: SomeNames | None = Field(
        default=None,
        description="Leave out a trial in which any of these regions has no first pass; a text "
        "without the region is not judged. Off when absent or false.",
        examples=[["verb"]],
    )
    answer_wrong: Switch = Field(
        default=False,
        description="Leave out a trial whose answer was wrong; needs trials.answer_correct. Off "
        "when absent.",
        examples=[True],
    )


class ParticipantRules(Rules):
    """Rules that leave out readers with all their trials, in this order."""

    model_config = ConfigDict(title="[screening.participants]")

    notes: FileName | None = Field(
        default=None,
        description="A table of readers to leave out (CSV, TSV or .xlsx: participant, trial, "
        "reason), "
        "relative to the study file; rows with a trial are about trials, so that one file may "
        "serve both. Off when absent or false.",
        examples=["notes.csv"],
    )
    correct_share_under: Number | None = Field(
        default=None,
        ge=0,
        le=1,
        description="Leave out a reader of whose answers a smaller share than this, from 0 to 1, "
        "was right; needs trials.answer_correct. Off when absent or false.",
        examples=[0.75],
    )
    lost_trials_share_over: Number | None = Field(
        default=None,
        ge=0,
        le=1,
        description="Leave out a reader of whose trials rules left out more than this share, from "
        "0 to 1. Off when absent or false.",
        examples=[0.3],
    )
    fewest_trials_per_cell: WholeNumber | None = Field(
        default=None,
        ge=1,
        le=MOST_COUNTED,
        description="Leave out a reader with fewer kept trials than this in any combination of "
        "the factors that the reader was given; needs trials.factors. Off when absent or false.",
        examples=[4],
    )


class ValueRules(Rules):
    """Rules by which a single value goes missing and its row stays."""

    model_config = ConfigDict(title="[screening.values]")

    outlier_sd: Number | None = Field(
        default=None,
        gt=0,
        description="Set a duration missing that is farther than so many standard deviations "
        "from the mean of its reader, region and outcome, where there are three values or more. "
        "Off when absent or false.",
        examples=[3],
    )


class Screening(Table):
    """What is left out, by rules that are applied in the order of these tables and their keys."""

    model_config = ConfigDict(title="[screening]")

    fixations: FixationRules | None = Field(
        default=None,
        description="Rules that leave out or merge single fixations, in the order of their keys.",
    )
    trials: TrialRules | None = Field(
        default=None, description="Rules that leave out whole trials, in the order of their keys."
    )
    participants: ParticipantRules | None = Field(
        default=None,
        description="Rules that leave out readers with all their trials, in the order of their "
        "keys.",
    )
    values: ValueRules | None = Field(
        default=None, description="Rules by which a single value goes missing and its row stays."
    )

    def rules(self) -> tuple[str, ...]:
        """Name the rules that are on.

        Returns
        -------
        tuple of str
            In order of application. A rule has the name of its key, but for the notes on readers:
            they are ``participant_notes``, since ``notes`` are those on trials.

        Examples
        --------
        >>> Screening(
        ...     participants={"notes": "notes.csv"}, fixations={"over_ms": 800, "under_ms": False}
        ... ).rules()
        ('over_ms', 'participant_notes')
        """
        named: list[str] = []
        for level in type(self).model_fields:
            table: Rules | None = getattr(self, level)
            for key in () if table is None else table.on():
                of_readers = key == "notes" and level == "participants"
                named.append("participant_notes" if of_readers else key)
        return tuple(named)
