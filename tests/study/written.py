"""Study files that the tests begin from."""

#: The least that makes a sound study. Its line numbers are those in the expected messages.
SOUND = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial_no"
onset = "t_start"
duration = "dur"
x = "gx"
y = "gy"

[regions]
file = "boxes.csv"
kind = "boxes"
"""

#: The whole study file of the design.
EXAMPLE = r"""
title = "Orchard study"

[logs]
files = ["logs/*.tsv"]            # globs, relative to this file; .gz read as it is
kind = "table"
participant_from_name = '(?P<participant>P\d+)'   # optional; a regex on the file's name
delimiter = "\t"                  # these four are found out when absent
decimal = "."
encoding = "utf-8"
missing = ["", ".", "NA"]

[logs.columns]                    # canonical name = the log's own header, or a table with its unit
participant = "reader"
trial = "trial_no"
item = "sentence"
session = "session"
onset = { column = "t_start", unit = "ms" }        # "ms" | "s" | "us"
fixation = "n"
duration = { column = "dur", unit = "ms" }
x = { column = "gx", unit = "px" }
y = { column = "gy", unit = "px" }
label = "area"
eye = "eye"
blink = "blink"

[logs.where]
eye = ["R"]

[participants]
table = "participants.csv"
[items]
table = "items.csv"

[trials]
table = "trial_list.csv"
keys = ["participant", "trial"]
factors = ["cue", "fit", "group"]
covariates = ["age"]
levels = { cue = ["early", "late"] }
repeated = "error"
answer_correct = "answer_ok"
onset = "t_text_on"
offset = "t_text_off"
skip = { block = ["practice"], role = ["filler"] }

[screen]
width_px = 1920
height_px = 1080
width_cm = 53.0
distance_cm = 65.0
y_axis = "down"
origin = "top-left"

[regions]
file = "../../region_definitions/orchard.csv"
kind = "marked_text"
vertical = "box"
tolerance_px = 20
overlap = "error"

[regions.layout]
left_px = 200
top_px = 500
character_width_px = 14
line_height_px = 60
space = "following"
direction = "ltr"

[lines]
method = "consensus"

[screening.fixations]             # in this order
outside_text_time = true          # starts before the text's onset or after its offset
off_screen = true
first = 1                         # the first n of a trial (a fixation on the starting mark)
last = 1                          # the last n (looking at the answer key)
blink = "drop"                    # a fixation a blink touches
undersweep = "drop"               # where a return sweep fell short and was corrected
merge = { under_ms = 80, within_px = 14 }
under_ms = 80
over_ms = 800

[screening.trials]
notes = "notes.csv"               # the experimenter's own: participant, trial, reason
fewest_fixations = 3
line_confidence_under = 0.9       # which lines were read is less sure than this
outside_share_over = 0.30
duration_ms = [500, 30000]
blink_in_first_pass_of = ["verb"]
no_first_pass_on = ["verb"]       # the critical region was not read in first pass
answer_wrong = false

[screening.participants]
notes = "notes.csv"
correct_share_under = 0.75
lost_trials_share_over = 0.30
fewest_trials_per_cell = 4        # cell: a combination of the factors

[screening.values]                # one value of one row goes missing, the row stays
outlier_sd = 3                    # durations, within participant and region

[measures]
outcomes = ["binary", "count"]
outside = "ignore"
no_opportunity = "missing"

[output]
folder = "out"
formats = ["parquet", "csv"]
pseudonyms = false
"""

#: The least, with every rule of screening named and switched off.
ALL_OFF = (
    SOUND
    + """\
[screening.fixations]
outside_text_time = false
off_screen = false
first = false
last = false
blink = false
undersweep = false
merge = false
under_ms = false
over_ms = false

[screening.trials]
notes = false
fewest_fixations = false
line_confidence_under = false
outside_share_over = false
duration_ms = false
blink_in_first_pass_of = false
no_first_pass_on = false
answer_wrong = false

[screening.participants]
notes = false
correct_share_under = false
lost_trials_share_over = false
fewest_trials_per_cell = false

[screening.values]
outlier_sd = false
"""
)


def changed(old: str, new: str, text: str = SOUND) -> str:
    """The sound study with one place changed; the place must be there once."""
    assert text.count(old) == 1, old
    return text.replace(old, new)


def changed_at(changes: dict[str, str]) -> str:
    """The sound study with several places changed."""
    text = SOUND
    for old, new in changes.items():
        text = changed(old, new, text)
    return text
