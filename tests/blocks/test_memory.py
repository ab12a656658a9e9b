"""The memory that a log takes does not grow with the log."""

from __future__ import annotations

import gzip
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.simulator.dialects import recorded_study
from tests.simulator.dialects.table_dialects import TABLE_DIALECTS
from tests.simulator.dialects.tables import write_tables

BLOCK = 1_000_000
ROOT = Path(__file__).parents[2]


def study_of(folder: Path, rows: int, *, packed: bool, quoted: bool) -> Path:
    """A study with one log of many rows: a thousand a reader, two hundred a trial."""
    folder.mkdir()
    path = write_tables(recorded_study(1, 1), folder, TABLE_DIALECTS["plain"])
    log = folder / "logs" / "P01.tsv"
    header, first, *_ = log.read_bytes().split(b"\n")
    names, cells = header.split(b"\t"), first.split(b"\t")
    places = [names.index(name) for name in (b"reader", b"trial_no", b"start")]
    mark = b'"' if quoted else b""

    def row(number: int) -> bytes:
        own = list(cells)
        reader, trial = number // 1000, number % 1000 // 200
        texts = (b"P%04d" % reader, b"%d" % trial, b"%d" % (1000 + number * 400))
        for place, text in zip(places, texts, strict=True):
            own[place] = text
        own[places[0]] = mark + own[places[0]] + mark
        return b"\t".join(own)

    text = b"\n".join([header, *map(row, range(rows)), b""])
    log.write_bytes(text)
    if packed:
        log.unlink()
        log = log.with_name("P01.tsv.gz")
        log.write_bytes(gzip.compress(text, 1))
        study = path.read_text(encoding="utf-8")
        assert ".tsv" in study
        path.write_text(study.replace('logs/*.tsv"', 'logs/*.tsv.gz"'), encoding="utf-8")
    return path


def peak(study: Path, length: int) -> tuple[int, int, float]:
    """How many fixations a log has, in how many blocks it was read, and the memory that took."""
    done = subprocess.run(
        [sys.executable, "-m", "tests.blocks.peak", str(study), str(length)],
        cwd=ROOT,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    fixations, blocks, most = done.stdout.split()
    return int(fixations), int(blocks), float(most)


@pytest.mark.parametrize(
    ("packed", "quoted", "rows"),
    [(False, False, 120_000), (True, False, 120_000), (False, True, 60_000)],
)
def test_memory_does_not_grow_with_the_log(
    packed: bool, quoted: bool, rows: int, tmp_path: Path
) -> None:
    """A log four times as long takes no more; held whole, it would take a good deal more."""
    pytest.importorskip("resource", reason="the system does not say how much memory was used")
    small = study_of(tmp_path / "small", rows, packed=packed, quoted=quoted)
    large = study_of(tmp_path / "large", 4 * rows, packed=packed, quoted=quoted)
    few, many, whole = peak(small, BLOCK), peak(large, BLOCK), peak(large, 0)
    assert (few[0], many[0], whole[0]) == (rows, 4 * rows, 4 * rows)
    assert many[1] > 2 * few[1] > 2
    assert whole[1] == 0
    assert many[2] < 2 * few[2]
    assert whole[2] > 2.5 * many[2]
