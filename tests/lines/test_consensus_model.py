"""The model behind the consensus against sums over all possible courses, written out."""

from __future__ import annotations

from itertools import pairwise, product

import numpy as np
import pytest

from etl.lines.consensus_drift import (
    ALIKE,
    ANYWHERE,
    FURTHEST,
    LINE_SD,
    NEAR,
    OFF_TEXT_AGAIN,
    OFF_TEXT_AT,
    OFF_TEXT_DENSITY,
    OFF_TEXT_SOFT,
    SCATTER,
    SCATTER_WEIGHT,
    WIDE,
    WIDER,
    Problem,
    problem_of,
    step,
)
from etl.lines.consensus_reading import (
    AWAY_AGAIN,
    Course,
    Floats,
    course_of,
    forward_backward,
)
from tests.lines.building import text

#: Few enough that all courses can be gone through: 4 states to the power of 5 fixations.
FIXATIONS, LINES, MODELS = 5, 2, 3


def some_course(seed: int) -> tuple[Floats, Floats, Course]:
    """A few fixations on two lines, and what their saccades say."""
    rng = np.random.default_rng(seed)
    x, y = rng.uniform(-100, 520, FIXATIONS), rng.uniform(20, 260, FIXATIONS)
    return x, y, course_of(x, rng.uniform(40, 300, FIXATIONS), text(LINES))


def over_all_courses(emission: Floats, course: Course, held: Floats) -> tuple[Floats, float]:
    """Chances of states and likelihood, by going through every course of one model."""
    size, states = emission.shape
    chances, total = np.zeros((size, states)), 0.0
    for path in product(range(states), repeat=size):
        likely = course.begin[path[0]] * emission[0, path[0]]
        for i, (one, other) in enumerate(pairwise(path)):
            move = course.moves[i, one, other]
            if one == other < LINES:
                move += held[i, one]
            likely *= move * emission[i + 1, other]
        total += likely
        for i, state in enumerate(path):
            chances[i, state] += likely
    return chances / total, np.log(total)


@pytest.mark.parametrize("seed", range(6))
def test_forward_and_backward_are_sums_over_all_courses(seed: int) -> None:
    """Chances of states and the likelihood, for several models at once."""
    rng = np.random.default_rng(seed)
    _, _, course = some_course(seed)
    emission = rng.uniform(1e-4, 3, (FIXATIONS, MODELS, 2 * LINES))
    staying = np.diagonal(course.moves, axis1=1, axis2=2)[:, None, :LINES]
    held = staying * rng.uniform(-0.9, 2, (FIXATIONS - 1, MODELS, LINES))
    chances, likelihood = forward_backward(emission, course, held)
    for model in range(MODELS):
        expected, total = over_all_courses(emission[:, model], course, held[:, model])
        np.testing.assert_allclose(chances[:, model], expected, rtol=1e-9)
        assert likelihood[model] == pytest.approx(total, rel=1e-9)


def test_long_trials_do_not_underflow() -> None:
    """A thousand fixations that each model finds most unlikely still have finite chances."""
    rng = np.random.default_rng(1)
    x = rng.uniform(-5000, 5000, 1000)
    course = course_of(x, np.full(1000, 200.0), text(LINES))
    emission = 10.0 ** rng.uniform(-7, 1, (1000, 1, 2 * LINES))
    chances, likelihood = forward_backward(emission, course, np.zeros((999, 1, LINES)))
    assert np.isfinite(likelihood).all()
    np.testing.assert_allclose(chances.sum(2), 1.0, rtol=1e-9)


@pytest.mark.parametrize("seed", range(6))
def test_moves_are_chances(seed: int) -> None:
    """From every state the chances of all states add up to 1, whatever the saccades."""
    _, _, course = some_course(seed)
    np.testing.assert_allclose(course.moves.sum(2), 1.0, rtol=1e-12)
    assert course.begin.sum() == pytest.approx(1.0)
    assert (course.moves >= 0).all()


def normal(value: float, sd: float) -> float:
    """The density of a normal distribution about 0."""
    return float(np.exp(-0.5 * (value / sd) ** 2) / (sd * np.sqrt(2 * np.pi)))


def step_written_out(
    problem: Problem, share: Floats, scatter: float
) -> tuple[Floats, Floats, float, Floats]:
    """One step for one model: drift, offsets of lines, scatter, chances of none and the lines."""
    rows, values, weights = [], [], []
    for i, line in product(range(FIXATIONS), range(LINES)):
        rows.append(problem.terms[i, line])
        values.append(problem.height[i, line])
        weights.append(np.sqrt(share[i, line]) / scatter)
    # What is expected of the drift is as if each term had been measured once, as 0.
    rows.extend(np.sqrt(problem.precision))
    design = np.array(rows) * np.append(weights, np.ones(4))[:, None]
    measured = np.append(np.array(values) * weights, np.zeros(4))
    drift = np.linalg.lstsq(design, measured, rcond=None)[0]
    off = np.array(
        [
            [problem.height[i, line] - problem.terms[i, line] @ drift for line in range(LINES)]
            for i in range(FIXATIONS)
        ]
    )
    own = np.zeros(LINES)
    for line in range(LINES):
        weight = share[:, line].sum() / scatter**2
        own[line] = (share[:, line] @ off[:, line]) / scatter**2 / (weight + 1 / LINE_SD**2)
        off[:, line] -= own[line]
    near = np.clip(off, -NEAR, NEAR)
    squares = sum(share[i, k] * near[i, k] ** 2 for i in range(FIXATIONS) for k in range(LINES))
    scatter = np.sqrt((squares + SCATTER_WEIGHT * SCATTER**2) / (share.sum() + SCATTER_WEIGHT))
    return drift, own, scatter, chances_written_out(problem, off, scatter)


def places_written_out(problem: Problem, off: Floats) -> list[float]:
    """How likely each fixation is on no line: anywhere, or off the text, perhaps once more."""
    places, before = [], 0.0
    for i in range(FIXATIONS):
        beyond = max(-off[i, 0], off[i, LINES - 1])
        off_text = 1 / (1 + np.exp(-(beyond - OFF_TEXT_AT) / OFF_TEXT_SOFT))
        if problem.beside[i]:
            off_text = 1.0
        likely = OFF_TEXT_DENSITY * (1 - before + before * OFF_TEXT_AGAIN / AWAY_AGAIN)
        places.append((1 - off_text) * problem.elsewhere + off_text * likely)
        before = off_text
    return places


def chances_written_out(problem: Problem, off: Floats, scatter: float) -> Floats:
    """Chances of none and of each line, from distances, by going through every course."""
    course, elsewhere = problem.course, problem.elsewhere
    on_line, emission = np.zeros((FIXATIONS, LINES)), np.zeros((FIXATIONS, 2 * LINES))
    visit, somewhere = np.zeros((FIXATIONS, LINES, LINES)), places_written_out(problem, off)
    for i, line in product(range(FIXATIONS), range(LINES)):
        density = (1 - WIDE) * normal(off[i, line], scatter)
        density += WIDE * normal(off[i, line], WIDER * scatter)
        on_line[i, line] = (1 - ANYWHERE) * density * problem.reach[i, line]
        emission[i, line] = on_line[i, line] + ANYWHERE * elsewhere * problem.reach[i, line]
    for i, home in product(range(FIXATIONS), range(LINES)):
        for line in range(LINES):
            share = course.visiting[i] * course.visits[home, line]
            visit[i, home, line] = share * on_line[i, line]
        none = (1 - course.visiting[i]) * somewhere[i]
        emission[i, LINES + home] = visit[i, home].sum() + none
    held = np.zeros((FIXATIONS - 1, LINES))
    for i, line in product(range(FIXATIONS - 1), range(LINES)):
        before, after = np.clip(off[i : i + 2, line] / scatter, -FURTHEST, FURTHEST)
        both = normal(after - ALIKE * before, np.sqrt(1 - ALIKE**2)) / normal(after, 1.0)
        held[i, line] = course.moves[i, line, line] * (both - 1)
    states, _ = over_all_courses(emission, course, held)
    chances = np.zeros((FIXATIONS, LINES + 1))
    for i in range(FIXATIONS):
        chances[i, 1:] = states[i, :LINES]
        for home in range(LINES):
            away = states[i, LINES + home] / emission[i, LINES + home]
            chances[i, 1:] += away * visit[i, home]
            chances[i, 0] += away * (1 - course.visiting[i]) * somewhere[i]
    return chances


@pytest.mark.parametrize("seed", range(6))
def test_step_is_least_squares_and_then_all_courses(seed: int) -> None:
    """Drift, offsets of lines, scatter and chances, for several models at once."""
    rng = np.random.default_rng(seed)
    x, y, course = some_course(seed)
    problem = problem_of(x, y, text(LINES), course)
    share = rng.dirichlet(np.ones(LINES), (MODELS, FIXATIONS))
    scatter = rng.uniform(0.1, 0.4, MODELS)
    fit = step(problem, share, scatter, by_line=True)
    for model in range(MODELS):
        drift, own, sd, chances = step_written_out(problem, share[model], float(scatter[model]))
        np.testing.assert_allclose(fit.drift[model], drift, rtol=1e-7, atol=1e-9)
        np.testing.assert_allclose(fit.line_offset[model], own, rtol=1e-7, atol=1e-9)
        assert fit.scatter[model] == pytest.approx(sd)
        np.testing.assert_allclose(fit.chances[model], chances, rtol=1e-6, atol=1e-12)


def test_known_drift_is_found_from_known_lines() -> None:
    """Offset and slope of many fixations without scatter, within what is expected of them."""
    rng = np.random.default_rng(3)
    passage, line = text(8), np.arange(400) % 8
    x = rng.uniform(100, 400, 400)
    y = passage.line_y_px[line] + 20 + 0.05 * (x - passage.begin_x_px - passage.width_px / 2)
    problem = problem_of(x, y, passage, course_of(x, np.full(400, 200.0), passage))
    fit = step(problem, np.eye(8)[line][None], np.array([0.1]), by_line=False)
    offset, slope = fit.drift[0, :2] * passage.line_height_px
    assert offset == pytest.approx(20, abs=0.3)
    assert slope / passage.width_px == pytest.approx(0.05, abs=0.002)
