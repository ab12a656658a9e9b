"""The consensus on 24 real trials, against the lines that two correctors agreed on.

A fixation that they discarded is right only if it is discarded; one that they kept is wrong if it
is. None of the constants was fitted to these trials.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from etl.lines import METHODS, MethodSettings
from etl.lines.consensus import LineAssignment, assign_by_consensus
from tests.lines.corrected import ABSENT, PASSAGES, Corrected, corrected_trials

pytestmark = pytest.mark.skipif(not PASSAGES.is_dir(), reason=ABSENT)


@cache
def answers() -> list[tuple[Corrected, LineAssignment]]:
    """All trials with what the consensus makes of them."""
    return [
        (t, assign_by_consensus(t.x_px, t.y_px, t.duration_ms, t.passage))
        for t in corrected_trials()
    ]


def right_of_kept() -> np.ndarray:
    """For each trial, the share of fixations kept by hand that are on the right line."""
    return np.array([np.mean((got.line == t.line)[t.kept]) for t, got in answers()])


def right_of_all() -> np.ndarray:
    """For each trial, the share of all fixations that are right."""
    return np.array([np.mean(got.line == t.line) for t, got in answers()])


def test_fixations_that_correctors_kept_are_on_their_lines() -> None:
    """On average at least 99.5 % of a trial, and in no trial under 95 %."""
    assert len(answers()) == 24
    assert right_of_kept().mean() >= 0.995
    assert right_of_kept().min() >= 0.95


def test_discarded_fixations_count_too() -> None:
    """On average at least 98.5 %."""
    assert right_of_all().mean() >= 0.985


@pytest.mark.parametrize("method", METHODS)
def test_no_single_method_is_as_good(method: str) -> None:
    """Neither on the fixations that were kept nor in the worst trial."""
    single = np.array(
        [
            np.mean(
                (METHODS[method](t.x_px, t.y_px, t.passage, MethodSettings()) + 1 == t.line)[t.kept]
            )
            for t, _ in answers()
        ]
    )
    assert right_of_kept().mean() > single.mean()
    assert right_of_kept().min() > single.min()


def test_sure_trials_are_right() -> None:
    """At least 97 % of what was kept, in every trial that is marked sure; most are."""
    sure = np.array([got.sure for _, got in answers()])
    assert right_of_kept()[sure].min() >= 0.97
    assert sure.mean() >= 0.8


def test_trial_that_ends_with_a_contested_jump_is_not_sure() -> None:
    """Reader 17 ends on an earlier line; methods and correctors do not agree on which."""
    assert [got.sure for t, got in answers() if t.reader == "17"] == [False]


def test_unsure_fixations_are_wrong_more_often() -> None:
    """Confidence tells: below nine in ten at least ten times as many are wrong as above."""
    wrong = np.concatenate([got.line != t.line for t, got in answers()])
    unsure = np.concatenate([got.confidence for _, got in answers()]) < 0.9
    assert wrong[unsure].mean() > 10 * wrong[~unsure].mean()
