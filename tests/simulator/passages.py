"""The passages study: notes of several lines, every word a region, lines told by consensus."""

from __future__ import annotations

import os
import textwrap
from pathlib import Path

from tests.simulator.layout import Grid, lay_out
from tests.simulator.spec import (
    Habits,
    Mess,
    PlannedReader,
    PlannedTrial,
    SimulatedStudy,
    StudySpec,
)
from tests.simulator.writing import Column, Dialect, LogFile, Places, put, table, write_study

GRID = Grid(left_px=160, top_px=120, character_width_px=14, line_height_px=80)

#: How many characters fit in a line of these passages.
LINE_CHARACTERS = 78

PASSAGES = {
    "ladder": """\
The ladder by the north wall is older than most of our members, and it shows. Two of its rungs are
loose, one is missing, and the paint has come off almost everywhere. We have talked about a new one
at every meeting since the spring, but nobody wants to throw the old one away. It was made from a
tree that fell in the great storm, right here, by the people who planted the first row of pears.
So this is our plan: the ladder will move to the tea room, where it can carry cups and plates
instead of pickers. Anyone who has a drill and a free morning is welcome to help us hang it up. And
until the new ladder comes, please use the steps from the shed and keep both feet on them.""",
    "bees": """\
There are now six hives at the far end of the orchard, three more than last year. The bees are calm
as long as you walk behind them and not across their path, so please follow the white stones. In
April they work in the cherry trees, in May in the apples, and later in the lime trees along the
road. Last summer they gave us forty jars of honey, enough for every member and a few for the fair.
If you find a swarm hanging from a branch, do not try to catch it yourself. Write the place and the
time on the board and ring the small bell at the gate, and someone with a veil will come. If you
are stung, there is ice in the kitchen and a box with what you need on the shelf above the sink.""",
    "frost": """\
Late frost is what we fear most, for one cold night in blossom time can cost us the whole crop. Ten
years ago it did, and there was not a single plum to be found between the stream and the road. Now
we keep watch. When the sky is clear and the wind drops, two of us stay awake and read the glass at
the lowest tree once an hour. If it falls below zero, we light small fires between the rows and
pour water over the youngest trees, so that a thin coat of ice keeps the buds from freezing harder.
It sounds odd, but it works. The night is long and the smoke gets into your clothes, yet those who
have seen the sun come up over a hundred glowing fires always put their names down again. The list
for this year hangs next to the door, and a few nights are still free.""",
}

COLUMNS = (
    Column("trial", "trial"),
    Column("note", "item"),
    Column("n", "fixation"),
    Column("start_s", "onset", "s"),
    Column("end_s", "end", "s"),
    Column("gaze_x", "x"),
    Column("gaze_y", "y"),
)

#: Mild: with lines of 80 px, scatter and drift together never reach a neighbouring line.
HABITS = Habits(vertical_sd_px=8.0, drift_sd_px=6.0, drift_limit_px=15.0)


def lines_of(passage: str) -> str:
    """A passage broken into the lines that stood on the screen."""
    return "\n".join(textwrap.wrap(passage, LINE_CHARACTERS, break_on_hyphens=False))


def passages_spec(readers: int = 4) -> StudySpec:
    """Plan the passages study: every reader reads every passage, each starting with another one."""
    layouts = {
        item: lay_out(lines_of(passage), GRID, every_word=True)
        for item, passage in PASSAGES.items()
    }
    items = list(PASSAGES)
    planned, trials = [], []
    for number in range(readers):
        who = f"P{31 + number}"
        planned.append(PlannedReader(who))
        order = items[number % 3 :] + items[: number % 3]
        trials += [PlannedTrial(who, n, item, item) for n, item in enumerate(order, start=1)]
    mess = Mess(blink_share=0.01, off_screen_share=0.002)
    return StudySpec(tuple(planned), tuple(trials), layouts, habits=HABITS, mess=mess)


def write_passages(study: SimulatedStudy, folder: Path, definitions: Path) -> Places:
    """Write the passages study: a log for every reader and passage, the reader in its name.

    Parameters
    ----------
    study : SimulatedStudy
        A study planned by ``passages_spec``.
    folder : Path
        Where the study goes.
    definitions : Path
        Where its region file goes; the study file names it relative to ``folder``.

    Returns
    -------
    dict
        As of ``write_study``.
    """
    rows = [[item, lines_of(passage)] for item, passage in PASSAGES.items()]
    put(definitions, table(["item", "text"], rows).encode("utf-8"))
    relative = Path(os.path.relpath(definitions, folder)).as_posix()
    commas = Dialect(delimiter=",")
    logs = [
        LogFile(f"logs/{trial.plan.participant}_{trial.plan.item}.csv", (trial,), commas)
        for trial in study.trials
    ]
    documents = {"study.toml": STUDY_FILE.replace("REGION_FILE", relative)}
    return write_study(study, folder, columns=COLUMNS, logs=logs, documents=documents)


STUDY_FILE = """\
# What belongs to this study and how it is to be read. Paths are relative to this file.
title = "Longer notes about a community orchard"

# ---- The fixation logs: one row a fixation, one file a reader and passage ------------------
[logs]
files = ["logs/*.csv"]
kind = "table"
participant_from_name = '(?P<participant>P\\d+)'    # the reader stands in the file's name only

[logs.columns]                    # our name for it = the header in the logs
trial = "trial"
item = "note"
fixation = "n"
onset = { column = "start_s", unit = "s" }
end = { column = "end_s", unit = "s" }              # these logs have no durations
x = { column = "gaze_x", unit = "px" }
y = { column = "gaze_y", unit = "px" }

# ---- The screen ----------------------------------------------------------------------------
[screen]
width_px = 1920
height_px = 1080
width_cm = 53.0
distance_cm = 65.0
y_axis = "down"
origin = "top-left"

# ---- The regions: every word is one --------------------------------------------------------
[regions]
file = "REGION_FILE"
kind = "words"

[regions.layout]
left_px = 160                     # left edge of the first letter of every line
top_px = 120                      # top of the first line's box
character_width_px = 14
line_height_px = 80
space = "following"               # the space before a word belongs to that word
direction = "ltr"

# Which line a fixation belongs to is told by all published methods together, for nothing else is
# said: [lines] method = "consensus" is what texts of several lines are read by.

# ---- What is wanted ------------------------------------------------------------------------
[measures]
outcomes = ["binary", "count", "duration"]

[output]
folder = "out"
formats = ["parquet", "csv"]
"""
