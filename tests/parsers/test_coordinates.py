"""Degrees and pixels, origins and axes, against plane geometry."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from etl.parsers.coordinates import degrees_to_px, to_screen_px
from etl.study.models import Screen

#: A screen on which a centimetre is 20 px across and down.
SCREEN = {"width_px": 1000, "height_px": 800, "width_cm": 50.0, "distance_cm": 57.3}


def placed(x: float, y: float, unit: str, **screen: object) -> tuple[float, float]:
    """Where a position of the log is on the screen."""
    x_px, y_px = to_screen_px(
        np.array([x]),
        np.array([y]),
        units=(unit, unit),
        screen=Screen.model_validate({**SCREEN, **screen}),
    )
    return float(x_px[0]), float(y_px[0])


def test_one_degree_at_57_cm_is_one_centimetre() -> None:
    """At 57.3 cm one centimetre subtends one degree.

    The rule of thumb of vision research (common practice, given in its handbooks; from memory).
    It follows from 1 / tan(1 degree) = 57.29.
    """
    offset = degrees_to_px(np.array([1.0]), size_px=1000, size_cm=50, distance_cm=57.3)
    assert offset[0] == pytest.approx(20.0, rel=5e-4)


def test_45_degrees_are_as_far_as_the_screen() -> None:
    """On a flat screen the offset grows with the tangent: 45 degrees are one distance away."""
    offset = degrees_to_px(np.array([45.0]), size_px=1000, size_cm=50, distance_cm=60)
    assert offset[0] == pytest.approx(60 * 20)


@given(
    st.floats(-60, 60),
    st.floats(20, 200),
    st.floats(10, 100),
    st.integers(300, 4000),
)
def test_offset_gives_back_its_angle(
    degrees: float, distance_cm: float, size_cm: float, size_px: int
) -> None:
    """The angle under which an offset is seen is the angle that it came from."""
    offset_px = degrees_to_px(
        np.array([degrees]), size_px=size_px, size_cm=size_cm, distance_cm=distance_cm
    )
    offset_cm = offset_px[0] / size_px * size_cm
    # Sines and tangents are exact to a few units in the last place.
    assert np.degrees(np.arctan2(offset_cm, distance_cm)) == pytest.approx(degrees, abs=1e-9)


def test_no_angle_has_no_place() -> None:
    """A missing angle stays missing."""
    assert np.isnan(degrees_to_px(np.array([np.nan]), size_px=1, size_cm=1, distance_cm=1)).all()


@pytest.mark.parametrize(
    ("y_axis", "expected"), [("down", (520, 420)), ("up", (520, 380))], ids=["down", "up"]
)
def test_degrees_count_from_the_middle(y_axis: str, expected: tuple[float, float]) -> None:
    """Straight ahead is the middle of the screen; one degree is 20 px here, across and down."""
    place = placed(1.0, 1.0, "deg", origin="centre", y_axis=y_axis)
    assert place == pytest.approx(expected, abs=0.02)


@pytest.mark.parametrize(
    ("origin", "y_axis", "expected"),
    [
        ("top-left", "down", (100, 50)),
        ("bottom-left", "up", (100, 750)),
        ("centre", "down", (600, 450)),
        ("centre", "up", (600, 350)),
    ],
)
def test_origins_and_axes(origin: str, y_axis: str, expected: tuple[float, float]) -> None:
    """Pixels from any origin become pixels from the top left corner, y downwards."""
    assert placed(100, 50, "px", origin=origin, y_axis=y_axis) == expected


@given(st.floats(0, 1000), st.floats(0, 800))
def test_a_point_is_the_same_from_every_origin(x_px: float, y_px: float) -> None:
    """One point of the screen, told from each origin, is found in the same place."""
    told = {
        ("top-left", "down"): (x_px, y_px),
        ("bottom-left", "up"): (x_px, 800 - y_px),
        ("centre", "down"): (x_px - 500, y_px - 400),
        ("centre", "up"): (x_px - 500, 400 - y_px),
    }
    for (origin, y_axis), (x, y) in told.items():
        place = placed(x, y, "px", origin=origin, y_axis=y_axis)
        assert place == pytest.approx((x_px, y_px), abs=1e-9)


def test_without_a_screen_pixels_stay() -> None:
    """Pixels from the top left corner need no screen."""
    x, y = np.array([1.0, np.nan]), np.array([2.0, 3.0])
    x_px, y_px = to_screen_px(x, y, units=("px", "px"), screen=None)
    assert np.array_equal(x_px, x, equal_nan=True)
    assert np.array_equal(y_px, y)
