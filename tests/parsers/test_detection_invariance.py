"""What must not change fixations: where the origin is, how the axes lie, when the clock began."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.parsers.detecting import Found, found_in
from tests.simulator.samples import samples_of

Places = tuple[NDArray[np.float64], NDArray[np.float64]]
INTERVAL_MS = 2.0
METHODS = [
    pytest.param({"method": "engbert_kliegl"}, id="velocity"),
    pytest.param({"method": "dispersion", "dispersion_px": 12.0}, id="dispersion"),
]


def noisy_places(seed: int) -> Places:
    """Rests of 200 ms with noise of half a pixel and saccades of 20 ms, with a hole or two."""
    rng = np.random.default_rng(seed)
    x_px, y_px = [], []
    here = np.array([200.0, 300.0])
    for _ in range(12):
        there = here + rng.uniform(40, 160, 2) * rng.choice([-1, 1], 2)
        x_px.append(np.full(100, here[0]))
        y_px.append(np.full(100, here[1]))
        way = np.linspace(0, 1, 12)[1:-1]
        x_px.append(here[0] + way * (there[0] - here[0]))
        y_px.append(here[1] + way * (there[1] - here[1]))
        here = there
    x, y = np.concatenate(x_px), np.concatenate(y_px)
    x, y = x + rng.normal(0, 0.5, len(x)), y + rng.normal(0, 0.5, len(y))
    x[rng.integers(0, len(x), 2)] = np.nan
    return x, y


def found_at(places: Places, settings: dict[str, object], begin_ms: float = 0.0) -> Found:
    """Fixations in samples at 500 Hz."""
    times = begin_ms + INTERVAL_MS * np.arange(len(places[0]))
    found = found_in(times.tolist(), places[0].tolist(), places[1].tolist(), **settings)
    assert len(found.fixations) >= 12
    return found


def turned(places: Places, degrees: float) -> Places:
    """Places turned about the origin; quarter turns exactly."""
    cosine, sine = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
    if degrees % 90 == 0:
        cosine, sine = round(cosine), round(sine)
    x, y = places
    return cosine * x - sine * y, sine * x + cosine * y


@pytest.mark.parametrize("settings", METHODS)
@pytest.mark.parametrize("seed", range(5))
def test_shift_moves_fixations_and_no_more(settings: dict[str, object], seed: int) -> None:
    """With another origin every fixation has the same times, and its place has moved along."""
    x, y = noisy_places(seed)
    found = found_at((x, y), settings)
    shifted = found_at((x + 1234.5, y - 321.7), settings)
    assert shifted.times == found.times
    moved = np.array(shifted.fixations)[:, 2:] - np.array(found.fixations)[:, 2:]
    # Means are rounded to a millionth of a pixel.
    assert np.abs(moved - [1234.5, -321.7]).max() < 2e-6


@pytest.mark.parametrize("settings", METHODS)
@pytest.mark.parametrize("seed", range(5))
def test_clock_that_began_earlier_changes_onsets_alone(
    settings: dict[str, object], seed: int
) -> None:
    """Times count from any zero."""
    places = noisy_places(seed)
    found, later = found_at(places, settings), found_at(places, settings, 7_186_806.0)
    assert later.fixations == [
        (onset + 7_186_806.0, duration, x, y) for onset, duration, x, y in found.fixations
    ]


@pytest.mark.parametrize("settings", METHODS)
@pytest.mark.parametrize("degrees", [90, 180, 270])
@pytest.mark.parametrize("seed", range(3))
def test_quarter_turn_changes_no_time(settings: dict[str, object], degrees: int, seed: int) -> None:
    """Both methods treat x and y alike, so that quarter turns change nothing at all."""
    places = noisy_places(seed)
    assert found_at(turned(places, degrees), settings).times == found_at(places, settings).times


@pytest.mark.parametrize("settings", METHODS)
@pytest.mark.parametrize("seed", range(3))
def test_mirror_changes_no_time(settings: dict[str, object], seed: int) -> None:
    """Left and right, up and down are alike."""
    x, y = noisy_places(seed)
    assert found_at((-x, y), settings).times == found_at((x, y), settings).times


@pytest.mark.parametrize("scale", [0.125, 4.0])
@pytest.mark.parametrize("seed", range(3))
def test_velocity_knows_no_unit(scale: float, seed: int) -> None:
    """Thresholds are multiples of each axis's own spread: stretching an axis changes nothing."""
    x, y = noisy_places(seed)
    settings: dict[str, object] = {"method": "engbert_kliegl"}
    assert found_at((scale * x, y), settings).times == found_at((x, y), settings).times


@pytest.mark.parametrize("degrees", [10, 30, 45, 77, 123])
def test_any_turn_changes_no_time_without_noise(degrees: int) -> None:
    """Where the eyes rest without noise, whatever moves is a saccade, however the axes lie."""
    made = samples_of([(n * 240.0, 200.0, 100.0 + 37 * n, 200.0 - 11 * n * n) for n in range(9)])
    turned_px = turned((made.x_px, made.y_px), degrees)
    found = found_in(made.t_ms.tolist(), made.x_px.tolist(), made.y_px.tolist())
    assert found.times == [(n * 240.0, 200.0) for n in range(9)]
    again = found_in(made.t_ms.tolist(), turned_px[0].tolist(), turned_px[1].tolist())
    assert again.times == found.times


@pytest.mark.parametrize("degrees", [10, 30, 45, 77, 123])
@pytest.mark.parametrize("seed", range(3))
def test_any_turn_moves_bounds_by_few_samples_in_noise(degrees: int, seed: int) -> None:
    """In noise the thresholds are an ellipse along the axes, so that turns are no exact matter.

    The same fixations are found, with bounds at most three samples apart (the reach of the moving
    average and one).
    """
    places, settings = noisy_places(seed), {"method": "engbert_kliegl"}
    found = np.array(found_at(places, settings).times)
    again = np.array(found_at(turned(places, degrees), settings).times)
    assert again.shape == found.shape
    assert np.abs(again[:, 0] - found[:, 0]).max() <= 3 * INTERVAL_MS
    assert np.abs(again.sum(axis=1) - found.sum(axis=1)).max() <= 3 * INTERVAL_MS
