"""Rules for trials on trials that are worked out on paper, and what ``also`` tells of them."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.screening.building import Built, Trial, build, study

HEADER = "[screening.trials]\n"


def lost(folder: Path, rule: str, *looks: str, before: str = "", **more: str) -> list[int]:
    """Which of some trials of one reader a rule leaves out."""
    trials = [Trial("R1", n, text, **more) for n, text in enumerate(looks, start=1)]
    done = build(study(folder, trials, f"{before}{HEADER}{rule}\n"))
    told = done.lost_trials()
    assert set(told.values()) <= {rule.partition(" ")[0]}
    assert [n for _, n in done.trials()] == [
        n for n in range(1, len(looks) + 1) if ("R1", n) not in told
    ]
    return [n for _, n in told]


def test_fewest_fixations_counts_kept_ones_in_and_outside_regions(tmp_path: Path) -> None:
    """3 kept are enough for 3, be they outside (350); of 4 with one too short 3 are; 2 are not."""
    before = "[screening.fixations]\nunder_ms = 80\n"
    looks = ("50:200 350:200 150:200", "50:200 50:60 150:200 150:200", "50:200 50:60 150:200")
    assert lost(tmp_path, "fewest_fixations = 3", *looks, before=before) == [3]


def test_outside_share_is_of_kept_fixations(tmp_path: Path) -> None:
    """3 of 10 is not above 0.3; 1 of 3 is; 1 of 4 is once a short one inside is gone."""
    before = "[screening.fixations]\nunder_ms = 80\n"
    ten = " ".join(["350:200"] * 3 + ["50:200"] * 7)
    looks = (
        ten,
        "350:200 50:200 50:200",
        "350:200 50:200 50:200 50:200",
        "350:200 50:200 50:60 50:200",
    )
    assert lost(tmp_path, "outside_share_over = 0.3", *looks, before=before) == [2, 4]


def test_duration_is_from_first_to_last_kept_fixation(tmp_path: Path) -> None:
    """[500, 1000]: 500 and 1000 are in, 499 and 1001 out; what is left out at the ends is no part.

    The last trial lasts 40 + 20 + 480 + 20 + 40 = 600 ms, its kept fixation 480.
    """
    before = "[screening.fixations]\nunder_ms = 80\n"
    looks = (
        *("50:500", "50:499", "50@1000:100 150@1900:100", "50@1000:100 150@1900.5:100.5"),
        "50:40 50:480 50:40",
    )
    assert lost(tmp_path, "duration_ms = [500, 1000]", *looks, before=before) == [2, 4, 5]


def test_duration_of_a_trial_without_kept_fixations_is_nothing(tmp_path: Path) -> None:
    """It is 0 ms: under any lower limit above 0."""
    before = "[screening.fixations]\nunder_ms = 80\n"
    looks = ("50:60 50:60", "50:600")
    assert lost(tmp_path, "duration_ms = [1, 1000]", *looks, before=before) == [1]


def test_blink_in_first_pass(tmp_path: Path) -> None:
    """Trial by trial what a blink touches.

    1: the first pass on the verb; 2: a later visit; 3: ``who`` only; 4: the verb, first entered
    from the right, so that it has no first pass; 5: the second fixation of its first pass.
    """
    looks = (
        "50:200 150:200b 250:200",
        "50:200 150:200 250:200 150:200b",
        "50:200b 150:200 250:200",
        "50:200 250:200 150:200b",
        "50:200 150:200 160:200b 250:200",
    )
    assert lost(tmp_path, 'blink_in_first_pass_of = ["verb"]', *looks) == [1, 5]


def test_blink_that_was_dropped_counts_all_the_same(tmp_path: Path) -> None:
    """With ``blink = "drop"`` the fixation is gone, and would have been of the first pass."""
    before = '[screening.fixations]\nblink = "drop"\n'
    looks = ("50:200 150:200b 250:200", "50:200 150:200 250:200 150:200b")
    assert lost(tmp_path, 'blink_in_first_pass_of = ["verb"]', *looks, before=before) == [1]


def test_fixation_left_out_before_the_blink_rule_is_no_part_of_a_first_pass(tmp_path: Path) -> None:
    """The blink is on the first fixation, which ``first`` leaves out."""
    before = "[screening.fixations]\nfirst = 1\n"
    looks = ("150:200b 160:200 250:200",)
    assert lost(tmp_path, 'blink_in_first_pass_of = ["verb"]', *looks, before=before) == []


def test_no_first_pass(tmp_path: Path) -> None:
    """Out: the verb skipped (2), first entered from the right (3), never reached (4).

    And gone with a fixation that is too short (5).
    """
    before = "[screening.fixations]\nunder_ms = 80\n"
    looks = (
        *("50:200 150:200 250:200", "50:200 250:200", "250:200 150:200", "50:200"),
        "50:200 150:60 250:200",
    )
    assert lost(tmp_path, 'no_first_pass_on = ["verb"]', *looks, before=before) == [2, 3, 4, 5]


def test_text_without_the_region_is_not_judged(tmp_path: Path) -> None:
    """The plums' text has no verb, so that it cannot have been skipped."""
    looks = ("50:200 250:200",)
    assert lost(tmp_path, 'no_first_pass_on = ["verb"]', *looks, item="plum") == []


def test_any_of_several_regions_is_enough(tmp_path: Path) -> None:
    """With two regions named, a trial that lacks a first pass on either goes."""
    looks = ("50:200 150:200 250:200", "50:200 150:200", "150:200 250:200", "50:200 250:200")
    assert lost(tmp_path, 'no_first_pass_on = ["verb", "fruit"]', *looks) == [2, 4]


@pytest.mark.parametrize(("outside", "gone"), [("ignore", True), ("interrupt", False)])
def test_outside_convention_decides_about_first_passes(
    tmp_path: Path, outside: str, gone: bool
) -> None:
    """With ``interrupt`` the look outside ends the first pass, so that the blink comes later."""
    trials = [
        Trial("R1", 1, "50:200 150:200 350:200 160:200b 250:200"),
        Trial("R1", 2, "50:200 150:200 250:200"),
    ]
    rules = HEADER + 'blink_in_first_pass_of = ["verb"]\n'
    done = build(study(tmp_path, trials, rules, outside=outside))
    assert done.lost_trials() == ({("R1", 1): "blink_in_first_pass_of"} if gone else {})


@pytest.mark.parametrize(
    ("word", "gone"),
    [
        *(("0", True), ("false", True), ("No", True), ("WRONG", True), ("0.0", True)),
        *(("1", False), ("TRUE", False), ("yes", False), ("correct", False)),
        *(("", False), ("NA", False)),
    ],
)
def test_wrong_answers(tmp_path: Path, word: str, gone: bool) -> None:
    """Words for wrong leave the trial out; a right answer, or no question, does not."""
    trials = [Trial("R1", 1, "50:200", ok=word), Trial("R1", 2, "50:200")]
    done = build(study(tmp_path, trials, HEADER + "answer_wrong = true\n"))
    assert done.lost_trials() == ({("R1", 1): "answer_wrong"} if gone else {})


NOTES = "participant,trial,reason\nR1,2,sneezed\nR1,2,and laughed\nR1,3,\nR2,,asleep\n"


@pytest.fixture(scope="module")
def noted(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Two readers; notes on two trials and on a reader, in one file."""
    trials = [Trial(who, n, "50:200 150:200") for who in ("R1", "R2") for n in (1, 2, 3)]
    rules = HEADER + 'notes = "notes.csv"\n[screening.participants]\nnotes = "notes.csv"\n'
    return build(study(tmp_path_factory.mktemp("noted"), trials, rules, notes=NOTES))


def test_notes_leave_out_trials_and_readers(noted: Built) -> None:
    """The trials and the reader named are gone, nothing else."""
    assert noted.trials() == [("R1", 1)]
    assert noted.account("trials") == {"read": 6, "notes": 2, "participant_notes": 3, "kept": 1}


def test_ledger_repeats_the_notes(noted: Built) -> None:
    """Reasons are told; two for one trial are joined, none is told as that."""
    columns = ("participant", "trial", "rule", "limit", "observed")
    assert noted.told("trial", *columns) == [
        ("R1", "2", "notes", "notes.csv", "sneezed; and laughed"),
        ("R1", "3", "notes", "notes.csv", "no reason given"),
        *(("R2", trial, "participant_notes", "notes.csv", "asleep") for trial in "123"),
    ]
    assert noted.told("participant", *columns) == [
        ("R2", "", "participant_notes", "notes.csv", "asleep")
    ]


EVERY_RULE = """
[screening.fixations]
under_ms = 80
[screening.trials]
notes = "notes.csv"
fewest_fixations = 3
outside_share_over = 0.3
duration_ms = [500, 1000]
blink_in_first_pass_of = ["verb"]
no_first_pass_on = ["verb"]
answer_wrong = true
"""


@pytest.fixture(scope="module")
def ordered(tmp_path_factory: pytest.TempPathFactory) -> Built:
    """Trials against which more and more rules speak; each goes by the first of them.

    All last less than 500 ms unless 700 is written; the verb lies at 150, a blink is a ``b``.
    """
    trials = [
        Trial("R1", 1, "50:200 150:200 250:200"),  # 640 ms, nothing against it
        Trial("R1", 2, "50:200 150:200 250:200", ok="0"),
        Trial("R1", 3, "50:200 250:200 250:200", ok="0"),
        Trial("R1", 4, "50:200 150:200b 250:200", ok="0"),
        Trial("R1", 5, "50:100 250:100 250:100", ok="0"),
        Trial("R1", 6, "350:100 250:100 250:100", ok="0"),
        Trial("R1", 7, "350:100 250:100", ok="0"),
        Trial("R1", 8, "350:100 250:100 150:60b", ok="0"),
        Trial("R1", 9, "50:200 150:200 250:200"),
    ]
    notes = "participant,trial,reason\nR1,8,sneezed\nR1,9,sneezed\n"
    return build(study(tmp_path_factory.mktemp("ordered"), trials, EVERY_RULE, notes=notes))


def test_first_rule_against_a_trial_is_charged_and_later_ones_are_told(ordered: Built) -> None:
    """Rule, what it saw, and ``also``, on paper."""
    assert ordered.told("trial", "trial", "rule", "observed", "also") == [
        ("2", "answer_wrong", "0", ""),
        ("3", "no_first_pass_on", "1", "answer_wrong"),
        ("4", "blink_in_first_pass_of", "1", "answer_wrong"),
        ("5", "duration_ms", "340", "no_first_pass_on answer_wrong"),
        ("6", "outside_share_over", "0.3333333333", "duration_ms no_first_pass_on answer_wrong"),
        (
            "7",
            "fewest_fixations",
            "2",
            "outside_share_over duration_ms no_first_pass_on answer_wrong",
        ),
        (
            *("8", "notes", "sneezed"),
            "fewest_fixations outside_share_over duration_ms no_first_pass_on answer_wrong",
        ),
        ("9", "notes", "sneezed", ""),
    ]


def test_fixation_left_out_by_its_own_rule_tells_the_rules_against_its_trial(
    ordered: Built,
) -> None:
    """The fixation of 60 ms in trial 8 would have gone with its trial too."""
    assert ordered.told("fixation", "trial", "fixation", "rule", "also") == [
        (
            *("8", "3", "under_ms"),
            "notes fewest_fixations outside_share_over duration_ms no_first_pass_on answer_wrong",
        )
    ]


def test_fixations_of_a_lost_trial_are_charged_to_its_rule(ordered: Built) -> None:
    """All but the one that its own rule left out."""
    assert ordered.fates(trial=8) == ["notes", "notes", "under_ms"]
    assert ordered.fates(trial=7) == ["fewest_fixations"] * 2
    assert ordered.account("fixations") == {
        "read": 26,
        "under_ms": 1,
        "notes": 5,
        "fewest_fixations": 2,
        "outside_share_over": 3,
        "duration_ms": 3,
        "blink_in_first_pass_of": 3,
        "no_first_pass_on": 3,
        "answer_wrong": 3,
        "kept": 3,
    }


def test_ledger_shows_limits_as_the_study_has_them(ordered: Built) -> None:
    """Each rule with its limit."""
    assert dict(ordered.told("trial", "rule", "limit")) == {
        "notes": "notes.csv",
        "fewest_fixations": "3",
        "outside_share_over": "0.3",
        "duration_ms": "500, 1000",
        "blink_in_first_pass_of": "verb",
        "no_first_pass_on": "verb",
        "answer_wrong": "true",
    }
