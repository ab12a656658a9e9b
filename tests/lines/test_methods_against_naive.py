"""The arrays of the methods against loops and recursions written from the definitions."""

from __future__ import annotations

from fractions import Fraction
from functools import cache
from itertools import combinations, pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.lines import Passage, exact_clusters, fit_regression, fit_stretching
from etl.lines.nearest import lines_in_order
from etl.lines.warping import warping_path
from tests.lines.building import DEFAULTS, any_fixations, found, read_through, text

Point = tuple[int, int]


def spread(values: tuple[int, ...]) -> Fraction:
    """The sum of squared distances from the mean."""
    mean = Fraction(sum(values), len(values))
    return sum(((value - mean) ** 2 for value in values), Fraction(0))


@given(st.lists(st.integers(-50, 50), min_size=1, max_size=9), st.integers(1, 4))
def test_clusters_are_the_best_of_all_divisions(values: list[int], count: int) -> None:
    """No division of the sorted numbers into as many parts has a smaller sum of squares."""
    got = exact_clusters(np.array(values, np.float64), count).tolist()
    ordered, number = sorted(values), min(count, len(set(values)))
    best = min(
        sum(spread(tuple(ordered[a:b])) for a, b in pairwise([0, *cuts, len(values)]))
        for cuts in combinations(range(1, len(values)), number - 1)
    )
    parts = [
        tuple(v for v, c in zip(values, got, strict=True) if c == part) for part in range(number)
    ]
    assert sum(map(spread, parts)) == best
    assert all(max(low) < min(high) for low, high in pairwise(parts))


@given(st.lists(st.integers(0, 6), min_size=4, max_size=9), st.randoms(use_true_random=False))
def test_clusters_do_not_hang_on_the_order(values: list[int], source: object) -> None:
    """Equal numbers are in one cluster, wherever they stand."""
    order = sorted(range(len(values)), key=lambda _: source.random())  # type: ignore[attr-defined]
    numbers = np.array(values, np.float64)
    whole = exact_clusters(numbers, 3)
    assert exact_clusters(numbers[order], 3).tolist() == whole[order].tolist()


def test_many_numbers_are_clustered_in_blocks() -> None:
    """Two thousand numbers in three heaps far from each other and from 0."""
    heaps = [1e6 + 10_000 * heap + np.arange(667) for heap in range(3)]
    got = exact_clusters(np.concatenate(heaps), 3)
    assert got.tolist() == [0] * 667 + [1] * 667 + [2] * 667


@settings(max_examples=60)
@given(st.integers(1, 7), st.integers(1, 7), st.randoms(use_true_random=False))
def test_warping_path_is_that_of_the_recursion(n: int, w: int, source: object) -> None:
    """The way is as short as the recursion says, in allowed steps from corner to corner."""
    off = np.array([[source.randint(0, 9) for _ in range(w)] for _ in range(n)], np.float64)  # type: ignore[attr-defined]

    @cache
    def least(i: int, j: int) -> float:
        before = [(i - 1, j), (i, j - 1), (i - 1, j - 1)]
        ways = [least(a, b) for a, b in before if a >= 0 and b >= 0]
        return float(off[i, j]) + min(ways, default=0.0)

    first, second = warping_path(off)
    assert off[first, second].sum() == least(n - 1, w - 1)
    pairs = list(zip(first.tolist(), second.tolist(), strict=True))
    assert (pairs[0], pairs[-1]) == ((0, 0), (n - 1, w - 1))
    assert {(c - a, d - b) for (a, b), (c, d) in pairwise(pairs)} <= {(0, 1), (1, 0), (1, 1)}


@given(st.lists(st.integers(-50, 400), min_size=1, max_size=5), st.integers(0, 3))
def test_rows_are_on_the_nearest_lines_in_order(rows: list[int], spare: int) -> None:
    """Of all choices of lines for the sorted rows, one with the least sum of distances."""
    lines = 64.0 * np.arange(len(rows) + spare)
    got = lines_in_order(np.array(rows, np.float64), lines)
    ordered = sorted(rows)
    best = min(
        sum(abs(y - lines[at]) for y, at in zip(ordered, chosen, strict=True))
        for chosen in combinations(range(lines.size), len(rows))
    )
    assert np.abs(np.array(rows) - lines[got]).sum() == best
    in_order = got[np.argsort(rows, kind="stable")]
    assert (np.diff(in_order) > 0).all()


def pair_of(points: list[Point]) -> tuple[int, bool]:
    """The error of a line through points, in thousandths of a px, and whether the limits hold."""
    n = len(points)
    x_mean = Fraction(sum(x for x, _ in points), n)
    y_mean = Fraction(sum(y for _, y in points), n)
    across = sum((x - x_mean) ** 2 for x, _ in points)
    slope = sum((x - x_mean) * (y - y_mean) for x, y in points) / across if across else Fraction(0)
    squares = sum((y - y_mean - slope * (x - x_mean)) ** 2 for x, y in points) / n
    error_px = float(squares) ** 0.5
    return round(error_px * 1000), abs(slope) < Fraction(1, 10) and error_px < 20


def merged_by_loop(points: list[Point], passage: Passage) -> list[int]:
    """The method as the paper tells it, every pair looked at again after every merging."""
    sequences: list[list[int]] = [[0]]
    for i in range(1, len(points)):
        (x, y), (x_before, y_before) = points[i], points[i - 1]
        if x < x_before or abs(y - y_before) > 32:
            sequences.append([])
        sequences[-1].append(i)
    lines = passage.line_y_px.size
    for smaller, larger, limited in ((3, 3, True), (1, 3, True), (1, 1, True), (1, 1, False)):
        while len(sequences) > lines:
            tried = []
            for (i, one), (j, other) in combinations(enumerate(sequences), 2):
                sizes = sorted([len(one), len(other)])
                error, within = pair_of([points[k] for k in (*one, *other)])
                if sizes[0] >= smaller and sizes[1] >= larger and (within or not limited):
                    tried.append((error, i, j))
            if not tried:
                break
            _, i, j = min(tried)
            sequences[i] += sequences.pop(j)
    means = [sum(points[k][1] for k in own) / len(own) for own in sequences]
    at = lines_in_order(np.array(means), passage.line_y_px)
    out = [0] * len(points)
    for line, own in zip(at.tolist(), sequences, strict=True):
        for k in own:
            out[k] = line
    return out


@pytest.mark.parametrize("seed", range(12))
def test_merging_is_that_of_the_loop(seed: int) -> None:
    """Errors kept from merging to merging are those computed anew, whatever the noise."""
    trial = read_through(seed, lines=2 + seed % 5, noise_px=4.0 * (1 + seed % 4), slope=0.02)
    points = [(int(x), int(y)) for x, y in zip(trial.x_px, trial.y_px, strict=True)]
    assert found("merge", trial.passage, points) == merged_by_loop(points, trial.passage)


@settings(max_examples=60)
@given(st.lists(st.tuples(st.integers(0, 500), st.integers(80, 320)), min_size=1, max_size=14))
def test_merging_of_anything_is_that_of_the_loop(points: list[Point]) -> None:
    """Single fixations, equal ones and steps straight up are merged as the loop does."""
    passage = text(3)
    assert found("merge", passage, points) == merged_by_loop(points, passage)


def off_px(heights: np.ndarray, passage: Passage) -> np.ndarray:
    """How far heights are from the nearest line."""
    return np.abs(heights[..., np.newaxis] - passage.line_y_px).min(axis=-1)


@pytest.mark.parametrize("slope", [-0.08, 0.0, 0.05])
@pytest.mark.parametrize("seed", range(3))
def test_no_regression_on_a_grid_fits_better(seed: int, slope: float) -> None:
    """Of 61 slopes and 51 offsets within the bounds none has a smaller sum of squares.

    A hundredth of it is allowed for the last step of the search, half of which is 0.002 px.
    """
    trial = read_through(seed, slope=slope)
    fit = fit_regression(trial.x_px, trial.y_px, trial.passage, DEFAULTS)
    across = trial.x_px - trial.passage.begin_x_px

    def squares(slopes: np.ndarray, offsets: np.ndarray) -> np.ndarray:
        lifted = trial.y_px - offsets[:, None, None] - slopes[:, None] * across
        return (off_px(lifted, trial.passage) ** 2).sum(axis=-1)

    own = squares(np.array([fit.slope]), np.array([fit.offset_px])).item()
    assert own <= 1.01 * squares(np.linspace(-0.1, 0.1, 61), np.linspace(-50, 50, 51)).min()
    assert fit.sd_px == pytest.approx((own / trial.x_px.size) ** 0.5)
    assert fit.slope == pytest.approx(slope, abs=0.01)


@pytest.mark.parametrize("shift", [-0.08, 0.0, 0.06])
@pytest.mark.parametrize("seed", range(3))
def test_no_stretching_on_a_grid_fits_better(seed: int, shift: float) -> None:
    """Of 61 scales and 51 offsets within the bounds none has a smaller sum of distances.

    A hundredth of it is allowed for the last step of the search.
    """
    trial = read_through(seed, shift=shift)
    fit = fit_stretching(trial.y_px, trial.passage, DEFAULTS)
    top = trial.passage.line_y_px[0]

    def distances(scales: np.ndarray, offsets: np.ndarray) -> np.ndarray:
        heights = top + scales[:, None] * (trial.y_px - top) + offsets[:, None, None]
        return off_px(heights, trial.passage).sum(axis=-1)

    own = distances(np.array([fit.scale]), np.array([fit.offset_px])).item()
    assert own <= 1.01 * distances(np.linspace(0.9, 1.1, 61), np.linspace(-50, 50, 51)).min()
    assert fit.scale == pytest.approx(1 / (1 + shift), abs=0.02)


@pytest.mark.parametrize(
    ("spread_px", "sd_px"), [(0.0, 1.0), (5.0, 5.0), (30.0, 20.0)], ids=["least", "own", "most"]
)
def test_standard_deviation_stays_within_its_bounds(spread_px: float, sd_px: float) -> None:
    """The root mean square distance from lines, but never under 1 or over 20 px."""
    heights = [100 + spread_px, 100 - spread_px]
    fit = fit_regression(np.array([100.0, 200.0]), np.array(heights), text(2), DEFAULTS)
    assert fit.sd_px == pytest.approx(sd_px)


@given(any_fixations(2))
def test_two_fixations_show_no_drift(fixations: list[tuple[float, float]]) -> None:
    """With two values to choose, two fixations fit anywhere; they are taken to the nearest line."""
    nearest = found("attach", text(3), fixations)
    assert found("regress", text(3), fixations) == nearest
    assert found("stretch", text(3), fixations) == nearest
