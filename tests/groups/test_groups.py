"""A reader alone and in any group: the same rows, counts, findings and summaries."""

from __future__ import annotations

import shutil
import time
from collections import Counter
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from etl.errors import FaultError
from etl.screening.ledger import Accounts, check_balance
from etl.session.joined_readers import group_of
from etl.session.reader import ReaderTables
from tests.groups.studies import STUDIES
from tests.groups.working import Readers, different, readers_of
from tests.screening.building import study
from tests.screening.strategies import Lab, Rules, labs, rules, usable
from tests.simulator import write_bulk_study

ANY = settings(max_examples=12, deadline=None, suppress_health_check=list(HealthCheck))
CUTS = st.lists(st.integers(1, 23))


@dataclass(frozen=True)
class Prepared:
    """The readers of a study, and what is told of each who is worked on alone."""

    readers: Readers

    @cached_property
    def alone(self) -> list[ReaderTables]:
        """What is told of each."""
        return self.readers.worked(range(len(self.readers.tasks)))


@pytest.fixture(scope="module")
def studies(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Prepared]:
    """Every study, read."""
    made = {}
    for name, make in STUDIES.items():
        readers = readers_of(make(tmp_path_factory.mktemp(name) / "study"))
        assert readers is not None
        made[name] = Prepared(readers)
    return made


@pytest.mark.parametrize("name", STUDIES)
@ANY
@given(cuts=CUTS)
def test_reader_is_the_same_in_any_group(
    studies: dict[str, Prepared], name: str, cuts: list[int]
) -> None:
    """Whoever else is worked on at the same time."""
    prepared = studies[name]
    for told, alone in zip(prepared.readers.worked(cuts), prepared.alone, strict=True):
        assert not different(told, alone), told.participant


def test_studies_are_worth_comparing(studies: dict[str, Prepared]) -> None:
    """There are readers with errors and without, readers left out, and all that is told."""
    told = {name: made.readers.worked([]) for name, made in studies.items()}
    failed = Counter(one.findings.failed for own in told.values() for one in own)
    assert failed[True] > 3
    assert failed[False] > 50
    wrong = {name: sum(one.findings.failed for one in own) for name, own in told.items()}
    assert (wrong["damaged"], wrong["wrongly_by_hand"], wrong["in_one_log"]) == (2, 2, 1)
    assert sum(one.counts["readers left out"] for one in told["screened"]) > 1
    assert sum(one.accounts["trials"].by_rule["skip"] for one in told["screened"]) > 10
    assert sum(one.accounts["fixations"].by_rule["repeated"] for one in told["recorded_again"]) > 9
    assert sum(bool(one.moved) for one in told["damaged"]) > 1
    assert sum(bool(one.unlisted) for one in told["labelled"]) == 3
    assert sum(one.counts["lines set by hand"] for one in told["by_hand"]) == 3
    assert len(told["in_one_log"]) == 6
    rules = Counter(
        rule for one in told["screened"] for own in one.accounts.values() for rule in own.by_rule
    )
    assert len(rules) > 12


@ANY
@given(labs(), rules(), st.sampled_from(["error", "first", "last"]), CUTS)
def test_reader_of_a_random_study_is_the_same_in_any_group(
    tmp_path_factory: pytest.TempPathFactory,
    lab: Lab,
    given_rules: Rules,
    repeated: str,
    cuts: list[int],
) -> None:
    """Random trials, recorded twice, with practice, sessions and notes, under random rules."""
    folder = tmp_path_factory.getbasetemp() / "random"
    shutil.rmtree(folder, ignore_errors=True)
    limits = str(usable(lab, given_rules))
    readers = readers_of(study(folder, lab.trials, limits, notes=lab.notes, repeated=repeated))
    assume(readers is not None)
    every = readers.worked(range(len(readers.tasks)))
    for told, alone in zip(readers.worked(cuts), every, strict=True):
        assert not different(told, alone), told.participant


def test_rows_of_a_group_stand_reader_after_reader(studies: dict[str, Prepared]) -> None:
    """The rows of a group are those of its readers, one below the other, in every table."""
    readers = studies["damaged"].readers
    tables = readers.bench.tables(group_of(readers.tasks, readers.aside))
    for name, batch in tables.batches.items():
        starts = tables.row_starts[name]
        assert (starts[0], starts[-1]) == (0, batch.num_rows)
        names = batch.column("participant").dictionary_decode().to_pylist()
        for place, one in enumerate(tables.readers):
            own = names[starts[place] : starts[place + 1]]
            assert set(own) <= {one.participant}
            assert name != "fixations" or bool(own) is not one.findings.failed


def test_contradiction_in_one_reader_of_many_is_found() -> None:
    """Accounts that are wrong in one reader and balance over all are not let through."""
    codes = np.array([-1, 2, -1, 2], dtype=np.int8)
    every = Accounts.of_each(codes, np.array([0, 0, 1, 1]), 2)
    kept = {"trials": np.array([2, 0])}
    with pytest.raises(FaultError, match="the accounts of trials do not balance"):
        check_balance({"trials": every, "fixations": every}, [], kept)
    kept = {"trials": np.array([1, 1]), "fixations": np.array([1, 1])}
    with pytest.raises(FaultError, match="the ledger has 0 fixation rows for"):
        check_balance({"trials": every, "fixations": every}, [], kept)


def test_group_costs_much_less_than_its_readers_alone(tmp_path: Path) -> None:
    """Twenty readers at once take less than two thirds of the time of one after the other."""
    made = write_bulk_study(tmp_path, readers=20, trials=20, fixations=10, regions=6)
    readers = readers_of(made.study_file)
    assert readers is not None

    def seconds(cuts: range) -> float:
        before = time.perf_counter()
        readers.worked(cuts)
        return time.perf_counter() - before

    together = min(seconds(range(0)) for _ in range(5))
    alone = min(seconds(range(20)) for _ in range(5))
    assert together < alone * 2 / 3
