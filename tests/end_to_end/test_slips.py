"""Slips that no single log shows: values of one reader only, files that are not read, lost rows."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

import etl

STUDY = """\
[logs]
files = ["logs/*.tsv"]
participant_from_name = '(?P<participant>P\\d+)'

[logs.columns]
trial = "trial"
item = "sentence"
fixation = "n"
onset = "start_ms"
duration = "dur_ms"
x = "x"

[trials]
factors = ["cue"]
onset = "text_on"
skip = { block = ["uebung"] }

[regions]
file = "regions.csv"
kind = "boxes"
vertical = "any"

[screening.fixations]
outside_text_time = true
"""
HEADER = "trial\tsentence\tblock\tcue\ttext_on\tn\tstart_ms\tdur_ms\tx\n"
TEXTS = ("pear", "plum", "quince", "medlar", "fig")
READERS = ("P01", "P02", "P03", "P04", "P05")
Cells = dict[str, str]


def regions(names: dict[str, str] | None = None) -> str:
    """Two regions a text; ``names`` says what the second one is called in some of them."""
    rows = [
        f"{text},who,1,0,0,100,50\n{text},{(names or {}).get(text, 'verb')},2,100,0,200,50\n"
        for text in TEXTS
    ]
    return "item,region,order,left,top,right,bottom\n" + "".join(rows)


def log(reader: str, change: Callable[[Cells], None] | None = None) -> str:
    """Six trials of six fixations; the first trial is practice. ``change`` edits a row's cells."""
    rows = []
    own = int(reader[1:])
    for trial in range(6):
        begin = 10_000 * (trial + 1)
        for n in range(1, 7):
            cells = {
                "trial": str(trial + 1),
                "sentence": TEXTS[trial % len(TEXTS)],
                "block": "main" if trial else "uebung",
                "cue": "early" if (trial + own) % 2 else "late",
                "text_on": str(begin),
                "n": str(n),
                "start_ms": str(begin + 250 * n),
                "dur_ms": str(200 + own + trial),
                "x": str(20 + 30 * n - own),
            }
            if change is not None:
                change(cells)
            if cells:
                rows.append("\t".join(cells.values()))
    return HEADER + "\n".join(rows) + "\n"


def check(folder: Path, files: dict[str, str] | None = None, study: str = STUDY) -> str:
    """All that a check says of the study with some files put in place of its own."""
    written = {
        "study.toml": study,
        "regions.csv": regions(),
        **{f"logs/{reader}.tsv": log(reader) for reader in READERS},
        **(files or {}),
    }
    for name, content in written.items():
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        (folder / name).write_text(content, encoding="utf-8", newline="\n")
    return etl.check(etl.load_study(folder / "study.toml")).text()


def in_trial(trial: str, **changed: str) -> Callable[[Cells], None]:
    """Change some cells of a trial."""

    def change(cells: Cells) -> None:
        if cells["trial"] == trial:
            cells |= changed

    return change


def test_sound_study_is_not_doubted(tmp_path: Path) -> None:
    """Nothing but what was read is told."""
    assert check(tmp_path) == (
        "note: 5 readers, 25 trials, 150 fixations, 0 of them outside every region; 5 more trials "
        "skipped"
    )


@pytest.mark.parametrize("spelled", ["Early", "early ", "EARLY", "ear-ly"])
def test_level_in_another_spelling(tmp_path: Path, spelled: str) -> None:
    """A level that is another one but for case, blanks or hyphens is told with its place."""
    said = check(tmp_path, {"logs/P03.tsv": log("P03", in_trial("3", cue=spelled))})
    if spelled.strip() == "early":
        assert "cue" not in said  # blanks around a cell mean nothing
        return
    assert (
        "warning: logs/P03.tsv:14: the value of cue differs from another one in spelling only; "
        f'found "{spelled}, of reader P03", expected perhaps "early"'
    ) in said


def test_levels_that_are_stated_are_not_doubted(tmp_path: Path) -> None:
    """Who lists the levels means them."""
    study = STUDY.replace(
        "[regions]", '[trials.levels]\ncue = ["early", "late", "Early"]\n[regions]'
    )
    files = {"logs/P03.tsv": log("P03", in_trial("3", cue="Early"))}
    assert "spelling" not in check(tmp_path, files, study)


def test_level_of_one_reader_alone(tmp_path: Path) -> None:
    """A level that one reader has alone, where others share theirs, is doubted."""
    said = check(tmp_path, {"logs/P03.tsv": log("P03", in_trial("3", cue="earlx"))})
    assert (
        "the value of cue occurs with one reader only; found "
        '"earlx, of reader P03", expected perhaps "early"'
    ) in said


def test_practice_in_another_spelling(tmp_path: Path) -> None:
    """A mark of trials to skip, written otherwise, would turn practice into trials of the study."""
    said = check(tmp_path, {"logs/P03.tsv": log("P03", in_trial("1", block="Übung"))})
    assert (
        "warning: logs/P03.tsv:2: the value of block differs from another one in spelling only; "
        'found "Übung, of reader P03", expected perhaps "uebung"'
    ) in said


def test_region_with_a_slip_in_its_name(tmp_path: Path) -> None:
    """A name that one text has alone, in place of a usual one, is told with its line."""
    said = check(tmp_path, {"regions.csv": regions({"fig": "vreb"})})
    assert (
        "warning: regions.csv:10: hardly any text has a region of this name, and this one lacks "
        'one that most have; found "vreb", expected perhaps "verb"'
    ) in said


def test_files_among_the_logs_that_no_pattern_names(tmp_path: Path) -> None:
    """A log in another spelling of the ending is not lost without a word."""
    said = check(tmp_path, {"logs/P06.TXT": log("P06"), "logs/readme.md": "About the logs.\n"})
    assert (
        'study.toml:2: logs.files: a file lies among the logs and is not read; found "logs/P06.TXT"'
    ) in said


def test_row_that_is_missing(tmp_path: Path) -> None:
    """A number that is left out once tells of a lost row."""

    def lose(cells: Cells) -> None:
        if (cells["trial"], cells["n"]) == ("4", "3"):
            cells.clear()

    said = check(tmp_path, {"logs/P02.tsv": log("P02", lose)})
    assert (
        "warning: logs/P02.tsv:22: numbers of fixations are left out at 1 place: rows may be "
        "missing"
    ) in said


def test_numbers_that_leave_out_many_are_a_way_of_numbering(tmp_path: Path) -> None:
    """Where every second number is left out, nothing is missing."""

    def double(cells: Cells) -> None:
        cells["n"] = str(2 * int(cells["n"]))

    files = {f"logs/{reader}.tsv": log(reader, double) for reader in READERS}
    assert "left out at" not in check(tmp_path, files)


def test_rule_that_takes_all_of_a_reader(tmp_path: Path) -> None:
    """A clock that is off for one reader is told with the reader's name."""

    def later(cells: Cells) -> None:
        cells["text_on"] = str(int(cells["text_on"]) + 5_000)

    said = check(tmp_path, {"logs/P04.tsv": log("P04", later)})
    assert "the rule outside_text_time takes most fixations of a reader; found" in said
    assert '"P04 (30 of 30)"' in said


def test_table_that_says_which_eye_counts_is_told_of_alone(tmp_path: Path) -> None:
    """Where it is wrong, the readers' eyes are no further problems."""
    study = (
        STUDY.replace('x = "x"\n', 'x = "x"\neye = "eye"\n\n[logs.eye]\ncolumn = "better"\n')
        + '\n[participants]\ntable = "readers.csv"\n'
    )
    files = {
        f"logs/{reader}.tsv": "".join(
            f"{line}\t{'eye' if number == 0 else 'L'}\n"
            for number, line in enumerate(log(reader).splitlines())
        )
        for reader in READERS
    }
    files["readers.csv"] = "participant,better\nP01,L\nP01,L\n"
    said = check(tmp_path, files, study)
    assert "eye of this reader" not in said
    assert "readers.csv:3: two rows have the same participant" in said


def test_zeros_that_a_spreadsheet_dropped(tmp_path: Path) -> None:
    """A table that says 1 where the logs say 01 is asked about the zeros."""
    study = STUDY.replace("(?P<participant>P\\d+)", "P(?P<participant>\\d+)")
    study += '\n[participants]\ntable = "readers.csv"\n'
    said = check(
        tmp_path, {"readers.csv": "participant,age\n1,20\n2,30\n3,25\n4,41\n5,33\n"}, study
    )
    assert 'readers.csv has no row for this participant; found "participant 01"' in said
    assert 'add the row to readers.csv (it has "1")' in said
