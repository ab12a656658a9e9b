"""Small studies by hand whose logs say themselves which region was fixated."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from tests.end_to_end.building import write

STUDY = """\
title = "Looking back"

[logs]
files = ["log.csv"]
kind = "table"
[logs.columns]
participant = "reader"
trial = "trial"
item = "text"
fixation = "n"
duration = "ms"
label = "area"

[trials]
factors = ["cue"]
levels = { cue = ["early", "late"] }

[regions]
file = "regions.csv"
kind = "labels"

[screening.fixations]
under_ms = 80
"""
REGIONS = "label,region,order\na,start,1\nb,middle,2\nc,end,3\n"
#: Reader, trial, cue, and the fixations: an area and its milliseconds each.
Trial = tuple[str, int, str, str]


def labelled_study(
    folder: Path, trials: Iterable[Trial], variants: str, study: str = STUDY
) -> tuple[Path, Path]:
    """Write a study and its variants file; gives both."""
    lines = ["reader,trial,text,cue,n,ms,area"]
    for reader, trial, cue, fixations in trials:
        lines += [
            f"{reader},{trial},t{trial},{cue},{number},{one[1:]},{one[0]}"
            for number, one in enumerate(fixations.split(), start=1)
        ]
    files = {
        "study.toml": study,
        "log.csv": "\n".join(lines) + "\n",
        "regions.csv": REGIONS,
        "variants.toml": variants,
    }
    study_file = write(folder, files)
    return study_file, study_file.with_name("variants.toml")


#: Four trials in each condition. Without ``under_ms`` the short glance of R1 in trial 2 is a
#: regression, and so is that of R2 in trial 3, whose middle is skipped with it.
BY_HAND: tuple[Trial, ...] = (
    ("R1", 1, "early", "a200 b200 c200"),
    ("R1", 2, "early", "a200 b200 a60 c200"),
    ("R1", 3, "late", "a200 b200 a200 c200"),
    ("R1", 4, "late", "a200 b200 c200"),
    ("R2", 1, "early", "a200 b200 c200"),
    ("R2", 2, "late", "a200 b200 a200 c200"),
    ("R2", 3, "late", "a200 b60 a200 c200"),
    ("R2", 4, "early", "b200 a200"),
)


def turning_trials() -> tuple[Trial, ...]:
    """Early, readers glance back shortly in 12 of 20 trials; late, they go back in 8 of 20.

    Which condition has more regressions hangs on whether glances of 60 ms count. One trial is of
    two fixations.
    """
    made: list[Trial] = []
    for reader in ("R1", "R2", "R3", "R4"):
        for number in range(1, 6):
            glance = number <= 3
            made.append((reader, number, "early", f"a200 b210 {'a60 ' * glance}c190"))
        for number in range(6, 11):
            back = number <= 7
            middle = "a200 b210 a180 c190" if back else "a200 b210 c190"
            made.append((reader, number, "late", "a300 b310" if number == 10 else middle))
    return tuple(made)
