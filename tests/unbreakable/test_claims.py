"""One build at a time into a folder, whoever makes it; others are not in the way."""

from __future__ import annotations

import json
import os
import re
import socket
import subprocess
import sys
import threading
from pathlib import Path

import pytest

import etl
from etl.export import claims
from etl.export.claims import claim_of, claimed
from tests.end_to_end.building import files_of, write
from tests.end_to_end.running import run
from tests.unbreakable.studies import TwoWays, beside, built, content

WAIT = r"expected one build at a time\n    fix: wait until that build has ended, or name another"


class Meanwhile:
    """Begins another build while the first reads its logs, once."""

    def __init__(self, study_file: Path, into: Path) -> None:
        self.study_file, self.into = study_file, into
        self.error: etl.DataError | None = None
        self.done = False

    def __call__(self, *_: object) -> None:
        """Take the place of a progress bar."""
        if self.done:
            return
        self.done = True
        try:
            etl.build(etl.load_study(self.study_file), into=self.into)
        except etl.DataError as error:
            self.error = error


def test_second_build_into_a_folder_is_refused_at_once(ways: TwoWays, tmp_path: Path) -> None:
    """It is told who is at work there, and the first is not disturbed."""
    target = tmp_path / "out"
    expected = built(ways.old, target)
    second = Meanwhile(ways.new, target)
    etl.build(etl.load_study(ways.old), into=target, progress=second)
    told = rf'another build .* this folder; found "process {os.getpid()}, since \d+-.*", {WAIT}'
    assert re.search(told, str(second.error))
    assert content(target) == expected
    assert beside(target) == []


def test_second_command_is_refused_with_status_2(ways: TwoWays, tmp_path: Path) -> None:
    """Another process is told the same, and writes nothing."""
    target = tmp_path / "out"
    with claimed(target, "out"):
        before = files_of(tmp_path)
        done = run("build", ways.old, "--into", target)
        assert (done.status, done.out) == (2, "")
        assert re.search(f'found "process {os.getpid()}, since', done.err)
        assert done.err.endswith("1 problem; nothing was written\n")
        assert files_of(tmp_path) == before
    assert built(ways.old, target)
    assert beside(target) == []


def test_builds_into_different_folders_go_side_by_side(ways: TwoWays, tmp_path: Path) -> None:
    """Also where the folder that is to hold both is not there yet."""
    second = Meanwhile(ways.new, tmp_path / "a" / "two")
    etl.build(etl.load_study(ways.old), into=tmp_path / "a" / "one", progress=second)
    assert second.error is None
    assert content(tmp_path / "a" / "one") == built(ways.old, tmp_path / "one")
    assert content(tmp_path / "a" / "two") == built(ways.new, tmp_path / "two")


@pytest.mark.parametrize("there", [True, False], ids=["earlier build", "nothing"])
def test_build_within_the_folder_of_another_is_refused(
    ways: TwoWays, tmp_path: Path, there: bool
) -> None:
    """It would go with the folder that the other replaces."""
    target = tmp_path / "out"
    if there:
        built(ways.old, target)
    second = Meanwhile(ways.new, target / "more" / "out")
    etl.build(etl.load_study(ways.old), into=target, progress=second)
    assert 'writing into the folder "out", which holds this one; found "process' in str(
        second.error
    )
    assert not (target / "more").exists()
    assert beside(target) == []


def test_build_around_the_folder_of_another_is_refused(ways: TwoWays, tmp_path: Path) -> None:
    """The folder holds something that is no earlier build, if only work of the other."""
    second = Meanwhile(ways.new, tmp_path / "out")
    inner = tmp_path / "out" / "inner"
    etl.build(etl.load_study(ways.old), into=inner, progress=second)
    assert "holds something else than an earlier build" in str(second.error)
    assert content(inner) == built(ways.old, tmp_path / "undisturbed")


def test_folder_within_an_earlier_build_is_refused(ways: TwoWays, tmp_path: Path) -> None:
    """The next build would stop at it."""
    built(ways.old, tmp_path / "out")
    before = files_of(tmp_path)
    with pytest.raises(etl.DataError, match='lies within an earlier build, "out"'):
        built(ways.new, tmp_path / "out" / "inner")
    assert files_of(tmp_path) == before


def test_claim_has_one_holder_at_a_time(tmp_path: Path) -> None:
    """Many threads that claim a folder as fast as they can never hold it together."""
    target, inside, most, held = tmp_path / "out", [0], [0], [0]

    def claim() -> None:
        for _ in range(25):
            try:
                with claimed(target, "out"):
                    inside[0] += 1
                    most[0] = max(most[0], inside[0])
                    held[0] += 1
                    (tmp_path / "work").touch()
                    inside[0] -= 1
            except etl.DataError:
                continue

    threads = [threading.Thread(target=claim) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert most == [1]
    assert held[0] > 25
    assert not claim_of(target).exists()


def test_folder_is_free_once_its_build_is_dead(ways: TwoWays, tmp_path: Path) -> None:
    """However the process ends, its lock goes with it, though the file stays."""
    target = tmp_path / "out"
    code = (
        "import os, signal, sys; from pathlib import Path\n"
        "from etl.export.claims import claimed\n"
        "with claimed(Path(sys.argv[1]), 'out'): os._exit(9)\n"
    )
    subprocess.run([sys.executable, "-c", code, str(target)], check=False)
    assert claim_of(target).exists()
    built(ways.old, target)
    assert beside(target) == []


def void_pid() -> int:
    """The number of a process that has ended."""
    with subprocess.Popen([sys.executable, "-c", ""]) as process:
        pass
    return process.pid


@pytest.fixture
def no_locks(monkeypatch: pytest.MonkeyPatch) -> None:
    """As on a file system that has no locks."""
    monkeypatch.setattr(claims, "_lock", lambda _: None)


@pytest.mark.usefixtures("no_locks")
def test_without_locks_a_living_claim_holds(ways: TwoWays, tmp_path: Path) -> None:
    """The file itself is the claim then."""
    target = tmp_path / "out"
    second = Meanwhile(ways.new, target)
    etl.build(etl.load_study(ways.old), into=target, progress=second)
    assert f'found "process {os.getpid()}, since' in str(second.error)
    assert beside(target) == []


@pytest.mark.usefixtures("no_locks")
@pytest.mark.skipif(os.name == "nt", reason="nothing there asks after a process without harm")
def test_without_locks_a_dead_claim_of_this_computer_is_void(ways: TwoWays, tmp_path: Path) -> None:
    """Its process is gone."""
    target = tmp_path / "out"
    claim = {"process": void_pid(), "computer": socket.gethostname(), "since": "then"}
    write(tmp_path, {claim_of(target).name: json.dumps(claim)})
    built(ways.old, target)
    assert beside(target) == []


@pytest.mark.usefixtures("no_locks")
@pytest.mark.parametrize("computer", ["another", None])
def test_without_locks_a_claim_of_another_computer_stands(
    ways: TwoWays, tmp_path: Path, computer: str | None
) -> None:
    """Nobody here can know whether that build lives; the message says what to delete."""
    target = tmp_path / "out"
    claim = {"process": void_pid(), "computer": computer, "since": "then"} if computer else ""
    write(tmp_path, {claim_of(target).name: json.dumps(claim)})
    told = rf"where no build is running, delete {re.escape(claim_of(target).name)}"
    with pytest.raises(etl.DataError, match=told) as refused:
        built(ways.old, target)
    assert ("on another, since then" in str(refused.value)) == (computer is not None)
    assert beside(target) == [claim_of(target).name]
