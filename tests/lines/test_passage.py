"""What a text and fixations must be like, and texts that are read from right to left."""

from __future__ import annotations

import numpy as np
import pytest

from etl.errors import FaultError
from etl.lines import METHODS, Passage
from tests.lines.building import DEFAULTS, found, read_through, text

REFUSED = {
    "no line": (([], [10.0], [0], 60.0, 100.0), "must have lines and words"),
    "no word": (([100.0], [], [], 60.0, 100.0), "must have lines and words"),
    "unequal": (([100.0], [10.0], [0, 0], 60.0, 100.0), "as long as each other"),
    "not finite": (([100.0], [np.nan], [0], 60.0, 100.0), "positions must be finite"),
    "lines up": (([160.0, 100.0], [10.0], [0], 60.0, 100.0), "line_y_px must go down"),
    "no height": (([100.0], [10.0], [0], 0.0, 100.0), "sizes must be above 0"),
    "words back": (([100.0, 160.0], [1.0, 2.0], [1, 0], 60.0, 100.0), "in reading order"),
    "no such line": (([100.0, 160.0], [1.0, 2.0], [1, 2], 60.0, 100.0), "name lines from 0"),
}


@pytest.mark.parametrize(("given", "says"), REFUSED.values(), ids=REFUSED.keys())
def test_impossible_text_is_refused(
    given: tuple[list[float], list[float], list[int], float, float], says: str
) -> None:
    """A text has lines from the top and words in reading order on them."""
    lines, words, word_line, height, width = given
    arrays = np.array(lines, np.float64), np.array(words), np.array(word_line, np.int32)
    with pytest.raises(FaultError, match=says):
        Passage(*arrays, height, width)


@pytest.mark.parametrize("method", METHODS)
def test_unequal_columns_are_refused(method: str) -> None:
    """Every fixation has an x and a y."""
    with pytest.raises(FaultError, match="x_px and y_px must be as long as each other"):
        METHODS[method](np.zeros(3), np.zeros(2), text(2), DEFAULTS)


@pytest.mark.parametrize("method", METHODS)
def test_missing_position_is_refused(method: str) -> None:
    """Fixations without a position are not for the methods."""
    with pytest.raises(FaultError, match="positions must be finite"):
        METHODS[method](np.array([1.0, np.nan]), np.zeros(2), text(2), DEFAULTS)


@pytest.mark.parametrize("method", METHODS)
def test_no_fixation_has_no_line(method: str) -> None:
    """Nothing in, nothing out."""
    assert found(method, text(3), []) == []


@pytest.mark.parametrize("method", METHODS)
def test_text_of_one_line_has_all_fixations(method: str) -> None:
    """Where there is one line, there is nothing to choose."""
    assert found(method, text(1), [(100, -50), (400, 900), (90, 100)]) == [0, 0, 0]


def test_mirrored_twice_is_the_text_itself() -> None:
    """Only the sign of x changes."""
    passage = text(3, (100, 250, 390))
    assert passage.mirrored.word_x_px.tolist() == [-100, -250, -390] * 3
    assert passage.mirrored.mirrored.word_x_px.tolist() == passage.word_x_px.tolist()


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("seed", range(3))
def test_right_to_left_text_is_read_through_a_mirror(method: str, seed: int) -> None:
    """A reading and its mirror image on a screen of 1,920 px have the same lines.

    The image is what a reader of a text from right to left makes: words in the same order, x turned
    about the middle of the screen. Mirrored as the passage says, it is a reading from left to right
    that stands elsewhere.
    """
    trial = read_through(seed, noise_px=14, slope=0.03)
    passage = trial.passage
    image = Passage(
        passage.line_y_px,
        1920 - passage.word_x_px,
        passage.word_line,
        passage.line_height_px,
        passage.width_px,
    )
    lines = METHODS[method](-(1920 - trial.x_px), trial.y_px, image.mirrored, DEFAULTS)
    assert lines.tolist() == trial.lines(method)
