"""A study whose logs hold gaze samples gives the very tables of the fixations they were made of."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import etl
from tests.end_to_end.building import rows_of, write
from tests.simulator.samples import samples_of

STUDY = """\
[logs]
files = ["logs/*.tsv"]

[logs.columns]
participant = "reader"
trial = "trial"
item = "sentence"
onset = "time"
x = "x"
y = "y"
{columns}
[screen]
width_px = 1000
height_px = 600

[regions]
file = "regions.csv"
kind = "boxes"
{tables}
[measures]
outcomes = ["binary", "count", "duration"]
"""
DETECTION = '\n[logs.samples]\nmethod = "engbert_kliegl"\nshortest_fixation_ms = 30\n'
REGIONS = "item,region,order,left,top,right,bottom\n" + "".join(
    f"{item},{region},{order},{100 * order},200,{100 * order + 100},300\n"
    for item in ("pear", "plum")
    for order, region in enumerate(("who", "verb", "fruit", "end"), start=1)
)
Fixation = tuple[float, float, float, float]


def trials() -> list[tuple[str, int, str, list[Fixation]]]:
    """Reader, trial, item and fixations, with gaps of 1 to 60 ms, in whole milliseconds."""
    rng = np.random.default_rng(20_260_101)
    made = []
    for reader in ("P01", "P02", "P03"):
        clock_ms = 50_000.0
        for trial in range(1, 9):
            fixations: list[Fixation] = []
            for _ in range(int(rng.integers(4, 14))):
                duration_ms = float(rng.integers(40, 420))
                x = float(rng.integers(900, 5100)) / 10
                fixations.append((clock_ms, duration_ms, x, float(rng.integers(1900, 3100)) / 10))
                clock_ms += duration_ms + float(rng.integers(1, 60))
            made.append((reader, trial, ("pear", "plum")[trial % 2], fixations))
            clock_ms += 700
    return made


def write_study(folder: Path, *, samples: bool, detection: str = DETECTION) -> Path:
    """Write the study with a row a fixation, or a row a sample."""
    logs: dict[str, list[str]] = {}
    for reader, trial, item, fixations in trials():
        rows = logs.setdefault(f"logs/{reader}.tsv", [])
        if samples:
            made = samples_of(fixations)
            values = zip(made.t_ms.tolist(), made.x_px.tolist(), made.y_px.tolist(), strict=True)
            rows += [
                f"{reader}\t{trial}\t{item}\t{t:.0f}\t{x}\t{y}".replace("nan", ".")
                for t, x, y in values
            ]
        else:
            rows += [f"{reader}\t{trial}\t{item}\t{t}\t{x}\t{y}\t{d}" for t, d, x, y in fixations]
    header = "reader\ttrial\tsentence\ttime\tx\ty" + ("" if samples else "\tduration")
    study = STUDY.format(
        columns="" if samples else 'duration = "duration"\n', tables=detection if samples else ""
    )
    files = {name: "\n".join([header, *rows, ""]) for name, rows in logs.items()}
    return write(folder, {"study.toml": study, "regions.csv": REGIONS, **files})


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> dict[bool, Path]:
    """The folders of tables, from logs of samples and from logs of fixations."""
    folders = {}
    for samples in (True, False):
        folder = tmp_path_factory.mktemp("samples" if samples else "fixations")
        study = etl.load_study(write_study(folder, samples=samples))
        folders[samples] = etl.build(study, workers=1).folder
    return folders


@pytest.mark.parametrize("table", ["outcomes", "outcomes_wide", "trials", "regressions"])
def test_samples_give_the_tables_of_their_fixations(built: dict[bool, Path], table: str) -> None:
    """Outcomes from samples are, byte for byte, those of the fixations they were made from."""
    one, other = (built[samples] / f"{table}.parquet" for samples in (True, False))
    assert one.read_bytes() == other.read_bytes()
    assert rows_of(built[True], table)


def test_fixations_differ_in_their_lines_alone(built: dict[bool, Path]) -> None:
    """A fixation's line in a log of samples is that of its first sample."""
    one, other = (rows_of(built[samples], "fixations") for samples in (True, False))
    lines = [row.pop("source_line") for row in one]
    assert lines != [row.pop("source_line") for row in other]
    assert one == other
    assert len(one) == sum(len(fixations) for *_, fixations in trials())


def test_run_record_names_the_method(built: dict[bool, Path]) -> None:
    """The record has the method and every parameter, with defaults filled in."""
    record = json.loads((built[True] / "run.json").read_text(encoding="utf-8"))
    samples = record["study"]["logs"]["samples"]
    assert (samples["method"], samples["threshold_factor"]) == ("engbert_kliegl", 6.0)
    assert (samples["shortest_saccade_ms"], samples["longest_gap_ms"]) == (12.0, 0.0)
    assert samples["shortest_fixation_ms"] == 30.0
    logs = [entry for entry in record["inputs"] if entry["role"] == "log"]
    assert len(logs) == 3
    for entry in logs:
        fates = [count for name, count in entry.items() if name.startswith("samples ")]
        assert sum(fates) == entry["samples"]


def test_check_names_samples_out_of_order(tmp_path: Path) -> None:
    """Before anything is written, a log whose samples go back in time is named with its line."""
    study = write_study(tmp_path, samples=True)
    log = tmp_path / "logs" / "P02.tsv"
    lines = log.read_text(encoding="utf-8").splitlines(keepends=True)
    lines[100], lines[101] = lines[101], lines[100]
    log.write_text("".join(lines), encoding="utf-8", newline="\n")
    findings = etl.check(etl.load_study(study), workers=1)
    assert findings.failed
    assert 'P02.tsv:102: column "time": the samples of a trial go back in time' in findings.text()


def test_dispersion_builds_too(tmp_path: Path) -> None:
    """The other method reads the same logs; its fixations need not be the same."""
    detection = '\n[logs.samples]\nmethod = "dispersion"\ndispersion_px = 20\n'
    study = etl.load_study(write_study(tmp_path, samples=True, detection=detection))
    result = etl.build(study, workers=1)
    made = [fixation for *_, fixations in trials() for fixation in fixations]
    found = rows_of(result.folder, "fixations")
    assert len(found) == pytest.approx(len(made), rel=0.1)
    onsets = {row["onset_ms"] for row in found}
    near = [
        any(onset - 12 <= got <= onset for got in onsets)
        for onset, duration, *_ in made
        if (duration >= 100)
    ]
    assert np.mean(near) > 0.9


def test_method_and_its_source_are_told(built: dict[bool, Path]) -> None:
    """What was noticed in a build says which paper the fixations are found by, and the rate."""
    record = json.loads((built[True] / "run.json").read_text(encoding="utf-8"))
    assert (
        "note: study.toml:20: fixations were found in gaze samples, 1000 a second (3 logs), by the "
        "velocity-based method of Engbert & Kliegl (2003, doi:10.1016/S0042-6989(03)00084-1), "
        "threshold_factor = 6, shortest_saccade_ms = 12, shortest_fixation_ms = 30, "
        "longest_gap_ms = 0"
    ) in "\n".join(record["warnings"])
