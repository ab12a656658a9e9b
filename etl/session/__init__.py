"""The map over readers: from a study and its folder to finished tables."""

from __future__ import annotations

import os
from pathlib import Path

from etl.measures import SELECTABLE
from etl.session.line_file import write_lines
from etl.session.one_trial import Wanted, explained, trace, write_picture
from etl.session.result import Result
from etl.session.run import build, check
from etl.study import Study
from etl.study import load_study as _load_study

__all__ = [
    "Result",
    "Wanted",
    "build",
    "check",
    "explained",
    "load_study",
    "trace",
    "write_lines",
    "write_picture",
]


def load_study(path: str | os.PathLike[str]) -> Study:
    """Read and check a study file.

    Parameters
    ----------
    path : path
        The study file (TOML).

    Returns
    -------
    Study
        With every default filled in.

    Raises
    ------
    StudyError
        With every problem of the file at once, each with its line.
    """
    return _load_study(Path(path), known_outcomes=SELECTABLE)
