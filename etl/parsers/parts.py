"""A log in parts: what one part tells of things that are decided for the log as a whole."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import IntEnum

from etl.errors import Findings
from etl.files.numeric_cells import DecimalSigns


class Step(IntEnum):
    """The steps of reading a log, in their order; what is wrong at one may end the reading."""

    MARKS = 0
    WIDTHS = 1
    HEADERS = 2
    STRANGE_MARKS = 3
    UNITS = 4
    ASKED = 5
    IDS = 6
    DECIMAL = 7
    NUMBERS = 8
    FIXATIONS = 9
    DONE = 10


@dataclass(slots=True)
class EyeRows:
    """How many rows of a reader name an eye, and on which line first.

    Attributes
    ----------
    count : int
        How many.
    line : int
        The first.
    """

    count: int
    line: int


@dataclass(slots=True)
class Part:
    """What one part of a log tells.

    Attributes
    ----------
    decimal : str
        The decimal sign by which its numbers are read.
    found : dict of Step to Findings
        What is wrong with single rows, by the step that found it.
    stopped : Step
        The step after which it makes no sense to go on; ``DONE`` where there is none.
    asked : dict of str to (bool, tuple of str)
        For each key of ``[logs.where]``, whether any row has a value asked for, and the first few
        values of its column.
    misnamed : dict of str to dict of str to int
        For each canonical name, the texts that are not those of the file's name, and their first
        lines.
    blink_words : dict of str to int
        Texts that do not say whether there was a blink, and their first lines.
    signs : DecimalSigns or None
        The decimal signs that occur, where the study states none.
    eyes : dict of str to dict of str to EyeRows
        For each reader the eyes that rows name, where each row is of one eye.
    chosen : dict of str to bool
        For each reader whether any row is of the eye that counts.
    """

    decimal: str
    found: dict[Step, Findings] = field(default_factory=dict)
    stopped: Step = Step.DONE
    asked: dict[str, tuple[bool, tuple[str, ...]]] = field(default_factory=dict)
    misnamed: dict[str, dict[str, int]] = field(default_factory=dict)
    blink_words: dict[str, int] = field(default_factory=dict)
    signs: DecimalSigns | None = None
    eyes: dict[str, dict[str, EyeRows]] = field(default_factory=dict)
    chosen: dict[str, bool] = field(default_factory=dict)

    @property
    def sound(self) -> bool:
        """Whether nothing is wrong in this part."""
        wrong = any(findings.failed for findings in self.found.values())
        return not (wrong or self.misnamed or self.blink_words)

    def at(self, step: Step) -> Findings:
        """Where that is recorded which is found at a step."""
        return self.found.setdefault(step, Findings())
