"""What somebody who looks on is shown of the logs as they are understood."""

from __future__ import annotations

from pathlib import Path

import pytest

import etl
from tests.drafting.small_logs import put, write_readers
from tests.drafting.test_line_words import log

COLUMNS = {
    "reader": "participant",
    "trial": "trial",
    "start": "onset",
    "dur": "duration",
    "gx": "x",
    "gy": "y",
}


def test_readers_and_trials_of_all_logs_are_counted(tmp_path: Path) -> None:
    """Whoever sees fewer trials than were read knows that something is wrong."""
    shown = etl.draft(write_readers(tmp_path, COLUMNS)).first_trial
    assert shown.endswith("\n\nUnderstood so: 3 readers and 36 trials in 3 logs.")


def test_logs_that_do_not_read_are_counted(tmp_path: Path) -> None:
    """A log that the draft does not fit is no reason to show nothing."""
    write_readers(tmp_path, COLUMNS)
    put(tmp_path / "P03.tsv", "reader\ttrial\tstart\tdur\tgx\tgy\nP03\t1\tnever\t200\t1\t1\n" * 2)
    shown = etl.draft(
        [tmp_path / "P01.tsv", tmp_path / "P02.tsv", tmp_path / "P03.tsv"]
    ).first_trial
    assert "2 readers and 24 trials in 3 logs; 1 log cannot be read so." in shown


@pytest.mark.parametrize(
    "begins",
    [
        pytest.param(lambda t: f"trial {t} text {'U' if t < 3 else ''}{t}", id="by its text"),
        pytest.param(lambda t: f"trial {t} kind {'warmup' if t < 3 else 'main'}", id="by a fact"),
    ],
)
def test_practice_is_not_the_only_trial_shown(begins: object, tmp_path: Path) -> None:
    """Where the first trials are few and named otherwise, one from the middle is shown too."""
    shown = etl.draft([put(tmp_path / "P01.txt", log(begins))]).first_trial  # type: ignore[arg-type]
    assert "The first looks like practice; one from the middle (participant P01, trial 7" in shown


def test_first_trial_like_the_others_stands_alone(tmp_path: Path) -> None:
    """Where nothing looks like practice, one trial is enough."""
    shown = etl.draft(
        [put(tmp_path / "P01.txt", log(lambda t: f"trial {t} text p{t}"))]
    ).first_trial
    assert "practice" not in shown
    assert "trial 1" in shown


def test_log_that_is_hardly_a_table_is_told_why_it_was_taken_for_one(tmp_path: Path) -> None:
    """Rows of too few fields are told once, with what the log was taken for and what to do."""
    rows = "".join(f"mark {n} apple 3\n" for n in range(60)) + "pause\nrest now\n"
    with pytest.raises(etl.DataError) as wrong:
        etl.draft([put(tmp_path / "P01.txt", f"what number of things\n{rows}")])
    (problem,) = wrong.value.findings.of("error")
    assert problem.problem == (
        "the log was taken for a table, because 97% of the lines below line 1 have 4 fields "
        "between blanks as that line has, but other lines have not"
    )
    assert (problem.line, problem.found) == (62, "pause")
    assert "If its lines tell of events" in problem.fix
