"""The run record ``run.json``: what was built, from what, by what, and what was noticed."""

from __future__ import annotations

import json
import platform
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path
from typing import Any

from etl.export.earlier import BUNDLE, PROGRAM, RECORD, digest_of

#: Where the record says which key the pseudonyms are of.
KEY_KNOWN_BY = "pseudonyms_of_key"
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
    key : str
        By what the key to the pseudonyms is known again, which tells nothing of it; empty where
        readers go by their ids.
    """

    study: Mapping[str, Any]
    inputs: Sequence[Mapping[str, Any]]
    counts: Mapping[str, int]
    rows: Mapping[str, int]
    warnings: Sequence[str]
    not_recorded: Sequence[str]
    elapsed_s: float
    key: str = ""

    def write(self, folder: Path) -> None:
        """Write the record into a folder, and into the bundle within it where there is one.

        Parameters
        ----------
        folder : Path
            Where everything else that the build writes is already. The record lists its files,
            those of the bundle by their path, and the digests of all but itself: a changed file is
            somebody's work, and no build may replace it.
        """
        bundle = folder / BUNDLE
        written = {
            path.relative_to(folder).as_posix(): path
            for path in folder.rglob("*")
            if path.is_file()
        }
        places = [folder, bundle] if bundle.is_dir() else [folder]
        records = {(place / RECORD).relative_to(folder).as_posix() for place in places}
        digests = {name: digest_of(written[name]) for name in sorted(written.keys() - records)}
        record = {
            "program": PROGRAM,
            "version": version("trialwright"),
            "python": platform.python_version(),
            "libraries": {name: version(name) for name in _LIBRARIES},
            "study": self.study,
            **({KEY_KNOWN_BY: self.key} if self.key else {}),
            "inputs": list(self.inputs),
            "counts": dict(self.counts),
            "files": sorted({*digests, *records} - {RECORD}),
            "sha256": digests,
            "rows": dict(self.rows),
            "warnings": list(self.warnings),
            "not_recorded": list(self.not_recorded),
            "elapsed_s": round(self.elapsed_s, 3),
        }
        text = json.dumps(record, ensure_ascii=False, indent=2) + "\n"
        for place in places:
            (place / RECORD).write_text(text, encoding="utf-8", newline="\n")
