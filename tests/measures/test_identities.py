"""What must hold for every trial there is, as properties over random trials.

The identities follow from the published definitions (Liversedge, Paterson & Pickering 1998; Rayner
1998, doi:10.1037/0033-2909.124.3.372; Clifton, Staub & Rayner 2007). Where one holds under some
conventions only, the test says which. No tolerance: durations are added in one order throughout.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from etl.measures import MEASURES, REASONS, TRIAL_MEASURES, Sequences, compute
from tests.measures.building import CONVENTIONS, cells, sequences

every_convention = pytest.mark.parametrize(
    ("outside", "no_opportunity"), CONVENTIONS, ids=["-".join(pair) for pair in CONVENTIONS]
)


@st.composite
def trials(draw):
    """One trial: orders, durations in ms with fractions, and the number of regions."""
    regions = draw(st.integers(1, 7))
    orders = draw(st.lists(st.integers(0, regions), max_size=25))
    durations_ms = draw(
        st.lists(
            st.floats(1.0, 2000.0, allow_subnormal=False),
            min_size=len(orders),
            max_size=len(orders),
        )
    )
    return orders, durations_ms, regions


def every_batch(test):
    """Run a test over random batches of trials, with no clock that a busy machine could fail."""
    batches = st.lists(trials(), min_size=1, max_size=6)
    return settings(max_examples=150, deadline=None)(given(batch=batches)(test))


def values(outcomes, *names):
    """The values of several measures of the regions."""
    return [outcomes.regions[name].values for name in names]


@every_convention
@every_batch
def test_times_of_a_region_are_nested(outside, no_opportunity, batch):
    """With a first pass: first pass <= right-bounded <= go-past, and right-bounded <= total."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    first, bounded, past, total = values(
        outcomes, "first_pass_time", "right_bounded_time", "go_past_time", "total_time"
    )
    has = ~np.isnan(first)
    assert (first[has] <= bounded[has]).all()
    assert (bounded[has] <= past[has]).all()
    assert (bounded[has] <= total[has]).all()


@every_convention
@every_batch
def test_a_first_pass_regression_out_lengthens_the_way_past(outside, no_opportunity, batch):
    """first_pass_regression_out = 1 implies go_past_time > first_pass_time."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    out, first, past = values(
        outcomes, "first_pass_regression_out", "first_pass_time", "go_past_time"
    )
    assert (past[out == 1] > first[out == 1]).all()


@pytest.mark.parametrize("no_opportunity", ["missing", "zero"])
@every_batch
def test_without_a_first_pass_regression_out_the_first_pass_is_the_way_past(no_opportunity, batch):
    """first_pass_regression_out = 0 implies go_past_time = first_pass_time.

    Only with outside fixations ignored: an interrupted first pass may be continued before the eyes
    go past. Under "zero", only where there is a first pass.
    """
    outcomes = compute(sequences(*batch), no_opportunity=no_opportunity)
    out, first, past = values(
        outcomes, "first_pass_regression_out", "first_pass_time", "go_past_time"
    )
    zero = (out == 0) & ~np.isnan(first)
    assert (past[zero] == first[zero]).all()


@every_convention
@every_batch
def test_a_reread_region_has_two_visits(outside, no_opportunity, batch):
    """With a first pass: visit_count >= 1 + reread."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    visits, reread, first = values(outcomes, "visit_count", "reread", "first_pass_time")
    has = ~np.isnan(first)
    assert (visits[has] >= 1 + reread[has]).all()


@every_convention
@every_batch
def test_regressions_are_counted_alike_everywhere(outside, no_opportunity, batch):
    """Regressions out, regressions in, the trial's count and the rows agree, missing being 0."""
    given_sequences = sequences(*batch)
    outcomes = compute(given_sequences, outside=outside, no_opportunity=no_opportunity)
    out, into = values(outcomes, "regression_out_count", "regression_in_count")
    rows = given_sequences.trial[outcomes.regressions.launch]
    for trial in range(len(batch)):
        own = slice(*outcomes.cell_offsets[trial : trial + 2])
        count = outcomes.trials["regression_count"].values[trial]
        assert np.nansum(out[own]) == np.nansum(into[own]) == count == np.sum(rows == trial)


@every_convention
@every_batch
def test_fixation_counts_add_up_to_the_trial(outside, no_opportunity, batch):
    """Fixations over the regions, and those outside, sum to the fixations of the trial."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    (fixations,) = values(outcomes, "fixation_count")
    for trial, (orders, _, _) in enumerate(batch):
        inside = outcomes.trials["fixation_count"].values[trial]
        assert fixations[slice(*outcomes.cell_offsets[trial : trial + 2])].sum() == inside
        assert inside + outcomes.trials["outside_fixation_count"].values[trial] == len(orders)


@every_convention
@every_batch
def test_a_value_is_nan_exactly_where_a_reason_stands(outside, no_opportunity, batch):
    """No value without a reason is missing, and no reason stands beside a value."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    for measured in (*outcomes.regions.values(), *outcomes.trials.values()):
        assert ((measured.reasons > 0) == np.isnan(measured.values)).all()
        assert measured.reasons.max() < len(REASONS)


@every_convention
@every_batch
def test_binary_outcomes_are_0_or_1_and_counts_are_whole(outside, no_opportunity, batch):
    """The kind that the catalogue states is the kind of the values."""
    outcomes = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    for measures, table in (
        (MEASURES, outcomes.regions),
        (TRIAL_MEASURES, outcomes.trials),
    ):
        for name, measure in measures.items():
            present = table[name].values[table[name].reasons == 0]
            if measure.kind == "binary":
                assert np.isin(present, [0, 1]).all()
            elif measure.kind == "count":
                assert (present == np.floor(present)).all()
            assert (present >= 0).all()


@every_convention
@every_batch
def test_trials_computed_together_equal_trials_computed_alone(outside, no_opportunity, batch):
    """No trial influences another, not even one without a fixation."""
    together = compute(sequences(*batch), outside=outside, no_opportunity=no_opportunity)
    first = 0
    for trial, one in enumerate(batch):
        alone = compute(sequences(one), outside=outside, no_opportunity=no_opportunity)
        own = together.cell_offsets[trial : trial + 2].tolist()
        for name, measured in alone.regions.items():
            assert cells(measured) == cells(together.regions[name], *own)
        for name, measured in alone.trials.items():
            assert cells(measured) == cells(together.trials[name], trial, trial + 1)
        fixations = slice(first, first + len(one[0]))
        assert (alone.visit == together.visit[fixations]).all()
        assert (alone.first_pass == together.first_pass[fixations]).all()
        launch = together.regressions.launch
        rows = (launch >= fixations.start) & (launch < fixations.stop)
        assert (alone.regressions.launch + first == launch[rows]).all()
        assert (alone.regressions.landing + first == together.regressions.landing[rows]).all()
        first += len(one[0])


def all_cells(outcomes):
    """Every cell of every measure, by level and name."""
    tables = {"region": outcomes.regions, "trial": outcomes.trials}
    return {
        (level, name): cells(measured)
        for level, table in tables.items()
        for name, measured in table.items()
    }


@every_batch
def test_ignored_outside_fixations_might_as_well_be_absent(batch):
    """With outside = "ignore", taking them out changes nothing but their own count."""
    inside = [
        (
            [order for order in orders if order],
            [ms for order, ms in zip(orders, durations_ms, strict=True) if order],
            regions,
        )
        for orders, durations_ms, regions in batch
    ]
    whole, thinned = all_cells(compute(sequences(*batch))), all_cells(compute(sequences(*inside)))
    counted = ("trial", "outside_fixation_count")
    assert whole.pop(counted) == [orders.count(0) for orders, _, _ in batch]
    assert thinned.pop(counted) == [0] * len(batch)
    assert whole == thinned


@every_batch
def test_without_outside_fixations_the_two_conventions_agree(batch):
    """There is nothing to interrupt where every fixation is inside a region."""
    inside = [([max(order, 1) for order in orders], ms, regions) for orders, ms, regions in batch]
    ignored = compute(sequences(*inside), outside="ignore")
    interrupted = compute(sequences(*inside), outside="interrupt")
    assert all_cells(ignored) == all_cells(interrupted)


@every_convention
@every_batch
def test_durations_in_half_the_unit_change_durations_only(outside, no_opportunity, batch):
    """Doubling every duration doubles the durations (exactly, in binary) and leaves the rest."""
    once = sequences(*batch)
    twice = Sequences(once.trial, once.region_order, once.duration_ms * 2, once.region_count)
    before, after = (
        all_cells(compute(each, outside=outside, no_opportunity=no_opportunity))
        for each in (once, twice)
    )
    for (level, name), column in before.items():
        kind = {"region": MEASURES, "trial": TRIAL_MEASURES}[level][name].kind
        factor = 2 if kind == "duration" else 1
        doubled = [cell if isinstance(cell, str) else cell * factor for cell in column]
        assert doubled == after[level, name]


@pytest.mark.parametrize("outside", ["ignore", "interrupt"])
@every_batch
def test_zero_replaces_the_reasons_it_names_and_nothing_else(outside, batch):
    """A cell differs between the conventions only where it had one of the four reasons."""
    missing = compute(sequences(*batch), outside=outside)
    zero = compute(sequences(*batch), outside=outside, no_opportunity="zero")
    for name, measure in MEASURES.items():
        for before, after in zip(
            cells(missing.regions[name]), cells(zero.regions[name]), strict=True
        ):
            no_chance = before in ("not_reached", "not_passed", "skipped", "never_fixated")
            if no_chance and measure.kind != "duration":
                assert after == (1 if name == "first_pass_skip" else 0)
            else:
                assert after == before
