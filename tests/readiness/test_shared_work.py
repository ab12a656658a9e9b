"""Row groups may be counted by anybody, in any order."""

from __future__ import annotations

import pickle
import random
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from etl.errors import FaultError
from etl.session import readiness_counting
from etl.session.readiness import readiness_of
from etl.session.readiness_counting import PairCounts
from tests.readiness.making import MadeStudy, random_study, write_study


class Scattered:
    """Does each task with a function of its own, in any order; everything goes by pickle."""

    def __init__(self, seed: int) -> None:
        self._source = random.Random(seed)
        self.tasks = 0

    def __call__(
        self,
        make: Callable[..., Callable[[Any], Any]],
        arguments: tuple[Any, ...],
        tasks: Sequence[Any],
    ) -> Iterator[Any]:
        """The answers, in an order that is drawn."""
        self.tasks += len(tasks)
        for task in self._source.sample(list(tasks), len(tasks)):
            own = pickle.loads(pickle.dumps((make, arguments, task)))  # noqa: S301 - made here
            yield pickle.loads(pickle.dumps(own[0](*own[1])(own[2])))  # noqa: S301


@pytest.fixture
def study(request: pytest.FixtureRequest, tmp_path: Path) -> tuple[MadeStudy, Path]:
    """A random study in many small row groups."""
    made = random_study(request.param)
    with pytest.MonkeyPatch.context() as patch:
        write_study(made, tmp_path, patch)
    return made, tmp_path


@pytest.mark.parametrize("study", range(12), indirect=True)
@pytest.mark.parametrize("cells", [1, 400])
def test_facts_do_not_hang_on_who_counts(
    study: tuple[MadeStudy, Path], cells: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Also where only the combinations of levels that occur are listed."""
    made, folder = study
    monkeypatch.setattr("etl.session.readiness.MOST_CELLS", cells)
    scattered = Scattered(seed=cells)
    told = readiness_of(folder, made.design, None, scattered)
    # As texts, since a number that is missing is not equal to itself.
    assert repr(told) == repr(readiness_of(folder, made.design))
    assert scattered.tasks > 1


@pytest.mark.parametrize("study", [3], indirect=True)
def test_rows_without_a_trial_are_a_fault(study: tuple[MadeStudy, Path]) -> None:
    """Both tables come from one build, so a pair that only one of them has is an error of ours."""
    made, folder = study
    more, fewer = folder / "more", folder / "fewer"
    for own in (more, fewer):
        own.mkdir()
    first = made.trials[0]["participant"]
    write_study(made, more)
    write_study(
        MadeStudy(made.design, made.wide, [r for r in made.trials if r["participant"] != first]),
        fewer,
    )
    (fewer / "outcomes_wide.parquet").write_bytes((more / "outcomes_wide.parquet").read_bytes())
    with pytest.raises(FaultError, match="no row in trials"):
        readiness_of(fewer, made.design)


def test_sums_outgrow_small_numbers() -> None:
    """Counts are held in one byte while they fit, and in more where their sum does not."""
    merging = readiness_counting._Merging()  # noqa: SLF001 - what adds them up
    for key in (5, 7, 5):
        merging.add(PairCounts(np.array([key]), np.full((1, 1, 1, 2), 200, dtype=np.uint8)))
    merged = merging.merge()
    assert merged.keys.tolist() == [5, 7]
    assert merged.values[:, 0, 0].tolist() == [[400, 400], [200, 200]]
