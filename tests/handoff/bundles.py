"""Small studies with awkward names, built, and the starter scripts of their bundles run."""

from __future__ import annotations

import csv
import os
import shutil
import subprocess
from collections.abc import Mapping, Sequence
from functools import cache
from pathlib import Path

import numpy as np
import pytest

import etl
from tests.end_to_end.building import write
from tests.end_to_end.odd_study import quoted

STUDY = """
title = {title}
[logs]
files = ["log.csv"]
kind = "table"
missing = [""]
[logs.columns]
participant = "who"
trial = "n"
{item}
fixation = "fix"
duration = "dur"
label = "area"
[trials]
factors = {factors}
[trials.levels]
{levels}
[regions]
file = "regions.csv"
kind = "labels"
[output]
formats = {formats}
{output}
"""

#: Readers and texts whose names a program that guesses takes for numbers or missing values.
READERS = ("1e1", "1e2", "007", "T", "P5", "P6", "P7", "P8", "P9", "P10")
ITEMS = ("NA", "TRUE", "0x1A", "i4", "1e3", "i6", "i7", "i8", "=i9", "'-i", "i 11", 'i"12')


def toml(texts: str | Sequence[str]) -> str:
    """A text, or a list of them, as TOML writes it."""
    if not isinstance(texts, str):
        return f"[{', '.join(map(toml, texts))}]"
    return '"' + texts.replace("\\", "\\\\").replace('"', '\\"') + '"'


def small_study(
    folder: Path,
    factors: Mapping[str, Sequence[str]],
    *,
    items: bool = True,
    regions: int = 3,
    formats: str = '["parquet", "csv"]',
    output: str = "",
    title: str = "A small study",
    region_names: Sequence[str] = (),
) -> Path:
    """Write a study of ten readers and twelve texts; gives its study file.

    Levels go round readers and texts, each factor at its own pace. Regions are called a, b, c, …,
    unless they are named; eyes go on from one to the next, leave out some and go back at random,
    with a fixed seed.
    """
    draw = np.random.default_rng(20)
    header = ["who", "n", *(["text"] if items else []), *factors, "fix", "dur", "area"]
    lines = [",".join(map(quoted, header))]
    names = list(region_names) or [chr(ord("a") + place) for place in range(regions)]
    for r, reader in enumerate(READERS):
        eagerness = draw.normal(0.0, 0.7)
        for i, item in enumerate(ITEMS):
            facts = []
            for f, levels in enumerate(factors.values()):
                facts.append(levels[(r * (f % 2) + i // (f + 1)) % len(levels)])
            fact = [reader, i + 1, *([item] if items else []), *facts]
            for n, area in enumerate(_scanned(draw, names, eagerness), start=1):
                lines.append(",".join(map(quoted, [*fact, n, 150 + int(draw.integers(200)), area])))
    labels = "".join(f"{name},{name},{place}\n" for place, name in enumerate(names, start=1))
    text = STUDY.format(
        title=toml(title),
        item='item = "text"' if items else "",
        factors=toml(list(factors)),
        levels="\n".join(f"{toml(name)} = {toml(own)}" for name, own in factors.items()),
        formats=formats,
        output=output,
    )
    return write(
        folder,
        {
            "study.toml": text,
            "log.csv": "\n".join(lines) + "\n",
            "regions.csv": f"label,region,order\n{labels}",
        },
    )


def _scanned(draw: np.random.Generator, names: Sequence[str], eagerness: float) -> list[str]:
    """The regions fixated in one trial."""
    back = 1.0 / (1.0 + np.exp(1.0 - eagerness))
    areas, at = [], 0
    while at < len(names):
        if draw.random() < 0.8:
            areas.append(names[at])
            if at and draw.random() < back:
                areas.append(names[int(draw.integers(at))])
        at += 1
    return areas or [names[-1]]


def bundle_of(study_file: Path) -> Path:
    """Build a study; gives the folder of its bundle."""
    return etl.build(etl.load_study(study_file), workers=1).folder / "handoff"


def cells_of(path: Path) -> list[list[str]]:
    """A CSV file as rows of cells, header first, by Python's own reader."""
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.reader(file))


def rows_of(path: Path) -> list[dict[str, str]]:
    """A CSV file as rows by the names of its columns."""
    header, *rows = cells_of(path)
    return [dict(zip(header, row, strict=True)) for row in rows]


@cache
def r_program() -> str | None:
    """Where Rscript is."""
    return shutil.which("Rscript")


@cache
def has_lme4() -> bool:
    """Whether R has the package lme4."""
    return r_program() is not None and _succeeds("stopifnot(requireNamespace('lme4'))")


def _succeeds(expression: str) -> bool:
    ran = subprocess.run([str(r_program()), "-e", expression], capture_output=True, check=False)
    return ran.returncode == 0


needs_r = pytest.mark.skipif(r_program() is None, reason="there is no Rscript here")
needs_lme4 = pytest.mark.skipif(not has_lme4(), reason="there is no R with the package lme4 here")


def run_r(
    *arguments: object, folder: Path | None = None, **environment: str
) -> subprocess.CompletedProcess[str]:
    """Run Rscript with some arguments, in a UTF-8 locale unless told otherwise."""
    return subprocess.run(
        [str(r_program()), *map(str, arguments)],
        cwd=folder,
        env={**os.environ, "LC_ALL": "C.UTF-8", **environment},
        capture_output=True,
        encoding="utf-8",
        errors="replace",
        check=False,
        timeout=300,
    )


def r_answers(script: str, folder: Path) -> list[list[str]]:
    """Run lines of R in a folder; gives the rows that they write to answers.csv."""
    path = folder / "ask.R"
    path.write_text(script, encoding="utf-8", newline="\n")
    ran = run_r(path, folder=folder)
    assert ran.returncode == 0, ran.stderr
    return cells_of(folder / "answers.csv")
