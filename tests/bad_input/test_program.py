"""The command as a program of its own: exit status, streams and folders."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.bad_input.small_study import SmallStudy

PROJECT = Path(__file__).resolve().parents[2]


def run(*arguments: str) -> subprocess.CompletedProcess[str]:
    """Run the command in the current folder, as a shell would."""
    environment = {**os.environ, "PYTHONPATH": str(PROJECT), "PYTHONUTF8": "1"}
    return subprocess.run(
        [sys.executable, "-m", "etl.cli", *arguments],
        capture_output=True,
        encoding="utf-8",
        env=environment,
        check=False,
        timeout=120,
    )


def test_program_refuses_with_status_2(study: SmallStudy) -> None:
    """A wrong log: status 2, the message on stderr, nothing on stdout, nothing written."""
    study.change("logs/P02.tsv", "1000250\t200", "1000250\ttwo")
    before = study.content()
    done = run("build", "study.toml")
    assert (done.returncode, done.stdout) == (2, "")
    assert study.content() == before
    assert done.stderr == (
        'logs/P02.tsv:3: column "dur_ms": this is no number; found "two", expected a number in '
        "ms\n"
        "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
        "1 problem; nothing was written\n"
    )


def test_program_refuses_alike_with_workers(study: SmallStudy) -> None:
    """Worker processes find the same problems, in the same order."""
    study.write("logs/P01.tsv", b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR")
    study.change("logs/P02.tsv", "1000250\t200", "1000250\ttwo")
    before = study.content()
    alone = run("build", "study.toml", "--workers", "1")
    together = run("build", "study.toml", "--workers", "2")
    assert (together.returncode, together.stdout, together.stderr) == (2, "", alone.stderr)
    assert study.content() == before


@pytest.mark.skipif(os.name == "nt", reason="on Windows the rights of a folder work otherwise")
def test_program_refuses_a_folder_it_may_not_write(study: SmallStudy) -> None:
    """A folder that may not be written is the user's matter, not a fault of the program."""
    locked = study.folder / "locked"
    locked.mkdir()
    locked.chmod(0o500)
    if os.access(locked, os.W_OK):
        pytest.skip("this user may write into any folder")
    done = run("build", "study.toml", "--into", "locked/out")
    locked.chmod(0o700)
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith("locked/out: the output folder cannot be written (")
