"""Studies built and described: codebook, table of regions and data packages beside the tables."""

from __future__ import annotations

import csv
import re
import tempfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

import etl
from etl.cells import plain
from etl.errors import Findings
from etl.handoff import DATA_PACKAGE, StudyFacts, write_data_package
from etl.session.codebook_facts import codebook_facts, write_described
from etl.session.crew import Room, silent
from etl.session.examining import examine
from etl.session.plan import Plan
from etl.session.readiness import readiness_of, write_readiness
from etl.session.region_rows import region_rows
from etl.tables import TableDesign

#: What a spreadsheet would run, what looks like a mark for no value, what Markdown takes for signs.
AWKWARD = {"cue": ("=1+1", "a | b", "NA"), "mood": ("-", "c\\d", "`e` *f* _g_ <b>h</b>")}
#: Numbers for the levels of a factor, and another factor by a name.
AWKWARD_OUTPUT = 'contrasts = { cue = "helmert", mood = { one = [1, 0, 0], two = [0, 0.1, -1] } }'

Row = Mapping[str, str | None]


@dataclass(frozen=True)
class Described:
    """A build with its codebook and data packages, and what they were made from."""

    folder: Path
    plan: Plan
    design: TableDesign
    facts: StudyFacts

    @property
    def folders(self) -> tuple[Path, ...]:
        """The output folder, and the one within it that is sent away."""
        return self.folder, self.folder / "handoff"

    @property
    def codebook(self) -> list[Row]:
        """The rows of the codebook."""
        return rows_of(self.folder / "codebook.csv")

    def columns(self, table: str) -> dict[str, Row]:
        """The columns of a table by name, as the codebook has them."""
        own = (row for row in self.codebook if row["table"] == table)
        return {
            str(row["column"]): row for row in own if not (table == "outcomes" and row["outcome"])
        }


def described(study_file: Path, into: Path) -> Described:
    """Build a study and describe it; what the build itself has written stays as it is."""
    study = etl.load_study(study_file)
    folder = etl.build(study, into=into, workers=1).folder
    plan, design = planned(study)
    facts = codebook_facts(plan, design, region_rows(plan.library))
    if not (folder / "readiness.csv").exists():
        write_readiness(readiness_of(folder, design), folder)
    if not (folder / "codebook.csv").exists():
        write_described(folder, plan, design)
    sent = folder / "handoff"
    if not sent.exists():
        sent.mkdir()
        for path in files_of(folder):
            (sent / path.name).write_bytes(path.read_bytes())
    for place in (folder, sent):
        if not (place / DATA_PACKAGE).exists():
            write_data_package(place, design, facts, [path.name for path in files_of(place)])
    return Described(folder, plan, design, facts)


def planned(study: etl.Study) -> tuple[Plan, TableDesign]:
    """A study's plan, and what its tables have in common."""
    findings = Findings()
    with tempfile.TemporaryDirectory() as folder, Room(Path(folder), 1, silent) as room:
        examined = examine(study, room, findings)
    assert examined is not None, findings.text()
    return examined[0], examined[1].design


def files_of(folder: Path) -> list[Path]:
    """The files of a folder, without those below it."""
    return sorted(path for path in folder.iterdir() if path.is_file())


def tables_of(folder: Path) -> Iterator[Path]:
    """The CSV files of a folder."""
    yield from (path for path in files_of(folder) if path.suffix == ".csv")


def header_of(path: Path) -> list[str]:
    """The columns of a CSV file."""
    with path.open(encoding="utf-8", newline="") as file:
        return [plain(name) for name in next(csv.reader(file))]


def rows_of(path: Path) -> list[Row]:
    """The rows of a CSV file as they were meant: empty cells as None, texts without apostrophes."""
    with path.open(encoding="utf-8", newline="") as file:
        header, *rows = csv.reader(file)
    names = [plain(name) for name in header]
    return [
        dict(zip(names, (plain(cell) if cell else None for cell in row), strict=True))
        for row in rows
    ]


def levels_in(cell: str | None) -> list[str]:
    """Several texts of one cell, as the codebook's page says that they are taken apart."""
    if cell is None:
        return []
    return [re.sub(r"\\([\\|])", r"\1", part) for part in cell.split(" | ")]
