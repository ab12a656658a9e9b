"""Whatever the fixations and the text: a line of the text for every fixation."""

from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.lines import METHODS
from tests.lines.building import DEFAULTS, any_fixations, found, read_through, text


@settings(max_examples=150)
@given(any_fixations(), st.integers(1, 7), st.sampled_from([20.0, 64.0, 63.7]))
def test_every_fixation_gets_a_line_of_the_text(
    fixations: list[tuple[float, float]], lines: int, height: float
) -> None:
    """Few fixations, equal ones, ones far off: always as many lines as fixations, all in range."""
    passage = text(lines, height=height)
    for method in METHODS:
        got = found(method, passage, fixations)
        assert len(got) == len(fixations), method
        assert all(0 <= line < lines for line in got), method


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("count", [1, 2, 5])
def test_equal_fixations_stay_together(method: str, count: int) -> None:
    """On one spot of the second line nothing tells fixations apart but their order."""
    got = found(method, text(3), [(200, 166)] * count)
    if method == "segment":  # as many lines as steps allow: it presumes that each line was read
        assert got == [min(i, 2) for i in range(count)]
    elif method == "warp":  # words are gone through from the first to the last
        assert got == sorted(got)
    else:
        assert got == [1] * count


@pytest.mark.parametrize("method", ["cluster", "merge"])
def test_fewer_rows_than_lines_lie_on_the_nearest_ones(method: str) -> None:
    """Two heights on a text of five lines are not the first two lines."""
    fixations = [(100, 230), (200, 230), (300, 230), (100, 350), (200, 350), (300, 350)]
    assert found(method, text(5), fixations) == [2, 2, 2, 4, 4, 4]


def test_slice_begins_with_the_line_nearest_to_the_highest_one_found() -> None:
    """The last two lines of four were read; the first ones are not presumed to be among them."""
    fixations = [(100, 230), (200, 230), (300, 230), (100, 290), (200, 290)]
    assert found("slice", text(4), fixations) == [2, 2, 2, 3, 3]


def test_two_thousand_fixations_are_no_trouble() -> None:
    """Methods whose work grows with the square of the fixations still take a moment only.

    Ten seconds for all is some tens of times what they take; what blows up takes minutes.
    """
    trial = read_through(3, lines=200, noise_px=12, skipping=0.1)
    assert trial.x_px.size >= 1_900
    started = time.perf_counter()
    lines = [METHODS[m](trial.x_px, trial.y_px, trial.passage, DEFAULTS) for m in METHODS]
    assert time.perf_counter() - started < 10
    assert np.array(lines).shape == (len(METHODS), trial.x_px.size)
