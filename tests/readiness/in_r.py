"""R at test time: whether it is there, and what a script of it answers."""

from __future__ import annotations

import csv
import functools
import shutil
import subprocess
from collections.abc import Sequence
from pathlib import Path

import pytest


@functools.cache
def lacking(package: str) -> str:
    """Why R cannot be asked; empty where it can."""
    if shutil.which("Rscript") is None:
        return "R is not installed (no Rscript on the path)"
    asked = subprocess.run(
        ["Rscript", "-e", f'quit(status = !requireNamespace("{package}", quietly = TRUE))'],
        check=False,
        capture_output=True,
    )
    return f"R has no package {package}" if asked.returncode else ""


def ask(script: str, folder: Path, package: str = "stats") -> None:
    """Run a script in a folder; the test is skipped where R or the package is absent."""
    if why := lacking(package):
        pytest.skip(why)
    (folder / "script.R").write_text(script, encoding="utf-8", newline="\n")
    done = subprocess.run(
        ["Rscript", "--vanilla", "script.R"],
        cwd=folder,
        check=False,
        capture_output=True,
        text=True,
        encoding="utf-8",
    )
    assert done.returncode == 0, done.stderr


def write_rows(path: Path, rows: Sequence[dict[str, object]]) -> None:
    """Rows as a CSV file for R; None becomes an empty cell."""
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def read_rows(path: Path) -> list[dict[str, str]]:
    """Rows that R wrote."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))
