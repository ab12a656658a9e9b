"""The study file of the small orchard study, whatever its logs look like."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

#: The fixations' places in the study, where the log has coordinates.
_MARKED_TEXT = """\
[regions]
file = "regions.csv"
kind = "marked_text"

[regions.layout]
left_px = 200
top_px = 500
character_width_px = 14
line_height_px = 60
"""
_LABELS = """\
[regions]
file = "labels.csv"
kind = "labels"
"""


@dataclass(frozen=True, slots=True)
class StudyFile:
    """What a study file says, beyond what it says in every dialect.

    Attributes
    ----------
    logs : str
        The tables ``[logs]`` and below, as TOML.
    labels : bool
        Whether regions are found by areas that the log names.
    text_times : bool
        Whether fixations before and after the text are left out by their onset.
    off_screen : bool
        Whether fixations past the edge of the screen are left out by their position.
    blinks : bool
        Whether fixations that a blink touches are left out.
    trials : str
        The keys of ``[trials]`` that say where facts about trials come from.
    tables : mapping of str to str
        The tables ``[participants]`` and so on, with their file names.
    screen : mapping of str to str
        Keys of ``[screen]`` that are not as usual, values as TOML.
    """

    logs: str
    labels: bool = False
    text_times: bool = True
    off_screen: bool = True
    blinks: bool = True
    trials: str = 'table = "trial_list.csv"\n'
    tables: Mapping[str, str] = field(default_factory=lambda: {"participants": "participants.csv"})
    screen: Mapping[str, str] = field(default_factory=dict)

    def text(self) -> str:
        """The whole file."""
        parts = [self.logs]
        parts += [f'[{name}]\ntable = "{file}"\n' for name, file in self.tables.items()]
        times = 'onset = "text_on"\noffset = "text_off"\n' if self.text_times else ""
        parts.append(
            "[trials]\n"
            + self.trials
            + 'factors = ["cue", "fit", "group"]\ncovariates = ["age"]\n'
            + 'answer_correct = "answer_ok"\n'
            + times
        )
        screen = {
            "width_px": "1920",
            "height_px": "1080",
            "width_cm": "53.0",
            "distance_cm": "65.0",
            "origin": '"top-left"',
            "y_axis": '"down"',
            **self.screen,
        }
        parts.append("[screen]\n" + "".join(f"{key} = {said}\n" for key, said in screen.items()))
        parts.append(_LABELS if self.labels else _MARKED_TEXT)
        rules = {
            "outside_text_time = true": self.text_times,
            "off_screen = true": self.off_screen and not self.labels,
            'blink = "drop"': self.blinks,
            "under_ms = 80": True,
            "over_ms = 800": True,
        }
        parts.append(
            "[screening.fixations]\n" + "".join(f"{rule}\n" for rule, on in rules.items() if on)
        )
        parts.append("[screening.participants]\ncorrect_share_under = 0.1\n")
        parts.append('[measures]\noutcomes = ["binary", "count", "duration"]\n')
        parts.append('[output]\nfolder = "out"\nformats = ["parquet"]\n')
        return "\n".join(parts)
