"""The bundle: a folder with all that a statistician needs, which can be sent away whole."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Final

from etl.handoff.data_package import write_data_package
from etl.handoff.scripts import READ_TABLES, BundleFacts, starter_texts
from etl.tables import TABLES

#: The run record, which is not there yet.
RECORD: Final = "run.json"
#: How much of a file is copied at once.
_PIECE_BYTES: Final = 1 << 28
#: What goes along besides the tables. The data package is another one, of what lies there.
BESIDES: Final = (
    "exclusions.csv",
    "accounts.csv",
    "log_accounts.csv",
    "codebook.csv",
    "codebook.md",
    "regions.csv",
    "readiness.csv",
    "readiness.json",
    "formulas.csv",
    "audit.html",
)


def write_bundle(
    build: Path, into: Path, facts: BundleFacts, csv_copy: Callable[[str, Path], None]
) -> None:
    """Write the bundle of a build, but for the run record, which lists it and comes last.

    Files are copied, not linked, so that what is done to the bundle leaves the build alone. Only
    what is listed here goes along.

    Parameters
    ----------
    build : Path
        The folder of a build, with all its files but the record and the data package.
    into : Path
        The folder of the bundle, which is made where it is not there.
    facts : BundleFacts
        What the bundle tells of the study. The same facts and files give the same bytes.
    csv_copy : callable
        Given the name of a table and a path, writes the table there as CSV; called for tables
        that the scripts read, where the study has them as Parquet only.
    """
    into.mkdir(exist_ok=True)
    formats = ("parquet", "csv") if "csv" in facts.formats else ("parquet",)
    for name in (*(f"{table}.{ending}" for table in TABLES for ending in formats), *BESIDES):
        _copy(build / name, into / name)
    if "csv" not in formats:
        for table in READ_TABLES:
            csv_copy(table, into / f"{table}.csv")
    for name, text in starter_texts(facts).items():
        (into / name).write_text(text, encoding="utf-8", newline="\n")
    files = [path.name for path in into.iterdir()]
    write_data_package(into, facts.design, facts.study, [*files, RECORD])


def _copy(file: Path, into: Path) -> None:
    """Copy a file; a file system that can shares the bytes until one of the two is changed."""
    if hasattr(os, "copy_file_range"):
        try:
            with file.open("rb") as source, into.open("wb") as sink:
                while os.copy_file_range(source.fileno(), sink.fileno(), _PIECE_BYTES):
                    pass
        except OSError:  # not across these two file systems, or not this kind; or the disk is full
            pass
        else:
            return
    shutil.copyfile(file, into)
