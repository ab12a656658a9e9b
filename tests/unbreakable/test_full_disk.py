"""A disk that fills up at any write: told, the earlier build intact, nothing left beside it."""

from __future__ import annotations

import random
import re
from pathlib import Path

import pytest

import etl
from tests.end_to_end.building import files_of
from tests.end_to_end.running import run
from tests.unbreakable.conftest import SmallDisk
from tests.unbreakable.studies import TwoWays, beside, built, content

FULL = (
    r"the output folder cannot be written \(No space left on device\)\n"
    r"    fix: make room on its disk, where [0-9.]+ MB are free: a new build needs room beside "
)


def refused(study: Path, target: Path, workers: int = 1) -> str:
    """What is said when there is no room; all is as before then."""
    before = files_of(target.parent)
    with pytest.raises(etl.DataError, match=FULL) as error:
        built(study, target, workers=workers)
    assert files_of(target.parent) == before
    assert beside(target) == []
    return str(error.value)


def test_disk_full_at_any_write(ways: TwoWays, disk: SmallDisk, tmp_path: Path) -> None:
    """Wherever in the work room runs out, the earlier build stays, and with room the new comes."""
    target = disk.folder / "out"
    expected = built(ways.new, tmp_path / "undisturbed")
    old = built(ways.old, target)
    size = sum(map(len, expected.values()))
    draw = random.Random(3)
    # In the claim, in the first table, in the last file, and anywhere.
    for free in [0, 4096, int(0.98 * size), *(draw.randrange(size) for _ in range(7))]:
        disk.leave_free(free)
        refused(ways.new, target)
        assert content(target) == old
    disk.leave_free(8 * size)
    assert built(ways.new, target) == expected
    assert beside(target) == []


def test_disk_full_while_workers_put_fixations_aside(ways: TwoWays, disk: SmallDisk) -> None:
    """What a worker cannot write is told like any other."""
    target = disk.folder / "out"
    built(ways.old, target)
    disk.leave_free(16384)
    refused(ways.new, target, workers=2)


def test_no_room_for_another_file(ways: TwoWays, disk: SmallDisk) -> None:
    """A file system may have room for no more names."""
    target = disk.folder / "out"
    built(ways.old, target)
    there = len(list(disk.folder.rglob("*")))
    for more in (1, 2, 5, 20, 40):
        disk.mount(f"size=64m,nr_inodes={there + 1 + more}")
        refused(ways.new, target)


def test_full_disk_is_told_by_the_command(ways: TwoWays, disk: SmallDisk) -> None:
    """Status 2, the folder, the reason, what to do; no traceback."""
    target = disk.folder / "out"
    built(ways.old, target)
    disk.leave_free(100_000)
    done = run("build", ways.new, "--into", target)
    assert (done.status, done.out) == (2, "")
    assert re.fullmatch(
        rf"{re.escape(str(target))}: {FULL}.*\n1 problem; nothing was written\n", done.err
    )


def test_disk_that_may_not_be_written(ways: TwoWays, disk: SmallDisk) -> None:
    """A read-only disk is told at once, whoever the user is."""
    target = disk.folder / "out"
    built(ways.old, target)
    before = files_of(disk.folder)
    disk.mount("ro")
    told = r"cannot be written \(Read-only file system\)\n    fix: see that you may write in it"
    with pytest.raises(etl.DataError, match=told):
        built(ways.new, target)
    assert files_of(disk.folder) == before


def test_folder_that_is_a_disk_of_its_own(ways: TwoWays, disk: SmallDisk) -> None:
    """It cannot be moved, so it is refused before anything is done; a folder in it will do."""
    told = "a disk or share of its own, .*\n    fix: name a folder within it"
    with pytest.raises(etl.DataError, match=told):
        built(ways.new, disk.folder)
    assert list(disk.folder.iterdir()) == []
    assert beside(disk.folder) == []
    assert built(ways.new, disk.folder / "out")


@pytest.mark.parametrize("where", ["full", "missing"])
def test_check_that_can_put_nothing_aside(
    ways: TwoWays, disk: SmallDisk, monkeypatch: pytest.MonkeyPatch, where: str
) -> None:
    """A check needs room for temporary files: told, nothing is left of them."""
    if where == "full":
        disk.leave_free(4096)  # of an empty disk; a size of 0 would be without end
    monkeypatch.setattr("tempfile.tempdir", str(disk.folder / ("" if where == "full" else "no")))
    told = (
        r"temporary files cannot be written \(No .*\)\n    fix: make room on the disk of .*TMPDIR"
    )
    with pytest.raises(etl.DataError, match=told):
        etl.check(etl.load_study(ways.new), workers=2)
    assert list(disk.folder.iterdir()) == []
