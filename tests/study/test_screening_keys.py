"""Keys of screening that are astray or of a wrong kind: the message and the line of each."""

from collections.abc import Callable

import pytest

from tests.study.written import SOUND


@pytest.mark.parametrize(
    ("tables", "expected"),
    [
        pytest.param(
            "[screening]\nunder_ms = 80\n",
            "study.toml:16: screening.under_ms: unknown key; expected fixations, trials, "
            "participants or values\n"
            "    fix: it belongs in [screening.fixations] or [screening.fixations.merge]",
            id="rule outside its table",
        ),
        pytest.param(
            "[screening]\nfixation = { first = 1 }\n",
            'study.toml:16: screening.fixation: unknown key\n    fix: did you mean "fixations"?',
            id="table near a known one",
        ),
        pytest.param(
            "[screening.fixations]\nfrist = 1\n",
            'study.toml:16: screening.fixations.frist: unknown key\n    fix: did you mean "first"?',
            id="rule near a known one",
        ),
        pytest.param(
            "[screening.trials]\nunder_ms = 80\n",
            "study.toml:16: screening.trials.under_ms: unknown key; expected notes, "
            "fewest_fixations, line_confidence_under, outside_share_over, duration_ms, "
            "blink_in_first_pass_of, no_first_pass_on or answer_wrong\n"
            "    fix: it belongs in [screening.fixations] or [screening.fixations.merge]",
            id="rule of another level",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 80, within = 14 }\n",
            "study.toml:16: screening.fixations.merge.within: unknown key\n"
            '    fix: did you mean "within_px"?',
            id="distance without its unit",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { within_px = 14 }\n",
            "study.toml:16: screening.fixations.merge.under_ms: this key is missing; expected the "
            "duration below which a fixation is merged, in milliseconds\n"
            "    fix: add for example under_ms = 80",
            id="merge without a limit",
        ),
    ],
)
def test_key_astray_is_sent_home(refusal: Callable[..., str], tables: str, expected: str) -> None:
    """A key that screening does not know is refused with the nearest, or its table."""
    assert refusal(SOUND + tables).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("tables", "expected"),
    [
        pytest.param(
            "[screening]\nfixations = false\n",
            'study.toml:16: screening.fixations: this is a true-or-false value; found "false", '
            "expected a table\n"
            "    fix: write its keys under [screening.fixations]",
            id="switch for a table",
        ),
        pytest.param(
            "[screening.fixations]\noutside_text_time = 1\n",
            "study.toml:16: screening.fixations.outside_text_time: this is a whole number; found "
            '"1", expected true or false\n'
            "    fix: write for example outside_text_time = true",
            id="number for outside_text_time",
        ),
        pytest.param(
            '[screening.fixations]\noff_screen = "yes"\n',
            'study.toml:16: screening.fixations.off_screen: this is text; found "yes", expected '
            "true or false\n"
            "    fix: write for example off_screen = true",
            id="text for off_screen",
        ),
        pytest.param(
            '[screening.trials]\nanswer_wrong = "true"\n',
            'study.toml:16: screening.trials.answer_wrong: this is text; found "true", expected '
            "true or false\n"
            "    fix: write answer_wrong = true",
            id="text for answer_wrong",
        ),
        pytest.param(
            "[screening.fixations]\nfirst = true\n",
            "study.toml:16: screening.fixations.first: this is a true-or-false value; found "
            '"true", expected a whole number\n'
            "    fix: write for example first = 1",
            id="true for first",
        ),
        pytest.param(
            "[screening.fixations]\nlast = 1.5\n",
            "study.toml:16: screening.fixations.last: this is a number with decimals; found "
            '"1.5", expected a whole number\n'
            "    fix: write for example last = 1",
            id="decimals for last",
        ),
        pytest.param(
            "[screening.fixations]\nblink = true\n",
            "study.toml:16: screening.fixations.blink: this is not one of the choices; found "
            '"true", expected "drop" (no other in this version)\n'
            '    fix: write "drop"',
            id="true for blink",
        ),
        pytest.param(
            "[screening.fixations]\nundersweep = true\n",
            "study.toml:16: screening.fixations.undersweep: this is not one of the choices; found "
            '"true", expected "drop" (no other in this version)\n'
            '    fix: write "drop"',
            id="true for undersweep",
        ),
        pytest.param(
            '[screening.fixations]\nblink = "keep"\n',
            "study.toml:16: screening.fixations.blink: this is not one of the choices; found "
            '"keep", expected "drop" (no other in this version)\n'
            '    fix: write "drop"',
            id="no choice of blink",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = 80\n",
            'study.toml:16: screening.fixations.merge: this is a whole number; found "80", '
            "expected a table\n"
            "    fix: write for example merge = { under_ms = 80, within_px = 14 }",
            id="number for merge",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = true\n",
            "study.toml:16: screening.fixations.merge: this is a true-or-false value; found "
            '"true", expected a table\n'
            "    fix: write for example merge = { under_ms = 80, within_px = 14 }",
            id="true for merge",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 80, within_px = false }\n",
            "study.toml:16: screening.fixations.merge.within_px: this is a true-or-false value; "
            'found "false", expected a number\n'
            "    fix: write for example within_px = 14",
            id="false for a distance",
        ),
        pytest.param(
            '[screening.fixations]\nunder_ms = "80 ms"\n',
            'study.toml:16: screening.fixations.under_ms: this is text; found "80 ms", expected a '
            "number\n"
            "    fix: write for example under_ms = 80",
            id="text for under_ms",
        ),
        pytest.param(
            "[screening.fixations]\nover_ms = true\n",
            "study.toml:16: screening.fixations.over_ms: this is a true-or-false value; found "
            '"true", expected a number\n'
            "    fix: write for example over_ms = 800",
            id="true for over_ms",
        ),
        pytest.param(
            '[screening.trials]\nnotes = ["notes.csv"]\n',
            'study.toml:16: screening.trials.notes: this is a list; found "["notes.csv"]", '
            "expected text in quotes\n"
            '    fix: write for example notes = "notes.csv"',
            id="list for notes on trials",
        ),
        pytest.param(
            "[screening.trials]\nfewest_fixations = true\n",
            "study.toml:16: screening.trials.fewest_fixations: this is a true-or-false value; "
            'found "true", expected a whole number\n'
            "    fix: write for example fewest_fixations = 3",
            id="true for fewest_fixations",
        ),
        pytest.param(
            '[screening.trials]\noutside_share_over = "0.3"\n',
            'study.toml:16: screening.trials.outside_share_over: this is text; found "0.3", '
            "expected a number\n"
            "    fix: write outside_share_over = 0.3",
            id="text for outside_share_over",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = 500\n",
            'study.toml:16: screening.trials.duration_ms: this is no range; found "500", expected '
            "two numbers in square brackets, the lower first\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="number for duration_ms",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = true\n",
            'study.toml:16: screening.trials.duration_ms: this is no range; found "true", '
            "expected two numbers in square brackets, the lower first\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="true for duration_ms",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = [500]\n",
            "study.toml:16: screening.trials.duration_ms: this is no range; expected two numbers "
            "in square brackets, the lower first\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="one number for duration_ms",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = [500, 1000, 30000]\n",
            "study.toml:16: screening.trials.duration_ms: this is no range; expected two numbers "
            "in square brackets, the lower first\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="three numbers for duration_ms",
        ),
        pytest.param(
            '[screening.trials]\nduration_ms = ["500", 30000]\n',
            'study.toml:16: screening.trials.duration_ms, entry 1: this is text; found "500", '
            "expected a number\n"
            "    fix: write 500",
            id="text in duration_ms",
        ),
        pytest.param(
            '[screening.trials]\nblink_in_first_pass_of = "verb"\n',
            'study.toml:16: screening.trials.blink_in_first_pass_of: this is text; found "verb", '
            "expected a list in square brackets\n"
            '    fix: write blink_in_first_pass_of = ["verb"]',
            id="text for blink_in_first_pass_of",
        ),
        pytest.param(
            "[screening.trials]\nno_first_pass_on = [1]\n",
            "study.toml:16: screening.trials.no_first_pass_on, entry 1: this is a whole number; "
            'found "1", expected text in quotes\n'
            '    fix: write "1"',
            id="number in no_first_pass_on",
        ),
        pytest.param(
            "[screening.participants]\nnotes = 1\n",
            'study.toml:16: screening.participants.notes: this is a whole number; found "1", '
            "expected text in quotes\n"
            '    fix: write notes = "1"',
            id="number for notes on readers",
        ),
        pytest.param(
            "[screening.participants]\ncorrect_share_under = true\n",
            "study.toml:16: screening.participants.correct_share_under: this is a true-or-false "
            'value; found "true", expected a number\n'
            "    fix: write for example correct_share_under = 0.75",
            id="true for correct_share_under",
        ),
        pytest.param(
            '[screening.participants]\nlost_trials_share_over = "30 %"\n',
            "study.toml:16: screening.participants.lost_trials_share_over: this is text; found "
            '"30 %", expected a number\n'
            "    fix: write for example lost_trials_share_over = 0.3",
            id="text for lost_trials_share_over",
        ),
        pytest.param(
            "[screening.participants]\nfewest_trials_per_cell = 4.0\n",
            "study.toml:16: screening.participants.fewest_trials_per_cell: this is a number with "
            'decimals; found "4.0", expected a whole number\n'
            "    fix: write fewest_trials_per_cell = 4",
            id="decimals for fewest_trials_per_cell",
        ),
        pytest.param(
            "[screening.values]\noutlier_sd = true\n",
            "study.toml:16: screening.values.outlier_sd: this is a true-or-false value; found "
            '"true", expected a number\n'
            "    fix: write for example outlier_sd = 3",
            id="true for outlier_sd",
        ),
    ],
)
def test_wrong_kind_of_limit_is_refused(
    refusal: Callable[..., str], tables: str, expected: str
) -> None:
    """A limit of the wrong kind is refused with what is expected and what to write."""
    assert refusal(SOUND + tables).rsplit("\n", 1)[0] == expected
