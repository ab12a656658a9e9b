"""What must not change the lines that are found."""

from __future__ import annotations

import numpy as np
import pytest

from etl.lines import METHODS, Passage
from tests.lines.building import DEFAULTS, Trial, read_through

SEEDS = range(4)


def noisy(seed: int) -> Trial:
    """A reading that no method gets right throughout."""
    return read_through(seed, noise_px=18, slope=0.03, shift=0.05)


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("seed", SEEDS)
def test_where_the_text_stands_does_not_matter(method: str, seed: int) -> None:
    """Text and fixations moved together by whole pixels have the same lines."""
    trial = noisy(seed)
    passage = trial.passage
    moved = Passage(
        passage.line_y_px + 523,
        passage.word_x_px - 1361,
        passage.word_line,
        passage.line_height_px,
        passage.width_px,
    )
    lines = METHODS[method](trial.x_px - 1361, trial.y_px + 523, moved, DEFAULTS)
    assert lines.tolist() == trial.lines(method)


@pytest.mark.parametrize("method", ["cluster", "merge", "segment"])
@pytest.mark.parametrize("seed", SEEDS)
def test_fixations_moved_down_alone_keep_their_lines(method: str, seed: int) -> None:
    """Methods that do not look at where lines are do not mind an offset."""
    trial = noisy(seed)
    lines = METHODS[method](trial.x_px, trial.y_px + 41, trial.passage, DEFAULTS)
    assert lines.tolist() == trial.lines(method)


@pytest.mark.parametrize("method", ["attach", "cluster", "stretch"])
def test_x_does_not_matter_to_methods_of_height(method: str) -> None:
    """They look at y alone."""
    trial = noisy(0)
    lines = METHODS[method](0 * trial.x_px, trial.y_px, trial.passage, DEFAULTS)
    assert lines.tolist() == trial.lines(method)


@pytest.mark.parametrize("method", ["attach", "cluster"])
def test_order_does_not_matter_to_methods_of_single_fixations(method: str) -> None:
    """Backwards in time they find the same lines, backwards."""
    trial = noisy(1)
    lines = METHODS[method](trial.x_px[::-1], trial.y_px[::-1], trial.passage, DEFAULTS)
    assert lines[::-1].tolist() == trial.lines(method)


@pytest.mark.parametrize("method", METHODS)
def test_undisturbed_reading_is_found(method: str) -> None:
    """Every line read once without drift, with 3 px of noise: all methods are right throughout."""
    assert read_through(7, noise_px=3).right(method) == 1.0


@pytest.mark.parametrize("method", METHODS)
def test_input_is_left_as_it_was(method: str) -> None:
    """Methods are pure: what they are given stays, and the same gives the same."""
    trial = noisy(2)
    before = trial.x_px.copy(), trial.y_px.copy(), trial.passage.word_x_px.copy()
    assert trial.lines(method) == trial.lines(method)
    after = trial.x_px, trial.y_px, trial.passage.word_x_px
    assert all(np.array_equal(a, b) for a, b in zip(before, after, strict=True))
