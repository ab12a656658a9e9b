"""Simulated studies are written as asked: dialects, places in the logs, large studies."""

from __future__ import annotations

import codecs
import csv
import gzip
import tomllib
from pathlib import Path

import numpy as np
import pytest

from tests.simulator import (
    Column,
    Dialect,
    LogFile,
    SimulatedStudy,
    lay_out,
    logs_by_reader,
    orchard_spec,
    simulate_study,
    write_bulk_study,
    write_orchard,
    write_study,
)
from tests.simulator.__main__ import PROJECT
from tests.simulator.bulk import REGION_LETTERS
from tests.simulator.layout import Grid
from tests.simulator.orchard import COLUMNS, laboratory_logs

LOGS = PROJECT / "sample_logs" / "orchard" / "logs"


@pytest.fixture(scope="module")
def small() -> SimulatedStudy:
    """Two readers, eight items, no practice."""
    rng = np.random.Generator(np.random.PCG64(11))
    return simulate_study(orchard_spec(rng, readers=2, items=8, with_fillers=False), rng)


@pytest.mark.parametrize(
    "dialect",
    [
        Dialect(),
        Dialect(delimiter=";", decimal=","),
        Dialect(encoding="utf-16-le", mark=True, newline="\r\n"),
        Dialect(encoding="utf-8", mark=True, newline="\r\n", delimiter=","),
        Dialect(compressed=True),
        Dialect(banner=("# one", "# two")),
        Dialect(both_eyes=True),
    ],
    ids=["plain", "comma decimals", "utf-16", "utf-8 with mark", "gz", "banner", "both eyes"],
)
def test_places_name_the_line_of_each_fixation(
    dialect: Dialect, small: SimulatedStudy, tmp_path: Path
) -> None:
    """In every dialect the named line of the named file holds that fixation of the right eye."""
    logs = [LogFile("logs/all.txt", small.trials, dialect)]
    places = write_study(small, tmp_path, columns=COLUMNS, logs=logs)
    raw = (tmp_path / "logs" / "all.txt").read_bytes()
    raw = gzip.decompress(raw) if dialect.compressed else raw
    text = raw.decode(dialect.encoding).removeprefix("\ufeff")
    lines = text.split(dialect.newline)
    assert lines.pop() == ""
    for trial in small.trials:
        for fixation in trial.fixations:
            key = trial.plan.participant, trial.plan.trial, fixation.fixation
            name, line = places[key]
            cells = lines[line - 1].split(dialect.delimiter)
            assert name == "logs/all.txt"
            assert (cells[0], int(cells[1]), int(cells[2]), cells[-1]) == (*key, "R")
            assert float(cells[5].replace(dialect.decimal, ".")) == fixation.x_px


def test_unrecorded_trial_is_in_the_list_but_in_no_log(orchard: SimulatedStudy) -> None:
    """Trial 23 of P11 was planned, and its log jumps from 22 to 24."""
    with (LOGS / "P11.tsv").open(encoding="utf-8", newline="") as stream:
        numbers = {int(row["trial"]) for row in csv.DictReader(stream, delimiter="\t")}
    assert numbers == set(range(1, 45)) - {23}
    assert not orchard.trial("P11", 23).recorded


def test_comma_decimal_log_has_semicolons_and_no_points() -> None:
    """The log of P05 is what a spreadsheet in many countries saves."""
    text = (LOGS / "P05.csv").read_text(encoding="utf-8")
    assert text.startswith("reader;trial;fix;")
    assert "." not in text


def test_utf_16_log_has_mark_and_windows_line_ends() -> None:
    """The log of P09 starts with a byte-order mark, and every line ends in CR LF."""
    raw = (LOGS / "P09.tsv").read_bytes()
    assert raw.startswith(codecs.BOM_UTF16_LE)
    text = raw.decode("utf-16")
    assert text.count("\r\n") == text.count("\n") > 100


def test_remarks_stand_above_the_header() -> None:
    """The log of P17 has its header in the third line."""
    lines = (LOGS / "P17.tsv").read_text(encoding="utf-8").splitlines()
    assert [line[:6] for line in lines[:3]] == ["# orch", "# read", "reader"]


def test_every_trial_is_in_exactly_one_log(orchard: SimulatedStudy) -> None:
    """Two readers share a log, the others have one each, and nothing is lost on the way."""
    logs = laboratory_logs(orchard)
    assert len(logs) == 23
    found = [trial.plan for log in logs for trial in log.trials]
    assert sorted(map(str, found)) == sorted(str(trial.plan) for trial in orchard.trials)


def test_unknown_fact_is_refused(small: SimulatedStudy, tmp_path: Path) -> None:
    """A column that no fixation can fill is a mistake in the test that asks for it."""
    with pytest.raises(ValueError, match="no such fact in a simulated log: pupil"):
        write_study(small, tmp_path, columns=[Column("p", "pupil")])


def test_study_of_another_size_names_the_region_file_from_its_own_folder(
    small: SimulatedStudy, tmp_path: Path
) -> None:
    """A study can be written anywhere, with its region file anywhere else."""
    write_orchard(small, tmp_path / "a" / "study", tmp_path / "b" / "regions.csv")
    said = tomllib.loads((tmp_path / "a" / "study" / "study.toml").read_text(encoding="utf-8"))
    assert said["regions"]["file"] == "../../b/regions.csv"
    assert said["logs"]["files"] == ["logs/*.tsv"]


def test_sentences_come_again_under_new_item_names() -> None:
    """A study with more items than sentences uses the sentences again."""
    spec = orchard_spec(np.random.Generator(np.random.PCG64(1)), readers=4, items=40)
    assert spec.layouts["i33-early-odd"] == spec.layouts["i01-early-odd"]
    assert len({trial.item for trial in spec.trials if trial.facts["role"] == "target"}) == 40


def test_logs_by_reader_gives_each_reader_a_log(small: SimulatedStudy) -> None:
    """Only readers that are named get another ending and dialect."""
    dialect = Dialect(delimiter=";")
    logs = logs_by_reader(small, {"P02": (".csv", dialect)})
    assert [(log.name, log.dialect.delimiter) for log in logs] == [
        ("logs/P01.tsv", "\t"),
        ("logs/P02.csv", ";"),
    ]


def test_bulk_places_lie_in_the_regions_given_as_true(tmp_path: Path) -> None:
    """Each written place of a large study is in the word of the region its order names."""
    bulk = write_bulk_study(tmp_path, readers=3, trials=5, fixations=30, regions=4, seed=2)
    with (tmp_path / "regions.csv").open(encoding="utf-8", newline="") as stream:
        texts = [row["text"] for row in csv.DictReader(stream)]
    layouts = [lay_out(text, Grid(200, 500, 14, 60)) for text in texts]
    assert {len(word.text) for layout in layouts for word in layout.words} == {REGION_LETTERS}
    for number, path in enumerate(sorted((tmp_path / "logs").iterdir())):
        with path.open(encoding="utf-8", newline="") as stream:
            rows = list(csv.DictReader(stream, delimiter="\t"))
        found = []
        for row in rows:
            layout = layouts[int(row["trial"]) - 1]
            word = layout.word_at(float(row["gaze_x"]), float(row["gaze_y"]))
            found.append(None if word is None else word.region_order)
        assert found == bulk.orders[number].ravel().tolist()
        assert [int(row["dur_ms"]) for row in rows] == bulk.durations_ms[number].ravel().tolist()


def test_bulk_fixations_never_overlap(tmp_path: Path) -> None:
    """The clock of a large study runs forwards over all trials of a reader."""
    write_bulk_study(tmp_path, readers=1, trials=6, fixations=10, seed=4)
    with (tmp_path / "logs" / "R1.tsv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream, delimiter="\t"))
    starts = np.array([int(row["start_ms"]) for row in rows])
    ends = starts + np.array([int(row["dur_ms"]) for row in rows])
    assert (starts[1:] - ends[:-1] >= 20).all()


def test_bulk_text_outlasts_the_trial_it_belongs_to(tmp_path: Path) -> None:
    """Every fixation of a large study lies between its text's onset and offset."""
    write_bulk_study(tmp_path, readers=2, trials=6, fixations=10, seed=4)
    with (tmp_path / "trial_list.csv").open(encoding="utf-8", newline="") as stream:
        span = {
            (row["participant"], row["trial"]): (int(row["text_on_ms"]), int(row["text_off_ms"]))
            for row in csv.DictReader(stream)
        }
    for path in (tmp_path / "logs").iterdir():
        with path.open(encoding="utf-8", newline="") as stream:
            for row in csv.DictReader(stream, delimiter="\t"):
                on_ms, off_ms = span[row["reader"], row["trial"]]
                assert on_ms <= int(row["start_ms"])
                assert int(row["start_ms"]) + int(row["dur_ms"]) <= off_ms


def test_bulk_same_seed_gives_same_bytes(tmp_path: Path) -> None:
    """A large study can be made again."""
    for name in ("one", "two"):
        write_bulk_study(tmp_path / name, readers=2, trials=3, fixations=5, seed=9)
    files = [path for path in sorted((tmp_path / "one").rglob("*")) if path.is_file()]
    assert len(files) == 5
    for path in files:
        other = tmp_path / "two" / path.relative_to(tmp_path / "one")
        assert path.read_bytes() == other.read_bytes()


def test_bulk_refuses_regions_beyond_the_screen(tmp_path: Path) -> None:
    """Thirteen words of ten characters do not fit 1920 px."""
    with pytest.raises(ValueError, match="1 to 12 regions fit the screen, not 13"):
        write_bulk_study(tmp_path, regions=13)
