"""Some builds killed, some built in one process; the long runs are programs of their own."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tests.unbreakable.kills import Target, kills
from tests.unbreakable.soak import WARM, memory_bytes, open_files, soak
from tests.unbreakable.studies import TwoWays

posix = pytest.mark.skipif(os.name == "nt", reason="processes are killed in groups on POSIX only")


@posix
@pytest.mark.slow
def test_killed_build_leaves_the_old_or_the_new_one(ways: TwoWays, tmp_path: Path) -> None:
    """Killed at any moment, alone and with workers; the next build succeeds, nothing is left."""
    tally = kills(Target(ways, tmp_path), [1, 2], 20, seed=1)
    assert tally.torn == [], tally.text()
    assert tally.kills == 20
    # Without builds killed before and after the swap, nothing was tried.
    assert {name.rpartition(": ")[2] for name in tally.found} == {"old", "new"}, tally.text()


@posix
@pytest.mark.slow
@pytest.mark.parametrize("fault", ["copied", "emptied"])
def test_kills_find_a_build_that_publishes_in_several_steps(
    ways: TwoWays, tmp_path: Path, fault: str
) -> None:
    """A fault planted on purpose is found, so the kills can find one."""
    target = Target(ways, tmp_path, "--fault", fault)
    tally = kills(target, [1], 6, seed=2, manners=["late step"])
    assert any("the folder is neither build" in line for line in tally.torn), tally.text()


@pytest.mark.slow
def test_many_builds_in_one_process_leave_nothing_behind(ways: TwoWays, tmp_path: Path) -> None:
    """Memory flat once warm, no file left open, no thread or process left."""
    found = soak(ways, tmp_path, WARM + 9)
    assert found.wrong == []
    assert len(set(found.open_files[1:])) == 1, found.text()
    assert len(set(found.threads[1:])) == 1, found.text()
    assert set(found.children) == {0}
    if memory_bytes() is not None:
        # One build holds tens of megabytes for a moment; a table kept would show as several
        # hundredths a build.
        assert found.growth < 0.05, found.text()
    assert (open_files() is None) == (not Path("/dev/fd").is_dir())


@pytest.mark.slow
def test_builds_with_workers_leave_nothing_behind(ways: TwoWays, tmp_path: Path) -> None:
    """Processes are let go after each build, with all that connects them."""
    found = soak(ways, tmp_path, 4, workers=2)
    assert found.wrong == []
    assert len(set(found.open_files[1:])) == 1, found.text()
    assert len(set(found.threads[1:])) == 1, found.text()
    assert set(found.children) == {0}
