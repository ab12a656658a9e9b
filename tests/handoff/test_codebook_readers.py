"""By the codebook alone, other readers get from CSV what pandas gets from Parquet."""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import duckdb
import pandas as pd
import pytest

from etl.cells import MARKED, plain
from tests.handoff.bundles import needs_r, run_r
from tests.handoff.codebook_building import Described, levels_in, rows_of, tables_of

Columns = dict[str, list[Any]]
#: How the types of the codebook are called elsewhere.
IN_DUCKDB = {
    "text": "VARCHAR",
    "category": "VARCHAR",
    "flag": "TINYINT",
    "integer": "BIGINT",
    "number": "DOUBLE",
}
IN_R = {"text": "chr", "flag": "int", "integer": "int", "number": "num"}
IN_PYTHON: dict[str, Callable[[str], Any]] = {"flag": int, "integer": int, "number": float}
SCRIPT = Path(__file__).with_name("codebook_types.R")


def from_parquet(path: Path) -> Columns:
    """A table by pandas; what is missing as None."""
    frame = pd.read_parquet(path)
    return {
        name: [None if gap else value for value, gap in zip(column, column.isna(), strict=True)]
        for name, column in frame.items()
    }


def by_hand(study: Described, path: Path) -> Columns:
    """A table that has no Parquet, by Python's own reader and the types of the codebook."""
    types = {name: str(row["type"]) for name, row in study.columns(path.stem).items()}
    rows = rows_of(path)
    return {
        name: [
            None if row[name] is None else IN_PYTHON.get(type_, str)(str(row[name])) for row in rows
        ]
        for name, type_ in types.items()
    }


def expected(study: Described, path: Path) -> Columns:
    """What is in a table, by pandas from Parquet where there is one."""
    parquet = path.with_suffix(".parquet")
    return from_parquet(parquet) if parquet.exists() else by_hand(study, path)


def by_duckdb(study: Described, path: Path) -> Columns:
    """A CSV file by duckdb, told the types of the codebook; apostrophes are taken off."""
    own = study.columns(path.stem)
    with path.open(encoding="utf-8", newline="") as file:
        header = next(csv.reader(file))
    types = {
        name: IN_DUCKDB[str(row["type"])] for name, row in zip(header, own.values(), strict=True)
    }
    with duckdb.connect() as connection:
        found = connection.read_csv(
            path.as_posix(), header=True, delimiter=",", quotechar='"', na_values="", columns=types
        )
        columns = zip(*found.fetchall(), strict=True)
        values = [list(column) for column in columns] or [[] for _ in own]
    return {
        name: [plain(value) if isinstance(value, str) else value for value in column]
        for name, column in zip(own, values, strict=True)
    }


def of_r(study: Described, path: Path) -> Columns:
    """What R has written of a table, by the types of the codebook."""
    with path.open(encoding="utf-8", newline="") as file:
        _, *rows = csv.reader(file)
    own = study.columns(path.stem)
    turns = [IN_PYTHON.get(str(row["type"]), str) for row in own.values()]
    return {
        name: [turn(row[place]) if row[place] else None for row in rows]
        for place, (name, turn) in enumerate(zip(own, turns, strict=True))
    }


@pytest.fixture(scope="module", params=["orchard", "passages", "awkward", "parquet"])
def read_by_r(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> tuple[Described, Path]:
    """A study, and where R has written what it read of it."""
    study = request.getfixturevalue(f"{request.param}_described")
    into = tmp_path_factory.mktemp("read_by_r")
    marked = into / "marked.txt"
    marked.write_text(MARKED, encoding="utf-8", newline="\n")
    names = [path.stem for path in tables_of(study.folder)]
    ran = run_r(SCRIPT, study.folder, into, marked, *names)
    assert ran.returncode == 0, ran.stderr
    return study, into


def test_duckdb_reads_the_same_values(any_described: Described) -> None:
    """Told the codebook's types, duckdb gets every value of every table exactly."""
    first, sent = any_described.folders
    # What lies in both folders is one file, copied.
    more = [path for path in tables_of(sent) if not (first / path.name).exists()]
    for path in (*tables_of(first), *more):
        assert by_duckdb(any_described, path) == expected(any_described, path), path


@needs_r
def test_r_reads_the_same_values(read_by_r: tuple[Described, Path]) -> None:
    """Told the codebook's types, R gets every value of every table to its last digit or two.

    R's own reader of decimals may miss the nearest number by its last bits (R documentation,
    ``?NumericConstants``), which is far below what any measure means.
    """
    study, into = read_by_r
    for path in tables_of(study.folder):
        own, known = of_r(study, into / path.name), expected(study, path)
        assert list(own) == list(known)
        for name, values in known.items():
            if any(isinstance(value, float) for value in values):
                pairs = zip(values, own[name], strict=True)
                assert all(a == b or math.isclose(a, b, rel_tol=1e-15) for a, b in pairs), (
                    path.stem,
                    name,
                )
            else:
                assert own[name] == values, (path.stem, name)


@needs_r
def test_str_in_r_shows_what_the_codebook_promises(read_by_r: tuple[Described, Path]) -> None:
    """Texts are chr, counts int, numbers num, and factors have as many levels as are listed."""
    study, into = read_by_r
    for path in tables_of(study.folder):
        lines = (into / f"{path.stem}.str").read_text(encoding="utf-8").splitlines()
        shown = [re.match(r" \$ .*?: ?(Factor w/ +(\d+) level|\w+)", line) for line in lines[1:]]
        own = study.columns(path.stem)
        assert len(shown) == len(own)
        for found, (name, row) in zip(shown, own.items(), strict=True):
            assert found is not None, (path.stem, name)
            if row["type"] == "category":
                assert int(found[2]) == len(levels_in(row["levels"])), (path.stem, name)
            else:
                assert found[1] == IN_R[str(row["type"])], (path.stem, name)


def test_studies_have_what_is_hard_to_read(awkward_described: Described) -> None:
    """The study that readers are tried on has formulas, marks for nothing, bars and quotes."""
    text = (awkward_described.folder / "outcomes_wide.csv").read_text(encoding="utf-8")
    for cell in ('"\'=1+1"', '"a | b"', '"NA"', '"-"', '"007"', '"1e1"', "\"''-i\""):
        assert f",{cell}," in text or f"\n{cell}," in text, cell
