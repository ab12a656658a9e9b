"""Studies written, copied and built for the end-to-end checks, and their tables read back."""

from __future__ import annotations

import re
import shutil
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from itertools import groupby
from pathlib import Path
from typing import Any

import pyarrow.parquet as pq

import etl
from tests.measures import naive
from tests.simulator import SimulatedStudy
from tests.simulator.writing import Places

PROJECT = Path(__file__).resolve().parents[2]
TABLES = ("outcomes", "outcomes_wide", "trials", "regressions", "fixations")
#: What a build writes besides the tables, whatever the formats.
BESIDES = (
    *("exclusions.csv", "accounts.csv", "log_accounts.csv", "regions.csv", "codebook.csv"),
    *("codebook.md", "datapackage.json", "readiness.csv", "readiness.json", "formulas.csv"),
    *("run.json", "audit.html"),
)
#: What the bundle holds that the output folder does not.
OF_THE_BUNDLE = ("README.md", "start.R", "start.py")
_PARQUET = {f"{table}.parquet" for table in TABLES}
_CSV = {f"{table}.csv" for table in TABLES}
_BUNDLED = {*_PARQUET, *BESIDES, *OF_THE_BUNDLE}
#: Every file that a build writes, with the tables in Parquet alone, and in CSV too. The scripts of
#: the bundle read two tables as CSV always.
PUBLISHED = {
    *(*_PARQUET, *BESIDES),
    *(f"handoff/{name}" for name in (*_BUNDLED, "outcomes_wide.csv", "trials.csv")),
}
PUBLISHED_WITH_CSV = {
    *(*_PARQUET, *_CSV, *BESIDES),
    *(f"handoff/{name}" for name in (*_BUNDLED, *_CSV)),
}

Row = dict[str, Any]


def rows_of(folder: Path, table: str) -> list[Row]:
    """The rows of a published table by pyarrow's own reader, missing cells as None."""
    with pq.ParquetFile(folder / f"{table}.parquet") as file:
        return file.read().to_pylist()


def files_of(folder: Path, *, besides: str = "") -> dict[str, bytes]:
    """Every file below a folder, by its name, but for those of one name."""
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and path.name != besides
    }


def tables_of(folder: Path) -> dict[str, bytes]:
    """All published files but the run record, which holds the time that the build took."""
    return files_of(folder, besides="run.json")


def write(folder: Path, files: Mapping[str, str]) -> Path:
    """Write files in UTF-8 with plain line ends; gives the study file, which is among them."""
    for name, text in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8", newline="\n")
    return folder / "study.toml"


#: The rules of screening in a study file, up to the next table or its heading.
_RULES = re.compile(r"^\[screening.*?(?=^# ----|^\[(?!screening))", re.MULTILINE | re.DOTALL)


def copied_sample(
    name: str, root: Path, changes: Mapping[str, str] | None = None, *, rules: str | None = ""
) -> Path:
    """Copy a sample study with its region definitions below a folder; gives its study file.

    ``changes`` maps texts of the study file to what takes their place; each must be there.
    ``rules`` take the place of its screening, by default none; with None it is as committed.
    """
    folder = root / "sample_logs" / name
    leave_out = shutil.ignore_patterns("out")
    shutil.copytree(PROJECT / "sample_logs" / name, folder, ignore=leave_out)
    (root / "region_definitions").mkdir()
    shutil.copy(PROJECT / "region_definitions" / f"{name}.csv", root / "region_definitions")
    study_file = folder / "study.toml"
    text = study_file.read_text(encoding="utf-8")
    for old, new in (changes or {}).items():
        assert text.count(old) == 1, f"{old!r} must stand in the study file once"
        text = text.replace(old, new)
    if rules is not None:
        text = _RULES.sub("", text) + rules
    study_file.write_text(text, encoding="utf-8", newline="\n")
    return study_file


def build(study_file: Path, into: Path | None = None, *, workers: int = 1) -> etl.Result:
    """Build a study in this process, or in as many as asked for."""
    return etl.build(etl.load_study(study_file), into=into, workers=workers)


@dataclass(frozen=True)
class Sample:
    """A sample study as committed but for its screening, built, with the truth about it.

    ``folder`` is where the study file is; ``places`` tells at which line of which log the
    simulator wrote each fixation.
    """

    name: str
    folder: Path
    truth: SimulatedStudy
    places: Places
    result: etl.Result

    @cached_property
    def tables(self) -> dict[str, list[Row]]:
        """All tables as rows."""
        return {table: rows_of(self.result.folder, table) for table in TABLES}

    @cached_property
    def true_trials(self) -> dict[tuple[str, int], Any]:
        """The simulated trials by reader and number."""
        return {(t.plan.participant, t.plan.trial): t for t in self.truth.trials}

    def region_count(self, participant: str, trial: int) -> int:
        """How many regions the text of a trial has, by the simulator's own layout."""
        text = self.true_trials[participant, trial].plan.text
        return len(self.truth.spec.layouts[text].regions)


def trial_of(row: Row) -> tuple[Any, Any]:
    """The trial a row is about."""
    return row["participant"], row["trial"]


def by_trial(rows: Iterable[Row]) -> Iterator[tuple[tuple[Any, Any], list[Row]]]:
    """The rows of each trial, which stand together."""
    for key, group in groupby(rows, trial_of):
        yield key, list(group)


@dataclass
class Recomputed:
    """What the naive loop makes of the kept fixations, cell by cell, keyed as the tables are."""

    outcomes: dict[tuple[Any, ...], naive.Cell] = field(default_factory=dict)
    trials: dict[tuple[Any, ...], naive.Cell] = field(default_factory=dict)
    regressions: list[tuple[Any, ...]] = field(default_factory=list)
    visits: dict[tuple[Any, ...], tuple[int | None, int | None]] = field(default_factory=dict)


def recomputed(
    fixations: Iterable[Row], sample: Sample, outside: str, no_opportunity: str
) -> Recomputed:
    """All outcomes anew, from the rows of ``fixations`` alone and the lengths of the texts."""
    out = Recomputed()
    for (who, trial), rows in by_trial(row for row in fixations if row["kept"]):
        orders = [row["region_order"] or 0 for row in rows]
        durations = [row["duration_ms"] for row in rows]
        one = naive.Trial(orders, durations, sample.region_count(who, trial))
        found = naive.measure(one, outside, no_opportunity)
        for name, cells in found.regions.items():
            for order, cell in enumerate(cells, start=1):
                out.outcomes[who, trial, order, name] = cell
        for name, cell in found.trial.items():
            out.trials[who, trial, name] = cell
        for launch, landing, ends in found.regressions:
            a, b = rows[launch], rows[landing]
            out.regressions.append(
                (
                    *(who, trial, a["region"], a["region_order"], b["region"], b["region_order"]),
                    a["region_order"] - b["region_order"],
                    *(int(ends), a["fixation"], b["fixation"], b["onset_ms"]),
                    # To a millionth of a pixel, so that no noise of subtracting is told.
                    None if b["x_px"] is None else round(b["x_px"] - a["x_px"], 6),
                )
            )
        for row, order, visit, first in zip(
            rows, orders, found.visit, found.first_pass, strict=True
        ):
            key = who, trial, row["fixation"]
            out.visits[key] = (visit, int(first)) if order else (None, None)
    return out
