"""The command ``draft`` as a user meets it: what is said where, the exit status, the time."""

from __future__ import annotations

import sys
import time
from pathlib import Path

import pytest

from tests.drafting.small_logs import put, write_readers
from tests.end_to_end.running import ESCAPE, run

COLUMNS = {
    "reader": "participant",
    "trial": "trial",
    "start": "onset",
    "dur": "duration",
    "gx": "x",
    "gy": "y",
}
QUESTIONS = """\
2 questions to answer, each in place of a "?":
  line  68  regions.file
           which file defines the regions of each text?
  line  71  regions.kind
           of which kind is that file? "marked_text" (a text a row, its regions in braces),
           "words" (a text a row, every word a region), "boxes" or "wkt" (a region a row)
"""


def test_draft_says_where_it_is_and_what_is_asked(tmp_path: Path) -> None:
    """On stdout stand the file, the questions with their lines, and what to do next."""
    write_readers(tmp_path / "logs", COLUMNS)
    ran = run("draft", "logs", folder=tmp_path)
    assert (ran.status, ran.err) == (0, "")
    assert ran.out == (
        "Written to study.toml: 11 guesses from 3 logs, each with its evidence above it.\n\n"
        f"{QUESTIONS}\nThen: trialwright check study.toml\n"
    )
    assert (tmp_path / "study.toml").is_file()


def test_check_of_a_draft_asks_its_questions(tmp_path: Path) -> None:
    """What is open is told by check with the same lines, and nothing else is."""
    write_readers(tmp_path / "logs", COLUMNS)
    run("draft", "logs", folder=tmp_path)
    ran = run("check", "study.toml", folder=tmp_path)
    assert (ran.status, ran.out) == (2, "")
    problems = [line for line in ran.err.split("\n") if line.startswith("study.toml")]
    said = "a question of the draft is still open"
    assert [line.partition(f": {said}")[0] for line in problems] == [
        "study.toml:68: regions.file",
        "study.toml:71: regions.kind",
    ]


def test_draft_goes_where_it_is_told(tmp_path: Path) -> None:
    """With --into the file has that name, and the logs are named from its folder."""
    write_readers(tmp_path / "logs", COLUMNS)
    (tmp_path / "studies").mkdir()
    ran = run("draft", "logs/*.tsv", "--into", "studies/pears.toml", folder=tmp_path)
    assert ran.status == 0
    text = (tmp_path / "studies" / "pears.toml").read_text(encoding="utf-8")
    assert 'files = ["../logs/*.tsv"]' in text
    assert "`trialwright check pears.toml`" in text


def test_draft_is_printed_alone(tmp_path: Path) -> None:
    """With --into - the study file is all that stands on stdout, and nothing is written."""
    write_readers(tmp_path / "logs", COLUMNS)
    ran = run("draft", "logs", "--into", "-", folder=tmp_path)
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.startswith("# A draft of a study file, ")
    assert ran.out.endswith('formats = ["parquet", "csv"]\n')
    assert [path.name for path in tmp_path.iterdir()] == ["logs"]


def test_study_file_that_is_there_is_kept(tmp_path: Path) -> None:
    """A draft never replaces a file: status 2, and the file is as it was."""
    write_readers(tmp_path / "logs", COLUMNS)
    kept = put(tmp_path / "study.toml", "title = 'mine'\n")
    ran = run("draft", "logs", folder=tmp_path)
    assert (ran.status, ran.out) == (2, "")
    assert ran.err == (
        "study.toml: there is a file of this name already, and a draft never replaces one\n"
        "    fix: write the draft elsewhere with --into, or move the file away\n"
        "1 problem; nothing was written\n"
    )
    assert kept.read_text(encoding="utf-8") == "title = 'mine'\n"


@pytest.mark.parametrize(
    ("content", "said"),
    [
        pytest.param(b"", "the file is empty", id="nothing"),
        pytest.param(b"\x89PNG\r\n\x1a\n", "this is no text file", id="a picture"),
        pytest.param(b"dear diary\nit rained\n", "this looks like no table", id="a letter"),
        pytest.param(b"P01\t1\t200\nP01\t2\t210\n", "this looks like no table", id="no header"),
        pytest.param(b"reader\ttrial\n", "this looks like no table", id="no row"),
        pytest.param(b"reader\ttrial\nP01\t\x00\n", "the text holds a zero byte", id="a NUL"),
    ],
)
def test_log_that_is_not_understood_is_refused(content: bytes, said: str, tmp_path: Path) -> None:
    """What cannot be understood ends with the file's name and status 2; nothing is written."""
    (tmp_path / "P01.tsv").write_bytes(content)
    ran = run("draft", "P01.tsv", folder=tmp_path)
    assert (ran.status, ran.out) == (2, "")
    assert ran.err.startswith("P01.tsv:")
    assert said in ran.err
    assert [path.name for path in tmp_path.iterdir()] == ["P01.tsv"]


@pytest.mark.skipif(sys.platform == "win32", reason="pseudo-terminals are of POSIX systems")
def test_first_trial_is_shown_on_a_terminal(tmp_path: Path) -> None:
    """Whoever looks on sees the first fixations as they are understood, in ms and px."""
    import pty  # noqa: PLC0415  (there is none on Windows)

    write_readers(tmp_path / "logs", COLUMNS)
    seen = bytearray()

    def read(handle: int) -> bytes:
        import os  # noqa: PLC0415

        part = os.read(handle, 65536)
        seen.extend(part)
        return part

    command = [sys.executable, "-m", "etl.cli", "draft", str(tmp_path / "logs"), "--into"]
    pty.spawn([*command, str(tmp_path / "study.toml")], read)
    shown = seen.decode("utf-8").replace("\r\n", "\n")
    assert "The first trial as it is understood (participant P01, trial 1; " in shown
    assert "fixation  onset_ms  duration_ms" in shown
    assert ESCAPE not in shown


def test_four_hundred_logs_take_seconds(tmp_path: Path) -> None:
    """Only the beginning of each log is looked at, however many there are."""
    write_readers(tmp_path / "logs", COLUMNS, readers=400, lines=3)
    began = time.perf_counter()
    ran = run("draft", "logs", folder=tmp_path)
    assert ran.status == 0
    # Two seconds on the machine where this was written; the rest is for slower ones.
    assert time.perf_counter() - began < 20
