"""The committed sample studies are exactly what the simulator writes."""

from __future__ import annotations

import gzip
from pathlib import Path

import pytest

from tests.simulator.__main__ import PROJECT, regenerate

#: What the simulator writes; anything else beside it (an output folder) is not its business.
WRITTEN = ("sample_logs/*/*.toml", "sample_logs/*/*.csv", "sample_logs/*/logs/*")
DEFINITIONS = ("region_definitions/orchard.csv", "region_definitions/passages.csv")
LIMIT_BYTES = 3_000_000


def files(root: Path) -> set[str]:
    """The files of the sample studies below a folder, relative and with slashes."""
    found = {path for pattern in (*WRITTEN, *DEFINITIONS) for path in root.glob(pattern)}
    return {path.relative_to(root).as_posix() for path in found}


def content(path: Path) -> bytes:
    """What a file says; how well a platform compresses it does not matter."""
    raw = path.read_bytes()
    return gzip.decompress(raw) if path.suffix == ".gz" else raw


@pytest.fixture(scope="module")
def fresh(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder into which the samples have just been written."""
    root = tmp_path_factory.mktemp("fresh")
    regenerate(root)
    return root


def test_same_files_are_written(fresh: Path) -> None:
    """No committed file is missing and none is left over."""
    assert files(PROJECT) == files(fresh)


def test_same_bytes_are_written(fresh: Path) -> None:
    """Every committed file holds what the simulator writes, byte for byte."""
    names = sorted(files(fresh))
    different = [name for name in names if content(PROJECT / name) != content(fresh / name)]
    assert different == []


def test_second_run_replaces_the_first(fresh: Path, tmp_path: Path) -> None:
    """Writing again deletes logs that are no longer written and changes nothing else."""
    regenerate(tmp_path)
    (tmp_path / "sample_logs" / "orchard" / "logs" / "P99.tsv").write_bytes(b"old\n")
    regenerate(tmp_path)
    assert files(tmp_path) == files(fresh)


def test_samples_stay_small(fresh: Path) -> None:
    """A clone is not made heavy by the samples."""
    assert sum((fresh / name).stat().st_size for name in files(fresh)) < LIMIT_BYTES


def test_compressed_log_carries_no_name_and_no_time(fresh: Path) -> None:
    """The header of the .gz log (RFC 1952, section 2.3) has no flags set and time zero."""
    head = (fresh / "sample_logs" / "orchard" / "logs" / "P13.tsv.gz").read_bytes()[:8]
    assert head == b"\x1f\x8b\x08\x00\x00\x00\x00\x00"
