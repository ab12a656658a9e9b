"""The orchard study: single-line notes, two by two within readers and items, four lists."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from tests.simulator.draws import normal, shuffled, whole
from tests.simulator.layout import Grid, Layout, lay_out
from tests.simulator.orchard_texts import FILLERS, PRACTICE, SENTENCES
from tests.simulator.spec import (
    Effects,
    Mess,
    PlannedReader,
    PlannedTrial,
    SimulatedStudy,
    StudySpec,
)
from tests.simulator.writing import (
    Column,
    Dialect,
    LogFile,
    Places,
    logs_by_reader,
    put,
    table,
    write_study,
)

GRID = Grid(left_px=200, top_px=500, character_width_px=14, line_height_px=60)

CONDITIONS = (("early", "fitting"), ("early", "odd"), ("late", "fitting"), ("late", "odd"))

#: About one regression to three first passes without, more where the topic does not fit the verb.
ORCHARD_EFFECTS = Effects(
    intercepts={"verb": -1.95, "spillover": -2.05},
    levels={"fit=odd": 0.9, "cue=late": 0.15, "cue=late:fit=odd": 0.3, "group=visitor": 0.25},
    covariates={"age": (45.0, 0.008)},
    reader_sd=0.45,
    item_sd=0.3,
    reader_slope_sd={"fit=odd": 0.25},
    durations={"fit=odd": 0.07},
)

ORCHARD_MESS = Mess(
    blink_share=0.012,
    off_screen_share=0.003,
    before_text_share=0.04,
    after_text_share=0.03,
    scattered=frozenset({("P15", 30)}),
    unrecorded=frozenset({("P11", 23)}),
)

#: A reader who found the questions harder than the others did, as log-odds of a right answer.
HESITANT = {"P19": 1.1}

COLUMNS = (
    Column("reader", "participant"),
    Column("trial", "trial"),
    Column("fix", "fixation"),
    Column("start_ms", "onset"),
    Column("dur_ms", "duration"),
    Column("gaze_x", "x"),
    Column("gaze_y", "y"),
    Column("blink", "blink"),
    Column("eye", "eye"),
)

NOTES = (
    ("P02", 17, "sneezed"),
    ("P06", 14, "somebody came in, the reader looked up"),
    ("P11", 23, "not recorded, the camera cable had come loose"),
    ("P15", 30, "gaze all over the screen, calibrated anew afterwards"),
    ("P20", 12, 'asked aloud: "is this a mistake?"'),
)


def orchard_spec(
    rng: np.random.Generator,
    *,
    readers: int = 24,
    items: int = 32,
    with_fillers: bool = True,
    effects: Effects = ORCHARD_EFFECTS,
    mess: Mess = ORCHARD_MESS,
) -> StudySpec:
    """Plan the orchard study, as it is or in another size.

    Parameters
    ----------
    rng : numpy.random.Generator
        For ages, abilities and the order of trials.
    readers, items : int
        How many. Beyond 32 items the sentences come again under new item names. Each list holds
        every item once; a multiple of 4 balances the items over lists, one of 8 the groups too.
    with_fillers : bool
        Whether practice trials and fillers stand among the trials.
    effects : Effects
        The truth behind the first-pass regressions.
    mess : Mess
        What goes wrong.
    """
    names = [f"i{number:0{max(2, len(str(items)))}d}" for number in range(1, items + 1)]
    layouts: dict[str, Layout] = {}
    for number, item in enumerate(names):
        for cue, fit in CONDITIONS:
            marked = SENTENCES[number % len(SENTENCES)].marked(cue, fit)
            layouts[f"{item}-{cue}-{fit}"] = lay_out(marked, GRID)
    asides = {"practice": PRACTICE, "filler": FILLERS} if with_fillers else {}
    for role, texts in asides.items():
        for number, text in enumerate(texts, start=1):
            layouts[f"{role}{number}"] = lay_out(text, GRID)
    width = max(2, len(str(readers)))
    planned, trials = [], []
    for number in range(readers):
        who = f"P{number + 1:0{width}d}"
        facts = {"group": ("volunteer", "visitor")[number // 4 % 2], "age": whole(rng, 19, 71)}
        ability = HESITANT.get(who, normal(rng, 2.6, 0.4))
        planned.append(PlannedReader(who, facts, ability))
        trials += plan_session(rng, who, number % 4, names, asides=bool(asides))
    return StudySpec(tuple(planned), tuple(trials), layouts, effects, mess=mess)


def plan_session(
    rng: np.random.Generator, who: str, list_number: int, items: Sequence[str], *, asides: bool
) -> list[PlannedTrial]:
    """The trials of one reader in order: practice first, then items and fillers in two blocks."""
    blocks = ("first", "second")
    which = str(list_number + 1)
    planned: list[tuple[str, str, dict[str, str]]] = []
    for number, item in enumerate(items):
        cue, fit = CONDITIONS[(number + list_number) % 4]
        planned.append((item, f"{item}-{cue}-{fit}", {"cue": cue, "fit": fit, "role": "target"}))
    practice: list[tuple[str, str, dict[str, str]]] = []
    if asides:
        for role, texts in (("practice", PRACTICE), ("filler", FILLERS)):
            facts = {"cue": "", "fit": "", "role": role}
            names = [f"{role}{number}" for number in range(1, len(texts) + 1)]
            (practice if role == "practice" else planned).extend((n, n, facts) for n in names)
    order = shuffled(rng, planned)
    trials = []
    for number, (item, text, facts) in enumerate([*practice, *order]):
        half = 2 * (number - len(practice)) // len(order)
        block = "practice" if number < len(practice) else blocks[half]
        facts = {**facts, "list": which, "block": block}
        trials.append(PlannedTrial(who, number + 1, item, text, facts))
    return trials


def laboratory_logs(study: SimulatedStudy) -> list[LogFile]:
    """The logs of the sample study, as different as those of a laboratory over the years."""
    banner = ("# orchard notes, reading room", "# reader P17, times in ms, places in px")
    dialects = {
        "P05": (".csv", Dialect(delimiter=";", decimal=",")),
        "P07": (".tsv", Dialect(both_eyes=True)),
        "P09": (".tsv", Dialect(encoding="utf-16-le", mark=True, newline="\r\n")),
        "P13": (".tsv.gz", Dialect(compressed=True)),
        "P17": (".tsv", Dialect(banner=banner)),
    }
    logs = {log.name: log for log in logs_by_reader(study, dialects)}
    one, other = logs.pop("logs/P21.tsv"), logs.pop("logs/P22.tsv")
    together = LogFile("logs/P21_P22.tsv", one.trials + other.trials)
    return [*logs.values(), together]


def write_orchard(
    study: SimulatedStudy,
    folder: Path,
    definitions: Path,
    logs: Sequence[LogFile] | None = None,
) -> Places:
    """Write an orchard study with its study file, tables and region definitions.

    Parameters
    ----------
    study : SimulatedStudy
        A study planned by ``orchard_spec``.
    folder : Path
        Where the study goes.
    definitions : Path
        Where its region file goes; the study file names it relative to ``folder``.
    logs : sequence of LogFile, optional
        By default one plain log a reader.

    Returns
    -------
    dict
        As of ``write_study``.
    """
    logs = logs_by_reader(study, {}) if logs is None else logs
    put(definitions, region_table(study).encode("utf-8"))
    relative = Path(os.path.relpath(definitions, folder)).as_posix()
    endings = sorted({log.name.rpartition(".")[2] for log in logs}, key="tsv csv gz".find)
    globs = ", ".join(f'"logs/*.{ending}"' for ending in endings)
    study_file = STUDY_FILE.replace("REGION_FILE", relative).replace("LOG_FILES", globs)
    readers = {reader.plan.participant for reader in study.readers}
    documents = {
        "study.toml": study_file,
        "variants.toml": VARIANTS_FILE,
        "trial_list.csv": trial_table(study),
        "participants.csv": table(
            ["participant", "group", "age"],
            [
                [r.plan.participant, r.plan.facts["group"], r.plan.facts["age"]]
                for r in study.readers
            ],
        ),
        "items.csv": item_table(study),
        "notes.csv": table(
            ["participant", "trial", "reason"], [note for note in NOTES if note[0] in readers]
        ),
    }
    return write_study(study, folder, columns=COLUMNS, logs=logs, documents=documents)


def target_items(study: SimulatedStudy) -> list[str]:
    """The items of the study in order, practice and fillers left out."""
    return sorted({t.plan.item for t in study.trials if t.plan.facts["role"] == "target"})


def region_table(study: SimulatedStudy) -> str:
    """The region definitions: a row a version of a sentence."""
    rows = []
    for number, item in enumerate(target_items(study)):
        for cue, fit in CONDITIONS:
            rows.append([item, cue, fit, SENTENCES[number % len(SENTENCES)].marked(cue, fit)])
    return table(["item", "cue", "fit", "text"], rows)


def item_table(study: SimulatedStudy) -> str:
    """Facts about the items."""
    rows = []
    for number, item in enumerate(target_items(study)):
        verb = SENTENCES[number % len(SENTENCES)].verb
        rows.append([item, verb, len(verb)])
    return table(["item", "verb", "verb_letters"], rows)


def trial_table(study: SimulatedStudy) -> str:
    """The trial list as the presentation program would have kept it."""
    names = ["cue", "fit", "list", "block", "role"]
    rows = [
        [
            trial.plan.participant,
            trial.plan.trial,
            trial.plan.item,
            *[trial.plan.facts[name] for name in names],
            int(trial.answer_ok),
            trial.text_on_ms,
            trial.text_off_ms,
        ]
        for trial in study.trials
    ]
    header = ["participant", "trial", "item", *names, "answer_ok", "text_on_ms", "text_off_ms"]
    return table(header, rows)


STUDY_FILE = """\
# What belongs to this study and how it is to be read. Paths are relative to this file.
title = "Notes about a community orchard"

# ---- The fixation logs: one row a fixation -------------------------------------------------
[logs]
# One log a reader, but for P21 and P22, who share one. The logs differ: P05 has semicolons and
# decimal commas, P09 is in UTF-16, P13 is compressed, P17 has lines of remarks above its header.
# What a log's delimiter, decimal sign and encoding are is found out, log by log.
files = [LOG_FILES]
kind = "table"

[logs.columns]                    # our name for it = the header in the logs
participant = "reader"
trial = "trial"
fixation = "fix"
onset = { column = "start_ms", unit = "ms" }
duration = { column = "dur_ms", unit = "ms" }
x = { column = "gaze_x", unit = "px" }
y = { column = "gaze_y", unit = "px" }
eye = "eye"
blink = "blink"

[logs.where]                      # P07 was recorded with both eyes; the right one counts
eye = ["R"]

# ---- Facts about readers, texts and trials -------------------------------------------------
[participants]
table = "participants.csv"

[items]
table = "items.csv"

[trials]
table = "trial_list.csv"
keys = ["participant", "trial"]
factors = ["cue", "fit", "group"]
covariates = ["age", "verb_letters"]
answer_correct = "answer_ok"
onset = "text_on_ms"              # when the sentence came up and went away, in log time
offset = "text_off_ms"
skip = { block = ["practice"], role = ["filler"] }

[trials.levels]                   # the first level is the one the others are compared with
cue = ["early", "late"]
fit = ["fitting", "odd"]
group = ["volunteer", "visitor"]

# ---- The screen ----------------------------------------------------------------------------
[screen]
width_px = 1920
height_px = 1080
width_cm = 53.0
distance_cm = 65.0
y_axis = "down"
origin = "top-left"

# ---- The regions of each sentence ----------------------------------------------------------
[regions]
file = "REGION_FILE"
kind = "marked_text"
vertical = "box"                  # a fixation above or below the line belongs to no region
overlap = "error"

[regions.layout]
left_px = 200                     # left edge of the first letter
top_px = 500                      # top of the line's box
character_width_px = 14
line_height_px = 60
space = "following"               # the space before a word belongs to that word
direction = "ltr"

# ---- What is left out, in this order; everything that is stands in the ledger -----------------
[screening.fixations]
outside_text_time = true          # before the sentence came up, or after it went away
off_screen = true
blink = "drop"                    # a fixation that a blink touches
merge = { under_ms = 80, within_characters = 1 }   # a short one joins a neighbour that near
under_ms = 80
over_ms = 800

[screening.trials]
notes = "notes.csv"               # the experimenter's own
fewest_fixations = 3
outside_share_over = 0.30         # share of a trial's fixations that hit no region

[screening.participants]
correct_share_under = 0.75        # share of questions answered rightly
lost_trials_share_over = 0.30

# ---- What is wanted ------------------------------------------------------------------------
[measures]
outcomes = ["binary", "count", "duration"]
outside = "ignore"                # a fixation outside every region does not end a visit
no_opportunity = "missing"        # no chance, no zero: such a cell stays empty, with the reason

[output]
folder = "out"
formats = ["parquet", "csv"]
"""

VARIANTS_FILE = """\
# Decisions about the orchard study that could be taken otherwise. Keys are those of study.toml, and
# each holds a list of alternatives, in which false is "off"; the study's own value is one of them.
title = "Five decisions that laboratories take differently"

[screening.fixations]
blink = ["drop", false]
under_ms = [false, 80, 100]

[screening.trials]
outside_share_over = [0.20, 0.30, false]

[regions]
tolerance_px = [0, 14, 28]        # nothing, one character, two

[measures]
no_opportunity = ["missing", "zero"]

# What the study is about: the page begins with these.
[[comparisons]]
outcome = "first_pass_regression_out"
region = "verb"
factor = "fit"
level = "odd"

[[comparisons]]
outcome = "first_pass_regression_out"
region = "verb"
factor = "cue"
level = "late"
"""
