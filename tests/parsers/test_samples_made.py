"""Samples that are made from fixations give these fixations again."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.parsers.detecting import found_in
from tests.simulator.samples import samples_of

Given = list[tuple[float, float, float, float]]


@st.composite
def fixations_at(draw: st.DrawFn) -> tuple[Given, float]:
    """Fixations of a trial in whole samples, places in tenths of a pixel, and the frequency."""
    frequency_hz = draw(st.sampled_from([1000.0, 500.0, 250.0]))
    interval_ms = 1000 / frequency_hz
    clock_ms = interval_ms * draw(st.integers(0, 2_000_000))
    place = st.integers(0, 19_200)
    fixations: Given = []
    for _ in range(draw(st.integers(1, 12))):
        duration_ms = interval_ms * draw(st.integers(2, 400))
        x, y = draw(place) / 10, draw(place) / 10
        if fixations and draw(st.booleans()):
            y = fixations[-1][3]
        fixations.append((clock_ms, duration_ms, x, y))
        gap = st.one_of(st.integers(1, 90), st.sampled_from([1, 3, 12, 80, 81, 500]))
        clock_ms += duration_ms + interval_ms * draw(gap)
    return fixations, frequency_hz


@settings(max_examples=300, deadline=None)
@given(fixations_at())
def test_fixations_are_found_again(made: tuple[Given, float]) -> None:
    """Detection by velocity finds onset, duration and place of each fixation bit for bit."""
    fixations, frequency_hz = made
    samples = samples_of(fixations, frequency_hz)
    found = found_in(
        samples.t_ms.tolist(),
        samples.x_px.tolist(),
        samples.y_px.tolist(),
        shortest_fixation_ms=0.0,
        frequency_hz=frequency_hz,
    )
    assert found.fixations == fixations


def test_reading_has_saccades_with_positions() -> None:
    """Gaps as between fixations of reading become motion, not samples without a position."""
    samples = samples_of([(0, 200, 100.0, 50.0), (230, 180, 180.0, 50.0), (440, 250, 90.0, 50.0)])
    assert samples.x_px.tolist() == samples.x_px[samples.x_px == samples.x_px].tolist()
    assert samples.x_px[:202].tolist() == [100.0] * 202
    assert 100.0 < samples.x_px[202] < samples.x_px[227] < 180.0
    assert samples.x_px[228:412].tolist() == [180.0] * 184


@pytest.mark.parametrize(
    ("fixations", "message"),
    [
        pytest.param([(0, 10, 1, 1), (10, 5, 2, 2)], "no sample lies before", id="they touch"),
        pytest.param([(0, 10, 1, 1), (8, 5, 2, 2)], "no sample lies before", id="they overlap"),
        pytest.param([(0, 10.5, 1, 1)], "the duration 10.5 ms is no whole", id="half a sample"),
        pytest.param(
            [(0, 10, 1, 1), (20.5, 5, 2, 2)], "the onset 20.5 ms is no whole", id="half a sample on"
        ),
    ],
)
def test_fixations_that_samples_cannot_show_are_refused(fixations: Given, message: str) -> None:
    """Fixations that touch, or are no whole samples, cannot be made."""
    with pytest.raises(ValueError, match=message):
        samples_of(fixations)
