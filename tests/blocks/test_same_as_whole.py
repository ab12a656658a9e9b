"""A log that is read in blocks gives what it gives when it is held whole: bytes and words."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest

import etl
from etl.parsers import readers
from tests.simulator.dialects import RecordedStudy, recorded_study
from tests.simulator.dialects.table_dialects import TABLE_DIALECTS
from tests.simulator.dialects.tables import write_tables

#: How long blocks are: a row or two, some rows, a good part of a log.
LENGTHS = (200, 1_000, 7_000)
Built = tuple[str, dict[str, object]]


@pytest.fixture(scope="module")
def study() -> RecordedStudy:
    """Three readers of four texts."""
    return recorded_study(3, 4)


def built(study: Path, workers: int = 1) -> Built:
    """What a build says, and all it writes; run records without the time it took."""
    out = study.parent / "out"
    shutil.rmtree(out, ignore_errors=True)
    try:
        findings = etl.build(etl.load_study(study), workers=workers).findings
    except etl.errors.InputError as refused:
        return refused.findings.text(), {}
    files: dict[str, object] = {}
    for path in sorted(out.rglob("*")):
        if path.is_file():
            files[path.relative_to(out).as_posix()] = path.read_bytes()
    record = json.loads((out / "run.json").read_text(encoding="utf-8"))
    for key in [key for key in record if "elapsed" in key]:
        del record[key]
    files["run.json"] = record
    return findings.text(), files


def hold(study: Path, length: int, monkeypatch: pytest.MonkeyPatch, workers: int = 1) -> Built:
    """Build both ways, and hold what comes of it against each other."""
    whole = built(study, workers)
    with monkeypatch.context() as patched:
        patched.setattr(readers, "SIZES", (1, length))
        blocks = built(study, workers)
    assert blocks[0] == whole[0]
    assert blocks[1].keys() == whole[1].keys()
    different = [name for name, content in whole[1].items() if blocks[1][name] != content]
    for name in different:
        if name == "run.json":
            assert blocks[1][name] == whole[1][name]
    assert different == []
    return whole


@pytest.mark.parametrize("length", LENGTHS)
@pytest.mark.parametrize("dialect", TABLE_DIALECTS)
def test_every_dialect(
    dialect: str,
    length: int,
    study: RecordedStudy,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """However tables are written: the same files, the same messages."""
    says, files = hold(write_tables(study, tmp_path, TABLE_DIALECTS[dialect]), length, monkeypatch)
    assert files, says
