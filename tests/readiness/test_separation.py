"""Separation: textbook examples, every direction tried out, and what is said to cause it."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

from etl.readiness import separation_of
from etl.readiness.separation import _by_program, _margins
from etl.readiness.terms import design_matrix
from tests.readiness.making import Row, judged

#: Agresti (2002), Categorical Data Analysis, 2nd edition, section 6.5.1 (from memory): x = 10 to 40
#: has zeros and 60 to 90 has ones.
AGRESTI_X = np.array([10, 20, 30, 40, 60, 70, 80, 90])
#: The same book, section 6.5.2, a clinical trial in five centres (from memory): successes and
#: failures of the active drug and of the placebo. Centres 1 and 3 have no success.
AGRESTI_CENTRES = {
    "1": ((0, 5), (0, 9)),
    "2": ((1, 12), (0, 10)),
    "3": ((0, 7), (0, 5)),
    "4": ((6, 3), (2, 6)),
    "5": ((5, 9), (2, 12)),
}


def with_intercept(x: NDArray[np.int64]) -> NDArray[np.float64]:
    """A design matrix of one number."""
    return np.column_stack([np.ones(len(x)), x]).astype(np.float64)


def cells_to_rows(cells: dict[tuple[str, ...], tuple[int, int]]) -> list[Row]:
    """Zeros and ones of each combination as rows of two readers."""
    return [
        (f"P{n % 2}", None, levels, value)
        for levels, counts in cells.items()
        for value, count in enumerate(counts)
        for n in range(count)
    ]


def test_number_that_tells_all_apart_separates_completely() -> None:
    """Agresti's example of complete separation by a number (from memory)."""
    high = (AGRESTI_X > 50).astype(np.int64)
    kind, told = separation_of(with_intercept(AGRESTI_X), 1 - high, high)
    assert (kind, told.all()) == ("complete", True)


def test_number_with_both_values_at_one_place_separates_quasi_completely() -> None:
    """The same with a zero and a one at x = 50 (the same section, from memory)."""
    x = np.append(AGRESTI_X, 50)
    high = (x > 50).astype(np.int64)
    low = (x < 50).astype(np.int64)
    kind, told = separation_of(with_intercept(x), np.append(low[:-1], 1), np.append(high[:-1], 1))
    assert (kind, told.tolist()) == ("quasi-complete", [True] * 8 + [False])


def test_number_with_overlap_does_not_separate() -> None:
    """One of each kind on the wrong side, and estimates exist."""
    ones = np.array([0, 0, 1, 0, 1, 0, 1, 1])
    kind, told = separation_of(with_intercept(AGRESTI_X), 1 - ones, ones)
    assert (kind, told.any()) == ("none", False)


def test_centres_without_success_separate_quasi_completely() -> None:
    """Agresti's clinical trial: main effects of centre and treatment (from memory)."""
    cells = {
        (centre, drug): (failures, successes)
        for centre, both in AGRESTI_CENTRES.items()
        for drug, (successes, failures) in zip(("active", "placebo"), both, strict=True)
    }
    factors = {"centre": list(AGRESTI_CENTRES), "drug": ["active", "placebo"]}
    one = judged(factors, cells_to_rows(cells), items=False)
    assert one.separations[0].effects == "centre + drug"
    assert one.separations[0].kind == "quasi-complete"
    assert one.separations[0].causes == ("centre = 1 has zeros only", "centre = 3 has zeros only")
    assert one.verdict == "separated"


SMALL = st.sampled_from([(0, 0), (0, 2), (2, 0), (1, 1)])


@given(st.sampled_from([(2, 2), (2, 3), (3, 3), (2, 2, 2)]), st.data())
def test_separated_cells_are_those_of_all_directions_tried_out(
    sizes: tuple[int, ...], data: st.DataObject
) -> None:
    """Main effects over every table: directions of small whole numbers are all there are."""
    codes = np.array(list(product(*map(range, sizes))))
    counts = np.array(data.draw(st.tuples(*[SMALL] * len(codes))))
    zeros, ones = counts[:, 0], counts[:, 1]
    matrix = design_matrix(codes, sizes, 1)
    kind, told = separation_of(matrix, zeros, ones)
    expected = np.zeros(len(codes), dtype=bool)
    single = (zeros > 0) != (ones > 0)
    for direction in product((-2, -1, 0, 1, 2), repeat=matrix.shape[1]):
        margin = matrix @ np.array(direction)
        wrong = (margin > 0) & (zeros > 0) | (margin < 0) & (ones > 0)
        if not wrong.any():
            expected |= (margin != 0) & single
    assert told.tolist() == expected.tolist()
    valued = zeros + ones > 0
    whole = bool(valued.any()) and expected[valued].all()
    assert kind == ("none" if not expected.any() else "complete" if whole else "quasi-complete")


@given(st.integers(0, 2**32 - 1))
def test_short_way_gives_what_the_linear_program_gives(seed: int) -> None:
    """Where rank alone decides, the program decides the same."""
    rng = np.random.default_rng(seed)
    sizes = tuple(rng.integers(2, 4, rng.integers(1, 4)).tolist())
    codes = np.array(list(product(*map(range, sizes))))
    matrix = design_matrix(codes, sizes, int(rng.integers(1, len(sizes) + 1)))
    sign = rng.choice([-1.0, 0.0, 0.0, 1.0], len(codes))
    signed, mixed = matrix[sign != 0] * sign[sign != 0, None], matrix[sign == 0]
    if len(signed):
        assert _margins(signed, mixed).tolist() == _by_program(signed, mixed).tolist()


@given(st.lists(SMALL, min_size=8, max_size=8))
def test_larger_model_is_separated_wherever_a_smaller_one_is(counts: list[tuple[int, int]]) -> None:
    """Main effects, two-way interactions, all interactions: never less as terms are added."""
    factors = {name: ["x", "y"] for name in "abc"}
    cells = dict(zip(product(*factors.values()), counts, strict=True))
    kinds = ["none", "quasi-complete", "complete"]
    one = judged(factors, cells_to_rows(cells), items=False)
    graves = [kinds.index(own.kind) for own in one.separations]
    assert graves == sorted(graves)
    if one.ladder:
        assert (one.verdict == "separated") == (graves != [] and graves[-1] > 0)


CAUSES = {
    "a level": (
        {("early", "fit"): (3, 2), ("early", "odd"): (0, 2), ("late", "fit"): (2, 2)}
        | {("late", "odd"): (0, 4)},
        ("fit = odd has ones only",),
    ),
    "a combination": (
        {("early", "fit"): (3, 2), ("early", "odd"): (1, 2), ("late", "fit"): (2, 2)}
        | {("late", "odd"): (4, 0)},
        ("cue = late × fit = odd has zeros only",),
    ),
    "two that only together tell": (
        {("early", "fit"): (3, 0), ("early", "odd"): (1, 2), ("late", "fit"): (2, 2)}
        | {("late", "odd"): (0, 4)},
        ("cue = early × fit = fit has zeros only", "cue = late × fit = odd has ones only"),
    ),
}


@pytest.mark.parametrize("case", CAUSES)
def test_cause_is_named_by_level_or_else_by_combination(case: str) -> None:
    """A level that has one value only is named rather than its cells."""
    cells, expected = CAUSES[case]
    factors = {"cue": ["early", "late"], "fit": ["fit", "odd"]}
    one = judged(factors, cells_to_rows(cells), items=False)
    first = next(own for own in one.separations if own.kind != "none")
    assert first.causes == expected


def test_combination_alone_separates_the_interaction_only() -> None:
    """One cell of one value leaves main effects estimable."""
    one = judged(
        {"cue": ["early", "late"], "fit": ["fit", "odd"]},
        cells_to_rows(CAUSES["a combination"][0]),
        items=False,
    )
    told = [(own.effects, own.kind) for own in one.separations]
    assert told == [("cue + fit", "none"), ("cue * fit", "quasi-complete")]


def test_many_causes_are_counted() -> None:
    """Beyond a handful the rest are a number."""
    levels = [f"l{n}" for n in range(20)]
    cells = {(level,): (2, 0) if n else (1, 1) for n, level in enumerate(levels)}
    one = judged({"word": levels}, cells_to_rows(cells), items=False)
    assert len(one.separations[0].causes) == 7
    assert one.separations[0].causes[-1] == "and 13 more such"
