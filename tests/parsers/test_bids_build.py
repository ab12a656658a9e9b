"""Studies of the open standard (BIDS) built from end to end, and held against tables."""

from __future__ import annotations

import json
from pathlib import Path

import pandas as pd
import pytest

import etl
from etl.errors import DataError
from tests.parsers.bids_making import CLOCK_MS, RECORDING, RUN, Dataset, told

STUDY = """\
[logs]
files = [FILES]
kind = "KIND"
MORE

[logs.columns]
trial = "trial"
item = "item"
COLUMNS

[participants]
table = "READERS"

[trials]
factors = ["cue", "group"]

[regions]
file = "boxes.csv"
kind = "boxes"

[screening.fixations]
blink = "drop"

[screening.participants]
notes = "notes.csv"

[output]
formats = ["parquet", "csv"]
"""
COLUMNS = """\
participant = "reader"
onset = "onset"
duration = "duration"
x = "x"
y = "y"
blink = "blink"
"""
BOXES = """\
item,region,order,left,top,right,bottom
pear,who,1,0,0,100,50
pear,verb,2,100,0,200,50
plum,who,1,0,0,100,50
plum,verb,2,100,0,200,50
"""
READERS = {"P01": "volunteer", "P02": "visitor", "P03": "visitor"}
TRIALS = [(0.1, 0.25, 1, "pear", "early"), (0.4, 0.25, 2, "plum", "late")]
#: Onset after the clock's start, duration, x and whether a blink lies just before, by reader.
FIXATIONS = {
    "P01": [(110, 40, 50, 0), (160, 60, 150, 0), (230, 70, 60, 0), (410, 99, 150, 0)],
    "P02": [(120, 50, 150, 0), (200, 50, 50, 0), (420, 30, 50, 0), (470, 90, 120, 1)],
    "P03": [(130, 30, 50, 0), (405, 80, 50, 0)],
}


def in_trial(at_ms: int) -> tuple[int, str, str]:
    """The trial, text and cue of a fixation."""
    return next((t, i, c) for s, d, t, i, c in TRIALS if 1000 * s <= at_ms < 1000 * (s + d))


def write_common(folder: Path, study: dict[str, str]) -> Path:
    """Write the study file and what both kinds of log have in common."""
    text = STUDY
    for key, value in study.items():
        text = text.replace(key, value)
    (folder / "study.toml").write_text(text, encoding="utf-8", newline="\n")
    (folder / "boxes.csv").write_text(BOXES, encoding="utf-8", newline="\n")
    (folder / "notes.csv").write_text(
        "participant,trial,reason\nP03,,fell asleep\n", encoding="utf-8", newline="\n"
    )
    return folder / "study.toml"


def write_dataset(folder: Path) -> Path:
    """The study as a dataset of the standard."""
    data = Dataset(folder)
    for file in (folder / "sub-P01/beh").iterdir():
        file.unlink()
    for reader, fixations in FIXATIONS.items():
        gaze = {}
        for onset, duration, x, _ in fixations:
            gaze.update(dict.fromkeys(range(onset, onset + duration), x))
        data.samples(((CLOCK_MS + ms, gaze.get(ms, "n/a"), 25, 3) for ms in range(700)), sub=reader)
        rows: list[tuple[object, ...]] = []
        for onset, duration, _, blink in fixations:
            if blink:
                rows.append((CLOCK_MS + onset - 8, 5, "blink", "n/a"))
            rows.append((CLOCK_MS + onset, duration, "fixation", 0))
        data.events([(CLOCK_MS, 9, "saccade", 0), *rows], sub=reader)
        data.task(TRIALS, ("onset", "duration", "trial", "item", "cue"), sub=reader)
    table = "".join(f"sub-{reader}\t{group}\n" for reader, group in READERS.items())
    (folder / "participants.tsv").write_text(
        f"participant_id\tgroup\n{table}", encoding="utf-8", newline="\n"
    )
    return write_common(
        folder,
        {
            "FILES": '"sub-*/**/*_physio.tsv.gz"',
            "KIND": "bids",
            "MORE": "",
            "COLUMNS": "",
            "READERS": "participants.tsv",
        },
    )


def write_tables(folder: Path) -> Path:
    """The same study as a table a reader."""
    folder.mkdir(parents=True, exist_ok=True)
    for reader, fixations in FIXATIONS.items():
        touched = [
            int(
                blink
                or (
                    (at + 1 < len(fixations) and fixations[at + 1][3] == 1)
                    and in_trial(fixations[at + 1][0]) == in_trial(onset)
                )
            )
            for at, (onset, _, _, blink) in enumerate(fixations)
        ]
        rows = [
            "\t".join(
                map(str, (reader, *in_trial(onset), CLOCK_MS + onset, duration, x, 25, touched[at]))
            )
            for at, (onset, duration, x, _) in enumerate(fixations)
        ]
        header = "reader\ttrial\titem\tcue\tonset\tduration\tx\ty\tblink"
        (folder / f"{reader}.tsv").write_text(
            "\n".join([header, *rows, ""]), encoding="utf-8", newline="\n"
        )
    rows = [f"{reader},{group}" for reader, group in READERS.items()]
    (folder / "readers.csv").write_text(
        "\n".join(["participant,group", *rows, ""]), encoding="utf-8", newline="\n"
    )
    return write_common(
        folder,
        {
            "FILES": '"P*.tsv"',
            "KIND": "table",
            "MORE": "",
            "COLUMNS": COLUMNS,
            "READERS": "readers.csv",
        },
    )


def built(path: Path, workers: int = 1) -> Path:
    """Build a study; the folder of its tables."""
    return etl.build(etl.load_study(path), workers=workers).folder


def test_dataset_gives_the_tables_of_the_same_study_as_tables(tmp_path: Path) -> None:
    """Outcomes, trials, regressions and accounts are the same bytes from either kind of log."""
    one, other = built(write_dataset(tmp_path / "bids")), built(write_tables(tmp_path / "table"))
    for name in (
        *("outcomes.csv", "outcomes.parquet", "outcomes_wide.csv", "trials.csv"),
        *("regressions.csv", "accounts.csv"),
    ):
        assert (one / name).read_bytes() == (other / name).read_bytes(), name


def test_fixations_differ_in_their_source_alone(tmp_path: Path) -> None:
    """Every fixation is the same, but for file and line; the file is that of the events."""
    frames = [
        pd.read_parquet(built(path) / "fixations.parquet")
        for path in (write_dataset(tmp_path / "bids"), write_tables(tmp_path / "table"))
    ]
    source = ["source_file", "source_line"]
    pd.testing.assert_frame_equal(*(frame.drop(columns=source) for frame in frames))
    first = frames[0].iloc[0]
    assert first.source_file == f"sub-P01/beh/sub-P01{RUN}_physioevents.tsv.gz"
    assert first.source_line == 2


def test_run_record_names_every_file(tmp_path: Path) -> None:
    """Samples, events and sidecars are among the inputs, each with its digest."""
    run = json.loads((built(write_dataset(tmp_path)) / "run.json").read_text(encoding="utf-8"))
    roles = {entry["role"] for entry in run["inputs"]}
    assert {"log", "samples", "sidecar", "trials", "facts", "notes"} <= roles


def test_second_eye_changes_nothing_where_the_first_counts(tmp_path: Path) -> None:
    """With both eyes recorded and one chosen, the outcomes are those of that eye alone."""
    path = write_dataset(tmp_path)
    before = (built(path) / "outcomes.parquet").read_bytes()
    data = tmp_path / "recording-eye2_physio.json"
    (tmp_path / "physio.json").unlink()
    left = told(RECORDING, RecordedEye="left")
    data.write_text(json.dumps(left), encoding="utf-8")
    (tmp_path / "recording-eye1_physio.json").write_text(json.dumps(RECORDING), encoding="utf-8")
    for suffix in ("physio", "physioevents"):
        for file in sorted(tmp_path.glob(f"sub-*/beh/*_recording-eye1_{suffix}.tsv.gz")):
            file.with_name(file.name.replace("eye1", "eye2")).write_bytes(file.read_bytes())
    with pytest.raises(DataError, match="nothing says which one counts for this reader"):
        built(path)
    text = path.read_text(encoding="utf-8")
    chosen = text.replace("[participants]\n", '[logs.eye]\nuse = "right"\n\n[participants]\n', 1)
    path.write_text(chosen, encoding="utf-8", newline="\n")
    assert (built(path) / "outcomes.parquet").read_bytes() == before


def test_recordings_of_something_else_are_passed_over_and_noted(tmp_path: Path) -> None:
    """A recording of breathing that the pattern finds too is no log, and is told of."""
    path = write_dataset(tmp_path)
    for reader in FIXATIONS:
        folder = tmp_path / f"sub-{reader}/beh"
        (folder / f"sub-{reader}_task-read_recording-belt_physio.tsv.gz").write_bytes(b"")
    belt = told(RECORDING, PhysioType="generic", Columns=["respiratory"])
    # In a sidecar of its own folder, which goes before the dataset's.
    for reader in FIXATIONS:
        name = f"sub-{reader}/beh/sub-{reader}_task-read_recording-belt_physio.json"
        (tmp_path / name).write_text(json.dumps(belt), encoding="utf-8")
    findings = etl.check(etl.load_study(path))
    assert not findings.failed, findings.text()
    assert "note: sub-P01/beh/sub-P01_task-read_recording-belt_physio.tsv.gz: 3 recordings of " in (
        findings.text()
    )


@pytest.mark.parametrize("pattern", ["sub-*/**/*_physio.tsv.gz", "sub-*/**/*.tsv.gz"])
def test_events_without_their_recording_are_refused(tmp_path: Path, pattern: str) -> None:
    """A reader is not lost silently with a recording that was not copied."""
    path = write_dataset(tmp_path)
    (tmp_path / f"sub-P02/beh/sub-P02{RUN}_physio.tsv.gz").unlink()
    text = path.read_text(encoding="utf-8").replace("sub-*/**/*_physio.tsv.gz", pattern)
    path.write_text(text, encoding="utf-8", newline="\n")
    with pytest.raises(DataError, match=r"physioevents\.tsv\.gz: the recording of these events is"):
        built(path)


def test_pattern_that_finds_no_eyes_says_so(tmp_path: Path) -> None:
    """Where no recording is one of the eyes, the key that says so is named."""
    path = write_dataset(tmp_path)
    values = told(RECORDING, PhysioType="generic")
    (tmp_path / "physio.json").write_text(json.dumps(values), encoding="utf-8")
    with pytest.raises(DataError, match="no recording that this finds is one of the eyes"):
        built(path)


def test_logs_of_two_datasets_are_refused(tmp_path: Path) -> None:
    """The label P01 of one dataset is not the reader P01 of another."""
    write_dataset(tmp_path / "one")
    write_dataset(tmp_path / "two")
    text = (tmp_path / "one/study.toml").read_text(encoding="utf-8")
    text = text.replace('"sub-*/**', '"*/sub-*/**')
    (tmp_path / "study.toml").write_text(text, encoding="utf-8", newline="\n")
    for name in ("boxes.csv", "notes.csv", "participants.tsv"):
        (tmp_path / name).write_bytes((tmp_path / "one" / name).read_bytes())
    with pytest.raises(DataError, match='the logs are of several datasets; found "one, two"'):
        built(tmp_path / "study.toml")


@pytest.mark.parametrize("spelled", ["P03", "sub-P03"])
def test_tables_name_readers_with_or_without_their_entity(tmp_path: Path, spelled: str) -> None:
    """In notes as in tables, sub- before a label is left out."""
    path = write_dataset(tmp_path)
    (tmp_path / "notes.csv").write_text(
        f"participant_id,trial,reason\n{spelled},,fell asleep\n", encoding="utf-8", newline="\n"
    )
    frame = pd.read_csv(built(path) / "outcomes.csv")
    assert sorted(frame.participant.unique()) == ["P01", "P02"]
    assert sorted(frame.group.unique()) == ["visitor", "volunteer"]


def test_reader_table_with_both_spellings_of_a_reader_is_refused(tmp_path: Path) -> None:
    """P01 and sub-P01 are one reader."""
    path = write_dataset(tmp_path)
    with (tmp_path / "participants.tsv").open("a", encoding="utf-8", newline="\n") as file:
        file.write("P01\tvisitor\n")
    with pytest.raises(DataError, match=r"participants\.tsv:5: two rows have the same participant"):
        built(path)


@pytest.mark.slow
def test_workers_give_the_same_bytes(tmp_path: Path) -> None:
    """Two processes build what one builds."""
    path = write_dataset(tmp_path)
    one = (built(path) / "outcomes.parquet").read_bytes()
    assert (built(path, workers=2) / "outcomes.parquet").read_bytes() == one
