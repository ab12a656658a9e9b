"""The run record ``run.json``: what was built, from what, by what, and what was noticed."""

from __future__ import annotations

import json
import platform
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path
from typing import Any

from etl.export.publish import BUNDLE, PROGRAM, RECORD, digest_of

#: Files that people are asked to change: a changed one is theirs, and no build may replace it.
_TO_BE_CHANGED = ("start.R", "start.py")
_LIBRARIES = ("numpy", "pandas", "pyarrow", "pydantic", "shapely")


@dataclass(frozen=True, slots=True)
class RunRecord:
    """What goes into the record.

    Attributes
    ----------
    study : mapping
        The study as understood, defaults filled in.
    inputs : sequence of mapping
        Every file read: ``file``, ``role``, ``sha256``; logs also how they were understood.
    counts : mapping
        Readers, trials and fixations: read, left out, kept.
    rows : mapping
        Rows of each table.
    warnings : sequence of str
        What was noticed.
    not_recorded : sequence of str
        Trials of the trial list that no log has.
    elapsed_s : float
        How long the build took.
    """

    study: Mapping[str, Any]
    inputs: Sequence[Mapping[str, Any]]
    counts: Mapping[str, int]
    rows: Mapping[str, int]
    warnings: Sequence[str]
    not_recorded: Sequence[str]
    elapsed_s: float

    def write(self, folder: Path) -> None:
        """Write the record into a folder, and into the bundle within it where there is one.

        Parameters
        ----------
        folder : Path
            Where everything else that the build writes is already. The record lists its files,
            those of the bundle by their path, and the digests of the scripts that people change.
        """
        bundle = folder / BUNDLE
        files = {
            path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()
        }
        scripts = [bundle / name for name in _TO_BE_CHANGED if (bundle / name).is_file()]
        places = [folder, bundle] if bundle.is_dir() else [folder]
        files |= {(place / RECORD).relative_to(folder).as_posix() for place in places[1:]}
        record = {
            "program": PROGRAM,
            "version": version("trialwright"),
            "python": platform.python_version(),
            "libraries": {name: version(name) for name in _LIBRARIES},
            "study": self.study,
            "inputs": list(self.inputs),
            "counts": dict(self.counts),
            "files": sorted(files),
            "to_be_changed": {
                path.relative_to(folder).as_posix(): digest_of(path) for path in scripts
            },
            "rows": dict(self.rows),
            "warnings": list(self.warnings),
            "not_recorded": list(self.not_recorded),
            "elapsed_s": round(self.elapsed_s, 3),
        }
        text = json.dumps(record, ensure_ascii=False, indent=2) + "\n"
        for place in places:
            (place / RECORD).write_text(text, encoding="utf-8", newline="\n")
