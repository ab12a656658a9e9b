"""Limits of screening that are out of bounds: the message and the line of each."""

from collections.abc import Callable

import pytest

from tests.study.written import SOUND


@pytest.mark.parametrize(
    ("tables", "expected"),
    [
        pytest.param(
            "[screening.fixations]\nfirst = 0\n",
            'study.toml:16: screening.fixations.first: out of bounds; found "0", expected a '
            "number of 1 or more\n"
            "    fix: write for example first = 1",
            id="first",
        ),
        pytest.param(
            "[screening.fixations]\nfirst = 100001\n",
            'study.toml:16: screening.fixations.first: out of bounds; found "100001", expected a '
            "number of 100000 or less\n"
            "    fix: write for example first = 1",
            id="first too many",
        ),
        pytest.param(
            "[screening.fixations]\nlast = 0\n",
            'study.toml:16: screening.fixations.last: out of bounds; found "0", expected a number '
            "of 1 or more\n"
            "    fix: write for example last = 1",
            id="last",
        ),
        pytest.param(
            "[screening.fixations]\nlast = 100001\n",
            'study.toml:16: screening.fixations.last: out of bounds; found "100001", expected a '
            "number of 100000 or less\n"
            "    fix: write for example last = 1",
            id="last too many",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 0, within_px = 14 }\n",
            'study.toml:16: screening.fixations.merge.under_ms: out of bounds; found "0", '
            "expected a number above 0\n"
            "    fix: write for example under_ms = 80",
            id="merge under_ms",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 80, within_px = 0 }\n",
            'study.toml:16: screening.fixations.merge.within_px: out of bounds; found "0", '
            "expected a number above 0\n"
            "    fix: write for example within_px = 14",
            id="merge within_px",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 80, within_deg = -0.5 }\n",
            'study.toml:16: screening.fixations.merge.within_deg: out of bounds; found "-0.5", '
            "expected a number above 0\n"
            "    fix: write for example within_deg = 0.5",
            id="merge within_deg",
        ),
        pytest.param(
            "[screening.fixations]\nmerge = { under_ms = 80, within_characters = 0 }\n",
            "study.toml:16: screening.fixations.merge.within_characters: out of bounds; found "
            '"0", expected a number above 0\n'
            "    fix: write for example within_characters = 1",
            id="merge within_characters",
        ),
        pytest.param(
            "[screening.fixations]\nunder_ms = 0\n",
            'study.toml:16: screening.fixations.under_ms: out of bounds; found "0", expected a '
            "number above 0\n"
            "    fix: write for example under_ms = 80",
            id="under_ms",
        ),
        pytest.param(
            "[screening.fixations]\nover_ms = -1\n",
            'study.toml:16: screening.fixations.over_ms: out of bounds; found "-1", expected a '
            "number above 0\n"
            "    fix: write for example over_ms = 800",
            id="over_ms",
        ),
        pytest.param(
            "[screening.fixations]\nover_ms = inf\n",
            'study.toml:16: screening.fixations.over_ms: out of bounds; found "inf", expected a '
            "finite number\n"
            "    fix: write for example over_ms = 800",
            id="over_ms without end",
        ),
        pytest.param(
            '[screening.trials]\nnotes = ""\n',
            "study.toml:16: screening.trials.notes: this is empty; expected some text\n"
            '    fix: write for example notes = "notes.csv"',
            id="empty notes on trials",
        ),
        pytest.param(
            "[screening.trials]\nnotes = 'notes\\day1.csv'\n",
            "study.toml:16: screening.trials.notes: folders are separated by a backslash, which "
            'only one operating system understands; found "notes\\day1.csv", expected a forward '
            "slash between folders\n"
            '    fix: write "notes/day1.csv"',
            id="backslash in notes on trials",
        ),
        pytest.param(
            "[screening.trials]\nfewest_fixations = 0\n",
            'study.toml:16: screening.trials.fewest_fixations: out of bounds; found "0", expected '
            "a number of 1 or more\n"
            "    fix: write for example fewest_fixations = 3",
            id="fewest_fixations",
        ),
        pytest.param(
            "[screening.trials]\nfewest_fixations = 100001\n",
            'study.toml:16: screening.trials.fewest_fixations: out of bounds; found "100001", '
            "expected a number of 100000 or less\n"
            "    fix: write for example fewest_fixations = 3",
            id="fewest_fixations too many",
        ),
        pytest.param(
            "[screening.trials]\nline_confidence_under = 90\n",
            'study.toml:16: screening.trials.line_confidence_under: out of bounds; found "90", '
            "expected a number of 1 or less\n"
            "    fix: write for example line_confidence_under = 0.9",
            id="line_confidence_under in percent",
        ),
        pytest.param(
            "[screening.trials]\nline_confidence_under = -0.1\n",
            'study.toml:16: screening.trials.line_confidence_under: out of bounds; found "-0.1", '
            "expected a number of 0 or more\n"
            "    fix: write for example line_confidence_under = 0.9",
            id="line_confidence_under below 0",
        ),
        pytest.param(
            "[screening.trials]\noutside_share_over = 30\n",
            'study.toml:16: screening.trials.outside_share_over: out of bounds; found "30", '
            "expected a number of 1 or less\n"
            "    fix: write for example outside_share_over = 0.3",
            id="outside_share_over in percent",
        ),
        pytest.param(
            "[screening.trials]\noutside_share_over = -0.1\n",
            'study.toml:16: screening.trials.outside_share_over: out of bounds; found "-0.1", '
            "expected a number of 0 or more\n"
            "    fix: write for example outside_share_over = 0.3",
            id="outside_share_over below 0",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = [-1, 30000]\n",
            'study.toml:16: screening.trials.duration_ms, entry 1: out of bounds; found "-1", '
            "expected a number of 0 or more\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="duration_ms below 0",
        ),
        pytest.param(
            "[screening.trials]\nduration_ms = [500, inf]\n",
            'study.toml:16: screening.trials.duration_ms, entry 2: out of bounds; found "inf", '
            "expected a finite number\n"
            "    fix: write for example duration_ms = [500, 30000]",
            id="duration_ms without end",
        ),
        pytest.param(
            "[screening.trials]\nblink_in_first_pass_of = []\n",
            "study.toml:16: screening.trials.blink_in_first_pass_of: this is empty; expected at "
            "least one entry\n"
            '    fix: write for example blink_in_first_pass_of = ["verb"]',
            id="no region in blink_in_first_pass_of",
        ),
        pytest.param(
            '[screening.trials]\nblink_in_first_pass_of = ["verb", "verb"]\n',
            "study.toml:16: screening.trials.blink_in_first_pass_of: named twice in this list: "
            '"verb"\n'
            "    fix: keep one of each",
            id="region twice in blink_in_first_pass_of",
        ),
        pytest.param(
            "[screening.trials]\nno_first_pass_on = []\n",
            "study.toml:16: screening.trials.no_first_pass_on: this is empty; expected at least "
            "one entry\n"
            '    fix: write for example no_first_pass_on = ["verb"]',
            id="no region in no_first_pass_on",
        ),
        pytest.param(
            '[screening.trials]\nno_first_pass_on = ["verb", "verb"]\n',
            'study.toml:16: screening.trials.no_first_pass_on: named twice in this list: "verb"\n'
            "    fix: keep one of each",
            id="region twice in no_first_pass_on",
        ),
        pytest.param(
            '[screening.trials]\nno_first_pass_on = [""]\n',
            "study.toml:16: screening.trials.no_first_pass_on, entry 1: this is empty; expected "
            "some text\n"
            '    fix: write for example no_first_pass_on = ["verb"]',
            id="empty name in no_first_pass_on",
        ),
        pytest.param(
            '[screening.participants]\nnotes = ""\n',
            "study.toml:16: screening.participants.notes: this is empty; expected some text\n"
            '    fix: write for example notes = "notes.csv"',
            id="empty notes on readers",
        ),
        pytest.param(
            "[screening.participants]\ncorrect_share_under = 75\n",
            "study.toml:16: screening.participants.correct_share_under: out of bounds; found "
            '"75", expected a number of 1 or less\n'
            "    fix: write for example correct_share_under = 0.75",
            id="correct_share_under in percent",
        ),
        pytest.param(
            "[screening.participants]\ncorrect_share_under = -0.1\n",
            "study.toml:16: screening.participants.correct_share_under: out of bounds; found "
            '"-0.1", expected a number of 0 or more\n'
            "    fix: write for example correct_share_under = 0.75",
            id="correct_share_under below 0",
        ),
        pytest.param(
            "[screening.participants]\nlost_trials_share_over = 30\n",
            "study.toml:16: screening.participants.lost_trials_share_over: out of bounds; found "
            '"30", expected a number of 1 or less\n'
            "    fix: write for example lost_trials_share_over = 0.3",
            id="lost_trials_share_over in percent",
        ),
        pytest.param(
            "[screening.participants]\nlost_trials_share_over = -0.1\n",
            "study.toml:16: screening.participants.lost_trials_share_over: out of bounds; found "
            '"-0.1", expected a number of 0 or more\n'
            "    fix: write for example lost_trials_share_over = 0.3",
            id="lost_trials_share_over below 0",
        ),
        pytest.param(
            "[screening.participants]\nfewest_trials_per_cell = 0\n",
            "study.toml:16: screening.participants.fewest_trials_per_cell: out of bounds; found "
            '"0", expected a number of 1 or more\n'
            "    fix: write for example fewest_trials_per_cell = 4",
            id="fewest_trials_per_cell",
        ),
        pytest.param(
            "[screening.participants]\nfewest_trials_per_cell = 100001\n",
            "study.toml:16: screening.participants.fewest_trials_per_cell: out of bounds; found "
            '"100001", expected a number of 100000 or less\n'
            "    fix: write for example fewest_trials_per_cell = 4",
            id="fewest_trials_per_cell too many",
        ),
        pytest.param(
            "[screening.values]\noutlier_sd = 0\n",
            'study.toml:16: screening.values.outlier_sd: out of bounds; found "0", expected a '
            "number above 0\n"
            "    fix: write for example outlier_sd = 3",
            id="outlier_sd",
        ),
    ],
)
def test_limit_out_of_bounds_is_refused(
    refusal: Callable[..., str], tables: str, expected: str
) -> None:
    """A limit that could leave out nothing, or everything, is refused."""
    assert refusal(SOUND + tables).rsplit("\n", 1)[0] == expected
