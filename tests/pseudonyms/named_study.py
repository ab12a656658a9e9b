"""A small study that names its readers wherever a study can, for builds with pseudonyms."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import openpyxl

from tests.end_to_end.building import write

#: Ids that can be looked for, ids with blanks and accents, and numbers of every length.
READERS = ("Quillfeather07", "Brambleton-12", "Óskar Lindqvist", "94417", "7", "8")
#: Those that nothing else in a study is likely to hold.
DISTINCTIVE = (*READERS[:4], "Quillfeather", "Brambleton", "Lindqvist")
#: A reader of the tables whom no log has.
NEVER = "Neverhere99"
#: A reader who is left out by [logs.where].
ELSEWHERE = "Elsewhere55"

STUDY = """\
title = "How Quillfeather07 and others read"

[logs]
files = ["logs/*.tsv", "logs/Quillfeather07.tsv"]

[logs.columns]
participant = "reader"
trial = "trial"
item = "sentence"
onset = "start_ms"
duration = "dur_ms"
x = "x"
y = "y"
eye = "eye"

[logs.where]
reader = ["Quillfeather07", "Brambleton-12", "Óskar Lindqvist", "94417", 7, 8, "Gone77"]

[logs.eye]
use = "R"
column = "better"
[logs.eye.readers]
Quillfeather07 = "L"
Brambleton-12 = "L"

[participants]
table = "readers Quillfeather07.xlsx#Brambleton-12"

[trials]
table = "trial_list.csv"
factors = ["cue", "group"]
covariates = ["age"]
skip = { participant = [8, "Missing66"], block = ["practice"], owner = ["of 94417"] }

[screen]
width_px = 400
height_px = 200

[regions]
file = "regions.csv"
kind = "boxes"

[screening.fixations]
under_ms = 80

[screening.trials]
notes = "notes_Brambleton-12.csv"

[screening.participants]
notes = "notes_Brambleton-12.csv"

[output]
formats = ["parquet", "csv"]
pseudonyms = true
"""
REGIONS = """\
item,region,order,left,top,right,bottom
pear,who,1,0,0,100,50
pear,verb,2,100,0,200,50
plum,who,1,0,0,100,50
plum,verb,2,100,0,200,50
"""
NOTES = """\
participant,trial,reason
Quillfeather07,2,"quillfeather07 sneezed, and 94417 came in"
7,,asked Óskar Lindqvist to stop
Neverhere99,1,Neverhere99 did not come
8,1,a note on a trial that is skipped
"""


def log_of(reader: str, *, eyes: str = "LR", trials: int = 4) -> str:
    """A log with rows of both eyes; the header is line 1."""
    lines = ["reader\ttrial\tsentence\tstart_ms\tdur_ms\tx\ty\teye"]
    for trial in range(1, trials + 1):
        for number in range(4):
            for eye in eyes:
                text = "pear" if trial % 2 else "plum"
                at = trial * 100_000 + number * 250 + 5 * (eye == "L")
                long = 60 if number == 3 else 200
                x_px = (50, 150, 60, 350)[number]
                lines.append(f"{reader}\t{trial}\t{text}\t{at}\t{long}\t{x_px}\t25\t{eye}")
    return "\n".join([*lines, ""])


def trial_list() -> str:
    """The trial list; two trials of it were not recorded, one of them of nobody's."""
    rows = ["participant,trial,cue,block,owner"]
    for reader in READERS:
        rows += [
            f"{reader},{trial},{'early' if trial < 3 else 'late'},test,"
            + ("of 94417" if (reader, trial) == ("94417", 4) else "all")
            for trial in range(1, 5)
        ]
    return "\n".join([*rows, "Brambleton-12,5,late,test,all", "Neverhere99,1,late,test,all", ""])


def write_study(folder: Path, changes: Mapping[str, str] | None = None) -> Path:
    """Write the study, with other texts in place of some of its files; gives its study file."""
    files = {
        "study.toml": STUDY,
        "regions.csv": REGIONS,
        "trial_list.csv": trial_list(),
        "notes_Brambleton-12.csv": NOTES,
        "logs/readme Brambleton-12.txt": "nothing to be read\n",
        **{f"logs/{reader}.tsv": log_of(reader) for reader in READERS},
    }
    files["logs/Quillfeather07.tsv"] += log_of(ELSEWHERE).partition("\n")[2]
    book = openpyxl.Workbook()
    book.active.title = "Brambleton-12"
    for row in reader_rows():
        book.active.append(row)
    folder.mkdir(parents=True, exist_ok=True)
    book.save(folder / "readers Quillfeather07.xlsx")
    return write(folder, {**files, **(changes or {})})


def reader_rows() -> list[list[str | int]]:
    """The table of readers, its header first."""
    rows: list[list[str | int]] = [["reader", "group", "age", "better"]]
    for place, reader in enumerate((*READERS, NEVER)):
        better = "L" if reader == "7" else ""
        rows.append([reader, "visitor" if place % 2 else "volunteer", 30 + place, better])
    return rows
