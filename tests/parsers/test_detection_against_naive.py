"""Both methods of detection against references that go sample by sample, in exact fractions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.parsers import naive_detection as naive
from tests.parsers.detecting import Fixation, found_in

NOWHERE = float("nan")


@dataclass(frozen=True)
class Recording:
    """Samples of one trial in whole tenths of a pixel; None where there is no position."""

    interval_ms: int
    ticks: list[int]
    places: list[tuple[int, int] | None]

    def columns(self) -> tuple[list[float], list[float], list[float]]:
        """Times, x and y as floats."""
        return (
            [float(tick * self.interval_ms) for tick in self.ticks],
            [NOWHERE if place is None else place[0] / 10 for place in self.places],
            [NOWHERE if place is None else place[1] / 10 for place in self.places],
        )

    def samples(self) -> list[naive.Sample]:
        """The same as fractions."""
        return [
            (Fraction(tick * self.interval_ms), *_tenths(place))
            for tick, place in zip(self.ticks, self.places, strict=True)
        ]


def _tenths(place: tuple[int, int] | None) -> tuple[Fraction | None, Fraction | None]:
    """A place as fractions."""
    if place is None:
        return None, None
    return Fraction(place[0], 10), Fraction(place[1], 10)


@st.composite
def recordings(draw: st.DrawFn) -> Recording:
    """Rests with a little noise and jumps between them, with samples missing or lost."""
    interval_ms = draw(st.sampled_from([1, 2, 4]))
    noise = st.integers(0, draw(st.sampled_from([0, 1, 3, 20])))
    places: list[tuple[int, int] | None] = []
    for _ in range(draw(st.integers(1, 6))):
        x, y = draw(st.integers(0, 3000)), draw(st.sampled_from([100, 100, 400]))
        rest = range(draw(st.integers(1, 25)))
        places.extend((x + draw(noise), y + draw(noise)) for _ in rest)
        places.extend([None] * draw(st.sampled_from([0, 0, 0, 1, 3])))
    lost = draw(st.sets(st.integers(1, max(1, len(places) - 1)), max_size=4))
    kept = [n for n in range(len(places)) if n not in lost]
    if len(kept) < 4 * len(lost) + 2:
        kept = list(range(max(2, len(places))))
        places += [(0, 0)] * (len(kept) - len(places))
    return Recording(interval_ms, kept, [places[n] for n in kept])


def rounded(fixations: Sequence[naive.Fixation]) -> list[Fixation]:
    """Exact fixations as floats."""
    return [(float(a), float(b), float(x), float(y)) for a, b, x, y in fixations]


def assert_same(found: Sequence[Fixation], exact: Sequence[naive.Fixation]) -> None:
    """Times are the same; means are rounded to a millionth of a pixel."""
    expected = rounded(exact)
    assert [f[:2] for f in found] == [f[:2] for f in expected]
    for one, other in zip(found, expected, strict=True):
        assert one[2:] == pytest.approx(other[2:], abs=1e-6)


@settings(max_examples=400, deadline=None)
@given(
    recordings(),
    st.sampled_from([1, 2, 6]),
    st.sampled_from([4, 12]),
    st.sampled_from([0, 10, 30]),
    st.sampled_from([0, 4, 8]),
)
def test_velocity_agrees_with_the_reference(
    recording: Recording, factor: int, shortest_saccade: int, shortest: int, longest_gap: int
) -> None:
    """The vectorised method of velocity finds what the paper's formulas say sample by sample."""
    found = found_in(
        *recording.columns(),
        method="engbert_kliegl",
        threshold_factor=float(factor),
        shortest_saccade_ms=float(shortest_saccade),
        shortest_fixation_ms=float(shortest),
        longest_gap_ms=float(longest_gap),
        frequency_hz=1000.0 / recording.interval_ms,
    )
    exact = naive.by_velocity(
        recording.samples(),
        Fraction(recording.interval_ms),
        factor=Fraction(factor),
        shortest_saccade=Fraction(shortest_saccade),
        shortest_fixation=Fraction(shortest),
        longest_gap=Fraction(longest_gap),
    )
    assert_same(found.fixations, exact)


@settings(max_examples=400, deadline=None)
@given(
    recordings(),
    st.sampled_from([0.3, 2.0, 4.0, 40.0]),
    st.sampled_from([1, 10, 30]),
    st.sampled_from([0, 4, 8]),
)
def test_dispersion_agrees_with_the_reference(
    recording: Recording, dispersion_px: float, shortest: int, longest_gap: int
) -> None:
    """The vectorised method of dispersion takes the steps of the paper's pseudo-code."""
    found = found_in(
        *recording.columns(),
        method="dispersion",
        dispersion_px=dispersion_px,
        shortest_fixation_ms=float(shortest),
        longest_gap_ms=float(longest_gap),
        frequency_hz=1000.0 / recording.interval_ms,
    )
    exact = naive.by_dispersion(
        recording.samples(),
        Fraction(recording.interval_ms),
        dispersion=Fraction(str(dispersion_px)),
        shortest_fixation=Fraction(shortest),
        longest_gap=Fraction(longest_gap),
    )
    assert_same(found.fixations, exact)


@settings(max_examples=100, deadline=None)
@given(st.lists(recordings(), min_size=2, max_size=4))
def test_each_trial_has_thresholds_of_its_own(trials: list[Recording]) -> None:
    """What is found in a trial does not hang on the other trials of the log."""
    trials = [Recording(4, one.ticks, one.places) for one in trials]
    columns = [one.columns() for one in trials]
    alone = [naive.by_velocity(one.samples(), Fraction(4)) for one in trials]
    found = found_in(
        *([value for column in columns for value in column[n]] for n in range(3)),
        trials=[n for n, one in enumerate(trials) for _ in one.ticks],
        frequency_hz=250.0,
    )
    assert_same(found.fixations, [fixation for own in alone for fixation in own])
