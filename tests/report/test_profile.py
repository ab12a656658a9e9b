"""The summary of a reader against the tables, counted anew by pandas, and against cases by hand."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest

from etl.report import LineGrid, Profiles, ReaderProfile
from etl.report.counts import binary_measures, conditions
from tests.report.making import Made, small


def profile(made: Made, grid: LineGrid | None = None, outside: str = "ignore") -> ReaderProfile:
    """The summary of the only reader of a small study."""
    return made.profile(made.participants[0], grid=grid, outside=outside)


def one_trial(*sequence: tuple[int, float]) -> Made:
    """A study of one reader and one trial; a fixation is a region order and a duration."""
    return small([("P1", "1", {}, list(sequence))], {}, regions=("a", "b", "c"))


def test_durations_are_those_of_kept_fixations(made: Made) -> None:
    """Mean, spread and quantiles are those that pandas finds."""
    kept = made.frames["fixations"].query("kept == 1")
    theirs = kept.groupby("participant", observed=True)["duration_ms"]
    for reader in made.profiles().readers:
        if reader.durations is None:
            assert reader.participant not in theirs.groups
            continue
        own = theirs.get_group(reader.participant)
        assert reader.durations.mean_ms == pytest.approx(own.mean(), abs=1e-9)
        assert reader.durations.spread_ms == pytest.approx(own.std(), abs=1e-9)
        quantiles = own.quantile([0.1, 0.25, 0.5, 0.75, 0.9])
        assert reader.durations.quantiles_ms == pytest.approx(tuple(quantiles), abs=1e-9)


def test_saccades_are_those_of_the_table_trials(orchard: Made) -> None:
    """Steps back and forward are the counts that the measures give."""
    trials = orchard.frames["trials"]
    theirs = trials.groupby("participant", observed=True)[["regression_count", "progression_count"]]
    found = {r.participant: (r.back, r.forward) for r in orchard.profiles().readers}
    assert found == {who: tuple(own) for who, own in theirs.sum().iterrows()}


def test_skips_are_those_of_the_table_outcomes(made: Made) -> None:
    """Skips are the values of first_pass_skip that are not missing."""
    outcomes = made.frames["outcomes"].query("measure == 'first_pass_skip'")
    theirs = outcomes.groupby("participant", observed=True)["value"].agg(["sum", "count"])
    for reader in made.profiles().readers:
        if reader.participant in theirs.index:
            own = tuple(theirs.loc[reader.participant])
            assert (reader.skips, reader.skip_chances) == own
        else:
            assert (reader.skips, reader.skip_chances) == (0, 0)


def test_rates_are_those_of_the_table_outcomes(made: Made) -> None:
    """Ones and values of every binary outcome, condition and region are those that pandas finds."""
    counts = made.profiles().counts.rates
    names, width = binary_measures(made.design), len(made.design.regions)
    cells = [
        tuple(levels[i] for levels, i in zip(made.design.factors.values(), cell, strict=True))
        for cell in conditions(made.design)
    ]
    found = {
        (*cells[key // width], made.design.regions[key % width], name): (
            int(counts.ones[row, column]),
            int(counts.n[row, column]),
        )
        for row, key in enumerate(counts.keys.tolist())
        for column, name in enumerate(names)
    }
    binary = made.frames["outcomes"].query("kind == 'binary'")
    by = [*made.design.factors, "region", "measure"]
    theirs = binary.groupby(by, observed=True)["value"].agg(["sum", "count"])
    assert found == {key: (int(a), int(b)) for key, (a, b) in theirs.iterrows()}


def test_missing_values_are_those_of_the_table_outcomes(made: Made) -> None:
    """Rows by outcome and reason are those that pandas finds."""
    table = made.profiles().counts.missing
    reasons = made.frames["outcomes"]["missing"].astype(object).fillna("")
    theirs = pd.crosstab(made.frames["outcomes"]["measure"].astype(str), reasons)
    for row, measure in enumerate(made.design.measures):
        for column, reason in enumerate(made.design.reasons):
            own = theirs.loc[measure.name].get(reason, 0)
            assert table[row, column] == own, (measure.name, reason)


def test_a_fixation_outside_breaks_a_step_only_if_it_interrupts() -> None:
    """From c over outside to a is a regression, but none where outside interrupts."""
    made = one_trial((3, 200), (0, 100), (1, 200), (2, 200))
    ignored, broken = profile(made).numbers, profile(made, outside="interrupt").numbers
    assert (ignored.back, ignored.forward) == (1, 1)
    assert (broken.back, broken.forward) == (0, 1)


def test_no_step_leads_from_trial_to_trial() -> None:
    """The last region of a trial and the first of the next are no saccade."""
    made = small([("P1", "1", {}, [(2, 200)]), ("P1", "2", {}, [(1, 200)])], {})
    assert (profile(made).numbers.back, profile(made).numbers.forward) == (0, 0)


def test_reader_without_kept_fixations_has_no_durations() -> None:
    """Nothing is made up for a reader who was left out."""
    made = one_trial((1, 200))
    made.frames["fixations"]["kept"] = 0
    numbers = profile(made, LineGrid(0, 40)).numbers
    assert (numbers.durations, numbers.offset_px, numbers.drift_px) == (None, None, None)


def test_one_fixation_has_no_spread() -> None:
    """A sample standard deviation needs two values."""
    durations = profile(one_trial((1, 200))).numbers.durations
    assert durations is not None
    assert (durations.mean_ms, durations.spread_ms) == (200, None)


def drifting(count: int) -> Made:
    """Trials of one fixation each, each 3 px lower than the one before; logs run backwards."""
    made = small([("P1", str(i), {}, [(1, 200)]) for i in range(1, count + 1)], {})
    frame = made.frames["fixations"]
    trial = frame["trial"].astype(int)
    frame["y_px"] = 20.0 + 3 * (trial - 1)
    frame["source_line"] = 100 - trial
    return made


def test_height_is_the_median_distance_below_the_middle_of_the_line() -> None:
    """Of 20, 23, …, 35 px with a middle at 20 px, the median is 7.5 px below."""
    assert profile(drifting(6), LineGrid(0, 40)).numbers.offset_px == 7.5


def test_drift_follows_the_order_of_the_log() -> None:
    """The last two of six trials in the log are the first two by name: 1.5 px less 13.5 px."""
    assert profile(drifting(6), LineGrid(0, 40)).numbers.drift_px == -12.0


def test_drift_needs_no_layout() -> None:
    """Without known lines the distance is from the reader's own median of the line."""
    numbers = profile(drifting(6)).numbers
    assert (numbers.offset_px, numbers.drift_px) == (None, -12.0)


def test_few_trials_have_no_drift() -> None:
    """Five trials make no thirds of two."""
    assert profile(drifting(5), LineGrid(0, 40)).numbers.drift_px is None


def test_a_fixation_far_below_a_text_belongs_to_its_last_line() -> None:
    """A trial with fixations on line 1 only has no line 3, however low a fixation is."""
    made = one_trial((1, 200), (0, 200), (0, 200))
    made.frames["fixations"]["y_px"] = [20.0, 100.0, 100.0]
    made.frames["fixations"]["line"] = [1, np.nan, np.nan]
    assert profile(made, LineGrid(0, 40)).numbers.offset_px == 80.0


def test_profile_is_small_however_many_fixations() -> None:
    """A hundred times the fixations make a profile of the same size, but for longer numbers."""
    short, long = one_trial((1, 200), (2, 210)), one_trial(*[(1, 200.0), (2, 210.0)] * 100)
    sizes = [len(pickle.dumps(profile(made))) for made in (short, long)]
    assert sizes[1] - sizes[0] < 50


def test_sums_do_not_depend_on_the_order_of_readers(made: Made) -> None:
    """Profiles added backwards count the same."""
    forward, backward = Profiles(), Profiles()
    profiles = [made.profile(who) for who in made.participants]
    for one, other in zip(profiles, reversed(profiles), strict=True):
        forward.add(one)
        backward.add(other)
    assert forward.counts.trials == backward.counts.trials
    assert (forward.counts.rates.keys == backward.counts.rates.keys).all()
    assert (forward.counts.rates.ones == backward.counts.rates.ones).all()
    assert (forward.counts.rates.n == backward.counts.rates.n).all()
    assert (forward.counts.missing == backward.counts.missing).all()
