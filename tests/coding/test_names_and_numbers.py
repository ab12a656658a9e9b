"""Names of the new columns, and numbers given by hand."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.coding import NAMED, coding_of, plain_name, tells_levels_apart

SMALL = st.integers(-4, 4)


@pytest.mark.parametrize(
    ("factor", "levels", "wanted", "columns"),
    [
        pytest.param("cue", ["early", "late"], "treatment", ["cue_late"], id="treatment"),
        pytest.param("cue", ["early", "late"], "sum", ["cue_early"], id="sum"),
        pytest.param("cue", ["a", "b", "c"], "helmert", ["cue_b", "cue_c"], id="helmert"),
        pytest.param(
            "cue",
            "abcde",
            "polynomial",
            ["cue_linear", "cue_quadratic", "cue_cubic", "cue_4"],
            id="polynomial",
        ),
        pytest.param("cue", "ab", {"contrast": [0, 1]}, ["cue_contrast"], id="given"),
        pytest.param("cue", ["x", "too early"], "treatment", ["cue_too_early"], id="blank"),
        pytest.param("cue", "-+=", "treatment", ["cue_1", "cue_2"], id="levels of signs"),
        pytest.param("cue", ["x", "a b", "a-b"], "treatment", ["cue_1", "cue_2"], id="alike"),
        pytest.param("2nd cue", "ab", "treatment", ["f_2nd_cue_b"], id="factor with a digit"),
        pytest.param("?", "ab", "treatment", ["factor_b"], id="factor of signs"),
    ],
)
def test_columns_are_named_after_factor_and_level(
    factor: str, levels: list[str], wanted: str | dict[str, list[float]], columns: list[str]
) -> None:
    """Names need no quotes in a formula; numbers take the place of levels that are lost in them."""
    assert list(coding_of(factor, levels, wanted).columns) == columns


@given(
    factor=st.text(max_size=6),
    levels=st.lists(st.text(max_size=4), min_size=1, max_size=5, unique=True),
    name=st.sampled_from(NAMED),
)
def test_any_names_give_distinct_plain_columns(factor: str, levels: list[str], name: str) -> None:
    """Whatever a factor and its levels are called, R takes the columns' names as they are."""
    columns = coding_of(factor, levels, name).columns
    assert len(set(columns)) == len(columns) == len(levels) - 1
    assert all(re.fullmatch("[A-Za-z][0-9A-Za-z_]*", column) for column in columns)


@given(st.text())
def test_plain_name_is_plain_already(text: str) -> None:
    """Keeping what can be kept a second time changes nothing."""
    assert plain_name(plain_name(text)) == plain_name(text)


@pytest.mark.parametrize(
    ("columns", "levels", "apart"),
    [
        pytest.param([[-0.5, 0.5]], 2, True, id="two levels"),
        pytest.param([[1, 1]], 2, False, id="constant"),
        pytest.param([[0, 0]], 2, False, id="zeros"),
        pytest.param([[-1, 0, 1]], 3, False, id="a column too few"),
        pytest.param([[-1, 1], [1, -1]], 2, False, id="a column too many"),
        pytest.param([[-1, 0, 1], [1, -2, 1]], 3, True, id="independent"),
        pytest.param([[-1, 0, 1], [2, 0, -2]], 3, False, id="a multiple of another"),
        pytest.param([[-1, 0, 1], [4, 5, 6]], 3, False, id="another and a constant"),
        pytest.param([[-1e-9, 0, 1e-9], [1e9, -2e9, 1e9]], 3, True, id="of very different size"),
        pytest.param([], 1, True, id="one level"),
    ],
)
def test_columns_that_tell_levels_apart(
    columns: list[list[float]], levels: int, apart: bool
) -> None:
    """One column less than levels, none of which follows from the others and a constant."""
    assert tells_levels_apart(columns, levels) is apart


@given(st.lists(st.lists(SMALL, min_size=4, max_size=4), min_size=3, max_size=3))
def test_rank_is_that_of_exact_arithmetic(columns: list[list[int]]) -> None:
    """Whole numbers tell levels apart exactly where the determinant is not zero."""
    whole = [[1, *(column[level] for column in columns)] for level in range(4)]
    assert tells_levels_apart(columns, 4) is (exact_determinant(whole) != 0)


def exact_determinant(rows: list[list[int]]) -> int:
    """By Laplace's expansion along the first row, in whole numbers."""
    if len(rows) == 1:
        return rows[0][0]
    return sum(
        (-1) ** place
        * number
        * exact_determinant([row[:place] + row[place + 1 :] for row in rows[1:]])
        for place, number in enumerate(rows[0])
    )


def test_given_numbers_are_the_matrix() -> None:
    """A row a level, a column a name, in the order in which they are given."""
    coding = coding_of("cue", "abc", {"one": [-1, 0, 1], "two": [1, -2, 1]})
    assert coding.columns == ("cue_one", "cue_two")
    assert coding.matrix == ((-1.0, 1.0), (0.0, -2.0), (1.0, 1.0))


def test_unknown_contrast_is_a_key_error() -> None:
    """The study file has been checked before: a name that is not known is a fault."""
    with pytest.raises(KeyError, match="simple"):
        coding_of("cue", "ab", "simple")


def test_least_squares_finds_the_differences_that_the_names_promise() -> None:
    """Fitting means of levels by each contrast gives what the field reads off it.

    Treatment: each mean against the first. Sum: each against the mean of all. Helmert: each against
    the mean of those before, over its number (Schad et al. 2020, doi:10.1016/j.jml.2019.104038).
    """
    means = np.array([3.0, 5.0, 13.0])
    promised = {
        "treatment": [3.0, 2.0, 10.0],
        "sum": [7.0, -4.0, -2.0],
        "helmert": [7.0, 2.0 / 2, 9.0 / 3],
    }
    for name, wanted in promised.items():
        numbers = np.array(coding_of("cue", "abc", name).matrix)
        found = np.linalg.solve(np.column_stack([np.ones(3), numbers]), means)
        # Three numbers of at most 13 through one solution: far from the last digit.
        assert np.abs(found - wanted).max() < 1e-12
