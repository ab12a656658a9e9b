"""Random trials for properties: any regions in any order, any of the conventions."""

from __future__ import annotations

from hypothesis import strategies as st

from etl.report.trace_input import Removal, TracedTrial
from tests.trace.tracing import by_hand


@st.composite
def trials(draw: st.DrawFn, *, most: int = 25) -> TracedTrial:
    """A trial of up to some fixations, some of them outside, some left out."""
    regions = draw(st.integers(1, 7))
    orders = draw(st.lists(st.integers(0, regions), max_size=most))
    # Whole milliseconds and tenths, as logs have them.
    tenths = draw(st.lists(st.integers(10, 9000), min_size=len(orders), max_size=len(orders)))
    out = draw(st.sets(st.integers(1, max(1, len(orders))), max_size=3))
    return by_hand(
        orders,
        [value / 10 for value in tenths],
        regions,
        left_out={number: Removal("under_ms", "80", "12") for number in out},
        geometry=draw(st.booleans()),
        outside=draw(st.sampled_from(["ignore", "interrupt"])),
        no_opportunity=draw(st.sampled_from(["missing", "zero"])),
    )
