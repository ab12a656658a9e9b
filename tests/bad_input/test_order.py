"""Fixations that go back in time or overlap, and trials that were recorded twice."""

import json
from pathlib import Path

import pyarrow.parquet as pq
import pytest

from tests.bad_input.small_study import SmallStudy, log

P01 = "logs/P01.tsv"
SECOND_RECORDING = log("P01", trials=[1]).split("\n", 1)[1].replace("\t1000", "\t3000")


def test_fixations_that_go_back_in_time(study: SmallStudy) -> None:
    """Without numbers, onsets must not go back within a trial."""
    study.change(P01, "1000250\t200", "1000750\t200")
    assert study.refusal() == (
        "logs/P01.tsv:4: the fixation begins before the one above it in the same trial; found "
        '"onset 1000500 ms after 1000750 ms", expected onsets that never go back within a trial\n'
        "    fix: sort the log by onset; if the trial was started again, give it a session or a "
        "trial number of its own\n"
        "1 problem; nothing was written\n"
    )


def test_numbers_against_onsets(study: SmallStudy) -> None:
    """Numbers that contradict the onsets are refused."""
    study.change("study.toml", 'onset = "start_ms"', 'onset = "start_ms"\nfixation = "n"')
    for reader in ("P01", "P02"):
        head, *rows = log(reader).rstrip("\n").split("\n")
        numbered = [f"{line}\t{number % 3 + 1}" for number, line in enumerate(rows)]
        study.write(f"logs/{reader}.tsv", "\n".join([f"{head}\tn", *numbered, ""]))
    study.change(P01, "1000250\t200", "1000750\t200")
    assert study.refusal() == (
        "logs/P01.tsv:4: the fixation begins before the one with the number before it; found "
        '"onset 1000500 ms after 1000750 ms", expected onsets that never go back within a trial\n'
        "    fix: correct the numbers or the onsets; if the trial was started again, give it a "
        "session or a trial number of its own\n"
        "1 problem; nothing was written\n"
    )


def test_number_that_is_not_whole(study: SmallStudy) -> None:
    """Fixations are numbered in whole numbers."""
    study.change("study.toml", 'onset = "start_ms"', 'fixation = "start_ms"')
    study.change(P01, "1000250\t200", "1000250.5\t200")
    assert study.refusal() == (
        'logs/P01.tsv:3: column "start_ms": the fixation\'s number is not whole; found '
        '"1000250.5", expected a whole number\n'
        "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]\n"
        "1 problem; nothing was written\n"
    )


def test_overlap_beyond_rounding(study: SmallStudy) -> None:
    """A fixation that begins well before the one before it ends is refused."""
    study.change(P01, "1000250\t200", "1000250\t253")
    assert study.refusal() == (
        'logs/P01.tsv:4: the fixation begins before the one before it is over; found "onset '
        '1000500 ms, 3 ms too early", expected no overlap with logs/P01.tsv:3 beyond 2 ms, which '
        "is taken for rounding\n"
        "    fix: check that onset and duration are the right columns with the right units, and "
        "that only one eye is read ([logs.where])\n"
        "1 problem; nothing was written\n"
    )


def test_overlap_by_rounding_is_counted(study: SmallStudy) -> None:
    """An overlap of two milliseconds is taken for rounding, said and counted."""
    study.change(P01, "1000250\t200", "1000250\t252")
    result = study.run("build", "study.toml")
    counts = json.loads(Path("out/run.json").read_text(encoding="utf-8"))["counts"]
    assert result.exit_code == 0
    assert (
        "1 fixation reaches into the next one by no more than 2 ms, which is taken for rounding"
        in (result.stdout)
    )
    assert counts["overlaps taken for rounding"] == 1


def test_end_before_onset(study: SmallStudy) -> None:
    """Where the log gives ends, a fixation ends after it began."""
    study.change("study.toml", 'duration = "dur_ms"', 'end = "dur_ms"')
    for reader in ("P01", "P02"):
        text = log(reader)
        for onset in (1000000, 1000250, 1000500, 2000000, 2000250, 2000500):
            text = text.replace(f"\t{onset}\t200", f"\t{onset}\t{onset + 200}")
        study.write(f"logs/{reader}.tsv", text)
    study.change(P01, "1000250\t1000450", "1000250\t1000250")
    assert study.refusal() == (
        'logs/P01.tsv:3: column "dur_ms": the fixation does not end after its onset; found '
        '"1000250", expected an end after its onset\n'
        "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]\n"
        "1 problem; nothing was written\n"
    )


def test_trial_recorded_twice(study: SmallStudy) -> None:
    """A trial that comes again after others is refused unless the study says which counts."""
    study.add(P01, SECOND_RECORDING)
    assert study.refusal() == (
        'logs/P01.tsv:8: a trial is recorded a second time; found "trial 1", expected one '
        "recording of each trial; the first begins in logs/P01.tsv:2\n"
        '    fix: say which counts by [trials] repeated = "first" or "last", or tell the two '
        "apart by a session\n"
        "1 problem; nothing was written\n"
    )


@pytest.mark.parametrize(
    ("repeated", "kept_lines"), [("first", [2, 3, 4]), ("last", [8, 9, 10])], ids=["first", "last"]
)
def test_one_recording_is_taken(study: SmallStudy, repeated: str, kept_lines: list[int]) -> None:
    """Of a trial recorded twice the stated one is kept, and the other is told apart."""
    study.add(P01, SECOND_RECORDING)
    study.add("study.toml", f'\n[trials]\nrepeated = "{repeated}"\n')
    assert study.run("build", "study.toml").exit_code == 0
    fixations = pq.read_table("out/fixations.parquet").to_pylist()
    own = [f for f in fixations if (f["participant"], str(f["trial"])) == ("P01", "1")]
    assert sorted(f["source_line"] for f in own if f["kept"]) == kept_lines
    assert {f["left_out_by"] for f in own if not f["kept"]} == {"repeated"}
