"""All mistakes of a study file are listed at once, in its order."""

from collections.abc import Callable

WRITTEN = r"""# A study file in which nearly everything is wrong.
tilte = "Orchard"

[logs]
flies = ["logs/*.tsv"]
kind = "tabel"
participant_from_name = '(?P<reader>P\d+)'
delimiter = ","
decimal = ","
missing = ["", "NA", "NA"]

[logs.columns]
participant = 7
onset = { column = "t", unit = "minutes" }
end = "t_end"
duration = "dur"
x = { column = "gx", unit = "deg" }

[logs.where]
eye = "R"
blink = [
  "0",
  false,
]

[trials]
keys = ["participant"]
factors = ["cue"]
covariates = ["cue", "region"]
levels = { cu = ["early", "late"] }

[screen]
width_px = "1920"
height_px = -1080
width_cm = inf
origin = "top-left"

[regoins]
file = 'a\b.csv'

[lines]
method = "chains"

[screening.fixations]
first = 0
blnik = "drop"
merge = { under_ms = 80 }
under_ms = 800
over_ms = 80

[screening.participants]
correct_share_under = 0.75

[measures]
outcomes = ["binary", "frist_pass_time"]
factors = ["fit"]

[output]
pseudonyms = "yes"
"""

EXPECTED = """\
study.toml:2: tilte: unknown key
    fix: did you mean "title"?
study.toml:5: logs.flies: unknown key
    fix: did you mean "files"?
study.toml:6: logs.kind: this is not one of the choices; found "tabel", expected "table", \
"events" or "bids"
    fix: did you mean "table"?
study.toml:7: logs.participant_from_name: the pattern does not say which part is the \
participant; found "(?P<reader>P\\d+)", expected a group named participant
    fix: rename its group reader to participant
study.toml:9: logs.decimal: the decimal sign is also the delimiter; found ",", expected two \
different characters
    fix: correct one of the two, or remove both to have them found out
study.toml:10: logs.missing: named twice in this list: "NA"
    fix: keep one of each
study.toml:13: logs.columns.participant: this is a whole number; found "7", expected the \
column's header in quotes, or a table with column and unit
    fix: write for example participant = "reader"
study.toml:14: logs.columns.onset.unit: this is not one of the choices; found "minutes", \
expected "ms", "s" or "us"
    fix: take one of these
study.toml:15: logs.columns.end: duration and end both say how long a fixation lasted; found \
"t_end", expected two of onset, duration and end
    fix: remove the one that is less exact in your logs
study.toml:20: logs.where.eye: this is text; found "R", expected a list in square brackets
    fix: write eye = ["R"]
study.toml:23: logs.where.blink, entry 2: this is a true-or-false value; found "false", expected \
text in quotes
    fix: write "false"
study.toml:27: trials.keys: there is no trial list to join; found "participant", expected table \
beside keys
    fix: add table = "…" with the trial list, or remove keys
study.toml:29: trials.covariates, entry 1: this is a factor already; found "cue", expected a \
name that is not in factors
    fix: remove it from one of the two lists
study.toml:29: trials.covariates, entry 2: the tables have a column of this name anyway; found \
"region", expected a name that no column of the tables has
    fix: rename the column in its table, or remove it from the list
study.toml:30: trials.levels.cu: this is no factor; found "cu", expected a name from factors
    fix: did you mean "cue"?
study.toml:32: screen.distance_cm: this key is missing, and positions in degrees need it; \
expected a number of centimetres
    fix: add distance_cm = … to [screen]
study.toml:33: screen.width_px: this is text; found "1920", expected a whole number
    fix: write width_px = 1920
study.toml:34: screen.height_px: out of bounds; found "-1080", expected a number above 0
    fix: write for example height_px = 1080
study.toml:35: screen.width_cm: out of bounds; found "inf", expected a finite number
    fix: write for example width_cm = 53.0
study.toml:36: screen.origin: positions in degrees are counted from the middle of the screen; \
found "top-left", expected "centre"
    fix: write origin = "centre", or remove the key
study.toml:38: regoins: unknown key
    fix: did you mean "regions"?
study.toml:42: lines.method: this is not one of the choices; found "chains", expected \
"consensus", "attach", "chain", "cluster", "merge", "regress", "segment", "slice", "split", \
"stretch", "warp", "nearest" or "none"
    fix: did you mean "chain"?
study.toml:45: screening.fixations.first: out of bounds; found "0", expected a number of 1 or more
    fix: write for example first = 1
study.toml:46: screening.fixations.blnik: unknown key
    fix: did you mean "blink"?
study.toml:47: screening.fixations.merge: nothing says how near the other fixation must be; \
expected one of within_px, within_deg and within_characters
    fix: add for example within_px = 14
study.toml:49: screening.fixations.over_ms: no duration lies between under_ms and over_ms; found \
"80", expected a number above 800
    fix: correct one of the two limits
study.toml:52: screening.participants.correct_share_under: nothing says whether an answer was \
correct; expected trials.answer_correct
    fix: add answer_correct = "…" to [trials] with the name of the column, or remove this rule
study.toml:55: measures.outcomes, entry 2: there is no such outcome; found "frist_pass_time", \
expected a group (binary, count or duration) or the name of a measure
    fix: did you mean "first_pass_time"?
study.toml:56: measures.factors: unknown key; expected outcomes, outside or no_opportunity
    fix: it belongs in [trials]
study.toml:59: output.pseudonyms: this is text; found "yes", expected true or false
    fix: remove the key
30 problems; nothing was written"""


def test_all_mistakes_are_listed_in_the_order_of_the_file(refusal: Callable[..., str]) -> None:
    """One run says all there is to say, each with its line; nothing hides anything else."""
    assert refusal(WRITTEN, ["first_pass_time"]) == EXPECTED
