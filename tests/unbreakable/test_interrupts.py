"""Ctrl-C and its like: the command ends, with its workers, and what it says is true."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import threading
import time
from pathlib import Path

import pytest

import etl
from etl.session.crew import Processes
from tests.end_to_end.building import files_of
from tests.unbreakable.kills import Course, Target, course, until_all_ended, words
from tests.unbreakable.studies import TwoWays, beside, built, content

posix = pytest.mark.skipif(os.name == "nt", reason="signals of this kind are not sent there")
OLD = "interrupted; nothing was written, the earlier build is as it was\n"
NEW = "interrupted; the new build was in its place already, and is whole\n"


@pytest.fixture(scope="module")
def target(ways: TwoWays, tmp_path_factory: pytest.TempPathFactory) -> Target:
    """A folder that is built into and interrupted, again and again."""
    return Target(ways, tmp_path_factory.mktemp("interrupted"))


@pytest.fixture(scope="module")
def courses(target: Target) -> dict[int, Course]:
    """How long a build takes, alone and with two workers."""
    return {workers: course(target, workers) for workers in (1, 2)}


@posix
@pytest.mark.slow
@pytest.mark.parametrize(
    ("number", "workers", "until"),
    [
        *((signal.SIGINT, 1, until) for until in ("begin", "settle", "swap", "swap again")),
        *((signal.SIGINT, 2, until) for until in ("begin", "begin again", "swap")),
        *((signal.SIGTERM, 2, "begin"), (signal.SIGTERM, 1, "swap")),
    ],
)
def test_interrupted_command_tidies_up_and_tells_the_truth(
    target: Target,
    courses: dict[int, Course],
    number: signal.Signals,
    workers: int,
    until: str,
) -> None:
    """At any moment: status, one line, old or new, nothing left, no worker lives on."""
    draw = random.Random(f"{until} {workers} {number}")
    until = until.partition(" ")[0]
    with target.start(workers) as process:
        for line in words(process):
            if line.startswith(until):
                break
        time.sleep(draw.uniform(0.0, 0.9 * courses[workers].left_s(until)))
        # A terminal interrupts all of its processes; whoever ends a program, that one alone.
        if number == signal.SIGINT:
            os.killpg(process.pid, number)
        else:
            process.send_signal(number)
        heard = until_all_ended(process)
        assert process.stderr is not None
        said = process.stderr.read()
    there = target.after_kill()
    if any(line.startswith("end") for line in heard):  # the command had come to its end
        assert there == target.coming.name
    else:
        assert process.returncode == 128 + number
        assert (said, there) in [(OLD, target.there.name), (NEW, target.coming.name)]
    assert beside(target.place) == []
    assert target.build_next() == []


@posix
@pytest.mark.parametrize("workers", [1, 2])
def test_interrupted_function_tidies_up_and_passes_it_on(
    ways: TwoWays, tmp_path: Path, workers: int
) -> None:
    """In Python the interruption goes on to the caller, with a note on what is there."""
    out = tmp_path / "out"
    expected = built(ways.old, out)

    def interrupt(stage: str, done: int, total: int) -> None:  # noqa: ARG001
        signal.raise_signal(signal.SIGINT)

    with pytest.raises(KeyboardInterrupt) as stop:
        etl.build(etl.load_study(ways.new), into=out, workers=workers, progress=interrupt)
    assert stop.value.__notes__ == ["nothing was written, the earlier build is as it was"]
    assert content(out) == expected
    assert beside(out) == []


def sleepy(seconds: float) -> object:
    """Work that takes its time, and does not listen."""

    def work(_: int) -> None:
        time.sleep(seconds)

    return work


@posix
def test_worker_that_does_not_answer_is_ended(tmp_path: Path) -> None:
    """Nobody waits for a worker that is at something long when its answer is not wanted any more.

    The work takes an hour: the test would, too.
    """
    timer = threading.Timer(2.0, lambda: os.kill(os.getpid(), signal.SIGINT))
    with pytest.raises(KeyboardInterrupt), Processes(2, tmp_path) as crew:  # noqa: PT012
        answers = crew.map(sleepy, (3600.0,), range(4))
        timer.start()
        next(answers)


@posix
@pytest.mark.slow
def test_workers_end_with_a_parent_that_is_killed(tmp_path: Path) -> None:
    """A kill leaves the parent no time to end its workers: they notice by themselves."""
    code = (
        "import sys, os, signal; from pathlib import Path\n"
        "from etl.session.crew import Processes\n"
        "from tests.unbreakable.test_interrupts import sleepy\n"
        "if __name__ == '__main__':\n"
        "    with Processes(2, Path(sys.argv[1])) as crew:\n"
        "        answers = crew.map(sleepy, (3600.0,), range(4))\n"
        "        import threading\n"
        "        threading.Timer(4.0, lambda: os.kill(os.getpid(), signal.SIGKILL)).start()\n"
        "        next(answers)\n"
    )
    script = tmp_path / "script.py"
    script.write_text(code, encoding="utf-8")
    project = Path(__file__).resolve().parents[2]
    # The streams end when the last process that holds them does.
    ran = subprocess.run(
        [sys.executable, str(script), str(tmp_path)],
        env={**os.environ, "PYTHONPATH": str(project)},
        capture_output=True,
        timeout=120,
        check=False,
    )
    assert ran.returncode == -signal.SIGKILL


def test_check_leaves_no_file_when_interrupted(
    ways: TwoWays, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What it had put aside goes, too."""
    before = files_of(ways.folder)
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    seen: list[str] = []

    def interrupt(*_: object) -> None:
        seen.extend(path.name for path in tmp_path.iterdir())
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        etl.check(etl.load_study(ways.new), progress=interrupt)
    assert len(seen) == 1
    assert files_of(ways.folder) == before
    assert list(tmp_path.iterdir()) == []
