"""A wrong call of the kernels is refused with a message that says what is wrong and where."""

import re

import numpy as np
import pytest

from etl.errors import FaultError
from etl.measures import Sequences, compute

GOOD = {
    "trial": np.array([0, 0, 1], np.int64),
    "region_order": np.array([1, 2, 0], np.int32),
    "duration_ms": np.array([200.0, 180.0, 210.0]),
    "region_count": np.array([3, 2], np.int32),
}

WRONG = {
    "two dimensions": (
        {"trial": np.zeros((3, 1), np.int64)},
        "sequences.trial: must be an array of one dimension, got shape (3, 1)",
    ),
    "a list": (
        {"region_order": [1, 2, 0]},
        "sequences.region_order: must be an array of one dimension, got list",
    ),
    "orders with fractions": (
        {"region_order": np.array([1.0, 2.0, np.nan])},
        "sequences.region_order: must hold signed integers, got float64",
    ),
    "whole durations": (
        {"duration_ms": np.array([200, 180, 210])},
        "sequences.duration_ms: must hold floating-point numbers, got int64",
    ),
    "too few durations": (
        {"duration_ms": np.array([200.0])},
        "sequences.duration_ms: must hold one value a fixation, got 1 for 3",
    ),
    "trials not sorted": (
        {"trial": np.array([0, 1, 0], np.int64)},
        "sequences.trial: must not go back, got 0 after 1 at fixation 2",
    ),
    "trial below 0": (
        {"trial": np.array([-1, 0, 1], np.int64)},
        "sequences.trial: must be from 0 to below 2, got -1",
    ),
    "trial too high": (
        {"trial": np.array([0, 1, 2], np.int64)},
        "sequences.trial: must be from 0 to below 2, got 2",
    ),
    "order below 0": (
        {"region_order": np.array([1, -1, 0], np.int32)},
        "sequences.region_order: must not be below 0, got -1 at fixation 1",
    ),
    "order beyond its own text": (
        {"region_order": np.array([1, 3, 3], np.int32)},
        "sequences.region_order: 3 at fixation 2 lies beyond the 2 regions of trial 1",
    ),
    "text without regions": (
        {"region_count": np.array([3, 0], np.int32)},
        "sequences.region_count: must be at least 1, got 0 for trial 1",
    ),
    "duration of nothing": (
        {"duration_ms": np.array([200.0, 0.0, 210.0])},
        "sequences.duration_ms: must be above 0 and finite, got 0.0 at fixation 1",
    ),
    "missing duration": (
        {"duration_ms": np.array([200.0, 180.0, np.nan])},
        "sequences.duration_ms: must be above 0 and finite, got nan at fixation 2",
    ),
    "endless duration": (
        {"duration_ms": np.array([np.inf, 180.0, 210.0])},
        "sequences.duration_ms: must be above 0 and finite, got inf at fixation 0",
    ),
}


@pytest.mark.parametrize(("change", "message"), WRONG.values(), ids=WRONG)
def test_wrong_arrays_are_refused(change, message):
    """The message names the array, what it must be, what it holds and where."""
    with pytest.raises(FaultError, match=f"^{re.escape(message)}$"):
        compute(Sequences(**{**GOOD, **change}))


def test_all_problems_are_told_at_once():
    """A call that is wrong in two ways hears of both."""
    wrong = {"trial": np.array([0, 1, 0], np.int64), "duration_ms": np.array([200.0, -1.0, 210.0])}
    with pytest.raises(FaultError, match=r"(?s)trial: must not go back.*\n.*duration_ms: must be"):
        compute(Sequences(**{**GOOD, **wrong}))


def test_narrow_whole_numbers_are_as_good_as_wide_ones():
    """Orders in 16 bits and trials in 32 give what wide ones give."""
    narrow = {
        "trial": GOOD["trial"].astype(np.int32),
        "region_order": GOOD["region_order"].astype(np.int16),
        "duration_ms": GOOD["duration_ms"].astype(np.float32),
    }
    found = compute(Sequences(**{**GOOD, **narrow})).regions["go_past_time"].values
    np.testing.assert_array_equal(found, compute(Sequences(**GOOD)).regions["go_past_time"].values)


def test_inputs_are_left_as_they_were():
    """The kernels change nothing that they were given, and leave it writable."""
    given = Sequences(**{name: array.copy() for name, array in GOOD.items()})
    compute(given)
    for name, array in GOOD.items():
        np.testing.assert_array_equal(getattr(given, name), array)
        assert getattr(given, name).flags.writeable


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"outside": "drop"}, 'outside: must be "ignore" or "interrupt", got \'drop\''),
        ({"no_opportunity": "0"}, 'no_opportunity: must be "missing" or "zero", got \'0\''),
    ],
    ids=["outside", "no_opportunity"],
)
def test_unknown_option_is_refused(options, message):
    """An option that the kernels do not know is never taken for the usual one."""
    with pytest.raises(FaultError, match=f"^{re.escape(message)}$"):
        compute(Sequences(**GOOD), **options)
