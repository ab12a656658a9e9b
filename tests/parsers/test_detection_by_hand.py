"""Short recordings whose fixations are worked out by hand, for both methods of detection."""

from __future__ import annotations

import pytest

from tests.parsers.detecting import found_in

NOWHERE = float("nan")
#: At 250 Hz, as in Engbert and Kliegl (2003): the times of n samples in ms.
STEP_MS = 4.0
#: Noise of one pixel about 0, which comes back every four samples.
NOISE = [0.0, 1.0, 0.0, -1.0]


def times(count: int) -> list[float]:
    """Times of samples at 250 Hz."""
    return [STEP_MS * n for n in range(count)]


def test_one_fixation_by_velocity() -> None:
    """Eyes that rest at one place are one fixation from the first sample to the end of the last."""
    # 20 samples of 4 ms: 80 ms. No velocity differs from 0.
    found = found_in(times(20), [100.0] * 20, [50.0] * 20)
    assert found.fixations == [(0.0, 80.0, 100.0, 50.0)]
    assert found.note.counts["samples in fixations"] == 20


def test_one_fixation_by_dispersion() -> None:
    """Samples whose dispersion stays within the limit are one fixation."""
    # Extent 2 in x (-1 to 1) and 0 in y: dispersion 2, which is at most 2.
    found = found_in(times(20), NOISE * 5, [50.0] * 20, method="dispersion", dispersion_px=2.0)
    assert found.fixations == [(0.0, 80.0, 0.0, 50.0)]


def test_two_fixations_by_velocity() -> None:
    """Between two fixations lie the samples whose velocity is above the threshold."""
    # Noise about 100, then about 220, and nothing in y. In units of 1 px per 24 ms, velocities
    # among noise are 0 and +-2 in turn (the samples two ahead and two behind are alike); those of
    # samples 18 to 21, whose windows reach over the jump between 19 and 20, are:
    #   v18 = (x20 + x19) - (x17 + x16) = (220 +  99) - (101 + 100) = 118
    #   v19 = (x21 + x20) - (x18 + x17) = (221 + 220) - (100 + 101) = 240
    #   v20 = (x22 + x21) - (x19 + x18) = (220 + 221) - ( 99 + 100) = 242
    #   v21 = (x23 + x22) - (x20 + x19) = (219 + 220) - (220 +  99) = 120
    # The 36 velocities have the median 0; their squares are 16 times 0, 16 times 4 and four large
    # ones, with the median 4. So sigma is 2, the threshold 6 * 2 = 12, and samples 18 to 21 are
    # fast for 16 ms, which is 12 ms or more.
    x_px = [100 + one for one in NOISE * 5] + [220 + one for one in NOISE * 5]
    found = found_in(times(40), x_px, [50.0] * 40)
    # Samples 0 to 17: their noise adds up to 1; samples 22 to 39: to -1.
    first = (0.0, 72.0, round(100 + 1 / 18, 6), 50.0)
    second = (88.0, 72.0, round(220 - 1 / 18, 6), 50.0)
    assert found.fixations == [first, second]
    assert found.note.counts["samples in saccades"] == 4


def test_two_fixations_by_dispersion() -> None:
    """A fixation ends before the sample with which the dispersion exceeds the limit."""
    # Windows of 5 samples (20 ms). Samples 0 to 6 spread 3 px; the seventh is 20 px away.
    # The windows that begin at samples 7 and 8 hold 20, 40 or 60 px; that at 9 holds none.
    x_px = [10.0, 11.0, 12.0, 13.0, 12.0, 11.0, 10.0, 30.0, 50.0, 70.0, 71.0, 72.0, 71.0, 70.0]
    found = found_in(
        times(14),
        x_px,
        [5.0] * 14,
        method="dispersion",
        dispersion_px=3.0,
        shortest_fixation_ms=20.0,
    )
    assert found.fixations == [
        (0.0, 28.0, round(79 / 7, 6), 5.0),
        (36.0, 20.0, round(354 / 5, 6), 5.0),
    ]
    assert found.note.counts["samples outside fixations"] == 2


def test_noise_alone_is_one_fixation_by_velocity() -> None:
    """In noise nothing stands out of the noise, however strong it is: there is no saccade."""
    # As above, velocities are 0 and +-2 in turn (in 50 px per 24 ms): the median of 16 velocities
    # is 0, that of their squares (0 + 4) / 2 = 2, and the square of the threshold 36 * 2 = 72,
    # which no square of a velocity (4) exceeds.
    found = found_in(times(20), [50 * one for one in NOISE * 5], [0.0] * 20)
    assert found.fixations == [(0.0, 80.0, 0.0, 0.0)]
    assert found.note.counts["samples in saccades"] == 0


def test_noise_alone_is_no_fixation_by_dispersion() -> None:
    """Noise that reaches beyond the limit within every window holds no fixation."""
    # Each window of 13 samples (52 ms) spreads from -50 to 50: 100 px, and 99 are allowed.
    x_px = [50 * one for one in NOISE * 5]
    found = found_in(times(20), x_px, [0.0] * 20, method="dispersion", dispersion_px=99.0)
    assert found.log is None
    assert "no fixation is found in the samples of the log" in found.findings.text()
    assert found.note.counts["samples outside fixations"] == 20


def test_single_sample_out_of_place_is_no_saccade() -> None:
    """What is fast for less than the shortest saccade is noise and part of the fixation."""
    # The window of the stray sample 10 leaves it out (v10 = 0); those of 8, 9, 11 and 12 see it:
    # two times two samples, 8 ms each, and 12 are needed.
    x_px = [100.0] * 10 + [400.0] + [100.0] * 10
    found = found_in(times(21), x_px, [50.0] * 21)
    assert found.fixations == [(0.0, 84.0, round(100 + 300 / 21, 6), 50.0)]


@pytest.mark.parametrize(
    ("threshold_factor", "expected"),
    [
        pytest.param(59.5, [(0.0, 76.0), (88.0, 72.0)], id="three samples are fast"),
        pytest.param(60.5, [(0.0, 160.0)], id="two samples are fast"),
    ],
)
def test_three_fast_samples_at_250_hz_are_a_saccade(
    threshold_factor: float, expected: list[tuple[float, float]]
) -> None:
    """The shortest saccade is 12 ms by default: three samples at 250 Hz, as in the paper."""
    # Velocities about the jump are 118, 240, 242 and 120 and sigma is 2, as worked out above: the
    # thresholds are 119 and 121.
    x_px = [100 + one for one in NOISE * 5] + [220 + one for one in NOISE * 5]
    found = found_in(times(40), x_px, [50.0] * 40, threshold_factor=threshold_factor)
    assert found.times == expected


def test_every_movement_is_fast_where_velocities_do_not_spread() -> None:
    """Where most velocities are 0 the threshold is 0, and a movement of 0.1 px is a saccade."""
    x_px = [100.0] * 20 + [100.1] * 20
    found = found_in(times(40), x_px, [50.0] * 40)
    assert found.times == [(0.0, 72.0), (88.0, 72.0)]


def test_rounding_of_binary_fractions_is_no_movement() -> None:
    """Sums of positions that are equal on paper are equal, though binary fractions differ."""
    # In the pattern each sum of neighbours comes again three samples on (0.8, 0.9, 0.5), so that
    # all velocities within it are 0 on paper; those of samples 28 to 31, whose windows reach over
    # its beginning, are -0.4, -0.2, -0.1 and -0.1.
    pattern = [0.1, 0.7, 0.2, 0.3, 0.5, 0.4]
    assert pattern[0] + pattern[1] != pattern[3] + pattern[4]
    x_px = [0.5] * 30 + pattern * 4
    found = found_in(times(54), x_px, [50.0] * 54, shortest_saccade_ms=4.0)
    assert found.times == [(0.0, 112.0), (128.0, 88.0)]


def test_gap_ends_a_fixation() -> None:
    """A single sample without a position ends a fixation, unless the study file allows for it."""
    x_px = [100.0] * 15 + [NOWHERE] + [100.0] * 15
    found = found_in(times(31), x_px, [50.0] * 31)
    assert found.fixations == [(0.0, 60.0, 100.0, 50.0), (64.0, 60.0, 100.0, 50.0)]
    assert found.note.counts["samples without a position"] == 1


@pytest.mark.parametrize("method", ["engbert_kliegl", "dispersion"])
@pytest.mark.parametrize("how", ["without a position", "not in the log"])
def test_short_hole_is_lasted_through(method: str, how: str) -> None:
    """A hole no longer than longest_gap_ms is within a fixation and adds nothing to its place."""
    x_px = [100.0] * 15 + [NOWHERE] * 2 + [102.0] * 15
    rows = [n for n in range(32) if how == "without a position" or x_px[n] == x_px[n]]
    settings = {"dispersion_px": 10.0} if method == "dispersion" else {"threshold_factor": 1e6}
    arguments = (
        [times(32)[n] for n in rows],
        [x_px[n] + NOISE[n % 4] for n in rows],
        [50.0 for _ in rows],
    )
    found = found_in(*arguments, method=method, longest_gap_ms=8.0, **settings)
    # Noise adds up to 1 over the samples 0 to 14, and to 0 over the samples 17 to 31.
    assert found.fixations == [(0.0, 128.0, round(101 + 1 / 30, 6), 50.0)]
    broken = found_in(*arguments, method=method, longest_gap_ms=7.0, **settings)
    assert broken.times == [(0.0, 60.0), (68.0, 60.0)]


def test_jump_across_a_short_hole_is_a_saccade() -> None:
    """A hole that is lasted through does not hide that the eyes are elsewhere after it."""
    x_px = [100.0] * 20 + [NOWHERE] + [300.0] * 20
    found = found_in(times(41), x_px, [50.0] * 41, longest_gap_ms=4.0)
    # Samples 18, 19, 21 and 22 have windows over the jump.
    assert found.times == [(0.0, 72.0), (92.0, 72.0)]


def test_saccade_reaches_to_the_edge_of_a_gap() -> None:
    """The two samples beside a gap, which have no velocity, are as the nearest that has one."""
    # In motion until the gap: without that rule samples 23 and 24 would be a fixation of 8 ms.
    x_px = [100.0] * 20 + [130.0, 160.0, 190.0, 220.0, 250.0, NOWHERE] + [300.0] * 20
    found = found_in(times(46), x_px, [50.0] * 46, shortest_fixation_ms=0.0)
    assert found.times == [(0.0, 72.0), (104.0, 80.0)]


def test_stretch_too_short_for_a_velocity_holds_no_saccade() -> None:
    """Of fewer than five samples none has a velocity: they are at rest as far as is known."""
    found = found_in(times(4), [0.0, 100.0, 200.0, 300.0], [0.0] * 4, shortest_fixation_ms=0.0)
    assert found.fixations == [(0.0, 16.0, 150.0, 0.0)]


def test_what_is_shorter_than_the_shortest_is_no_fixation() -> None:
    """A rest of 48 ms is none where 50 are asked for, and one where 48 are."""
    x_px = [100.0] * 12 + [NOWHERE] + [300.0] * 20
    arguments = times(33), x_px, [50.0] * 33
    assert found_in(*arguments).times == [(52.0, 80.0)]
    assert found_in(*arguments).note.counts["samples of too short a fixation"] == 12
    assert found_in(*arguments, shortest_fixation_ms=48.0).times == [(0.0, 48.0), (52.0, 80.0)]
