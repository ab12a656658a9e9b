"""A small study by hand whose tables are to hold factors as numbers and centred covariates."""

from __future__ import annotations

from pathlib import Path

from tests.end_to_end.building import write

#: Reader, trial, item, cue, fit, step, age, height, and the labels fixated, a letter a region.
TRIALS = (
    ("R1", "1", "pear", "early", "good", "low", "20", "1.5", "abcb"),
    ("R1", "2", "plum", "late", "bad", "mid", "20", "", "ab"),
    ("R1", "3", "fig", "middle", "good", "high", "20", "1.75", "acab"),
    ("R2", "1", "pear", "late", "bad", "top", "31", "-2.5e1", "b"),
    ("R2", "2", "plum", "early", "good", "low", "31", "0", "cab"),
    ("R2", "3", "fig", "middle", "bad", "mid", "31", "0.1", "abca"),
    ("R2", "4", "practice", "middle", "bad", "mid", "999", "999", "abc"),
    ("R3", "1", "pear", "early", "bad", "high", "47", "3", "a"),
    ("R3", "2", "plum", "middle", "good", "top", "47", "3", "bcbca"),
)
#: Those of the study, of which the one with a single fixation is left out by screening.
OF_STUDY = tuple(trial for trial in TRIALS if trial[2] != "practice")

STUDY = """
[logs]
files = ["log.csv"]
kind = "table"
[logs.columns]
participant = "who"
trial = "trial"
item = "text"
fixation = "n"
duration = "dur"
label = "area"
[trials]
factors = ["cue", "fit", "step"]
covariates = ["height", "age"]
skip = { item = ["practice"] }
[trials.levels]
cue = ["middle", "early", "late"]
fit = ["good", "bad"]
step = ["high", "low", "mid", "top"]
[screening.trials]
fewest_fixations = 2
[regions]
file = "regions.csv"
kind = "labels"
[output]
formats = ["parquet", "csv"]
"""
REGIONS = "label,region,order\na,start,1\nb,middle,2\nc,end,3\n"


def model_study(folder: Path, output: str = "", study: str = STUDY) -> Path:
    """Write the study, with some keys more in its last table; gives its study file."""
    lines = ["who,trial,text,cue,fit,step,age,height,n,dur,area"]
    for trial in TRIALS:
        for number, area in enumerate(trial[8], start=1):
            lines.append(",".join([*trial[:8], str(number), str(150 + 10 * number), area]))
    files = {
        "study.toml": study + output,
        "log.csv": "\n".join(lines) + "\n",
        "regions.csv": REGIONS,
    }
    return write(folder, files)
