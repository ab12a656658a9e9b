"""The kernels of screening against loops over one trial at a time, on thousands of readers."""

from __future__ import annotations

import statistics
from collections import Counter
from dataclasses import dataclass

import numpy as np
import pytest

from etl.screening import LEFT_OUT_BY, outlying
from etl.screening.ledger import Accounts, Screened, entries_of
from etl.screening.rules import FIXATION_RULES, READER_RULES, TRIAL_RULES
from etl.session.screening import screen
from tests.screening import naive_screening as naive
from tests.screening.random_readers import (
    LIBRARY,
    NAN,
    SCREEN_PX,
    options,
    random_reader,
    random_rules,
    unscreened,
)

READERS = 6000


@dataclass(frozen=True)
class Both:
    """One reader screened twice."""

    rules: dict[str, object]
    told: Screened
    slow: naive.Reader
    ledger: list[naive.Told]
    seed: int

    @property
    def looks(self) -> list[naive.Fixation]:
        """All fixations of the naive reader."""
        return [f for trial in self.slow.trials for f in trial.fixations]


def screened_twice(seed: int) -> Both:
    """A random reader under random rules."""
    rng = np.random.default_rng(seed)
    rules = random_rules(rng)
    outside = ("ignore", "interrupt")[rng.integers(2)]
    reader, texts = random_reader(rng)
    before = unscreened(reader, texts)
    told = screen(before, LIBRARY, options(rules, outside))
    reasons = (before.trials.skipped_by, before.trials.notes, before.notes)
    first_row = np.searchsorted(before.ordered.trial, np.arange(len(texts)))
    entries = entries_of(told, options(rules, outside).limits, reasons, first_row)
    ledger = [(e.level, e.trial + 1, max(e.fixation, 0), e.rule, e.action, e.also) for e in entries]
    naive.screen(reader, rules, SCREEN_PX, outside)
    return Both(rules, told, reader, ledger, seed)


@pytest.fixture(scope="module")
def readers() -> list[Both]:
    """All readers, screened by both."""
    return [screened_twice(seed) for seed in range(READERS)]


def different(readers: list[Both], one: object, other: object) -> list[int]:
    """Seeds of the readers for which two ways of telling say different things."""
    return [both.seed for both in readers if one(both) != other(both)]


def names(codes: np.ndarray) -> list[str]:
    """Codes as rules, kept as nothing."""
    return ["" if code < 0 else LEFT_OUT_BY[code] for code in codes.tolist()]


def test_rule_that_leaves_each_fixation_out(readers: list[Both]) -> None:
    """Fixation by fixation the same rule."""
    assert not different(
        readers,
        lambda both: names(both.told.fixations.left_out),
        lambda both: [f.left_out for f in both.looks],
    )


def test_durations_and_onsets_after_merging(readers: list[Both]) -> None:
    """Exactly the same, for all numbers are whole."""
    assert not different(
        readers,
        lambda both: [
            both.told.fixations.duration_ms.tolist(),
            both.told.fixations.onset_ms.tolist(),
            both.told.fixations.blink.tolist(),
        ],
        lambda both: [
            [f.duration_ms for f in both.looks],
            [f.onset_ms for f in both.looks],
            [f.blink for f in both.looks],
        ],
    )


def test_fixation_that_each_was_merged_into(readers: list[Both]) -> None:
    """The same number in the trial, none where not merged."""

    def into(both: Both) -> list[int]:
        rows = both.told.fixations.into
        return [0 if row < 0 else int(both.told.number[row]) for row in rows.tolist()]

    assert not different(readers, into, lambda both: [f.into for f in both.looks])


@pytest.mark.parametrize("rule", FIXATION_RULES)
def test_fixations_that_a_rule_speaks_against(readers: list[Both], rule: str) -> None:
    """Whether or not another rule left them out before."""
    asked = [both for both in readers if rule in both.rules]
    assert not different(
        asked,
        lambda both: both.told.fixations.holds[rule].tolist(),
        lambda both: [rule in f.against for f in both.looks],
    )
    assert sum(rule in f.against for both in asked for f in both.looks) > 500


@pytest.mark.parametrize("rule", TRIAL_RULES)
def test_trials_that_a_rule_speaks_against(readers: list[Both], rule: str) -> None:
    """Whether or not another rule left them out before."""
    asked = [both for both in readers if rule in both.rules]
    assert not different(
        asked,
        lambda both: both.told.trials.holds[rule].tolist(),
        lambda both: [rule in trial.against for trial in both.slow.trials],
    )
    spoken = Counter(rule in t.against for both in asked for t in both.slow.trials)
    assert min(spoken[True], spoken[False]) > 200


@pytest.mark.parametrize("rule", READER_RULES)
def test_readers_that_a_rule_speaks_against(readers: list[Both], rule: str) -> None:
    """Whether or not another rule left them out before."""
    asked = [both for both in readers if rule in both.rules]
    assert not different(
        asked,
        lambda both: both.told.readers.holds[rule].tolist(),
        lambda both: [rule in both.slow.against],
    )
    spoken = Counter(rule in both.slow.against for both in asked)
    assert min(spoken[True], spoken[False]) > 100


def test_charge_of_trials_and_fixations(readers: list[Both]) -> None:
    """Each to the first rule that removes it, those of a trial or reader to that."""
    assert not different(
        readers,
        lambda both: (names(both.told.trial_codes()), names(both.told.fixation_codes())),
        lambda both: naive.charged(both.slow),
    )


def test_accounts(readers: list[Both]) -> None:
    """Counts of what each rule is charged for."""

    def told(both: Both) -> list[tuple[int, int, dict[str, int]]]:
        units = (both.told.trial_codes(), both.told.fixation_codes())
        every = [Accounts.of(codes) for codes in units]
        assert all(accounts.balance() for accounts in every)
        return [(a.read, a.kept, dict(a.by_rule)) for a in every]

    def slow(both: Both) -> list[tuple[int, int, dict[str, int]]]:
        counts = [Counter(rules) for rules in naive.charged(both.slow)]
        return [(c.total(), c.pop("", 0), dict(c)) for c in counts]

    assert not different(readers, told, slow)


def test_ledger(readers: list[Both]) -> None:
    """Row by row the same thing, rule, action and later rules, in the same order."""
    assert not different(readers, lambda both: both.ledger, lambda both: naive.ledger(both.slow))


def test_outlying_values() -> None:
    """Far values of random groups are those that Python's own statistics finds."""
    rng = np.random.default_rng(7)
    far = 0
    for _ in range(500):
        values = rng.choice([NAN, 150.0, 200.0, 210.0, 250.0, 900.0], rng.integers(0, 30))
        group = rng.integers(0, 4, len(values)).astype(np.int32)
        limit = float(rng.choice([0.5, 1.0, 1.5, 2.0]))
        expected = []
        for value, own in zip(values, group, strict=True):
            rest = [v for v, g in zip(values, group, strict=True) if g == own and v == v]
            known = value == value and len(rest) >= 3
            apart = abs(value - statistics.mean(rest)) if known else 0
            expected.append(known and apart > limit * statistics.stdev(rest))
        assert outlying(values, group, limit).tolist() == expected
        far += sum(expected)
    assert far > 500


def test_random_readers_are_worth_comparing(readers: list[Both]) -> None:
    """Chains of merges, merged blinks, repeated recordings and skipped trials all occur.

    And undersweeps that are short enough to be merged, had they not been left out before.
    """
    chains = blinks = repeated = skipped = short = 0
    for both in readers:
        for trial in both.slow.trials:
            into = {f.number: f.into for f in trial.fixations if f.into}
            chains += sum(target in into for target in into.values())
            repeated += any(f.aside for f in trial.fixations)
            skipped += trial.skipped
            if "merge" in both.rules:
                gone = [f for f in trial.fixations if f.left_out == "undersweep"]
                short += sum(f.duration_ms < both.rules["merge"][0] for f in gone)
        blinks += int((both.told.fixations.blink & ~both.told.recorded.blink).sum())
    assert min(chains, blinks, repeated, skipped, short) > 100
