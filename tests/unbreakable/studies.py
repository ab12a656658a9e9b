"""A small study of several logs, built in two ways, and what is compared of a build."""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path

import etl
from etl.session.kept_store import GROUP, LOG
from tests.end_to_end.building import files_of
from tests.simulator.bulk import write_bulk_study

#: By this the two ways of building differ.
_LIMIT = "\n[screening.fixations]\nunder_ms = {}\n"


@dataclass(frozen=True)
class TwoWays:
    """The study files of two builds of the same logs that differ in a limit."""

    folder: Path
    old: Path
    new: Path


def two_ways(folder: Path, *, readers: int = 6, trials: int = 12) -> TwoWays:
    """Write the study, and a second study file beside the first."""
    first = write_bulk_study(folder, readers=readers, trials=trials, fixations=12).study_file
    text = first.read_text(encoding="utf-8")
    assert "[screening.fixations]" not in text
    files = []
    for name, limit in (("old", 90), ("new", 140)):
        path = folder / f"{name}.toml"
        path.write_text(text + _LIMIT.format(limit), encoding="utf-8", newline="\n")
        files.append(path)
    first.unlink()
    return TwoWays(folder, *files)


def content(folder: Path) -> dict[str, bytes]:
    """Every file of a build; in the run records, without the time that the build took.

    That time is the only thing in which two builds of the same inputs differ.
    """
    files = files_of(folder)
    for name in [name for name in files if name.rpartition("/")[2] == "run.json"]:
        record = json.loads(files[name])
        assert record.pop("elapsed_s") >= 0
        # The record within the bundle is the same file; other files have digests in it.
        files[name] = json.dumps(record).encode("utf-8")
    return files


def built(study_file: Path, into: Path, *, workers: int = 1) -> dict[str, bytes]:
    """What a build that nobody disturbs writes."""
    return content(etl.build(etl.load_study(study_file), into=into, workers=workers).folder)


def beside(target: Path) -> list[str]:
    """What lies beside a folder, hidden files too, that no build may leave.

    Beside it a build keeps what it has parsed; of that, what is no whole entry may not be left.
    """
    kept = target.with_name(f"{target.name}.kept")
    left = sorted(path.name for path in target.parent.iterdir() if path not in (target, kept))
    if kept.is_dir():
        left += sorted(
            f"{kept.name}/{path.name}"
            for path in kept.iterdir()
            if path.suffix not in (LOG, GROUP) and path.name not in ("README.txt", "CACHEDIR.TAG")
        )
    return left
