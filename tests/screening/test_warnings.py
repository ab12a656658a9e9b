"""What is said where a choice of rules is dangerous."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tests.screening.building import Built, Trial, build, study

GOOD = "50:200 150:200 250:200"
#: The first rule stands in this line of the study file.
LINE = "warning: study.toml:37: "


def warned(folder: Path, trials: list[Trial], rules: str) -> list[str]:
    """The warnings of a build."""
    done = build(study(folder, trials, rules))
    return [line.partition("\n")[0] for line in warnings_of(done)]


def warnings_of(done: Built) -> list[str]:
    """The warnings, with the study file named as it is beside its output."""
    beside = f"{done.folder.parent}{os.sep}"
    return [line.replace(beside, "") for line in done.findings if line.startswith("warning")]


@pytest.mark.parametrize(
    ("short", "said"),
    [
        (2, []),
        (
            3,
            [
                (
                    f"{LINE}screening.fixations.under_ms: the rule under_ms leaves out 15% of the "
                    'fixations; found "3 of 20"'
                )
            ],
        ),
    ],
    ids=["a tenth", "more than a tenth"],
)
def test_rule_that_takes_more_than_a_tenth_of_fixations(
    tmp_path: Path, short: int, said: list[str]
) -> None:
    """2 of 20 are a tenth, 3 are more: the rule is named with its line and what it took."""
    looks = " ".join(["50:60"] * short + ["50:200"] * (20 - short))
    rules = "[screening.fixations]\nunder_ms = 80\n"
    assert warned(tmp_path, [Trial("R1", 1, looks)], rules) == said


def test_rule_that_takes_more_than_a_tenth_of_trials(tmp_path: Path) -> None:
    """2 of 12 trials, with 2 of 32 fixations: a warning about trials only."""
    trials = [Trial("R1", n, GOOD if n > 2 else "50:200") for n in range(1, 13)]
    assert warned(tmp_path, trials, "[screening.trials]\nfewest_fixations = 3\n") == [
        (
            f"{LINE}screening.trials.fewest_fixations: the rule fewest_fixations leaves out 17% of "
            'the trials; found "2 of 12"'
        )
    ]


def test_rule_for_readers_that_takes_more_than_a_tenth(tmp_path: Path) -> None:
    """A reader of two is half of everything: told for trials and for fixations."""
    trials = [Trial("R1", 1, GOOD), Trial("R2", 1, GOOD, ok="0")]
    rules = "[screening.participants]\ncorrect_share_under = 0.5\n"
    head = f"{LINE}screening.participants.correct_share_under: the rule "
    assert warned(tmp_path, trials, rules) == [
        head + 'correct_share_under leaves out 50% of the trials; found "1 of 2"',
        head + 'correct_share_under leaves out 50% of the fixations; found "3 of 6"',
    ]


def test_practice_is_no_part_of_the_share(tmp_path: Path) -> None:
    """Half of all trials are practice, which is no rule of screening; 1 of 10 others is lost."""
    trials = [Trial("R1", n, GOOD if n > 1 else "50:200") for n in range(1, 11)]
    trials += [Trial("R1", n, GOOD, block="practice") for n in range(11, 21)]
    assert warned(tmp_path, trials, "[screening.trials]\nfewest_fixations = 3\n") == []


#: Eleven trials, so that the one without a first pass is less than a tenth.
SKIPPING = [Trial("R1", n, GOOD if n > 1 else "50:200 250:200") for n in range(1, 12)]
WITHOUT_SKIPS = '[screening.trials]\nno_first_pass_on = ["verb"]\n'


@pytest.mark.parametrize(
    "outcomes", ['["binary"]', '["first_pass_skip"]', '["count", "first_pass_skip"]']
)
def test_rule_that_removes_what_is_measured(tmp_path: Path, outcomes: str) -> None:
    """``no_first_pass_on`` leaves out just the trials in which the region is skipped."""
    file = study(tmp_path, SKIPPING, WITHOUT_SKIPS)
    text = file.read_text(encoding="utf-8")
    changed = text.replace('outcomes = ["binary", "count", "duration"]', f"outcomes = {outcomes}")
    file.write_text(changed, encoding="utf-8", newline="\n")
    assert "".join(warnings_of(build(file))) == (
        f"{LINE}screening.trials.no_first_pass_on: this rule leaves out the trials in which "
        "the region was skipped, which is what first_pass_skip measures there; found "
        '"verb"\n    fix: take first_pass_skip of these regions from a build without the rule, or '
        "leave it out of [measures] outcomes"
    )


@pytest.mark.parametrize("outcomes", ['["count", "duration"]', '["regression_in"]'])
def test_rule_is_harmless_where_skipping_is_not_measured(tmp_path: Path, outcomes: str) -> None:
    """Without ``first_pass_skip`` among the outcomes there is no warning."""
    file = study(tmp_path, SKIPPING, WITHOUT_SKIPS)
    text = file.read_text(encoding="utf-8")
    changed = text.replace('outcomes = ["binary", "count", "duration"]', f"outcomes = {outcomes}")
    file.write_text(changed, encoding="utf-8", newline="\n")
    assert warnings_of(build(file)) == []


def test_trials_without_a_text_time_are_counted(tmp_path: Path) -> None:
    """Each side is counted for itself; practice trials are not."""
    trials = [
        Trial("R1", 1, GOOD, on="1000", off="9000"),
        Trial("R1", 2, GOOD, on="1001000"),
        Trial("R1", 3, GOOD),
        Trial("R1", 4, GOOD, block="practice"),
    ]
    rules = "[screening.fixations]\noutside_text_time = true\n"
    head = f"{LINE}column "
    assert warned(tmp_path, trials, rules) == [
        head + '"on": 1 trial has no time here and is not judged by it',
        head + '"off": 2 trials have no time here and are not judged by it',
    ]
