"""No CSV file that is written holds a cell that a spreadsheet would run, and none loses a text."""

from __future__ import annotations

import csv
import io
import json
import re
import shutil
import subprocess
from pathlib import Path
from typing import Any

import duckdb
import pandas as pd
import pyarrow.parquet as pq
import pytest

import etl
from etl.cells import MARKED, plain
from tests.end_to_end.building import TABLES, build, write

#: Levels of the factor, one a trial; "-5" looks like a number among texts, "-" is one sign.
LEVELS = ("=1+2", "-", "+49 30", "@home", "'=x", "-5", "＝wide")
FACTOR, COVARIATE = "=cue", "@mood"
READERS = ("=P1", "+P2", "'-P3")
ITEM, REGION, LOG = "@pear", "-start", "=log.csv"

STUDY = f"""
[logs]
files = ["*log.csv"]
kind = "table"
[logs.columns]
participant = "who"
trial = "trial"
item = "text"
fixation = "n"
duration = "dur"
label = "area"
[trials]
factors = ["{FACTOR}"]
covariates = ["{COVARIATE}"]
levels = {{ "{FACTOR}" = {json.dumps(sorted(LEVELS), ensure_ascii=False)} }}
[screening.trials]
notes = "notes.csv"
fewest_fixations = 2
[regions]
file = "regions.csv"
kind = "labels"
[output]
formats = ["parquet", "csv"]
contrasts = {{ "{FACTOR}" = "sum" }}
"""


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> etl.Result:
    """A study in which every name that can be chosen is dangerous."""
    rows = [["who", "trial", "text", FACTOR, COVARIATE, "n", "dur", "area"]]
    for reader in READERS:
        for number, level in enumerate(LEVELS, start=1):
            for fixation, area in enumerate("aba" if number > 1 else "a", start=1):
                mood = ("=good", "so, so")[number % 2]
                rows.append([reader, f"+T{number}", ITEM, level, mood, str(fixation), "200", area])
    log = io.StringIO(newline="")
    csv.writer(log, lineterminator="\n").writerows(rows)
    folder = tmp_path_factory.mktemp("dangerous")
    study = write(
        folder,
        {
            "study.toml": STUDY,
            LOG: log.getvalue(),
            "regions.csv": f"label,region,order\na,{REGION},1\nb,=end,2\n",
            "notes.csv": f"participant,trial,reason\n{READERS[1]},+T3,=HYPERLINK(1)\n",
        },
    )
    return build(study)


def rows_in(path: Path) -> list[list[str]]:
    """All cells of a CSV file as they stand in it, header first."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.reader(file, strict=True))


def texts(table: str, folder: Path) -> dict[str, list[str | None]]:
    """The columns of texts of a table, by name, from the Parquet."""
    told = pq.read_table(folder / f"{table}.parquet").to_pandas()
    return {
        name: [None if pd.isna(cell) else str(cell) for cell in told[name]]
        for name in told.columns
        if not pd.api.types.is_numeric_dtype(told[name])
    }


def test_study_is_as_dangerous_as_it_should_be(built: etl.Result) -> None:
    """Every kind of name that somebody chose is such a text, or the other tests say nothing."""
    trials = texts("trials", built.folder)
    assert set(trials["participant"]) == set(READERS)
    assert set(trials[FACTOR]) == set(LEVELS[1:])
    assert "=good" in trials[COVARIATE]
    assert set(trials["item"]) == {ITEM}
    fixations = texts("fixations", built.folder)
    assert set(fixations["source_file"]) == {LOG}
    assert {REGION, "=end"} <= set(fixations["region"])


def test_no_cell_of_any_csv_begins_with_a_sign(built: etl.Result) -> None:
    """In tables, ledger and accounts, headers among them; numbers and single signs are none."""
    number = re.compile(r"[+-]?[0-9.]+(e[+-]?[0-9]+)?")
    files = sorted(built.folder.rglob("*.csv"))
    assert {f"{table}.csv" for table in (*TABLES, "exclusions", "accounts", "log_accounts")} <= {
        file.name for file in files
    }
    for file in files:
        for row in rows_in(file):
            for cell in row:
                dangerous = len(cell) > 1 and cell[0] in "=+-@＝＋－＠\t\r\n"
                assert not dangerous or number.fullmatch(cell), (file.name, cell)


@pytest.mark.parametrize("table", TABLES)
def test_parquet_and_header_hold_the_texts_themselves(built: etl.Result, table: str) -> None:
    """Nothing is changed in the Parquet; the CSV's header and cells are the same but for marks."""
    names = pq.read_schema(built.folder / f"{table}.parquet").names
    header, *rows = rows_in(built.folder / f"{table}.csv")
    assert [plain(name) for name in header] == names
    for name, column in texts(table, built.folder).items():
        assert [plain(row[names.index(name)]) or None for row in rows] == column


@pytest.mark.parametrize(
    ("file", "cells"),
    [
        ("exclusions.csv", {"'=P1", "''-P3", "'@pear", "'=log.csv", "'+T3"}),
        ("accounts.csv", {"'=P1", "'+P2", "''-P3"}),
        ("log_accounts.csv", {"'=log.csv"}),
    ],
)
def test_ledger_and_accounts_have_marks(built: etl.Result, file: str, cells: set[str]) -> None:
    """Readers, trials, items and logs are marked where they are listed."""
    assert cells <= {cell for row in rows_in(built.folder / file) for cell in row}


def test_pandas_reads_the_same_values(built: etl.Result) -> None:
    """By pandas' reader, after the marks are taken off."""
    told = pd.read_csv(
        built.folder / "trials.csv", dtype=str, keep_default_na=False, encoding="utf-8"
    )
    for name, column in texts("trials", built.folder).items():
        marked = "'" + name if name in (FACTOR, COVARIATE) else name
        assert [plain(cell) or None for cell in told[marked]] == column


def test_duckdb_reads_the_same_values(built: etl.Result) -> None:
    """By duckdb's reader; the column of levels stays text, "-5" among them."""
    told = duckdb.read_csv(str(built.folder / "trials.csv"))
    names = [plain(name) for name in told.columns]
    rows = told.fetchall()
    for name, column in texts("trials", built.folder).items():
        cells = [row[names.index(name)] for row in rows]
        assert [plain(cell) if cell else None for cell in cells] == column


def r_string(text: str) -> str:
    """A text as R's source writes it, in ASCII."""
    return (
        '"'
        + "".join(
            f"\\u{ord(c):04x}" if not c.isascii() else repr(c)[1:-1] if c != "'" else c
            for c in text
        )
        + '"'
    )


@pytest.mark.parametrize("locale", ["C.UTF-8", "C"])
def test_r_reads_the_same_values(
    built: etl.Result, tmp_path: Path, locale: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """By R's own reader, with the pattern that this package tells, whatever R's locale."""
    rscript = shutil.which("Rscript")
    if rscript is None:
        pytest.skip("no Rscript on the path: R (r-base-core in Debian) is needed")
    script = tmp_path / "read.R"
    script.write_text(
        f"marked <- {r_string(MARKED)}\n"
        'plain <- function(x) ifelse(startsWith(x, "\'") & grepl(marked, x, perl = TRUE), '
        "substring(x, 2), x)\n"
        f"table <- read.csv({r_string((built.folder / 'trials.csv').as_posix())}, "
        'colClasses = "character", check.names = FALSE, na.strings = "", encoding = "UTF-8")\n'
        f'out <- file({r_string((tmp_path / "told.txt").as_posix())}, open = "wb")\n'
        "for (name in names(table)) writeLines(enc2utf8(c(plain(name), nrow(table), "
        'plain(table[[name]]))), out, useBytes = TRUE, sep = "\\n")\n'
        "close(out)\n",
        encoding="ascii",
    )
    monkeypatch.setenv("LC_ALL", locale)
    ran = subprocess.run([rscript, str(script)], capture_output=True, text=True, check=False)
    assert ran.returncode == 0, ran.stderr
    lines = iter((tmp_path / "told.txt").read_text(encoding="utf-8").splitlines())
    told: dict[str, Any] = {}
    for name in lines:
        told[name] = [next(lines) for _ in range(int(next(lines)))]
    for name, column in texts("trials", built.folder).items():
        assert [None if cell == "NA" else cell for cell in told[name]] == column
