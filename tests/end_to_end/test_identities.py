"""The identities that follow from the published definitions, on the built tables.

Liversedge, Paterson & Pickering 1998; Rayner 1998, doi:10.1037/0033-2909.124.3.372; Clifton, Staub
& Rayner 2007. Durations here are whole milliseconds or sums of a few decimals of one, so a
difference under a millionth of a millisecond is rounding.
"""

from __future__ import annotations

from collections import Counter

from tests.end_to_end.building import Sample, trial_of

ROUNDING_MS = 1e-6


def test_durations_of_a_first_pass_are_nested(sample: Sample) -> None:
    """first_pass_time <= right_bounded_time <= go_past_time, right_bounded_time <= total_time."""
    passes = [r for r in sample.tables["outcomes_wide"] if r["first_pass_time"] is not None]
    assert len(passes) > 1000
    for row in passes:
        bounded = row["right_bounded_time"] + ROUNDING_MS
        assert row["first_pass_time"] <= bounded
        assert row["right_bounded_time"] <= row["go_past_time"] + ROUNDING_MS
        assert row["right_bounded_time"] <= row["total_time"] + ROUNDING_MS


def test_going_past_takes_longer_exactly_after_a_regression(sample: Sample) -> None:
    """No first-pass regression: go-past time is first-pass time; one: it is longer."""
    outs = Counter()
    for row in sample.tables["outcomes_wide"]:
        if row["first_pass_regression_out"] is None:
            continue
        longer = row["go_past_time"] > row["first_pass_time"] + ROUNDING_MS
        assert longer == bool(row["first_pass_regression_out"])
        outs[longer] += 1
    assert min(outs[True], outs[False]) > 50


def test_second_pass_is_what_total_time_has_more(sample: Sample) -> None:
    """total_time = first_pass_time (nothing where there is none) + second_pass_time."""
    for row in sample.tables["outcomes_wide"]:
        if row["total_time"] is not None:
            parts = (row["first_pass_time"] or 0) + row["second_pass_time"]
            assert abs(parts - row["total_time"]) <= ROUNDING_MS


def test_reread_region_has_two_visits(sample: Sample) -> None:
    """visit_count >= 1 + reread, where there is a first pass."""
    for row in sample.tables["outcomes_wide"]:
        if row["reread"] is not None:
            assert row["visit_count"] >= 1 + row["reread"]


def test_binary_outcomes_say_whether_their_counts_are_above_zero(sample: Sample) -> None:
    """fixated, regression_out and regression_in are their counts, cut at one; missing alike."""
    pairs = {
        "fixated": "fixation_count",
        "regression_out": "regression_out_count",
        "regression_in": "regression_in_count",
    }
    for row in sample.tables["outcomes_wide"]:
        for binary, count in pairs.items():
            told = None if row[count] is None else int(row[count] > 0)
            assert row[binary] == told


def test_regressions_add_up(sample: Sample) -> None:
    """Summed out of all regions = summed into all = the trial's = rows of ``regressions``."""
    out, into = Counter(), Counter()
    for row in sample.tables["outcomes_wide"]:
        out[trial_of(row)] += row["regression_out_count"] or 0
        into[trial_of(row)] += row["regression_in_count"] or 0
    listed = Counter(map(trial_of, sample.tables["regressions"]))
    for row in sample.tables["trials"]:
        key = trial_of(row)
        assert out[key] == into[key] == row["regression_count"] == listed[key]


def test_fixations_and_times_add_up(sample: Sample) -> None:
    """Counts and times on the regions sum to the trial's, and those to ``fixations``."""
    counts, times_ms, inside, outside = Counter(), Counter(), Counter(), Counter()
    for row in sample.tables["outcomes_wide"]:
        counts[trial_of(row)] += row["fixation_count"]
        times_ms[trial_of(row)] += row["total_time"] or 0
    for row in sample.tables["fixations"]:
        if row["kept"]:
            (outside if row["region"] is None else inside)[trial_of(row)] += 1
    for row in sample.tables["trials"]:
        key = trial_of(row)
        assert counts[key] == row["fixation_count"] == inside[key]
        assert row["outside_fixation_count"] == outside[key]
        assert abs(times_ms[key] - row["reading_time"]) <= ROUNDING_MS


def test_value_and_reason_exclude_each_other(sample: Sample) -> None:
    """Each row of ``outcomes`` has a value or a reason why there is none, never both."""
    assert all((r["value"] is None) != (r["missing"] is None) for r in sample.tables["outcomes"])
