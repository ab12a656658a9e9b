"""Studies whose logs are events, built from end to end and held against the same as tables."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest

import etl
from etl.errors import DataError
from tests.end_to_end.building import build, rows_of, write

REGIONS = """\
item,region,order,left,top,right,bottom
pear,who,1,0,0,100,50
pear,verb,2,100,0,200,50
pear,tree,3,200,0,300,50
plum,who,1,0,0,100,50
plum,verb,2,100,0,200,50
plum,tree,3,200,0,300,50
"""
REST = """
[trials]
factors = ["cue"]
answer_correct = "answer"
onset = "text_on"
REPEATED

[regions]
file = "regions.csv"
kind = "boxes"

[screening.fixations]
outside_text_time = true
blink = "drop"
under_ms = 80

[screening.trials]
answer_wrong = true
"""
TABLE = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial"
item = "tree"
onset = { column = "from", unit = "s" }
end = { column = "to", unit = "s" }
x = "x"
y = "y"
blink = "blink"
"""
EVENTS = r"""
[logs]
files = ["logs/*.log"]
kind = "events"

[logs.columns]
item = "tree"
onset = { column = "from", unit = "s" }
end = { column = "to", unit = "s" }

[logs.patterns]
fixation = '^rested (?P<from>[\d.]+) to (?P<to>[\d.]+) on (?P<x>[\d.]+)/(?P<y>[\d.]+)$'
blink = '^shut (?P<onset>[\d.]+) to (?P<end>[\d.]+)$'
trial_start = '^gate (?P<trial>\d+) opens on (?P<tree>\w+)$'
trial_end = '^gate closes$'
facts = [
    '^visitor (?P<participant>\w+)$',
    '^text up at (?P<text_on>[\d.]+)$',
    '^answer (?P<answer>right|wrong)$',
]
lasting = '^cue: (?P<cue>\w+)$'
ignore = '^wind'
"""


@dataclass(frozen=True)
class Fixation:
    """A fixation of a trial; times in seconds."""

    onset: float
    end: float
    x: int
    blink: bool


@dataclass(frozen=True)
class Trial:
    """A trial as recorded."""

    number: int
    tree: str
    cue: str
    answer: str
    text_on: float
    fixations: tuple[Fixation, ...]


def recorded(seed: int, trials: int = 12) -> list[Trial]:
    """The trials of one reader."""
    random = np.random.default_rng(seed)
    now, made = 1000.0, []
    for number in range(1, trials + 1):
        text_on = now + 0.15
        fixations = []
        for _ in range(int(random.integers(3, 15))):
            end = now + int(random.integers(60, 500)) / 1000
            x, blink = int(random.integers(0, 320)), bool(random.random() < 0.1)
            fixations.append(Fixation(round(now, 3), round(end, 3), x, blink))
            now = end + int(random.integers(10, 60)) / 1000
        cue = "early" if number <= trials // 2 else "late"
        answer = "wrong" if random.random() < 0.2 else "right"
        tree = str(random.choice(["pear", "plum"]))
        made.append(Trial(number, tree, cue, answer, round(text_on, 3), tuple(fixations)))
        now += 1
    return made


def as_table(reader: str, trials: Sequence[Trial]) -> str:
    """The trials as a table with a fixation a row."""
    lines = ["reader\ttrial\ttree\tcue\tanswer\ttext_on\tfrom\tto\tx\ty\tblink"]
    for t in trials:
        for f in t.fixations:
            facts = f"{reader}\t{t.number}\t{t.tree}\t{t.cue}\t{t.answer}\t{t.text_on:.3f}"
            lines.append(f"{facts}\t{f.onset:.3f}\t{f.end:.3f}\t{f.x}\t25\t{int(f.blink)}")
    return "\n".join([*lines, ""])


def as_events(reader: str, trials: Sequence[Trial]) -> str:
    """The same trials as events, each thing said where a lab's script would say it."""
    lines, cue = [f"visitor {reader}"], ""
    for t in trials:
        if t.cue != cue:
            cue = t.cue
            lines.append(f"cue: {cue}")
        lines += [f"gate {t.number} opens on {t.tree}", f"text up at {t.text_on:.3f}"]
        for f in t.fixations:
            if f.blink:
                lines.append(f"shut {f.onset + 0.01:.3f} to {f.onset + 0.02:.3f}")
            lines += [f"rested {f.onset:.3f} to {f.end:.3f} on {f.x}/25", "wind"]
        lines += ["gate closes", f"answer {t.answer}", ""]
    return "\n".join(lines)


READERS = {"P01": recorded(1), "P02": recorded(2), "P03": recorded(3)}


def table_study(folder: Path, rest: str = REST) -> Path:
    """Write the study as tables."""
    logs = {f"logs/{name}.tsv": as_table(name, trials) for name, trials in READERS.items()}
    return write(folder, {"study.toml": TABLE + rest, "regions.csv": REGIONS, **logs})


def events_study(folder: Path, rest: str = REST, **changes: str) -> Path:
    """Write the study as events; a change takes the place of a reader's log."""
    logs = {f"logs/{n}.log": as_events(n, trials) for n, trials in READERS.items()}
    logs |= {f"logs/{name}.log": text for name, text in changes.items()}
    return write(folder, {"study.toml": EVENTS + rest, "regions.csv": REGIONS, **logs})


SOUND = REST.replace("REPEATED\n", "")


def test_events_give_the_outcomes_of_the_same_tables(tmp_path: Path) -> None:
    """What is measured does not depend on how the log is laid out, byte for byte."""
    table = build(table_study(tmp_path / "table", SOUND)).folder
    events = build(events_study(tmp_path / "events", SOUND)).folder
    for name in ("outcomes", "outcomes_wide", "trials", "regressions"):
        content = (events / f"{name}.parquet").read_bytes()
        assert content == (table / f"{name}.parquet").read_bytes(), name
    assert (events / "accounts.csv").read_bytes() == (table / "accounts.csv").read_bytes()
    left_out = {row["left_out_by"] for row in rows_of(events, "fixations")}
    assert {"blink", "outside_text_time", "under_ms", "answer_wrong"} <= left_out


def test_fixations_name_their_lines(tmp_path: Path) -> None:
    """The table of fixations tells in which line of the log each stands."""
    study = events_study(tmp_path, SOUND)
    for row in rows_of(build(study).folder, "fixations"):
        text = (tmp_path / row["source_file"]).read_text(encoding="utf-8")
        line = text.split("\n")[row["source_line"] - 1]
        assert line.startswith(f"rested {row['onset_ms'] / 1000:.3f} to ")


@pytest.mark.parametrize(("repeated", "kept"), [("first", 3), ("last", 1)])
def test_trial_recorded_twice(tmp_path: Path, repeated: str, kept: int) -> None:
    """A trial that starts again is a second recording, of which the study takes one."""
    first = "gate 1 opens on pear\nrested 1 to 1.2 on 5/25\nrested 2 to 2.2 on 5/25\n"
    first += "rested 3 to 3.2 on 5/25\ngate closes\n"
    again = "gate 1 opens on pear\nrested 4 to 4.2 on 5/25\ngate closes\n"
    facts = "visitor P01\ncue: early\n"
    rest = '[trials]\nfactors = ["cue"]\n' + f'repeated = "{repeated}"\n'
    rest += '[regions]\nfile = "regions.csv"\nkind = "boxes"\n'
    study = events_study(tmp_path, rest, P01=facts + first + again)
    rows = [row for row in rows_of(build(study).folder, "fixations") if row["participant"] == "P01"]
    assert sum(row["kept"] for row in rows) == kept
    assert {row["left_out_by"] for row in rows if not row["kept"]} == {"repeated"}


def told(study: Path) -> str:
    """The errors of a study whose logs are wrong."""
    with pytest.raises(DataError) as caught:
        etl.build(etl.load_study(study))
    return "\n".join(caught.value.findings.lines(("error",)))


def test_trial_recorded_twice_by_mistake(tmp_path: Path) -> None:
    """Without a word in the study file, a trial that comes twice stops the build."""
    log = as_events("P01", READERS["P01"][:3])
    block = log.partition("\n\n")[0].partition("cue: early\n")[2]
    study = events_study(tmp_path, SOUND, P01=log + block + "\n")
    line = log.count("\n") + 3
    assert told(study).startswith(f"logs/P01.log:{line}: a trial is recorded a second time; ")


def test_lines_out_of_order(tmp_path: Path) -> None:
    """Fixations of a trial that stand out of the order of time stop the build."""
    lines = ["visitor P01", "cue: early", "gate 1 opens on pear", "text up at 1", "answer right"]
    lines += ["rested 2 to 2.2 on 5/25", "rested 1.5 to 1.7 on 5/25", "gate closes", ""]
    study = events_study(tmp_path, SOUND, P01="\n".join(lines))
    assert told(study) == (
        "logs/P01.log:7: the fixation begins before the one above it in the same trial; found "
        '"onset 1500 ms after 2000 ms", expected onsets that never go back within a trial\n'
        "    fix: sort the log by onset; if the trial was started again, give it a session or a "
        "trial number of its own"
    )


def test_fact_that_the_logs_do_not_know(tmp_path: Path) -> None:
    """A factor must be a group of a pattern, or stand in a table."""
    said = told(events_study(tmp_path, SOUND.replace('["cue"]', '["weather"]')))
    assert said.count("fix:") == 1
    assert 'found "weather"' in said


def test_damaged_logs_are_all_told_at_once(tmp_path: Path) -> None:
    """Each log is read although another one is damaged, and nothing is written."""
    text = as_events("P01", READERS["P01"])
    study = events_study(
        tmp_path,
        SOUND,
        P01=text.replace("rested", "rosted", 1),
        P02=as_events("P02", READERS["P02"]).replace("gate closes\n", "", 1),
    )
    said = told(study)
    assert "logs/P01.log:5: logs.patterns: no pattern describes this line; " in said
    assert "logs/P02.log:3: a trial starts and does not end; " in said
    assert said.count("fix:") == 2
    assert not (tmp_path / "out").exists()


def test_study_as_understood_is_in_the_record(tmp_path: Path) -> None:
    """The run record holds the patterns as the study file writes them."""
    folder = build(events_study(tmp_path, SOUND)).folder
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    assert "'^wind'" in EVENTS
    assert record["study"]["logs"]["patterns"]["ignore"] == ["^wind"]
