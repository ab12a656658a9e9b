"""A study by hand in which ids, names and facts are as awkward as a laboratory makes them.

Two readers came twice; one trial was recorded twice; the facts stand in the log. Trial numbers sort
as numbers (9 before 10), readers as text (R10 before R9), and an id with leading zeros is a name.
"""

from __future__ import annotations

from pathlib import Path

from tests.end_to_end.building import write

#: Reader, session, trial, item, cue, mood, and the labels fixated, a letter a region.
TRIALS = (
    ("R9", "b", "10", "007", "late", "so, so", "abcb"),
    ("R9", "b", "9", 'Ünlü "pear"', "early", "", "ab"),
    ("R10", "a", "10", "007", "early", "so, so", "cbac"),
    ("R9", "a", "10", "o'hara; plum", "early", "good", "b"),
    ("R9", "b", "10", "007", "late", "so, so", "ac"),
    ("R10", "a", "9", "practice", "", "", "ab"),
    ("R9", "a", "8", "practice", "", "", "b"),
    ("R9", "a", "9", "007", "late", "NaN", "a?c"),
)

STUDY = """
[logs]
files = ["log.csv"]
kind = "table"
[logs.columns]
participant = "who"
session = "came"
trial = "trial"
item = "text"
fixation = "n"
duration = "dur"
label = "area"
[trials]
factors = ["cue"]
covariates = ["mood"]
levels = { cue = ["late", "early"] }
repeated = "first"
skip = { item = ["practice"] }
[regions]
file = "regions.csv"
kind = "labels"
[output]
formats = ["parquet", "csv"]
"""

REGIONS = """label,region,order
a,"start, or so",1
b,middle,2
c,Ende,3
"""


def quoted(cell: object) -> str:
    """A cell in quotes, with quotes in it doubled."""
    return '"' + str(cell).replace('"', '""') + '"'


def odd_study(folder: Path, *, later_trials_first: bool = False) -> Path:
    """Write the study; gives its study file. The readers' rows may stand the other way round."""
    lines = ["who,came,trial,text,cue,mood,n,dur,area"]
    trials = TRIALS
    if later_trials_first:
        # The two recordings of a trial keep their order, for the first of them counts.
        trials = tuple(sorted(TRIALS, key=lambda trial: trial[:3], reverse=True))
    for trial in trials:
        for number, area in enumerate(trial[6], start=1):
            cells = [*trial[:6], number, 150 + 10 * number + 0.125, area]
            lines.append(",".join(map(quoted, cells)))
    files = {"study.toml": STUDY, "log.csv": "\n".join(lines) + "\n", "regions.csv": REGIONS}
    return write(folder, files)
