"""What the tables, the logs and the region file say about a trial, seen in the built tables."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pyarrow.parquet as pq
import pytest

import etl
from etl.errors import DataError

STUDY = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial"
item = "sentence"
onset = "start"
duration = "dur"
x = "x"
y = "y"

[regions]
file = "regions.csv"
kind = "boxes"
"""
LOG = """\
reader\ttrial\tsentence\tmood\tstart\tdur\tx\ty
P01\t1\tpear\tcalm\t1000\t200\t50\t25
P01\t2\tplum\ttense\t2000\t200\t50\t25
"""
REGIONS = """\
item,region,order,left,top,right,bottom
pear,all,1,0,0,100,50
plum,all,1,0,0,100,50
"""


def build(folder: Path, study: str, files: Mapping[str, str | None] | None = None) -> etl.Result:
    """Build a small study with some files added or replaced; None stands for no file."""
    written = {"study.toml": STUDY + study, "logs/P01.tsv": LOG, "regions.csv": REGIONS}
    for name, text in {**written, **(files or {})}.items():
        if text is None:
            continue
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        (folder / name).write_text(text, encoding="utf-8", newline="\n")
    return etl.build(etl.load_study(folder / "study.toml"))


def facts_of(folder: Path, *names: str, table: str = "trials") -> dict[str, tuple[Any, ...]]:
    """Some columns of the table of trials, by trial."""
    rows = pq.read_table(folder / "out" / f"{table}.parquet").to_pylist()
    return {str(row["trial"]): tuple(row[name] for name in names) for row in rows}


def test_facts_come_from_every_table(tmp_path: Path) -> None:
    """The trial list, the readers, the items, the log and the region file each supply facts."""
    study = """
[participants]
table = "readers.csv"
[items]
table = "items.csv"
[trials]
table = "list.csv"
factors = ["cue", "group", "length", "mood", "kind_of_text"]
"""
    files = {
        "readers.csv": "participant,group\nP01,volunteer\n",
        "items.csv": "item,length\npear,short\nplum,long\n",
        "list.csv": "participant,trial,cue\nP01,1,early\nP01,2,late\n",
        "regions.csv": REGIONS.replace("bottom\n", "bottom,kind_of_text\n")
        .replace("pear,all,1,0,0,100,50", "pear,all,1,0,0,100,50,note")
        .replace("plum,all,1,0,0,100,50", "plum,all,1,0,0,100,50,letter"),
    }
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "cue", "group", "length", "mood", "kind_of_text") == {
        "1": ("early", "volunteer", "short", "calm", "note"),
        "2": ("late", "volunteer", "long", "tense", "letter"),
    }


@pytest.mark.parametrize(
    ("tables", "winner"),
    [
        (("list", "readers", "items", "log"), "list"),
        (("readers", "items", "log"), "readers"),
        (("items", "log"), "items"),
        (("log",), "log"),
    ],
    ids=["trial list", "readers", "items", "log"],
)
def test_precedence(tmp_path: Path, tables: tuple[str, ...], winner: str) -> None:
    """A fact in several places is taken from the trial list, then readers, items, the log."""
    study = '\n[trials]\nfactors = ["mood"]\n'
    files = {}
    if "list" in tables:
        study += 'table = "list.csv"\n'
        files["list.csv"] = "participant,trial,mood\nP01,1,list\nP01,2,list\n"
    if "readers" in tables:
        study += '[participants]\ntable = "readers.csv"\n'
        files["readers.csv"] = "participant,mood\nP01,readers\n"
    if "items" in tables:
        study += '[items]\ntable = "items.csv"\n'
        files["items.csv"] = "item,mood\npear,items\nplum,items\n"
    files["logs/P01.tsv"] = LOG.replace("calm", "log").replace("tense", "log")
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "mood") == {"1": (winner,), "2": (winner,)}


def test_tables_may_use_the_logs_own_headers(tmp_path: Path) -> None:
    """A table without a column participant is joined by the header that the logs use."""
    study = '\n[participants]\ntable = "readers.csv"\n[items]\ntable = "items.csv"\n[trials]\n'
    study += (
        'table = "list.csv"\nkeys = ["reader", "trial"]\nfactors = ["group", "length", "cue"]\n'
    )
    files = {
        "readers.csv": "reader,group\nP01,volunteer\n",
        "items.csv": "sentence,length\npear,short\nplum,long\n",
        "list.csv": "reader,trial,cue\nP01,1,early\nP01,2,late\n",
    }
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "group", "length", "cue") == {
        "1": ("volunteer", "short", "early"),
        "2": ("volunteer", "long", "late"),
    }


def test_item_from_the_trial_list(tmp_path: Path) -> None:
    """Where the log names no item, the trial list may; the item table is joined by that."""
    study = '\n[items]\ntable = "items.csv"\n[trials]\ntable = "list.csv"\nfactors = ["length"]\n'
    files = {
        "study.toml": STUDY.replace('item = "sentence"\n', "") + study,
        "items.csv": "item,length\npear,short\nplum,long\n",
        "list.csv": "participant,trial,item\nP01,1,plum\nP01,2,pear\n",
    }
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "item", "length") == {"1": ("plum", "long"), "2": ("pear", "short")}


def test_list_joined_by_a_fact_of_the_log(tmp_path: Path) -> None:
    """A trial list may be joined by a fact that stands in the log."""
    study = '\n[trials]\ntable = "list.csv"\nkeys = ["participant", "mood"]\nfactors = ["cue"]\n'
    build(tmp_path, study, {"list.csv": "participant,mood,cue\nP01,calm,early\nP01,tense,late\n"})
    assert facts_of(tmp_path, "cue") == {"1": ("early",), "2": ("late",)}


def test_list_joined_by_a_fact_of_the_reader(tmp_path: Path) -> None:
    """A trial list may be joined by a fact of the reader table, such as a list's name."""
    study = '\n[participants]\ntable = "readers.csv"\n[trials]\ntable = "list.csv"\n'
    study += 'keys = ["version", "item"]\nfactors = ["cue"]\n'
    files = {
        "readers.csv": "participant,version\nP01,A\n",
        "list.csv": "version,item,cue\nA,pear,early\nA,plum,late\nB,pear,late\nB,plum,early\n",
    }
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "cue") == {"1": ("early",), "2": ("late",)}


@pytest.mark.parametrize(
    "skip",
    ['skip = { mood = ["tense"] }', "skip = { trial = [2] }", 'skip = { item = ["plum"] }'],
    ids=["fact of the log", "trial", "item"],
)
def test_skipped_trial_needs_no_table(tmp_path: Path, skip: str) -> None:
    """A trial that is no part of the study may stand in no table and have no text."""
    study = (
        f'\n[items]\ntable = "items.csv"\n[trials]\ntable = "list.csv"\nfactors = ["cue"]\n{skip}\n'
    )
    files = {
        "items.csv": "item,length\npear,short\n",
        "list.csv": "participant,trial,cue\nP01,1,early\n",
        "regions.csv": REGIONS.replace("plum,all,1,0,0,100,50\n", ""),
    }
    result = build(tmp_path, study, files)
    assert facts_of(tmp_path, "cue") == {"1": ("early",)}
    assert facts_of(tmp_path, "kept", "left_out_by", table="fixations")["2"] == (0, "skip")
    assert result.counts["trials skipped"] == 1


def test_skip_by_a_fact_of_the_item(tmp_path: Path) -> None:
    """Fillers are known by a fact of their item."""
    study = '\n[items]\ntable = "items.csv"\n[trials]\nskip = { role = ["filler"] }\n'
    build(tmp_path, study, {"items.csv": "item,role\npear,target\nplum,filler\n"})
    assert list(facts_of(tmp_path)) == ["1"]


def test_missing_row_of_a_trial_in_the_study_is_an_error(tmp_path: Path) -> None:
    """A value to skip by does not excuse a trial that has no row at all."""
    study = '\n[trials]\ntable = "list.csv"\nfactors = ["cue"]\nskip = { cue = ["", "none"] }\n'
    with pytest.raises(DataError, match=r"list\.csv has no row for this participant and trial"):
        build(tmp_path, study, {"list.csv": "participant,trial,cue\nP01,1,early\n"})


def test_unrecorded_trials_and_readers_are_warned_of(tmp_path: Path) -> None:
    """Rows of the tables that no log has are named; skipped ones are not."""
    study = '\n[participants]\ntable = "readers.csv"\n[trials]\ntable = "list.csv"\n'
    study += 'factors = ["cue"]\nskip = { cue = ["practice"] }\n'
    files = {
        "readers.csv": "participant\nP01\nP02\n",
        "list.csv": "participant,trial,cue\nP01,1,early\nP01,2,late\nP01,3,late\nP01,4,practice\n",
    }
    result = build(tmp_path, study, files)
    assert result.findings.lines(["warning"]) == [
        (
            "warning: list.csv:4: the trial is in the list but in no log; found "
            '"participant P01, trial 3"'
        ),
        'warning: readers.csv:3: the reader is in the table but in no log; found "P02"',
    ]


def test_session_is_part_of_a_trial(tmp_path: Path) -> None:
    """Trials of the same number in two sessions are two trials, each with its facts."""
    study = '\n[trials]\ntable = "list.csv"\nkeys = ["participant", "session", "trial"]\n'
    study += 'factors = ["cue"]\n'
    files = {
        "study.toml": STUDY.replace(
            "[logs.columns]",
            "participant_from_name = '(?P<participant>P..)_(?P<session>.)'\n[logs.columns]",
        )
        + study,
        "logs/P01.tsv": None,
        "logs/P01_a.tsv": LOG,
        "logs/P01_b.tsv": "# in June\n" + LOG,
        "list.csv": "participant,session,trial,cue\nP01,a,1,w\nP01,a,2,x\nP01,b,1,y\nP01,b,2,z\n",
    }
    build(tmp_path, "", files)
    rows = pq.read_table(tmp_path / "out/trials.parquet").to_pylist()
    assert [(row["session"], str(row["trial"]), row["cue"]) for row in rows] == [
        ("a", "1", "w"),
        ("a", "2", "x"),
        ("b", "1", "y"),
        ("b", "2", "z"),
    ]


def test_facts_are_the_same_however_letters_are_stored(tmp_path: Path) -> None:
    """A letter with an accent, stored as one character or as two, joins all the same."""
    study = '\n[participants]\ntable = "readers.csv"\n[trials]\nfactors = ["group"]\n'
    files = {
        "logs/P01.tsv": LOG.replace("P01", "Zoe\u0308"),
        "readers.csv": "participant,group\nZo\u00eb,volunteer\n",
    }
    build(tmp_path, study, files)
    assert facts_of(tmp_path, "participant", "group")["1"] == ("Zo\u00eb", "volunteer")


def test_unreadable_first_log_hides_no_fact(tmp_path: Path) -> None:
    """A fact that stands in the logs is not called missing because one log is damaged."""
    with pytest.raises(DataError) as refused:
        build(tmp_path, '\n[trials]\nfactors = ["mood"]\n', {"logs/A.tsv": "", "logs/P01.tsv": LOG})
    assert str(refused.value) == (
        "logs/A.tsv: the file is empty\n"
        "    fix: remove it from the folder, or copy it again\n"
        "1 problem; nothing was written"
    )
