"""A log that is read in blocks gives what it gives when it is held whole: bytes and words."""

from __future__ import annotations

import json
import os
import shutil
from pathlib import Path
from random import Random
from typing import Any
from zlib import crc32

import pytest

import etl
from etl.parsers import readers
from etl.session import block_logs, work
from tests.blocks.both_ways import WHOLE, told
from tests.fuzz.cases import CORPUS, some_kinds
from tests.fuzz.damage import DAMAGES
from tests.fuzz.kinds import KINDS
from tests.fuzz.oracle import put, sound_study
from tests.simulator.dialects import RecordedStudy, recorded_study
from tests.simulator.dialects.table_dialects import TABLE_DIALECTS
from tests.simulator.dialects.tables import write_tables

#: How long blocks are: a row or two, some rows, a good part of a log.
LENGTHS = (200, 1_000, 7_000)
#: Set to anything, every case is tried with all of them, and not with one.
EVERY_LENGTH = "TEST_EVERY_LENGTH"
Built = tuple[str, dict[str, object]]


@pytest.fixture(scope="module")
def study() -> RecordedStudy:
    """Three readers of four texts."""
    return recorded_study(3, 4)


def lengths(case: str) -> tuple[int, ...]:
    """Those with which a case is tried: another case, another one."""
    if os.environ.get(EVERY_LENGTH):
        return LENGTHS
    return (LENGTHS[crc32(case.encode("utf-8")) % len(LENGTHS)],)


@pytest.mark.parametrize("dialect", TABLE_DIALECTS)
def test_every_dialect(
    dialect: str, study: RecordedStudy, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """However tables are written: the same fixations, trials, accounts, figures and messages."""
    path = write_tables(study, tmp_path, TABLE_DIALECTS[dialect])
    whole, none = told(path, WHOLE, monkeypatch)
    assert none == 0
    for length in lengths(dialect):
        blocks, some = told(path, length, monkeypatch)
        assert blocks == whole
        assert some == len(whole) > 0


def damaged(kind: str, damage: str, folder: Path) -> Path | None:
    """A damaged study; None where the damage does not apply, or the system has no such names."""
    sound = sound_study(kind)
    files = DAMAGES[damage].spoil(KINDS[kind], dict(sound.files), Random(f"{kind}/{damage}/1"))
    if files is None or files == sound.files:
        return None
    try:
        put(folder, files)
    except OSError:
        return None
    return folder / "study.toml"


@pytest.mark.parametrize("damage", CORPUS)
def test_every_damage(damage: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """However logs are damaged: the same words, in the same order, and the same account."""
    for kind in some_kinds(damage):
        folder = tmp_path / kind
        folder.mkdir()
        path = damaged(kind, damage, folder)
        try:
            whole = None if path is None else told(path, WHOLE, monkeypatch)[0]
        except etl.InputError:
            continue
        for length in lengths(f"{kind} {damage}"):
            if path is not None:
                assert told(path, length, monkeypatch)[0] == whole


def built(study: Path, workers: int, *, afresh: bool = True) -> Built:
    """What a build says, and all it writes; run records without the time it took."""
    out = study.parent / "out"
    shutil.rmtree(out, ignore_errors=True)
    for kept in study.parent.glob("*.kept") if afresh else ():
        shutil.rmtree(kept)
    findings = etl.build(etl.load_study(study), workers=workers).findings
    files: dict[str, object] = {}
    for path in sorted(out.rglob("*")):
        if path.is_file():
            files[path.relative_to(out).as_posix()] = path.read_bytes()
            if path.name == "run.json":
                record = json.loads(path.read_text(encoding="utf-8"))
                del record["elapsed_s"]
                files[path.relative_to(out).as_posix()] = record
    return findings.text(), files


@pytest.mark.parametrize(
    ("dialect", "pseudonyms"),
    [("plain", False), ("one log", False), ("one log", True), ("everything at once", False)],
)
def test_whole_build(
    dialect: str,
    pseudonyms: bool,
    study: RecordedStudy,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """The same bytes in every file, by one worker or by two that share a log."""
    path = write_tables(study, tmp_path, TABLE_DIALECTS[dialect])
    if pseudonyms:
        text = path.read_text(encoding="utf-8")
        assert "[output]\n" in text
        path.write_text(
            text.replace("[output]\n", "[output]\npseudonyms = true\n"), encoding="utf-8"
        )
    whole = built(path, 1)
    monkeypatch.setattr(readers, "SIZES", (1, 900))
    assert built(path, 1) == whole
    assert built(path, 2) == whole
    # What the build before has kept of every block serves this one.
    monkeypatch.setattr(work, "whole_log", None)
    assert built(path, 1, afresh=False) == whole


def test_log_that_changes_between_two_blocks(
    study: RecordedStudy, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Nothing comes of it but a message."""
    path = write_tables(study, tmp_path, TABLE_DIALECTS["plain"])
    log = min((tmp_path / "logs").iterdir())
    real = block_logs.read_block

    def read_and_write(*arguments: Any) -> Any:
        with log.open("ab") as file:
            file.write(b"\n")
        return real(*arguments)

    monkeypatch.setattr(block_logs, "read_block", read_and_write)
    read, _ = told(path, 500, monkeypatch)
    assert read[0]["findings"][0].startswith(
        f"logs/{log.name}: the file changed while it was read; expected a file that nobody writes"
    )
    assert read[0]["trials"] is None
    assert read[0]["readers"] == {}
