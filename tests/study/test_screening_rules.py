"""Rules of screening that lack what they need or contradict themselves: message and line."""

from collections.abc import Callable

import pytest

from tests.study.written import SOUND, changed_at

NO_ONSET = {'onset = "t_start"': 'fixation = "n"'}
LABELS_ALONE = {
    'x = "gx"\ny = "gy"\n': 'label = "area"\n',
    'kind = "boxes"': 'kind = "labels"',
}
X_ALONE = {'y = "gy"\n': "", 'kind = "boxes"': 'kind = "boxes"\nvertical = "any"'}


@pytest.mark.parametrize(
    ("changes", "tables", "expected"),
    [
        pytest.param(
            {},
            "[screening.fixations]\noutside_text_time = true\n",
            "study.toml:16: screening.fixations.outside_text_time: nothing says when the text was "
            "on the screen; expected trials.onset or trials.offset\n"
            '    fix: add onset = "…" or offset = "…" to [trials] with the name of the column, or '
            "remove this rule",
            id="no time of the text",
        ),
        pytest.param(
            NO_ONSET,
            '[trials]\nonset = "t_on"\n[screening.fixations]\noutside_text_time = true\n',
            "study.toml:18: screening.fixations.outside_text_time: nothing says when a fixation "
            "began; expected logs.columns.onset\n"
            '    fix: add onset = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="no onsets for the time of the text",
        ),
        pytest.param(
            NO_ONSET,
            "[screening.fixations]\noutside_text_time = true\n",
            "study.toml:16: screening.fixations.outside_text_time: nothing says when the text was "
            "on the screen; expected trials.onset or trials.offset\n"
            '    fix: add onset = "…" or offset = "…" to [trials] with the name of the column, or '
            "remove this rule\n"
            "study.toml:16: screening.fixations.outside_text_time: nothing says when a fixation "
            "began; expected logs.columns.onset\n"
            '    fix: add onset = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="neither time of the text nor onsets",
        ),
        pytest.param(
            {},
            '[screening.fixations]\nblink = "drop"\n',
            "study.toml:16: screening.fixations.blink: nothing says which fixations a blink "
            "touches; expected logs.columns.blink\n"
            '    fix: add blink = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="no blinks",
        ),
        pytest.param(
            {},
            '[screening.trials]\nblink_in_first_pass_of = ["verb"]\n',
            "study.toml:16: screening.trials.blink_in_first_pass_of: nothing says which fixations "
            "a blink touches; expected logs.columns.blink\n"
            '    fix: add blink = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="no blinks in first pass",
        ),
        pytest.param(
            NO_ONSET,
            "[screening.trials]\nduration_ms = [500, 30000]\n",
            "study.toml:16: screening.trials.duration_ms: nothing says when a fixation began; "
            "expected logs.columns.onset\n"
            '    fix: add onset = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="no onsets for the duration of a trial",
        ),
        pytest.param(
            {},
            "[screening.trials]\nanswer_wrong = true\n",
            "study.toml:16: screening.trials.answer_wrong: nothing says whether an answer was "
            "correct; expected trials.answer_correct\n"
            '    fix: add answer_correct = "…" to [trials] with the name of the column, or remove '
            "this rule",
            id="no answers of trials",
        ),
        pytest.param(
            {},
            "[screening.participants]\ncorrect_share_under = 0.75\n",
            "study.toml:16: screening.participants.correct_share_under: nothing says whether an "
            "answer was correct; expected trials.answer_correct\n"
            '    fix: add answer_correct = "…" to [trials] with the name of the column, or remove '
            "this rule",
            id="no answers of readers",
        ),
        pytest.param(
            {},
            "[screening.participants]\nfewest_trials_per_cell = 4\n",
            "study.toml:16: screening.participants.fewest_trials_per_cell: without factors there "
            "are no cells in which to count trials; expected trials.factors\n"
            '    fix: add factors = ["…"] to [trials] with the names of their columns, or remove '
            "this rule",
            id="no factors",
        ),
    ],
)
def test_rule_has_the_facts_it_needs(
    refusal: Callable[..., str], changes: dict[str, str], tables: str, expected: str
) -> None:
    """A rule is refused where nothing says what it judges by, at the rule itself."""
    assert refusal(changed_at(changes) + tables).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "tables", "expected"),
    [
        pytest.param(
            {},
            "[screening.fixations]\noff_screen = true\n",
            "study.toml:16: screening.fixations.off_screen: nothing says how large the screen is; "
            "expected [screen]\n"
            "    fix: add [screen] with width_px and height_px, or remove this rule",
            id="off_screen without a screen",
        ),
        pytest.param(
            LABELS_ALONE,
            "[screen]\n"
            "width_px = 1920\n"
            "height_px = 1080\n"
            "[screening.fixations]\n"
            "off_screen = true\n",
            "study.toml:18: screening.fixations.off_screen: nothing says where each fixation was; "
            "expected logs.columns.x and logs.columns.y\n"
            '    fix: add x = "…" and y = "…" to [logs.columns] with the header of the column, or '
            "remove this rule",
            id="off_screen with labels",
        ),
        pytest.param(
            X_ALONE,
            "[screen]\n"
            "width_px = 1920\n"
            "height_px = 1080\n"
            "[screening.fixations]\n"
            "off_screen = true\n",
            "study.toml:19: screening.fixations.off_screen: nothing says where each fixation was; "
            "expected logs.columns.y\n"
            '    fix: add y = "…" to [logs.columns] with the header of the column, or remove this '
            "rule",
            id="off_screen without y",
        ),
        pytest.param(
            LABELS_ALONE,
            "[screening.fixations]\nmerge = { under_ms = 80, within_px = 14 }\n",
            "study.toml:15: screening.fixations.merge: nothing says where each fixation was; "
            "expected logs.columns.x and logs.columns.y\n"
            '    fix: add x = "…" and y = "…" to [logs.columns] with the header of the column, or '
            "remove this rule",
            id="merge with labels",
        ),
    ],
)
def test_rule_about_places_has_positions(
    refusal: Callable[..., str], changes: dict[str, str], tables: str, expected: str
) -> None:
    """Rules about places are refused without positions, and off_screen without a screen."""
    assert refusal(changed_at(changes) + tables).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("key", "written"),
    [
        ("screening.fixations.undersweep", '[screening.fixations]\nundersweep = "drop"\n'),
        (
            "screening.trials.line_confidence_under",
            "[screening.trials]\nline_confidence_under = 0.9\n",
        ),
    ],
    ids=["undersweep", "line_confidence_under"],
)
@pytest.mark.parametrize(
    ("changes", "line", "expected"),
    [
        pytest.param(
            LABELS_ALONE,
            15,
            'regions.kind = "labels" has no lines; expected a kind of regions that have '
            "positions\n    fix: remove this rule, or correct kind",
            id="labels",
        ),
        pytest.param(
            X_ALONE,
            16,
            'with regions.vertical = "any" no line can be told from another; expected '
            'vertical = "box"\n    fix: remove this rule for texts of one line, or write '
            'vertical = "box"',
            id="x alone",
        ),
    ],
)
def test_rule_about_lines_has_lines(
    refusal: Callable[..., str],
    key: str,
    written: str,
    changes: dict[str, str],
    line: int,
    expected: str,
) -> None:
    """Rules about lines are refused where regions are in no lines, or y does not count."""
    message = refusal(changed_at(changes) + written).rsplit("\n", 1)[0]
    assert message == f"study.toml:{line}: {key}: {expected}"


@pytest.mark.parametrize("method", ["slice", "nearest", "none"])
def test_confidence_needs_all_methods(refusal: Callable[..., str], method: str) -> None:
    """A method by itself does not tell how sure it is, so that the rule could never apply."""
    tables = f'[lines]\nmethod = "{method}"\n[screening.trials]\nline_confidence_under = 0.9\n'
    assert refusal(SOUND + tables).rsplit("\n", 1)[0] == (
        f'study.toml:18: screening.trials.line_confidence_under: lines.method = "{method}" does '
        'not tell how sure the lines are; expected method = "consensus"\n'
        '    fix: write method = "consensus" in [lines], or remove this rule'
    )


@pytest.mark.parametrize(
    ("changes", "tables", "expected"),
    [
        pytest.param(
            {},
            "[screening.fixations]\nmerge = { under_ms = 80 }\n",
            "study.toml:16: screening.fixations.merge: nothing says how near the other fixation "
            "must be; expected one of within_px, within_deg and within_characters\n"
            "    fix: add for example within_px = 14",
            id="no distance",
        ),
        pytest.param(
            {},
            "[screen]\n"
            "width_px = 1920\n"
            "height_px = 1080\n"
            "width_cm = 53\n"
            "distance_cm = 65\n"
            "[screening.fixations.merge]\n"
            "within_deg = 0.5\n"
            "under_ms = 80\n"
            "within_px = 14\n",
            "study.toml:21: screening.fixations.merge.within_deg: how near the other fixation "
            'must be is said more than once; found "within_px, within_deg", expected one of '
            "within_px, within_deg and within_characters\n"
            "    fix: keep one of them",
            id="two distances",
        ),
        pytest.param(
            {},
            "[screen]\n"
            "width_px = 1920\n"
            "height_px = 1080\n"
            "width_cm = 53\n"
            "distance_cm = 65\n"
            "[screening.fixations.merge]\n"
            "under_ms = 80\n"
            "within_px = 14\n"
            "within_deg = 0.5\n"
            "within_characters = 1\n",
            "study.toml:24: screening.fixations.merge.within_characters: how near the other "
            'fixation must be is said more than once; found "within_px, within_deg, '
            'within_characters", expected one of within_px, within_deg and within_characters\n'
            "    fix: keep one of them\n"
            "study.toml:24: screening.fixations.merge.within_characters: nothing says how wide a "
            'character is: regions.kind = "boxes" has no layout; expected within_px or within_deg\n'
            "    fix: give within_px in place of within_characters",
            id="three distances",
        ),
        pytest.param(
            {},
            "[screening.fixations]\nmerge = { under_ms = 80, within_deg = 0.5 }\n",
            "study.toml:16: screening.fixations.merge.within_deg: a distance in degrees needs the "
            "size and the distance of the screen; expected [screen]\n"
            "    fix: add [screen] with width_px, height_px, width_cm and distance_cm, or give "
            "within_px in place of within_deg",
            id="degrees without a screen",
        ),
        pytest.param(
            {},
            "[screen]\n"
            "width_px = 1920\n"
            "height_px = 1080\n"
            "[screening.fixations]\n"
            "merge = { under_ms = 80, within_deg = 0.5 }\n",
            "study.toml:15: screen.width_cm: this key is missing, and within_deg in "
            "screening.fixations.merge needs it; expected a number of centimetres\n"
            "    fix: add width_cm = … to [screen], or give within_px in place of within_deg\n"
            "study.toml:15: screen.distance_cm: this key is missing, and within_deg in "
            "screening.fixations.merge needs it; expected a number of centimetres\n"
            "    fix: add distance_cm = … to [screen], or give within_px in place of within_deg",
            id="degrees without sizes",
        ),
        pytest.param(
            {},
            "[screening.fixations]\nmerge = { under_ms = 80, within_characters = 1 }\n",
            "study.toml:16: screening.fixations.merge.within_characters: nothing says how wide a "
            'character is: regions.kind = "boxes" has no layout; expected within_px or within_deg\n'
            "    fix: give within_px in place of within_characters",
            id="characters without a layout",
        ),
    ],
)
def test_merge_has_one_distance(
    refusal: Callable[..., str], changes: dict[str, str], tables: str, expected: str
) -> None:
    """Merging needs exactly one distance, and what turns it into pixels."""
    assert refusal(changed_at(changes) + tables).rsplit("\n", 1)[0] == expected


@pytest.mark.parametrize(
    ("changes", "tables", "expected"),
    [
        pytest.param(
            {},
            "[screening.fixations]\nunder_ms = 800\nover_ms = 80\n",
            "study.toml:17: screening.fixations.over_ms: no duration lies between under_ms and "
            'over_ms; found "80", expected a number above 800\n'
            "    fix: correct one of the two limits",
            id="limits of a fixation turned round",
        ),
        pytest.param(
            {},
            "[screening.fixations]\nover_ms = 80.5\nunder_ms = 80.5\n",
            "study.toml:16: screening.fixations.over_ms: no duration lies between under_ms and "
            'over_ms; found "80.5", expected a number above 80.5\n'
            "    fix: correct one of the two limits",
            id="limits of a fixation alike",
        ),
        pytest.param(
            {},
            "[screening.trials]\nduration_ms = [30000, 500]\n",
            "study.toml:16: screening.trials.duration_ms: no duration lies between the two "
            'limits; found "[30000, 500]", expected two numbers, the lower first\n'
            "    fix: write duration_ms = [500, 30000]",
            id="limits of a trial turned round",
        ),
        pytest.param(
            {},
            "[screening.trials]\nduration_ms = [500, 500.0]\n",
            "study.toml:16: screening.trials.duration_ms: no duration lies between the two "
            'limits; found "[500, 500]", expected two numbers, the lower first\n'
            "    fix: correct one of the two limits",
            id="limits of a trial alike",
        ),
    ],
)
def test_limits_leave_room(
    refusal: Callable[..., str], changes: dict[str, str], tables: str, expected: str
) -> None:
    """Two limits between which nothing lies are refused."""
    assert refusal(changed_at(changes) + tables).rsplit("\n", 1)[0] == expected
