"""A study file, read with the outcomes that there are."""

from __future__ import annotations

import os
from pathlib import Path

from etl.measures import SELECTABLE
from etl.study import Study
from etl.study import load_study as _load_study


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
