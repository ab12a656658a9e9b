"""Memory grows by few bytes a trial while facts are joined, and by little a log."""

from __future__ import annotations

import gc
import pickle
import tracemalloc
from collections.abc import Callable
from pathlib import Path

import pytest

import etl
from etl.errors import Findings
from etl.session.all_logs import read_logs
from etl.session.crew import Alone
from etl.session.gather import gather
from etl.session.kept_logs import Aside, Shelf
from etl.session.kept_store import KeptStore
from etl.session.plan import Plan, make_plan
from etl.session.seen import Sharing
from etl.session.work import LogAnswer
from tests.simulator import write_bulk_study

TRIALS = 300
#: How many readers the smaller and the larger study have.
SIZES = (10, 60)
#: Bytes a trial. A number of an array takes 1 to 8 of them, a text of its own some 60, a tuple
#: as much: there is room for arrays only.
MOST_JOINING, MOST_KEPT = 90, 40


def read(folder: Path, readers: int) -> tuple[Plan, list[LogAnswer], Aside]:
    """A study whose logs have been read, as by workers: nothing is shared."""
    study = etl.load_study(
        write_bulk_study(folder, readers=readers, trials=TRIALS, fixations=1).study_file
    )
    plan, logs = make_plan(study, Findings())
    assert plan is not None
    aside = aside_in(folder / "kept")
    answers = read_logs(logs, plan.reader, aside, Alone(), lambda *_: None)
    return plan, [pickle.loads(pickle.dumps(answer)) for answer in answers], aside  # noqa: S301


def aside_in(folder: Path) -> Aside:
    """Where fixations are put aside: in memory, while there is room."""
    return Aside(KeptStore(folder / "earlier", folder), keep=False, shelf=Shelf(1 << 30))


def traced(work: Callable[[], object]) -> tuple[int, int]:
    """The bytes at the peak of some work, and those that its result holds."""
    gc.collect()
    tracemalloc.start()
    try:
        before, _ = tracemalloc.get_traced_memory()
        result = work()
        gc.collect()
        after, peak = tracemalloc.get_traced_memory()
        del result
    finally:
        tracemalloc.stop()
    return peak - before, after - before


@pytest.fixture(scope="module")
def slopes(tmp_path_factory: pytest.TempPathFactory) -> tuple[float, float]:
    """Bytes a trial, from two sizes: at the peak of joining, and afterwards."""
    measured = []
    for readers in SIZES:
        plan, answers, aside = read(tmp_path_factory.mktemp("study") / "made", readers)
        work = lambda p=plan, a=answers, s=aside: gather(p, a, s, Findings())  # noqa: E731
        measured.append(traced(work))
    more = TRIALS * (SIZES[1] - SIZES[0])
    (peak, kept), (more_peak, more_kept) = measured
    return (more_peak - peak) / more, (more_kept - kept) / more


def test_joining_takes_few_bytes_a_trial(slopes: tuple[float, float]) -> None:
    """At the peak."""
    assert slopes[0] < MOST_JOINING


def test_the_work_that_waits_takes_few_bytes_a_trial(slopes: tuple[float, float]) -> None:
    """The tasks of readers are columns until they are asked for."""
    assert slopes[1] < MOST_KEPT


def test_trials_of_many_logs_share_their_texts(tmp_path: Path) -> None:
    """What another log adds is far less than what it takes by itself."""
    _, answers, _ = read(tmp_path / "made", SIZES[0])
    parts = [answer.trials for answer in answers]
    copies = [pickle.dumps(part) for part in parts]

    def alone() -> list[object]:
        return [pickle.loads(copy) for copy in copies]  # noqa: S301

    def shared() -> list[object]:
        sharing = Sharing()
        return [sharing.trials(pickle.loads(copy)) for copy in copies]  # noqa: S301

    assert traced(shared)[1] < traced(alone)[1] / 3
    for one, other in zip(alone(), shared(), strict=True):
        assert one.ids.keys() == other.ids.keys()  # type: ignore[attr-defined]
        for name, column in one.ids.items():  # type: ignore[attr-defined]
            theirs = other.ids[name]  # type: ignore[attr-defined]
            assert column.values == theirs.values
            assert column.codes.tolist() == theirs.codes.tolist()
