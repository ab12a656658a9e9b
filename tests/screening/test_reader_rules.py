"""Rules for readers, and values set aside, on studies that are worked out on paper."""

from __future__ import annotations

import statistics
from collections.abc import Mapping
from pathlib import Path

import pytest

from tests.end_to_end.building import rows_of
from tests.screening.building import Built, Trial, build, study

GOOD, SHORT = "50:200 150:200 250:200", "50:200"


def reader(
    who: str, answers: str, cues: str = "", looks: Mapping[int, str] | None = None
) -> list[Trial]:
    """A reader's trials: an answer each (``-``: no question), the cue's first letter each.

    ``looks`` says what is read in single trials, from 1.
    """
    cues = cues or "e" * len(answers)
    return [
        Trial(
            who,
            n,
            (looks or {}).get(n, GOOD),
            ok="" if answer == "-" else answer,
            cue={"e": "early", "l": "late"}[cue],
        )
        for n, (answer, cue) in enumerate(zip(answers, cues, strict=True), start=1)
    ]


def readers_lost(done: Built) -> dict[str, tuple[str, str, str]]:
    """Readers left out: rule, limit and what was observed."""
    rows = done.told("participant", "participant", "rule", "limit", "observed")
    return {who: tuple(rest) for who, *rest in rows}


RULE = "[screening.participants]\n"


def test_correct_share_is_of_the_trials_with_a_question(tmp_path: Path) -> None:
    """3 of 4 is not under 0.75; 2 of 3 is, whatever the trials without a question."""
    trials = [*reader("R1", "1110-"), *reader("R2", "110--"), *reader("R3", "---")]
    done = build(study(tmp_path, trials, RULE + "correct_share_under = 0.75\n"))
    assert readers_lost(done) == {"R2": ("correct_share_under", "0.75", "0.6666666667")}
    assert done.account("trials") == {"read": 13, "correct_share_under": 5, "kept": 8}


def test_correct_share_is_of_all_trials_read_kept_or_not(tmp_path: Path) -> None:
    """R1's wrong answer is in a trial that is lost; 1 of 2 is right all the same."""
    trials = [*reader("R1", "10", looks={2: SHORT}), *reader("R2", "10")]
    rules = "[screening.trials]\nfewest_fixations = 3\n" + RULE + "correct_share_under = 0.6\n"
    done = build(study(tmp_path, [*trials, *reader("R3", "11")], rules))
    assert set(readers_lost(done)) == {"R1", "R2"}


def test_lost_trials_share(tmp_path: Path) -> None:
    """1 of 3 lost is above 0.3, 3 of 10 is not; fixations lost are no trials lost."""
    three, one = {1: SHORT, 2: SHORT, 3: SHORT}, {2: SHORT}
    trials = [*reader("R1", "1" * 10, looks=three), *reader("R2", "111", looks=one)]
    trials += reader("R3", "111", looks={1: "50:200 150:60 150:200 250:200", 2: GOOD + " 50:60"})
    rules = "[screening.fixations]\nunder_ms = 80\n[screening.trials]\nfewest_fixations = 3\n"
    done = build(study(tmp_path, trials, rules + RULE + "lost_trials_share_over = 0.3\n"))
    assert readers_lost(done) == {"R2": ("lost_trials_share_over", "0.3", "0.3333333333")}
    assert done.account("trials") == {
        "read": 16,
        "fewest_fixations": 4,
        "lost_trials_share_over": 2,
        "kept": 10,
    }


def test_skipped_trials_are_no_trials_read(tmp_path: Path) -> None:
    """A wrong answer in practice counts for nothing, and 1 lost of 3 is not 1 of 4."""
    practice = Trial("R1", 9, GOOD, ok="0", block="practice")
    trials = [*reader("R1", "111", looks={1: SHORT}), practice, *reader("R2", "1")]
    rules = "[screening.trials]\nfewest_fixations = 3\n" + RULE
    limits = "correct_share_under = 1\nlost_trials_share_over = 0.3\n"
    done = build(study(tmp_path, trials, rules + limits))
    assert readers_lost(done) == {"R1": ("lost_trials_share_over", "0.3", "0.3333333333")}
    assert done.account("trials", "R1") == {
        "read": 4,
        "skip": 1,
        "fewest_fixations": 1,
        "lost_trials_share_over": 2,
    }


def test_fewest_trials_per_cell(tmp_path: Path) -> None:
    """2 kept in each cue are enough; 1 is not; a cue that the reader never met is no cell."""
    trials = [
        *reader("R1", "1111", "eell"),
        *reader("R2", "1111", "eell", looks={3: SHORT}),
        *reader("R3", "11", "ee"),
        *reader("R4", "111", "eel", looks={3: SHORT}),
    ]
    rules = "[screening.trials]\nfewest_fixations = 3\n" + RULE + "fewest_trials_per_cell = 2\n"
    done = build(study(tmp_path, trials, rules))
    assert readers_lost(done) == {
        "R2": ("fewest_trials_per_cell", "2", "1"),
        "R4": ("fewest_trials_per_cell", "2", "0"),
    }


def test_rules_for_readers_apply_in_their_order(tmp_path: Path) -> None:
    """Each reader goes by the first rule; the others, if they hold too, are in ``also``.

    R1: noted, nothing else. R2: noted, 1 of 3 right, 1 of 3 lost, a cue with none kept. R3: as R2
    without a note. R4: all right. R5: all right, 2 of 3 kept, no trial kept in ``late``.
    """
    rules = (
        '[screening.trials]\nfewest_fixations = 3\n[screening.participants]\nnotes = "notes.csv"\n'
        "correct_share_under = 0.5\nlost_trials_share_over = 0.2\nfewest_trials_per_cell = 1\n"
    )
    trials = [
        *reader("R1", "111", "eel"),
        *reader("R2", "100", "eel", looks={3: SHORT}),
        *reader("R3", "100", "eel", looks={3: SHORT}),
        *reader("R4", "111", "eel"),
        *reader("R5", "111", "eel", looks={3: SHORT}),
    ]
    notes = "participant,reason\nR1,asleep\nR2,asleep\n"
    done = build(study(tmp_path, trials, rules, notes=notes))
    told = done.told("participant", "participant", "rule", "observed", "also")
    every = "correct_share_under lost_trials_share_over fewest_trials_per_cell"
    assert told == [
        ("R1", "participant_notes", "asleep", ""),
        ("R2", "participant_notes", "asleep", every),
        ("R3", "correct_share_under", "0.3333333333", every.partition(" ")[2]),
        ("R5", "lost_trials_share_over", "0.3333333333", "fewest_trials_per_cell"),
    ]
    assert {who for who, _ in done.trials()} == {"R4"}


def test_trial_of_a_lost_reader_tells_the_rules_against_the_reader(tmp_path: Path) -> None:
    """A trial, and a fixation, that went by rules of their own would have gone with the reader."""
    looks = {2: SHORT, 3: GOOD + " 50:60"}
    trials = [*reader("R1", "000", looks=looks), *reader("R2", "111")]
    rules = (
        "[screening.fixations]\nunder_ms = 80\n[screening.trials]\nfewest_fixations = 3\n" + RULE
    )
    limits = "correct_share_under = 0.5\nlost_trials_share_over = 0.3\n"
    done = build(study(tmp_path, trials, rules + limits))
    both = "correct_share_under lost_trials_share_over"
    assert [(r["level"], r["rule"], r["also"]) for r in done.ledger] == [
        ("trial", "correct_share_under", "lost_trials_share_over"),
        ("trial", "fewest_fixations", both),
        ("fixation", "under_ms", both),
        ("trial", "correct_share_under", "lost_trials_share_over"),
        ("participant", "correct_share_under", "lost_trials_share_over"),
    ]
    assert done.fates() == ["correct_share_under"] * 3
    assert done.fates(trial=2) == ["fewest_fixations"]
    assert done.account("fixations", "R1") == {
        "read": 8,
        "under_ms": 1,
        "fewest_fixations": 1,
        "correct_share_under": 6,
    }


#: Durations of the one fixation on the verb, trial by trial.
TIMES_MS = (200, 210, 190, 205, 195, 900)


def with_verbs(who: str, times_ms: tuple[int, ...]) -> list[Trial]:
    """Trials in which the verb is looked at once, for as long as said."""
    return [Trial(who, n, f"50:200 150:{ms} 250:200") for n, ms in enumerate(times_ms, start=1)]


@pytest.fixture(scope="module")
def outlying(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """A reader with one long look at the verb, one who always looks so long, one of two trials."""
    trials = [
        *with_verbs("R1", TIMES_MS),
        *with_verbs("R2", (890, 900, 910)),
        *with_verbs("R3", (200, 2000)),
    ]
    rules = "[screening.values]\noutlier_sd = 2\n"
    return build(study(tmp_path_factory.mktemp("outlying"), trials, rules))


def test_value_far_from_the_mean_of_reader_and_region_is_set_missing(outlying: Built) -> None:
    """The mean of the six is 316.7, the standard deviation 285.9: 900 is 2.04 away, 200 is 0.41.

    The other readers have nothing far off: 900 is the mean of R2, and R3 has two values only.
    """
    middle, spread = statistics.mean(TIMES_MS), statistics.stdev(TIMES_MS)
    assert (round(middle, 1), round(spread, 1)) == (316.7, 285.9)
    assert outlying.values("first_fixation_duration", "verb") == {
        **{("R1", n): ms for n, ms in enumerate(TIMES_MS[:5], start=1)},
        ("R1", 6): "outlier",
        ("R2", 1): 890,
        ("R2", 2): 900,
        ("R2", 3): 910,
        ("R3", 1): 200,
        ("R3", 2): 2000,
    }


def test_spread_is_that_of_a_sample(tmp_path: Path) -> None:
    """900 is 2.04 sample deviations from the mean of the six, but 2.24 with all six divided by."""
    rules = "[screening.values]\noutlier_sd = 2.1\n"
    done = build(study(tmp_path, with_verbs("R1", TIMES_MS), rules))
    assert done.told("value", "trial") == []


def test_two_values_are_too_few(tmp_path: Path) -> None:
    """Of two values each is 0.7 deviations from the mean; three are needed to say what is far."""
    rules = "[screening.values]\noutlier_sd = 0.5\n"
    two = build(study(tmp_path / "two", with_verbs("R1", (200, 2000)), rules))
    three = build(study(tmp_path / "three", with_verbs("R1", (200, 2000, 1100)), rules))
    assert two.told("value", "trial") == []
    assert {trial for (trial,) in three.told("value", "trial")} >= {"1", "2"}


def test_each_duration_is_judged_for_itself(outlying: Built) -> None:
    """In the same trial, each duration of the verb that is 900 ms is far off, and no other."""
    told = outlying.told("value", "participant", "trial", "region", "rule", "limit", "observed")
    assert told == [
        ("R1", "6", "verb", "outlier_sd", "2", f"{measure} 900")
        for measure in (
            *("first_fixation_duration", "single_fixation_duration", "first_pass_time"),
            *("go_past_time", "right_bounded_time", "total_time"),
        )
    ]
    assert set(outlying.told("value", "action", "fixation", "also")) == {("set missing", "", "")}


def test_binary_outcomes_and_counts_are_never_set_aside(outlying: Built) -> None:
    """The row stays, with its other outcomes."""
    rows = [r for r in rows_of(outlying.folder, "outcomes") if r["missing"] == "outlier"]
    assert {(r["participant"], r["trial"], r["region"], r["kind"]) for r in rows} == {
        ("R1", 6, "verb", "duration")
    }
    (wide,) = (
        r
        for r in rows_of(outlying.folder, "outcomes_wide")
        if (r["participant"], r["trial"], r["region"]) == ("R1", 6, "verb")
    )
    assert (wide["total_time"], wide["fixation_count"], wide["first_pass_skip"]) == (None, 1, 0)


def test_values_set_aside_leave_accounts_and_trials_alone(outlying: Built) -> None:
    """Values are no fixations: nothing is left out, and the trial has its reading time."""
    assert outlying.account("fixations") == {"read": 33, "kept": 33}
    times = {
        (r["participant"], r["trial"]): r["reading_time"]
        for r in rows_of(outlying.folder, "trials")
    }
    assert times["R1", 6] == 1300


def test_equal_values_are_never_far_off(tmp_path: Path) -> None:
    """Where all are the same there is no distance from the mean, not even by rounding."""
    trials = [Trial("R1", n, "50:200.1 150:0.1 250:200.3") for n in range(1, 8)]
    done = build(study(tmp_path, trials, "[screening.values]\noutlier_sd = 1\n"))
    assert done.told("value", "trial") == []


def test_lost_trials_have_no_part_in_the_mean(tmp_path: Path) -> None:
    """Without the long trial, which a rule for trials leaves out, nothing is far off."""
    rules = "[screening.trials]\nduration_ms = [0, 1000]\n[screening.values]\noutlier_sd = 2\n"
    done = build(study(tmp_path, with_verbs("R1", TIMES_MS), rules))
    assert done.told("value", "trial") == []
    assert done.lost_trials() == {("R1", 6): "duration_ms"}
