"""Any one step on the disk fails: the old or the new build is there, and nothing else."""

from __future__ import annotations

import errno
import os
import random
from collections.abc import Callable
from functools import partial
from pathlib import Path

import pytest

import etl
from etl.export.publish import published
from tests.end_to_end.building import files_of, write
from tests.unbreakable.steps import counted, watched
from tests.unbreakable.studies import TwoWays, beside, built, content

RECORD = '{"program": "trialwright", "files": ["table.csv"]}\n'
OLD = {"run.json": RECORD, "table.csv": "old\n"}
NEW = {"run.json": RECORD, "table.csv": "new\n", "handoff/start.R": "1\n"}


def failing(at: int, number: int) -> Callable[[int, str], None]:
    """A step that fails with an error of the system."""

    def step(count: int, _: str) -> None:
        if count == at:
            raise OSError(number, os.strerror(number))

    return step


def publish(target: Path) -> None:
    """Publish three files."""
    with published(target, "out") as shop:
        write(shop.fresh, NEW)
        write(shop.kept, {"0.arrow": "fixations"})


def said_by(work: Callable[[], object]) -> str:
    """What is said if some work is refused."""
    try:
        work()
    except etl.DataError as error:
        return str(error)
    return ""


@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EACCES, errno.EIO])
@pytest.mark.parametrize("exchange", [True, False], ids=["in one step", "two renamings"])
@pytest.mark.parametrize("there", [OLD, {}], ids=["earlier build", "nothing"])
def test_any_step_of_publishing_fails(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    number: int,
    exchange: bool,
    there: dict[str, str],
) -> None:
    """All steps one after the other, from the claim to the tidying up."""
    if not exchange:
        monkeypatch.setattr("etl.export.swapping.exchange", lambda *_: False)
    old, new = ({n: t.encode() for n, t in files.items()} for files in (there, NEW))
    (tmp_path / "count").mkdir()
    write(tmp_path / "count" / "out", there)
    steps = counted(tmp_path, lambda: publish(tmp_path / "count" / "out"))
    assert len(steps) > 30
    outcomes = []
    for at in range(1, len(steps) + 1):
        target = tmp_path / str(at) / "out"
        target.parent.mkdir()
        write(target, there)
        with watched(tmp_path, failing(at, number)):
            told = said_by(partial(publish, target))
        outcomes.append("old" if told else "new")
        assert not told or told.startswith("out: the output folder cannot be written (")
        name = steps[at - 1]
        assert files_of(target) == (new if outcomes[-1] == "new" else old), (at, name)
        assert beside(target) == [], (at, name)
    # What fails after the swap is no reason to call the build off.
    assert outcomes[0] == "old"
    assert "new" in outcomes
    assert outcomes.count("old") > 15


def test_any_step_of_a_build_fails(ways: TwoWays, tmp_path: Path) -> None:
    """Some steps of a whole build."""
    old = built(ways.old, tmp_path / "count" / "out")
    study = etl.load_study(ways.new)
    steps = counted(tmp_path, lambda: etl.build(study, into=tmp_path / "count" / "out"))
    new = content(tmp_path / "count" / "out")
    target = tmp_path / "place" / "out"
    built(ways.old, target)
    draw = random.Random(11)
    refused = 0
    for at in sorted(draw.sample(range(1, len(steps) + 1), 12)):
        with watched(tmp_path, failing(at, errno.ENOSPC)):
            told = said_by(partial(etl.build, study, into=target))
        expected = old if told else new
        refused += bool(told)
        assert not told or "cannot be written (No space left on device)" in told
        assert content(target) == expected, (at, steps[at - 1])
        assert beside(target) == [], (at, steps[at - 1])
        if expected is new:
            built(ways.old, target)
    # Steps after the swap, and those of what is kept for the next build, call no build off.
    assert refused >= 3


def test_folder_that_vanishes_meanwhile(ways: TwoWays, tmp_path: Path) -> None:
    """Somebody removes the folder that is to hold the output: told, without a traceback."""
    target = tmp_path / "a" / "out"
    target.parent.mkdir()

    def vanish(stage: str, done: int, total: int) -> None:  # noqa: ARG001
        if target.parent.exists():
            target.parent.rename(tmp_path / "gone")

    told = "the folder that is to hold it was moved or removed, or is a file"
    with pytest.raises(etl.DataError, match=told):
        etl.build(etl.load_study(ways.old), into=target, progress=vanish)


def test_folder_within_a_file(ways: TwoWays, tmp_path: Path) -> None:
    """A file cannot hold the output."""
    write(tmp_path, {"file": "mine\n"})
    with pytest.raises(etl.DataError, match=r"cannot be written \((Not a directory|File exists)"):
        built(ways.old, tmp_path / "file" / "out")
    assert files_of(tmp_path) == {"file": b"mine\n"}


def test_link_is_followed_and_stays(ways: TwoWays, tmp_path: Path) -> None:
    """The tables land where a link points; the link is not replaced."""
    link = tmp_path / "link"
    try:
        link.symlink_to(tmp_path / "far" / "out", target_is_directory=True)
    except OSError:
        pytest.skip("this user may make no links")
    expected = built(ways.old, link)
    assert built(ways.new, link) != expected
    assert link.is_symlink()
    assert content(tmp_path / "far" / "out") == content(link)
    assert beside(tmp_path / "far" / "out") == []


def test_link_to_itself(ways: TwoWays, tmp_path: Path) -> None:
    """A link that leads nowhere is told."""
    link = tmp_path / "link"
    try:
        link.symlink_to(link)
    except OSError:
        pytest.skip("this user may make no links")
    with pytest.raises(etl.DataError, match="the output folder cannot be written"):
        built(ways.old, link)
